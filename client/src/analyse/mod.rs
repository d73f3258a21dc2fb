//! Saved records: files in, the acquisitions of a pair out. No daemon is needed.

mod parquet;

use std::path::Path;

use evenpair_api::Reading;
use evenpair_core::import::{self, ImportError, Imported, Options, Table};

use crate::trouble::Trouble;

/// The largest file that is read: 10 million rows of 60 characters, which take a few gigabytes as numbers.
const LARGEST_FILE: u64 = 1 << 30;

/// What a file holds.
enum Content {
    /// Columns of numbers.
    Columns(Table),
    /// A capture as the daemon stores it, with everything that tells its volts and seconds.
    Capture(Box<Imported>),
}

/// Reads one acquisition: a file that holds both legs, or, with `negative`, a file for each leg.
pub(crate) fn read(path: &Path, negative: Option<&Path>, reading: &Reading) -> Result<Imported, Trouble> {
    let options = Options::try_from(reading).map_err(|error| Trouble::Usage(error.to_string()))?;
    let not_understood = |error: ImportError| match error {
        ImportError::Option { .. } => Trouble::Usage(error.to_string()),
        _ => Trouble::Records { path: path.to_owned(), why: error.to_string() },
    };
    match (content(path, &options)?, negative) {
        (Content::Capture(capture), None) => Ok(*capture),
        (Content::Columns(table), None) => import::from_table(table, &options).map_err(not_understood),
        (Content::Columns(table), Some(negative)) => match content(negative, &options)? {
            Content::Columns(other) => import::from_tables(table, other, &options).map_err(not_understood),
            Content::Capture(_) => Err(both_legs(negative)),
        },
        (Content::Capture(_), Some(_)) => Err(both_legs(path)),
    }
}

fn both_legs(path: &Path) -> Trouble {
    let why = "it is a stored capture and holds both legs; give it alone".to_owned();
    Trouble::Records { path: path.to_owned(), why }
}

fn content(path: &Path, options: &Options) -> Result<Content, Trouble> {
    let file = |source| Trouble::File { doing: "reading", path: path.to_owned(), source };
    let size = std::fs::metadata(path).map_err(file)?.len();
    if size > LARGEST_FILE {
        let why = format!("it has {size} bytes, at most {LARGEST_FILE} are read; save a shorter record");
        return Err(Trouble::Records { path: path.to_owned(), why });
    }
    let bytes = std::fs::read(path).map_err(file)?;
    if parquet::is_parquet(&bytes) {
        return parquet::read(bytes).map_err(|why| Trouble::Records { path: path.to_owned(), why });
    }
    // Only names and units can hold anything but ASCII, and one that is spelt wrong does no harm.
    let text = String::from_utf8_lossy(&bytes);
    let table = import::read_text(&text, options);
    table.map(Content::Columns).map_err(|error| Trouble::Records { path: path.to_owned(), why: error.to_string() })
}
