//! What can go wrong in the store: what was being done, where, and what to try.

use std::io;
use std::path::{Path, PathBuf};

use parquet::errors::ParquetError;

/// Why the store could not do what was asked. Nothing that was stored before is lost by any of them.
#[derive(Debug, thiserror::Error)]
pub(crate) enum StoreError {
    /// A thing with this identity is already stored, and is never overwritten.
    #[error("{what} {id} is already stored; a stored one is never overwritten, so number it anew")]
    AlreadyThere {
        /// What it is: `run`, `capture`, `correction`, `event`.
        what: &'static str,
        /// Its identity.
        id: String,
    },
    /// The store is closed, or its thread has ended.
    #[error("the store is closed, so it could not {doing}; start the daemon again")]
    Closed {
        /// What was asked.
        doing: &'static str,
    },
    /// Something stored cannot be understood.
    #[error("while trying to {doing}: {what} in {} is damaged: {why}; restore it from a backup", path.display())]
    Damaged {
        /// What was being done.
        doing: &'static str,
        /// What is damaged.
        what: String,
        /// The file it stands in.
        path: PathBuf,
        /// What is wrong with it.
        why: String,
    },
    /// The database refused.
    #[error("could not {doing} in {}: {source}; see that the disk works and that no other program changes the file", path.display())]
    Database {
        /// What was being done.
        doing: &'static str,
        /// The database's file.
        path: PathBuf,
        /// What the database says.
        source: rusqlite::Error,
    },
    /// No space is left.
    #[error("the disk is full, so it could not {doing} in {}; free space or choose another --data", path.display())]
    DiskFull {
        /// What was being done.
        doing: &'static str,
        /// The file or folder that could not grow.
        path: PathBuf,
    },
    /// A file or folder could not be read or written.
    #[error("could not {doing} at {}: {source}; see that the folder exists and that the daemon may write to it", path.display())]
    File {
        /// What was being done.
        doing: &'static str,
        /// The file or folder.
        path: PathBuf,
        /// What the system says.
        source: io::Error,
    },
    /// The database was made by another program.
    #[error("{} is a database of another program; choose another --data", path.display())]
    Foreign {
        /// The database's file.
        path: PathBuf,
    },
    /// What was given contradicts itself, so nothing was stored.
    #[error("could not {doing}: {why}; this is a fault of the daemon, please report it")]
    Inconsistent {
        /// What was being done.
        doing: &'static str,
        /// The contradiction.
        why: String,
    },
    /// Another daemon uses the data folder.
    #[error(
        "the data folder {} is in use by another daemon (process {holder}); stop that one or choose another --data",
        path.display()
    )]
    InUse {
        /// The data folder.
        path: PathBuf,
        /// The other daemon's process number, as it wrote it down.
        holder: String,
    },
    /// The database was made by a newer version of this program.
    #[error(
        "{} has schema {found}, and this daemon knows schemas up to {known}; run the newer daemon or choose another --data",
        path.display()
    )]
    Newer {
        /// The database's file.
        path: PathBuf,
        /// The schema found.
        found: i64,
        /// The last schema that this program knows.
        known: i64,
    },
    /// No such thing is stored.
    #[error("no {what} {id} is stored; ask for the list to see what is")]
    Unknown {
        /// What was looked for.
        what: &'static str,
        /// Its identity.
        id: String,
    },
    /// A waveform file could not be written or read.
    #[error("could not {doing} at {}: {source}; see that the file is whole and that the disk works", path.display())]
    Waveform {
        /// What was being done.
        doing: &'static str,
        /// The file.
        path: PathBuf,
        /// What the Parquet library says.
        source: ParquetError,
    },
}

impl StoreError {
    /// The error for a failed file operation; a full disk is told apart.
    pub(super) fn file(doing: &'static str, path: &Path, source: io::Error) -> Self {
        if full(&source) {
            return Self::DiskFull { doing, path: path.to_owned() };
        }
        Self::File { doing, path: path.to_owned(), source }
    }

    /// The error for a failed Parquet operation; the file's own trouble is told apart.
    pub(super) fn waveform(doing: &'static str, path: &Path, source: ParquetError) -> Self {
        let path = path.to_owned();
        match source {
            ParquetError::External(inner) => match inner.downcast::<io::Error>() {
                Ok(error) => Self::file(doing, &path, *error),
                Err(other) => Self::Waveform { doing, path, source: ParquetError::External(other) },
            },
            source => Self::Waveform { doing, path, source },
        }
    }

    /// The error for a failed database operation; a full disk is told apart.
    pub(super) fn database(doing: &'static str, path: &Path, source: rusqlite::Error) -> Self {
        if source.sqlite_error_code() == Some(rusqlite::ErrorCode::DiskFull) {
            return Self::DiskFull { doing, path: path.to_owned() };
        }
        Self::Database { doing, path: path.to_owned(), source }
    }
}

/// What a job on the database can end with, before the words about what was being done are added.
#[derive(Debug)]
pub(super) enum Fault {
    /// A row cannot be understood: what, and why.
    Damaged { what: &'static str, why: String },
    /// Already a whole error.
    Store(StoreError),
    /// The database's.
    Sql(rusqlite::Error),
}

impl Fault {
    /// Adds what was being done, and in which database.
    pub(super) fn into_error(self, doing: &'static str, path: &Path) -> StoreError {
        match self {
            Self::Damaged { what, why } => {
                StoreError::Damaged { doing, what: what.to_owned(), path: path.to_owned(), why }
            }
            Self::Store(error) => error,
            Self::Sql(source) => StoreError::database(doing, path, source),
        }
    }
}

impl From<rusqlite::Error> for Fault {
    fn from(source: rusqlite::Error) -> Self {
        Self::Sql(source)
    }
}

impl From<StoreError> for Fault {
    fn from(error: StoreError) -> Self {
        Self::Store(error)
    }
}

/// Whether the system says that no space is left.
fn full(error: &io::Error) -> bool {
    matches!(error.kind(), io::ErrorKind::StorageFull | io::ErrorKind::QuotaExceeded)
}
