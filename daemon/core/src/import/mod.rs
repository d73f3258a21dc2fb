//! Records from anywhere: text or columns in, the records of a pair out.
//!
//! What a scope saves differs in separator, decimal mark, header lines, names and units. All of it can be told by
//! [`Options`]; what is not told is guessed, and every guess is reported in [`Imported::guesses`] under the name of the
//! option that would have told it. Nothing is read from disk here: text comes in as `&str`, other formats as a
//! [`Table`] of columns.
//!
//! Understood is text with a row a sample: fields separated by comma, semicolon, tab or blanks; decimal point or, where
//! commas do not separate, decimal comma; any number of header lines before the data, the last of which may name the
//! columns (and one after it their units); quoted fields (RFC 4180); seconds and volts with the usual prefixes. Not
//! understood: thousands separators, times as dates, several acquisitions in one file.

mod axis;
mod choose;
mod error;
mod header;
mod legs;
mod options;
mod step;
mod text;

pub use error::ImportError;
pub use header::{Hint, Scale};
pub use options::{Decimal, Options, Separator};
pub use text::read as read_text;

use crate::analysis::Record;

/// Something that was not told and had to be guessed.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Guess {
    /// The option that would have told it, such as `separator`.
    pub option: &'static str,
    /// What was taken.
    pub taken: String,
}

/// A column of numbers.
#[derive(Debug, Clone, PartialEq)]
pub struct Column {
    /// Its name as it stands in the header; `column 3` where there is none.
    pub name: String,
    /// Its unit, as far as the header tells it.
    pub unit: Option<Scale>,
    /// Its values in the file's own unit; NaN where one is missing.
    pub values: Vec<f64>,
}

impl Column {
    /// A column whose unit, if it has one, stands in its name: `time_s`, `CH1 (mV)`.
    #[must_use]
    pub fn named(name: &str, values: Vec<f64>) -> Self {
        Self { name: name.to_owned(), unit: header::unit_in(name), values }
    }
}

/// The columns of one file. They have one length.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Table {
    /// The columns, in the file's order.
    pub columns: Vec<Column>,
    /// The line, from 1, that the first row stands in; 1 where there are no lines.
    pub first_line: usize,
    /// The sample interval in seconds that a header line tells.
    pub interval: Option<Hint>,
    /// What was guessed so far.
    pub guesses: Vec<Guess>,
    /// What a person should know, such as lines that were left out.
    pub notes: Vec<String>,
}

/// The two records of a pair, and how they were read.
#[derive(Debug, Clone, PartialEq)]
pub struct Imported {
    /// The positive leg.
    pub positive: Record,
    /// The negative leg.
    pub negative: Record,
    /// What was guessed.
    pub guesses: Vec<Guess>,
    /// What a person should know.
    pub notes: Vec<String>,
}

/// The records of a pair from text that holds both legs, or, with `negative`, from a text for each leg.
///
/// # Errors
/// See [`ImportError`]; each says where in the text and what to try.
pub fn from_text(text: &str, negative: Option<&str>, options: &Options) -> Result<Imported, ImportError> {
    let table = text::read(text, options)?;
    match negative {
        None => from_table(table, options),
        Some(other) => from_tables(table, text::read(other, options)?, options),
    }
}

/// The records of a pair from the columns of one file.
///
/// # Errors
/// As [`from_text`].
pub fn from_table(mut table: Table, options: &Options) -> Result<Imported, ImportError> {
    let roles = choose::both(&table, options)?;
    table.guesses.extend(roles.guesses);
    legs::one_table(table, roles.positive, roles.negative, options)
}

/// The records of a pair from the columns of a file for each leg.
///
/// # Errors
/// As [`from_text`].
pub fn from_tables(mut positive: Table, mut negative: Table, options: &Options) -> Result<Imported, ImportError> {
    let (p, guesses) = choose::one(&positive, choose::Leg::Positive, options)?;
    positive.guesses.extend(guesses);
    let (n, guesses) = choose::one(&negative, choose::Leg::Negative, options)?;
    negative.guesses.extend(guesses);
    legs::two_tables(positive, p, negative, n, options)
}

#[cfg(test)]
mod properties;
#[cfg(test)]
mod tests;
