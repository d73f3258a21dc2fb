//! Durable files: the few steps from which they are made, behind a trait so that tests can make each of them fail.

use std::fs::{self, File};
use std::io::{self, Write};
use std::path::{Path, PathBuf};

use parquet::errors::ParquetError;

use super::error::StoreError;

/// The steps from which a durable file is made.
pub(super) trait Disk: Send + Sync {
    /// Makes a folder; one that exists already is as good.
    fn make_folder(&self, path: &Path) -> io::Result<()>;
    /// Makes an empty file for writing; one that exists already is emptied.
    fn create(&self, path: &Path) -> io::Result<Box<dyn Output>>;
    /// Gives a file its final name.
    fn rename(&self, from: &Path, to: &Path) -> io::Result<()>;
    /// Removes a file.
    fn remove(&self, path: &Path) -> io::Result<()>;
    /// Makes the names in a folder durable.
    fn sync_folder(&self, path: &Path) -> io::Result<()>;
}

/// A file being written.
pub(super) trait Output: Write + Send {
    /// Makes the content durable.
    fn sync(&mut self) -> io::Result<()>;
}

/// The system's disk.
#[derive(Debug)]
pub(super) struct RealDisk;

impl Disk for RealDisk {
    fn make_folder(&self, path: &Path) -> io::Result<()> {
        fs::create_dir_all(path)
    }

    fn create(&self, path: &Path) -> io::Result<Box<dyn Output>> {
        Ok(Box::new(File::create(path)?))
    }

    fn rename(&self, from: &Path, to: &Path) -> io::Result<()> {
        fs::rename(from, to)
    }

    fn remove(&self, path: &Path) -> io::Result<()> {
        fs::remove_file(path)
    }

    fn sync_folder(&self, path: &Path) -> io::Result<()> {
        // Elsewhere a folder cannot be opened as a file, and the system makes names durable by itself.
        if cfg!(unix) { File::open(path)?.sync_all() } else { Ok(()) }
    }
}

impl Output for File {
    fn sync(&mut self) -> io::Result<()> {
        self.sync_all()
    }
}

/// The ending that marks a file that is not yet whole.
pub(super) const PART: &str = ".part";

/// Where `target` is written before it gets its name: the same folder, so that the renaming is one step.
pub(super) fn part_of(target: &Path) -> PathBuf {
    let mut name = target.as_os_str().to_owned();
    name.push(PART);
    PathBuf::from(name)
}

/// Writes `target` so that after a loss of power it is either there and whole, or not there at all: write to a
/// temporary name, sync, rename, sync the folder. Returns its length in bytes. When a step fails the temporary file is
/// removed; when even that fails, the next start's sweep does it.
///
/// # Errors
/// [`StoreError::DiskFull`], [`StoreError::File`] or [`StoreError::Waveform`].
pub(super) fn write_durably(
    disk: &dyn Disk,
    doing: &'static str,
    target: &Path,
    write: impl FnOnce(&mut dyn Output) -> Result<(), ParquetError>,
) -> Result<u64, StoreError> {
    let part = part_of(target);
    let fail = |source| StoreError::file(doing, target, source);
    let steps = || {
        let mut output = disk.create(&part).map_err(fail)?;
        write(output.as_mut()).map_err(|source| StoreError::waveform(doing, target, source))?;
        output.sync().map_err(fail)?;
        drop(output);
        let bytes = fs::metadata(&part).map_err(fail)?.len();
        disk.rename(&part, target).map_err(fail)?;
        Ok(bytes)
    };
    let bytes = steps().inspect_err(|_| {
        let _ = disk.remove(&part);
    })?;
    disk.sync_folder(target.parent().unwrap_or(target)).map_err(fail)?;
    Ok(bytes)
}
