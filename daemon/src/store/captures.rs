//! Captures: the waveform file first, then the rows.

use std::path::PathBuf;

use evenpair_api::{Capture, Captures};
use rusqlite::{Connection, params};
use uuid::Uuid;

use super::convert::{all, first};
use super::corrections::read_correction;
use super::disk::{Disk, write_durably};
use super::error::{Fault, StoreError};
use super::folder::{Folder, waveform_name};
use super::rows::{insert_capture, read_capture};
use super::waveform::{Waveform, csv, parquet};
use super::{LARGEST_PAGE, Store};

impl Store {
    /// Stores a capture: its waveform durably, and only then its rows. Returns the capture as stored, with `file` set
    /// to where its waveform lies. On the disk when this returns; what is said about the correction in the file comes
    /// from the stored correction.
    ///
    /// # Errors
    /// [`StoreError::AlreadyThere`] when the run has a capture of this number, [`StoreError::Unknown`] when the run or
    /// the correction is not stored, [`StoreError::Inconsistent`] when the records do not fit each other or the
    /// capture, [`StoreError::DiskFull`], or what the disk or the database says. After an error the capture does not
    /// count.
    pub(crate) async fn put_capture(&self, capture: &Capture, waveform: Waveform) -> Result<Capture, StoreError> {
        let mut capture = capture.clone();
        capture.file = waveform_name(capture.run, capture.number);
        waveform.check_against(&capture)?;
        let (folder, disk) = (self.inner.folder.clone(), self.inner.disk.clone());
        // Encoding happens on the writer's thread as well: then the whole is one job that a caller who goes away
        // cannot leave half-done, and no second one can take the number meanwhile.
        self.inner
            .writer
            .ask("store a capture", move |connection| {
                store(connection, &folder, disk.as_ref(), &capture, &waveform)?;
                Ok(capture)
            })
            .await
    }

    /// A run's captures with numbers above `after`, in order; at most `limit` (at least 1) and [`LARGEST_PAGE`].
    /// Empty when the run is not stored.
    ///
    /// # Errors
    /// [`StoreError::Damaged`] when a row cannot be understood, or what the database says.
    pub(crate) async fn captures(&self, run: Uuid, after: u32, limit: u32) -> Result<Captures, StoreError> {
        self.inner
            .reader
            .ask("read a run's captures", move |connection| {
                // One transaction, so that the page and the total belong together.
                let transaction = connection.transaction()?;
                let sql = "select number from captures where run = ?1 and number > ?2 order by number limit ?3";
                let limit = limit.clamp(1, LARGEST_PAGE);
                let mut numbers: Vec<u32> =
                    all(&transaction, sql, params![run.to_string(), after, limit + 1], |row| Ok(row.get(0)?))?;
                let more = numbers.len() > limit as usize;
                numbers.truncate(limit as usize);
                let next = if more { numbers.last().copied() } else { None };
                let mut items = Vec::with_capacity(numbers.len());
                for number in numbers {
                    items.extend(read_capture(&transaction, run, number)?);
                }
                let sql = "select count(*) from captures where run = ?1";
                let total = first(&transaction, sql, [run.to_string()], |row| Ok(row.get(0)?))?.unwrap_or(0);
                Ok(Captures { items, total, next })
            })
            .await
    }

    /// One capture.
    ///
    /// # Errors
    /// [`StoreError::Damaged`] when a row cannot be understood, or what the database says.
    #[cfg(test)]
    pub(crate) async fn capture(&self, run: Uuid, number: u32) -> Result<Option<Capture>, StoreError> {
        self.inner
            .reader
            .ask("read a capture", move |connection| {
                let transaction = connection.transaction()?;
                read_capture(&transaction, run, number)
            })
            .await
    }

    /// Where a capture's waveform file lies.
    ///
    /// # Errors
    /// What the database says.
    pub(crate) async fn waveform_path(&self, run: Uuid, number: u32) -> Result<Option<PathBuf>, StoreError> {
        let file = self
            .inner
            .reader
            .ask("look up a waveform's file", move |connection| {
                let sql = "select file from captures where run = ?1 and number = ?2";
                first(connection, sql, params![run.to_string(), number], |row| Ok(row.get::<_, String>(0)?))
            })
            .await?;
        Ok(file.map(|file| self.inner.folder.path(&file)))
    }

    /// A capture's waveform.
    ///
    /// # Errors
    /// [`StoreError::Unknown`] when there is no such capture, [`StoreError::Damaged`] when the file does not hold what
    /// it must, or what the disk says.
    pub(crate) async fn read_waveform(&self, run: Uuid, number: u32) -> Result<Waveform, StoreError> {
        let path = self
            .waveform_path(run, number)
            .await?
            .ok_or_else(|| StoreError::Unknown { what: "capture", id: format!("{run}/{number}") })?;
        tokio::task::spawn_blocking(move || parquet::read(&path))
            .await
            .map_err(|_| StoreError::Closed { doing: "read a waveform" })?
    }

    /// A capture's waveform as comma-separated text.
    ///
    /// # Errors
    /// As [`Store::read_waveform`].
    pub(crate) async fn waveform_csv(&self, run: Uuid, number: u32) -> Result<Vec<u8>, StoreError> {
        let waveform = self.read_waveform(run, number).await?;
        let written = tokio::task::spawn_blocking(move || {
            let mut text = Vec::new();
            // Writing to memory does not fail.
            csv::write(&waveform, &mut text).map(|()| text)
        });
        written.await.ok().and_then(Result::ok).ok_or(StoreError::Closed { doing: "write a waveform as text" })
    }
}

/// The steps (a) to (g) of the module's head.
fn store(
    connection: &mut Connection,
    folder: &Folder,
    disk: &dyn Disk,
    capture: &Capture,
    waveform: &Waveform,
) -> Result<(), Fault> {
    let doing = "write a waveform";
    let (run, id) = (capture.run.to_string(), || format!("{}/{}", capture.run, capture.number));
    if first(connection, "select 1 from runs where id = ?1", [&run], |_| Ok(()))?.is_none() {
        return Err(StoreError::Unknown { what: "run", id: run }.into());
    }
    let sql = "select 1 from captures where run = ?1 and number = ?2";
    if first(connection, sql, params![run, capture.number], |_| Ok(()))?.is_some() {
        return Err(StoreError::AlreadyThere { what: "capture", id: id() }.into());
    }
    let correction = match capture.correction {
        None => None,
        Some(correction) => Some(
            read_correction(connection, correction)?
                .ok_or_else(|| StoreError::Unknown { what: "correction", id: correction.to_string() })?,
        ),
    };
    let target = folder.path(&capture.file);
    let of_run = target.parent().unwrap_or(&target);
    disk.make_folder(of_run)
        .and_then(|()| disk.sync_folder(&folder.waveforms()))
        .map_err(|source| StoreError::file(doing, of_run, source))?;
    let bytes =
        write_durably(disk, doing, &target, |output| parquet::write(output, waveform, capture, correction.as_ref()))?;
    let transaction = connection.transaction()?;
    insert_capture(&transaction, capture, bytes)?;
    Ok(transaction.commit()?)
}

#[cfg(test)]
mod tests;
