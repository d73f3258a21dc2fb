//! Captures: pages, refusals, and a stop between every two steps of storing one.
#![allow(clippy::unwrap_used)]

use std::sync::Arc;
use std::sync::atomic::Ordering;

use rusqlite::Connection;
use tempfile::TempDir;
use uuid::Uuid;

use crate::store::tests::{FaultyDisk, a_capture, a_correction, a_run, a_waveform, open};
use crate::store::{Store, StoreError, Swept};

#[tokio::test]
async fn pages_join_without_gap_or_overlap() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let run = a_run(0);
    store.create_run(&run, "").await.unwrap();
    let mut all = Vec::new();
    for number in 1..=7 {
        all.push(store.put_capture(&a_capture(run.id, number, None, 50), a_waveform(50)).await.unwrap());
    }
    for limit in 1..=8 {
        let (mut seen, mut after) = (Vec::new(), Some(0));
        while let Some(from) = after {
            let page = store.captures(run.id, from, limit).await.unwrap();
            assert_eq!(page.total, 7);
            assert!(page.items.len() <= limit as usize && !page.items.is_empty());
            seen.extend(page.items);
            after = page.next;
        }
        assert_eq!(seen, all, "pages of {limit}");
    }
    let other = store.captures(Uuid::now_v7(), 0, 10).await.unwrap();
    assert_eq!((other.items.len(), other.total, other.next), (0, 0, None));
}

#[tokio::test]
async fn a_figure_that_is_not_a_number_stays_none() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let run = a_run(0);
    store.create_run(&run, "").await.unwrap();
    let mut capture = a_capture(run.id, 1, None, 50);
    capture.figures[1].quantity.value = f64::NAN;
    store.put_capture(&capture, a_waveform(50)).await.unwrap();
    let read = store.capture(run.id, 1).await.unwrap().unwrap();
    assert!(read.figures[1].quantity.value.is_nan());
    assert_eq!(read.figures[0], capture.figures[0]);
}

#[tokio::test]
async fn a_stored_capture_is_never_overwritten() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let run = a_run(0);
    store.create_run(&run, "").await.unwrap();
    store.put_capture(&a_capture(run.id, 1, None, 50), a_waveform(50)).await.unwrap();
    let refused = store.put_capture(&a_capture(run.id, 1, None, 60), a_waveform(60)).await.unwrap_err();
    assert!(matches!(refused, StoreError::AlreadyThere { what: "capture", .. }), "{refused}");
    assert_eq!(store.read_waveform(run.id, 1).await.unwrap().points(), 50);
    assert!(store.check().await.unwrap().broken.is_empty());
}

#[tokio::test]
async fn a_capture_that_belongs_to_nothing_leaves_no_file() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let run = a_run(0);
    let refused = store.put_capture(&a_capture(run.id, 1, None, 50), a_waveform(50)).await.unwrap_err();
    assert!(matches!(refused, StoreError::Unknown { what: "run", .. }), "{refused}");
    store.create_run(&run, "").await.unwrap();
    let never_stored = a_correction("gate", 0);
    let capture = a_capture(run.id, 1, Some(&never_stored), 50);
    let refused = store.put_capture(&capture, a_waveform(50)).await.unwrap_err();
    assert!(matches!(refused, StoreError::Unknown { what: "correction", .. }), "{refused}");
    let mut short = a_waveform(50);
    short.negative = a_waveform(49).negative;
    let refused = store.put_capture(&a_capture(run.id, 1, None, 50), short).await.unwrap_err();
    assert!(matches!(refused, StoreError::Inconsistent { .. }), "{refused}");
    assert!(!folder.path().join("waveforms").join(run.id.to_string()).exists());
    assert_eq!(store.waveform_path(run.id, 1).await.unwrap(), None);
    let refused = store.read_waveform(run.id, 1).await.unwrap_err();
    assert!(matches!(refused, StoreError::Unknown { what: "capture", .. }), "{refused}");
}

/// Steps of the disk that opening takes before the first capture: the folder, its sync, and the database's name.
const OPENING: usize = 3;

/// The steps of one capture, in the order of the module's head.
const STORING: [&str; 7] = ["make folder", "sync folder", "create", "write", "sync", "rename", "sync folder"];

#[tokio::test]
async fn a_stop_between_any_two_steps_loses_nothing_and_doubles_nothing() {
    for done in 0..=STORING.len() {
        let folder = TempDir::new().unwrap();
        let run = a_run(0);
        let store = open(&folder);
        store.create_run(&run, "").await.unwrap();
        let kept = store.put_capture(&a_capture(run.id, 1, None, 50), a_waveform(50)).await.unwrap();
        store.close().await.unwrap();

        let disk = FaultyDisk::new(OPENING + done, true);
        let (names, steps) = (disk.names.clone(), disk.steps.clone());
        let store = Store::open_on(folder.path(), Arc::new(disk)).unwrap();
        assert_eq!(steps.load(Ordering::SeqCst), OPENING);
        if done == STORING.len() {
            // The last stop: the file is there and its rows are not.
            let forbid = |c: &mut Connection| {
                Ok(c.execute_batch(
                    "create temp trigger no_limits before insert on limits begin select raise(abort, 'stop'); end",
                )?)
            };
            store.inner.writer.ask("forbid rows", forbid).await.unwrap();
        }
        let refused = store.put_capture(&a_capture(run.id, 2, None, 60), a_waveform(60)).await.unwrap_err();
        if done < STORING.len() {
            assert!(matches!(refused, StoreError::DiskFull { .. }), "after {done}: {refused}");
        } else {
            assert!(matches!(refused, StoreError::Database { .. }), "after {done}: {refused}");
        }
        assert_eq!(names.lock().unwrap()[OPENING..], STORING[..done]);
        assert_eq!(store.captures(run.id, 0, 10).await.unwrap().items, std::slice::from_ref(&kept));
        drop(store);

        let store = open(&folder);
        let parts = u64::from((3..6).contains(&done));
        let orphans = u64::from(done >= 6);
        assert_eq!(store.swept(), Swept { parts, orphans }, "after {done}");
        assert_eq!(store.check().await.unwrap().broken, [], "after {done}");
        assert_eq!(store.captures(run.id, 0, 10).await.unwrap().items, std::slice::from_ref(&kept));
        let again = store.put_capture(&a_capture(run.id, 2, None, 70), a_waveform(70)).await.unwrap();
        assert_eq!(store.captures(run.id, 0, 10).await.unwrap().items, [kept, again]);
        assert_eq!(store.read_waveform(run.id, 2).await.unwrap().points(), 70);
        store.close().await.unwrap();
        assert_eq!(open(&folder).swept(), Swept::default(), "a second start found more");
    }
}

#[tokio::test]
async fn a_full_disk_leaves_no_half_written_file_behind() {
    for done in 2..6 {
        let folder = TempDir::new().unwrap();
        let run = a_run(0);
        let store = Store::open_on(folder.path(), Arc::new(FaultyDisk::new(OPENING + done, false))).unwrap();
        store.create_run(&run, "").await.unwrap();
        let refused = store.put_capture(&a_capture(run.id, 1, None, 50), a_waveform(50)).await.unwrap_err();
        assert!(matches!(refused, StoreError::DiskFull { .. }), "{refused}");
        let of_run = folder.path().join("waveforms").join(run.id.to_string());
        assert_eq!(std::fs::read_dir(of_run).unwrap().count(), 0, "after {done}");
    }
}
