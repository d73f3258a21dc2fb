//! Whether what the store promises holds: the invariants in the module's head, one by one.

use std::fs;
use std::io;
use std::path::PathBuf;

use rusqlite::Connection;
use uuid::Uuid;

use super::Store;
use super::convert::{all, first, from_id, from_integer};
use super::error::{Fault, StoreError};
use super::folder::Folder;
use super::sweep::{Found, files, has_row};
use super::waveform::parquet;

/// What a check found.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub(crate) struct CheckReport {
    /// Runs stored.
    pub(crate) runs: u64,
    /// Captures stored.
    pub(crate) captures: u64,
    /// Everything that does not hold; empty when all is well.
    pub(crate) broken: Vec<Broken>,
}

/// A promise that does not hold.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub(crate) enum Broken {
    /// Invariant 1: a capture's file is not there.
    #[error("capture {run}/{number}: its file {} is missing; restore it from a backup", path.display())]
    FileMissing {
        /// The run.
        run: Uuid,
        /// The capture's number.
        number: u32,
        /// Where the file should be.
        path: PathBuf,
    },
    /// Invariant 1: a capture's file is not what was written.
    #[error("capture {run}/{number}: its file {} is damaged: {why}; restore it from a backup", path.display())]
    FileDamaged {
        /// The run.
        run: Uuid,
        /// The capture's number.
        number: u32,
        /// The file.
        path: PathBuf,
        /// What is wrong with it.
        why: String,
    },
    /// Invariant 2: a waveform file has no row.
    #[error("{} belongs to no capture; the next start of the daemon moves it aside", path.display())]
    RowMissing {
        /// The file.
        path: PathBuf,
    },
    /// Invariant 3: a half-written file is left.
    #[error("{} is half-written; the next start of the daemon removes it", path.display())]
    Part {
        /// The file.
        path: PathBuf,
    },
    /// Invariant 4: a journal has a gap.
    #[error("the journal of run {run} has {entries} entries but its last number is {last}")]
    JournalGap {
        /// The run.
        run: Uuid,
        /// Entries there are.
        entries: u64,
        /// The last one's number.
        last: u64,
    },
    /// Invariant 5: a run counts captures that are not stored.
    #[error("run {run} counts {counted} captures but {stored} are stored")]
    Overcounted {
        /// The run.
        run: Uuid,
        /// What the run says.
        counted: u64,
        /// What is stored.
        stored: u64,
    },
    /// Invariant 6: SQLite finds the database unsound.
    #[error("the database is damaged: {what}; restore it from a backup")]
    Database {
        /// What SQLite says.
        what: String,
    },
}

impl Store {
    /// Looks whether everything that the store promises holds. Reads the end of every waveform file, so it takes a
    /// while on a large folder; writes wait meanwhile, so that none is half-way.
    ///
    /// # Errors
    /// What the disk or the database says when the check itself cannot be made.
    pub(crate) async fn check(&self) -> Result<CheckReport, StoreError> {
        let folder = self.inner.folder.clone();
        self.inner.writer.ask("check the store", move |connection| check(connection, &folder)).await
    }
}

/// The whole check.
fn check(connection: &Connection, folder: &Folder) -> Result<CheckReport, Fault> {
    let count = |sql: &str| -> Result<u64, Fault> {
        from_integer("a count", first(connection, sql, [], |row| Ok(row.get(0)?))?.unwrap_or(0))
    };
    let mut broken = Vec::new();
    check_database(connection, &mut broken)?;
    check_counts(connection, &mut broken)?;
    check_rows(connection, folder, &mut broken)?;
    for found in files(folder)? {
        match found {
            Found::Part(path) => broken.push(Broken::Part { path }),
            Found::Waveform { path, run, number } => {
                if !has_row(connection, run, number, &folder.database())? {
                    broken.push(Broken::RowMissing { path });
                }
            }
        }
    }
    Ok(CheckReport {
        runs: count("select count(*) from runs")?,
        captures: count("select count(*) from captures")?,
        broken,
    })
}

/// Invariant 6.
fn check_database(connection: &Connection, broken: &mut Vec<Broken>) -> Result<(), Fault> {
    let found: Vec<String> = all(connection, "pragma integrity_check", [], |row| Ok(row.get(0)?))?;
    broken.extend(found.into_iter().filter(|what| what != "ok").map(|what| Broken::Database { what }));
    let strays = all(connection, "pragma foreign_key_check", [], |row| {
        let (table, owner): (String, String) = (row.get(0)?, row.get(2)?);
        Ok(Broken::Database { what: format!("a row of {table} belongs to a row of {owner} that is not there") })
    })?;
    broken.extend(strays);
    Ok(())
}

/// Invariants 4 and 5.
fn check_counts(connection: &Connection, broken: &mut Vec<Broken>) -> Result<(), Fault> {
    let sql = "select run, count(*), max(number) from journal group by run having count(*) <> max(number)";
    broken.extend(all(connection, sql, [], |row| {
        Ok(Broken::JournalGap {
            run: from_id("a journal's run", &row.get::<_, String>(0)?)?,
            entries: from_integer("a count", row.get(1)?)?,
            last: from_integer("a journal's number", row.get(2)?)?,
        })
    })?);
    let sql = "select id, captures, (select count(*) from captures where run = runs.id) as stored from runs \
               where captures > stored";
    broken.extend(all(connection, sql, [], |row| {
        Ok(Broken::Overcounted {
            run: from_id("a run's identity", &row.get::<_, String>(0)?)?,
            counted: from_integer("a count", row.get(1)?)?,
            stored: from_integer("a count", row.get(2)?)?,
        })
    })?);
    Ok(())
}

/// Invariant 1.
fn check_rows(connection: &Connection, folder: &Folder, broken: &mut Vec<Broken>) -> Result<(), Fault> {
    let sql = "select run, number, file, file_bytes, points from captures order by run, number";
    let found = all(connection, sql, [], |row| {
        let run = from_id("a capture's run", &row.get::<_, String>(0)?)?;
        let (number, file): (u32, String) = (row.get(1)?, row.get(2)?);
        let (bytes, points): (i64, i64) = (row.get(3)?, row.get(4)?);
        let path = folder.path(&file);
        let why = match fs::metadata(&path) {
            Err(error) if error.kind() == io::ErrorKind::NotFound => {
                return Ok(Some(Broken::FileMissing { run, number, path }));
            }
            Err(error) => Some(error.to_string()),
            Ok(found) if found.len() != from_integer("a file's length", bytes)? => {
                Some(format!("it has {} bytes, and {bytes} were written", found.len()))
            }
            Ok(_) => match parquet::rows(&path) {
                Err(error) => Some(error.to_string()),
                Ok(rows) if rows != points => Some(format!("it has {rows} samples, and the capture has {points}")),
                Ok(_) => None,
            },
        };
        Ok(why.map(|why| Broken::FileDamaged { run, number, path, why }))
    })?;
    broken.extend(found.into_iter().flatten());
    Ok(())
}

#[cfg(test)]
mod tests;
