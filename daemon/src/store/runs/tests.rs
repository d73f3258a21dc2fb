//! Runs, stages and journals come back as they went in, in order.
#![allow(clippy::unwrap_used)]

use evenpair_api::{RunState, StageReport};
use serde_json::json;
use tempfile::TempDir;
use uuid::Uuid;

use crate::store::StoreError;
use crate::store::tests::{a_run, open};

#[tokio::test]
async fn a_run_is_updated_and_its_stages_follow() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let mut run = a_run(0);
    store.create_run(&run, "").await.unwrap();
    run.state = RunState::Broken;
    run.ended_at = Some(jiff::Timestamp::new(1_790_000_500, 0).unwrap());
    run.reason = Some("the scope does not answer".to_owned());
    run.progress.done = 9;
    run.progress.doing.clear();
    run.failures.clear();
    run.generation = 17;
    store.update_run(&run).await.unwrap();
    let stage = StageReport {
        step: 0,
        text: "route to the gate".to_owned(),
        started_s: 0.1,
        ended_s: Some(1.0 / 3.0),
        outcome: Some("closed".to_owned()),
    };
    let other = StageReport { step: 7, ..stage.clone() };
    store.put_stage(run.id, &other).await.unwrap();
    store.put_stage(run.id, &stage).await.unwrap();
    run.stages = vec![stage, other];
    assert_eq!(store.run(run.id).await.unwrap(), Some(run));
}

#[tokio::test]
async fn lists_have_their_order_and_only_what_belongs_there() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let mut runs: Vec<_> = (0..4).map(a_run).collect();
    runs[1].state = RunState::Passed;
    runs[2].state = RunState::Waiting;
    // Whole seconds and fractions must sort by time, not by how they are written.
    runs[3].created_at = jiff::Timestamp::new(1_790_000_003, 0).unwrap();
    for run in [&runs[2], &runs[0], &runs[3], &runs[1]] {
        store.create_run(run, "").await.unwrap();
    }
    let ids = |runs: &[evenpair_api::Run]| runs.iter().map(|run| run.id).collect::<Vec<Uuid>>();
    let listed = store.runs(3).await.unwrap();
    assert_eq!(ids(&listed), [runs[3].id, runs[2].id, runs[1].id]);
    assert!(listed.iter().all(|run| run.stages.is_empty()));
    let unfinished = store.unfinished().await.unwrap();
    assert_eq!(unfinished, [runs[0].clone(), runs[2].clone(), runs[3].clone()]);
}

#[tokio::test]
async fn a_journal_keeps_its_order_and_its_numbers_per_run() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let (one, two) = (a_run(0), a_run(1));
    store.create_run(&one, "").await.unwrap();
    store.create_run(&two, "").await.unwrap();
    for number in 1..=20_u64 {
        assert_eq!(store.append(one.id, &json!({ "started": number })).await.unwrap(), number);
        // On the disk when `append` returns: another connection sees it at once.
        let seen = rusqlite::Connection::open(folder.path().join("evenpair.sqlite")).unwrap();
        let count: u64 = seen
            .query_row("select count(*) from journal where run = ?1", [one.id.to_string()], |row| row.get::<_, i64>(0))
            .unwrap()
            .try_into()
            .unwrap();
        assert_eq!(count, number);
    }
    assert_eq!(store.append(two.id, &json!("other")).await.unwrap(), 1);
    let journal = store.journal(one.id).await.unwrap();
    assert_eq!(journal, (1..=20).map(|number| json!({ "started": number })).collect::<Vec<_>>());
}

#[tokio::test]
async fn what_is_not_there_or_there_already_is_told() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let run = a_run(0);
    let stage = run.stages[0].clone();
    for refused in [
        store.update_run(&run).await.unwrap_err(),
        store.put_stage(run.id, &stage).await.unwrap_err(),
        store.append(run.id, &json!(1)).await.unwrap_err(),
    ] {
        assert!(matches!(&refused, StoreError::Unknown { what: "run", id } if *id == run.id.to_string()), "{refused}");
    }
    assert_eq!(store.run(run.id).await.unwrap(), None);
    assert_eq!(store.source(run.id).await.unwrap(), None);
    store.create_run(&run, "first").await.unwrap();
    let refused = store.create_run(&run, "second").await.unwrap_err();
    assert!(matches!(refused, StoreError::AlreadyThere { what: "run", .. }), "{refused}");
    assert_eq!(store.source(run.id).await.unwrap().as_deref(), Some("first"));
}
