//! The sweep at a start: what a crash can have left between two steps of storing a capture.

use std::fs;
use std::io;
use std::path::{Path, PathBuf};

use rusqlite::{Connection, params};
use uuid::Uuid;

use super::convert::first;
use super::disk::{Disk, PART};
use super::error::StoreError;
use super::folder::Folder;

/// What a sweep did.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub(crate) struct Swept {
    /// Half-written files that were removed.
    pub(crate) parts: u64,
    /// Whole waveform files without a row that were moved to `waveforms/orphans/`.
    pub(crate) orphans: u64,
}

/// A file in a run's folder that the store made.
#[derive(Debug, PartialEq, Eq)]
pub(super) enum Found {
    /// Half-written.
    Part(PathBuf),
    /// A capture's waveform.
    Waveform { path: PathBuf, run: Uuid, number: u32 },
}

/// Removes half-written files and moves waveform files without a row aside. A file that the store did not make is left
/// alone.
///
/// # Errors
/// What the disk or the database says.
pub(super) fn sweep(connection: &Connection, folder: &Folder, disk: &dyn Disk) -> Result<Swept, StoreError> {
    let doing = "sweep up after the last run of the daemon";
    let mut swept = Swept::default();
    for found in files(folder)? {
        match found {
            Found::Part(path) => {
                disk.remove(&path).map_err(|source| StoreError::file(doing, &path, source))?;
                swept.parts += 1;
            }
            Found::Waveform { path, run, number } => {
                if has_row(connection, run, number, &folder.database())? {
                    continue;
                }
                let target = free_name(&folder.orphans(), run, number);
                disk.make_folder(&folder.orphans())
                    .and_then(|()| disk.rename(&path, &target))
                    .and_then(|()| disk.sync_folder(&folder.orphans()))
                    .map_err(|source| StoreError::file(doing, &path, source))?;
                swept.orphans += 1;
            }
        }
    }
    Ok(swept)
}

/// Every file in the runs' folders that the store made.
///
/// # Errors
/// What the disk says.
pub(super) fn files(folder: &Folder) -> Result<Vec<Found>, StoreError> {
    let mut found = Vec::new();
    for of_run in list(&folder.waveforms())? {
        let Some(run) = name_of(&of_run).and_then(|name| name.parse::<Uuid>().ok()) else { continue };
        for path in list(&of_run)? {
            let Some(name) = name_of(&path) else { continue };
            if name.ends_with(PART) {
                found.push(Found::Part(path));
            } else if let Some(number) = name.strip_suffix(".parquet").and_then(|number| number.parse().ok()) {
                found.push(Found::Waveform { path, run, number });
            }
        }
    }
    Ok(found)
}

/// Whether a capture is stored.
pub(super) fn has_row(connection: &Connection, run: Uuid, number: u32, path: &Path) -> Result<bool, StoreError> {
    let sql = "select 1 from captures where run = ?1 and number = ?2";
    first(connection, sql, params![run.to_string(), number], |_| Ok(()))
        .map(|row| row.is_some())
        .map_err(|fault| fault.into_error("look for a capture's row", path))
}

/// A name in the folder of orphans that is not taken: the same capture can be left behind more than once.
fn free_name(orphans: &Path, run: Uuid, number: u32) -> PathBuf {
    let first = orphans.join(format!("{run}-{number}.parquet"));
    let others = (2_u32..).map(|attempt| orphans.join(format!("{run}-{number}-{attempt}.parquet")));
    std::iter::once(first.clone()).chain(others).find(|path| !path.exists()).unwrap_or(first)
}

/// The paths in a folder, sorted by name; none when it is not a folder.
fn list(folder: &Path) -> Result<Vec<PathBuf>, StoreError> {
    let entries = match fs::read_dir(folder) {
        Ok(entries) => entries,
        Err(error) if matches!(error.kind(), io::ErrorKind::NotFound | io::ErrorKind::NotADirectory) => {
            return Ok(Vec::new());
        }
        Err(source) => return Err(StoreError::file("list a folder", folder, source)),
    };
    let paths: Result<Vec<_>, _> = entries.map(|entry| entry.map(|entry| entry.path())).collect();
    let mut paths = paths.map_err(|source| StoreError::file("list a folder", folder, source))?;
    paths.sort();
    Ok(paths)
}

/// A path's last part.
fn name_of(path: &Path) -> Option<&str> {
    path.file_name()?.to_str()
}
