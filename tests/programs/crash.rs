//! `kill -9` in the middle: nothing that was told of is lost, and the bench comes to rest.

use std::cell::Cell;

use evenpair_tests::{Lab, LabPlan, run_to_end};
use serde_json::Value;

use crate::scripts::{night, text};
use crate::sequences::{outputs, readable_captures};

/// Kills the daemon once `enough` says so of an event, starts it again, and checks what every such night must keep.
///
/// With `at_the_end` the kill may come when the run is over already, which must then be in the store.
async fn killed_when(enough: impl Fn(&Value) -> bool, at_the_end: bool) {
    let mut lab = Lab::start(&LabPlan::default()).await;
    let id = lab.api.begin("/runs", &text(&night(&[24, 36, 48, 60, 30, 40], ""))).await;
    let seen = lab.api.events_until(&id, enough).await;
    let status = lab.daemon.signal("KILL").await;
    assert_eq!(status.code(), None, "it was killed");
    assert_ne!(seen.last().unwrap()["state"], "passed", "the run was over before the kill");
    let told = seen.iter().filter(|event| event["kind"] == "captured").count();

    lab.restart_daemon().await;
    let run = lab.api.ended(&id).await;
    if !(at_the_end && run["state"] == "passed") {
        assert_eq!(run["state"], "broken", "{run}");
        let reason = run["reason"].as_str().unwrap();
        assert!(reason.contains("daemon was stopped"), "{reason}");
    }
    assert_eq!(outputs(&lab).await, ["0", "0"]);
    let captures = readable_captures(&lab, &id).await;
    assert!(captures >= told, "{told} were told of, {captures} are there");
    assert_eq!(run["progress"]["captures"].as_u64(), Some(captures as u64), "{run}");
    // What was told before the kill is told again, in the same words; each generation comes once.
    let again = lab.api.events(&id).await;
    assert_eq!(&again[..seen.len()], &seen[..]);
    let generations: Vec<u64> = again.iter().map(|event| event["generation"].as_u64().unwrap()).collect();
    assert_eq!(generations, (1..=generations.len() as u64).collect::<Vec<_>>());

    assert_eq!(lab.daemon.signal("TERM").await.code(), Some(0), "{}", lab.log());
    let data = lab.data();
    let check = run_to_end("evenpaird", &["--check", "--data", data.to_str().unwrap()]).await;
    let said = String::from_utf8_lossy(&check.stdout).into_owned() + &String::from_utf8_lossy(&check.stderr);
    assert_eq!(check.status.code(), Some(0), "{said}");
    assert!(said.contains("1 runs") && said.contains("0 broken"), "{said}");
}

/// An event counter: true at the `n`th event.
fn nth(n: usize) -> impl Fn(&Value) -> bool {
    let count = Cell::new(0);
    move |_| {
        count.set(count.get() + 1);
        count.get() == n
    }
}

/// The `n`th capture.
fn nth_capture(n: u64) -> impl Fn(&Value) -> bool {
    move |event| event["kind"] == "captured" && event["capture"]["number"] == n
}

/// Catches: a journal that is written after what it describes; a run that stays open for ever.
#[tokio::test]
async fn killed_as_it_begins() {
    killed_when(nth(2), false).await;
}

/// Catches: a reference that stays on, a run without a correction that cannot be ended.
#[tokio::test]
async fn killed_while_deskewing() {
    killed_when(nth(7), false).await;
}

/// Catches: a capture that is told of before it is on the disk.
#[tokio::test]
async fn killed_at_the_first_capture() {
    killed_when(nth_capture(1), false).await;
}

/// Catches: a file without a row, or a row without a file.
#[tokio::test]
async fn killed_at_the_fourth_capture() {
    killed_when(nth_capture(4), false).await;
}

/// Catches: an end that is written before the bench is at rest.
#[tokio::test]
async fn killed_while_coming_to_rest() {
    killed_when(|event| event["progress"]["doing"] == "bringing the bench to rest", true).await;
}
