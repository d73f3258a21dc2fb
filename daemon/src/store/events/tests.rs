//! Events come back in order, with the capture as it is stored.
#![allow(clippy::unwrap_used)]

use evenpair_api::{Event, EventKind, RunState};
use tempfile::TempDir;

use crate::store::StoreError;
use crate::store::tests::{a_capture, a_correction, a_run, a_waveform, open};

#[tokio::test]
async fn a_stream_is_taken_up_where_it_broke_off() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let mut run = a_run(0);
    let correction = a_correction("gate", 0);
    store.create_run(&run, "").await.unwrap();
    store.put_correction(&correction).await.unwrap();
    let capture = store.put_capture(&a_capture(run.id, 1, None, 60), a_waveform(60)).await.unwrap();
    let kinds = [
        EventKind::StateChanged { state: RunState::Running, reason: None },
        EventKind::Corrected { correction: Box::new(correction) },
        EventKind::Captured { capture: Box::new(capture) },
        EventKind::Progressed { progress: run.progress.clone() },
    ];
    let events: Vec<_> = (1_u64..)
        .zip(kinds)
        .map(|(generation, kind)| Event { generation, at_s: generation as f64 * 0.5, kind })
        .collect();
    for event in &events[..3] {
        store.append_event(run.id, event).await.unwrap();
    }
    run.generation = 4;
    run.progress.done = 5;
    store.publish(&run, &events[3]).await.unwrap();
    assert_eq!(store.run(run.id).await.unwrap().unwrap().progress.done, 5);
    assert_eq!(store.events(run.id, 0, 100).await.unwrap(), events);
    assert_eq!(store.events(run.id, 1, 2).await.unwrap(), events[1..3]);
    assert!(store.events(run.id, 4, 100).await.unwrap().is_empty());
}

#[tokio::test]
async fn a_refused_event_changes_nothing() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let run = a_run(0);
    let event = |generation, kind| Event { generation, at_s: 1.0, kind };
    let changed = |state| EventKind::StateChanged { state, reason: None };
    let refused = store.append_event(run.id, &event(1, changed(RunState::Running))).await.unwrap_err();
    assert!(matches!(refused, StoreError::Unknown { .. }), "{refused}");
    store.create_run(&run, "").await.unwrap();
    store.append_event(run.id, &event(1, changed(RunState::Running))).await.unwrap();

    let mut ended = run.clone();
    ended.state = RunState::Passed;
    let refused = store.publish(&ended, &event(1, changed(RunState::Passed))).await.unwrap_err();
    assert!(matches!(refused, StoreError::AlreadyThere { what: "event", .. }), "{refused}");
    assert_eq!(store.run(run.id).await.unwrap(), Some(run.clone()));

    let capture = Box::new(a_capture(run.id, 9, None, 60));
    let refused = store.append_event(run.id, &event(2, EventKind::Captured { capture })).await.unwrap_err();
    assert!(matches!(&refused, StoreError::Unknown { id, .. } if id.ends_with("/9")), "{refused}");
    assert_eq!(store.events(run.id, 0, 100).await.unwrap().len(), 1);
}
