//! The check finds each broken promise, and only that.
#![allow(clippy::unwrap_used)]

use std::fs;

use rusqlite::Connection;
use serde_json::json;
use tempfile::TempDir;
use uuid::Uuid;

use super::*;
use crate::store::tests::{a_capture, a_run, a_waveform, open};

async fn filled() -> (TempDir, Store, Uuid) {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let mut run = a_run(0);
    store.create_run(&run, "").await.unwrap();
    for number in 1..=3 {
        store.append(run.id, &json!(number)).await.unwrap();
        store.put_capture(&a_capture(run.id, number, None, 50), a_waveform(50)).await.unwrap();
        run.progress.captures = number;
        store.update_run(&run).await.unwrap();
    }
    (folder, store, run.id)
}

async fn spoil(store: &Store, sql: &'static str) {
    let job = move |c: &mut Connection| Ok(c.execute_batch(sql)?);
    store.inner.writer.ask("spoil", job).await.unwrap();
}

#[tokio::test]
async fn a_sound_store_has_nothing_broken() {
    let (_folder, store, _) = filled().await;
    assert_eq!(store.check().await.unwrap(), CheckReport { runs: 1, captures: 3, broken: vec![] });
}

#[tokio::test]
async fn missing_cut_and_swapped_files_are_found() {
    let (_folder, store, run) = filled().await;
    let path = async |number| store.waveform_path(run, number).await.unwrap().unwrap();
    fs::remove_file(path(1).await).unwrap();
    let bytes = fs::read(path(2).await).unwrap();
    fs::write(path(2).await, &bytes[..bytes.len() - 1]).unwrap();
    // The same length, but the end that says what is inside is gone.
    let bytes = fs::read(path(3).await).unwrap();
    fs::write(path(3).await, vec![0; bytes.len()]).unwrap();
    let broken = store.check().await.unwrap().broken;
    assert!(matches!(broken[0], Broken::FileMissing { number: 1, .. }), "{broken:?}");
    assert!(matches!(&broken[1], Broken::FileDamaged { number: 2, why, .. } if why.contains("bytes")), "{broken:?}");
    assert!(matches!(broken[2], Broken::FileDamaged { number: 3, .. }), "{broken:?}");
    assert_eq!(broken.len(), 3);
    assert!(store.read_waveform(run, 3).await.is_err());
    assert!(store.capture(run, 1).await.unwrap().is_some(), "the figures outlive the file");
}

#[tokio::test]
async fn a_missing_file_is_told_at_the_next_start_too() {
    let (folder, store, run) = filled().await;
    fs::remove_file(store.waveform_path(run, 2).await.unwrap().unwrap()).unwrap();
    store.close().await.unwrap();
    let broken = open(&folder).check().await.unwrap().broken;
    assert!(matches!(broken[..], [Broken::FileMissing { number: 2, .. }]), "{broken:?}");
}

#[tokio::test]
async fn stray_files_are_found_and_foreign_ones_left_alone() {
    let (folder, store, run) = filled().await;
    let of_run = folder.path().join("waveforms").join(run.to_string());
    fs::write(of_run.join("9.parquet"), b"whole but unknown").unwrap();
    fs::write(of_run.join("8.parquet.part"), b"half").unwrap();
    fs::write(of_run.join("notes.txt"), b"a person's").unwrap();
    let broken = store.check().await.unwrap().broken;
    assert_eq!(
        broken,
        [Broken::Part { path: of_run.join("8.parquet.part") }, Broken::RowMissing { path: of_run.join("9.parquet") }]
    );
    store.close().await.unwrap();
    let store = open(&folder);
    assert_eq!((store.swept().parts, store.swept().orphans), (1, 1));
    let orphan = folder.path().join("waveforms/orphans").join(format!("{run}-9.parquet"));
    assert_eq!(fs::read(&orphan).unwrap(), b"whole but unknown");
    assert!(of_run.join("notes.txt").exists());
    store.close().await.unwrap();
    // A second orphan of the same number does not replace the first.
    fs::write(of_run.join("9.parquet"), b"another").unwrap();
    assert_eq!(open(&folder).swept().orphans, 1);
    assert_eq!(fs::read(&orphan).unwrap(), b"whole but unknown");
    assert_eq!(fs::read(orphan.with_file_name(format!("{run}-9-2.parquet"))).unwrap(), b"another");
}

#[tokio::test]
async fn gaps_and_overcounts_and_strays_are_found() {
    let (_folder, store, run) = filled().await;
    spoil(&store, "delete from journal where number = 2; update runs set captures = 5;").await;
    let broken = store.check().await.unwrap().broken;
    assert_eq!(
        broken,
        [Broken::JournalGap { run, entries: 2, last: 3 }, Broken::Overcounted { run, counted: 5, stored: 3 }]
    );
    spoil(&store, "pragma foreign_keys = off; delete from figures where place = 0; pragma foreign_keys = on;").await;
    let broken = store.check().await.unwrap().broken;
    assert!(matches!(&broken[0], Broken::Database { what } if what.contains("terms")), "{broken:?}");
}
