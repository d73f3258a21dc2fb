//! The data folder: what lies where in it, and the lock that keeps a second daemon out.
//!
//! ```text
//! evenpair.sqlite          the database (beside it SQLite's -wal and -shm)
//! lock                     held while a daemon uses the folder; holds its process number
//! waveforms/<run>/<n>.parquet   one file per capture
//! waveforms/orphans/       files without a row, moved there at a start; never deleted
//! ```

use std::fs::{File, OpenOptions, TryLockError};
use std::io::{Read, Write};
use std::path::{Path, PathBuf};

use uuid::Uuid;

use super::disk::Disk;
use super::error::StoreError;

/// The folder of the waveform files.
const WAVEFORMS: &str = "waveforms";

/// The data folder.
#[derive(Debug, Clone)]
pub(super) struct Folder {
    root: PathBuf,
}

impl Folder {
    /// Makes the folder and the one for waveforms, where they are not there yet.
    ///
    /// # Errors
    /// [`StoreError::DiskFull`] or [`StoreError::File`].
    pub(super) fn prepare(root: &Path, disk: &dyn Disk) -> Result<Self, StoreError> {
        let folder = Self { root: root.to_owned() };
        let waveforms = folder.waveforms();
        disk.make_folder(&waveforms)
            .and_then(|()| disk.sync_folder(&folder.root))
            .map_err(|source| StoreError::file("make the folder for waveforms", &waveforms, source))?;
        Ok(folder)
    }

    /// The data folder itself.
    pub(super) fn root(&self) -> &Path {
        &self.root
    }

    /// The database's file.
    pub(super) fn database(&self) -> PathBuf {
        self.root.join("evenpair.sqlite")
    }

    /// The folder that holds one folder per run.
    pub(super) fn waveforms(&self) -> PathBuf {
        self.root.join(WAVEFORMS)
    }

    /// Where files without a row are moved to.
    pub(super) fn orphans(&self) -> PathBuf {
        self.waveforms().join("orphans")
    }

    /// A stored relative name as a path.
    pub(super) fn path(&self, file: &str) -> PathBuf {
        self.root.join(file)
    }

    /// Takes the lock; it is held as long as the file that is returned.
    ///
    /// # Errors
    /// [`StoreError::InUse`] when another daemon holds it, [`StoreError::File`] when the lock cannot be made.
    pub(super) fn lock(&self) -> Result<File, StoreError> {
        let path = self.root.join("lock");
        let fail = |source| StoreError::file("lock the data folder", &path, source);
        let mut file =
            OpenOptions::new().read(true).write(true).create(true).truncate(false).open(&path).map_err(fail)?;
        match file.try_lock() {
            Ok(()) => {}
            Err(TryLockError::WouldBlock) => {
                // Only for the message, so a file that cannot be read is no further trouble.
                let mut holder = String::new();
                let _ = file.read_to_string(&mut holder);
                let holder = holder.trim();
                let holder = if holder.is_empty() { "unknown" } else { holder }.to_owned();
                return Err(StoreError::InUse { path: self.root.clone(), holder });
            }
            Err(TryLockError::Error(source)) => return Err(fail(source)),
        }
        file.set_len(0).and_then(|()| writeln!(file, "{}", std::process::id())).map_err(fail)?;
        Ok(file)
    }
}

/// The name of a capture's waveform file, relative to the data folder, with `/` between its parts on every system.
pub(super) fn waveform_name(run: Uuid, number: u32) -> String {
    format!("{WAVEFORMS}/{run}/{number}.parquet")
}
