//! What stays: runs, captures, corrections and events in one SQLite file, waveforms in one Parquet file per capture.
//!
//! One thread owns the only connection that writes; a second one owns a connection that can only read, so a page of
//! captures never waits behind a capture being written. Every change is one transaction, and in WAL mode with
//! `synchronous = FULL` it is on the disk when the call returns. Reads are one page long, so none holds the log back.
//!
//! What always holds, also after `kill -9` or a loss of power, and what [`Store::check`] looks at:
//!
//! 1. Every capture's row has its waveform file, whole, with as many samples as the row says.
//! 2. Every waveform file has its row.
//! 3. No half-written file is left.
//! 4. A run's journal is numbered from 1 without gaps.
//! 5. A run never counts more captures than are stored.
//! 6. The database is sound by SQLite's own check, and no row belongs to something that is not there.
//!
//! A capture is stored in these steps, and a stop between any two of them leaves nothing half-done: (a) see that its
//! number is free; (b) make the run's folder and sync the one above it; (c) write `<n>.parquet.part`; (d) sync it;
//! (e) rename it to `<n>.parquet`; (f) sync the folder; (g) insert the rows and commit. A stop before (e) leaves a
//! part, which the next start removes; a stop between (e) and (g) leaves a file without a row, which the next start
//! moves to `waveforms/orphans/`: the run never heard that the capture counts, so it will make it again.

mod captures;
mod check;
mod convert;
mod corrections;
mod desk;
mod disk;
mod error;
mod events;
mod folder;
mod rows;
mod runs;
mod schema;
mod sweep;
mod transfers;
mod waveform;

use std::fs::File;
use std::path::Path;
use std::sync::Arc;

use rusqlite::{Connection, OpenFlags};

use desk::Desk;
use disk::{Disk, RealDisk};
use folder::Folder;

pub(crate) use error::StoreError;
pub(crate) use sweep::Swept;
pub(crate) use waveform::Waveform;

/// The most items that one call returns. A capture with its figures takes some 10 kB as JSON, so a page stays below
/// 5 MB.
pub(crate) const LARGEST_PAGE: u32 = 500;

/// A handle to the store; cloning it is cheap. The store closes when the last handle goes.
///
/// # Cancel safety
/// Every `async` method that changes something is carried out whole once it has been polled, also when its caller goes
/// away.
#[derive(Clone)]
pub(crate) struct Store {
    inner: Arc<Inner>,
}

struct Inner {
    // Fields drop in this order: the reader first, so that the writer is the last connection and SQLite folds the
    // write-ahead log into the database; the lock last.
    reader: Desk,
    writer: Desk,
    folder: Folder,
    disk: Arc<dyn Disk>,
    swept: Swept,
    _lock: File,
}

impl Store {
    /// Opens the data folder, making it where there is none: locks it, brings the schema up to date, sweeps up what a
    /// crash left. Blocks for as long as that takes; meant for the daemon's start.
    ///
    /// # Errors
    /// [`StoreError::InUse`], [`StoreError::Newer`], [`StoreError::Foreign`], [`StoreError::DiskFull`], or what the
    /// disk or the database says.
    pub(crate) fn open(folder: &Path) -> Result<Self, StoreError> {
        Self::open_on(folder, Arc::new(RealDisk))
    }

    /// [`Store::open`], on a disk that a test can make fail.
    fn open_on(folder: &Path, disk: Arc<dyn Disk>) -> Result<Self, StoreError> {
        let folder = Folder::prepare(folder, disk.as_ref())?;
        let lock = folder.lock()?;
        let path = folder.database();
        let mut connection = connect_to_write(&path)?;
        schema::upgrade(&mut connection, &path, schema::STEPS)?;
        disk.sync_folder(folder.root())
            .map_err(|source| StoreError::file("make the database's name durable", &path, source))?;
        let swept = sweep::sweep(&connection, &folder, disk.as_ref())?;
        let reading = connect_to_read(&path)?;
        Ok(Self {
            inner: Arc::new(Inner {
                reader: Desk::start("store-reader", &path, reading)?,
                writer: Desk::start("store-writer", &path, connection)?,
                folder,
                disk,
                swept,
                _lock: lock,
            }),
        })
    }

    /// What the sweep at the start found.
    pub(crate) fn swept(&self) -> Swept {
        self.inner.swept
    }

    /// Waits until everything that was asked of the store is done, then lets this handle go. When it was the last one,
    /// the database is closed and the data folder is free when this returns.
    ///
    /// # Errors
    /// [`StoreError::Closed`] when the writer's thread has ended already.
    pub(crate) async fn close(self) -> Result<(), StoreError> {
        self.inner.writer.ask("finish what is queued", |_| Ok(())).await?;
        // Dropping joins threads, which must not hold up the runtime.
        let _ = tokio::task::spawn_blocking(move || drop(self)).await;
        Ok(())
    }
}

/// How long SQLite waits for a lock in milliseconds. The data folder is locked against a second daemon, so only a person
/// with a database browser can hold one.
const BUSY_MS: u32 = 5_000;

/// Opens the connection that writes.
fn connect_to_write(path: &Path) -> Result<Connection, StoreError> {
    let failed = |source| StoreError::database("open the database", path, source);
    let connection = Connection::open(path).map_err(failed)?;
    let set_up = || {
        connection.pragma_update(None, "busy_timeout", BUSY_MS)?;
        // Before any table exists and without a transaction, as SQLite demands.
        connection.pragma_update(None, "journal_mode", "wal")?;
        // NORMAL would survive a crash of the process but not a loss of power.
        connection.pragma_update(None, "synchronous", "full")?;
        connection.pragma_update(None, "fullfsync", true)?;
        connection.pragma_update(None, "foreign_keys", true)?;
        // An I/O error in a mapped file would be a signal, not an error.
        connection.pragma_update(None, "mmap_size", 0)?;
        // Longest a log stays after it was folded in: 16 MiB.
        connection.pragma_update(None, "journal_size_limit", 16 << 20)
    };
    set_up().map_err(failed)?;
    connection.set_prepared_statement_cache_capacity(STATEMENTS);
    Ok(connection)
}

/// Opens the connection that reads.
fn connect_to_read(path: &Path) -> Result<Connection, StoreError> {
    let failed = |source| StoreError::database("open the database for reading", path, source);
    let flags = OpenFlags::SQLITE_OPEN_READ_ONLY | OpenFlags::SQLITE_OPEN_NO_MUTEX;
    let connection = Connection::open_with_flags(path, flags).map_err(failed)?;
    let set_up = || {
        connection.pragma_update(None, "busy_timeout", BUSY_MS)?;
        connection.pragma_update(None, "mmap_size", 0)
    };
    set_up().map_err(failed)?;
    connection.set_prepared_statement_cache_capacity(STATEMENTS);
    Ok(connection)
}

/// How many prepared statements a connection keeps: more than there are different ones in this module.
const STATEMENTS: usize = 64;

#[cfg(test)]
mod tests;
