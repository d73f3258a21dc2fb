//! What can be wrong with a file of records, each with where and what to try.

/// Why a file could not be read as the records of a pair.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum ImportError {
    /// Several columns have the name that was told.
    #[error("{count} columns are called `{name}`; tell the column's number (they count from 1) as {option}")]
    AmbiguousColumn {
        /// The option that named it.
        option: &'static str,
        /// The name.
        name: String,
        /// How many there are.
        count: usize,
    },
    /// The time column does not tell evenly spaced samples.
    #[error(
        "the times in column `{column}` are not evenly spaced: line {line} is {off_samples:.2} samples from its place; \
         save the record with more digits of time, or tell the sample interval as interval"
    )]
    Axis {
        /// The time column.
        column: String,
        /// Line of the worst time.
        line: usize,
        /// How far off it is, in samples.
        off_samples: f64,
    },
    /// The times do not increase.
    #[error("the times in column `{column}` do not increase; is it the time column? tell it as time")]
    AxisFalls {
        /// The time column.
        column: String,
    },
    /// A row ends early or has a field too many.
    #[error("line {line} has {found} fields where the rows before have {wanted}; is the file whole?")]
    Fields {
        /// The line, from 1.
        line: usize,
        /// How many fields it has.
        found: usize,
        /// How many it should have.
        wanted: usize,
    },
    /// A sample inside the record is missing.
    #[error("the {leg} leg has no number in line {line}, in the midst of its record; is the file whole?")]
    Missing {
        /// `positive` or `negative`.
        leg: &'static str,
        /// The line, from 1.
        line: usize,
    },
    /// The legs were sampled at different rates.
    #[error(
        "the positive leg has a sample every {positive_s:e} s, the negative leg every {negative_s:e} s; save both from \
         one acquisition"
    )]
    Intervals {
        /// Interval of the positive leg in seconds.
        positive_s: f64,
        /// Interval of the negative leg in seconds.
        negative_s: f64,
    },
    /// There is no such column.
    #[error("there is no column `{name}` for {option}; there are: {}", known.join(", "))]
    NoColumn {
        /// The option that named it.
        option: &'static str,
        /// The name.
        name: String,
        /// The names there are.
        known: Vec<String>,
    },
    /// Nothing tells the time of a sample.
    #[error(
        "no column and no header line tells the time; tell the time column as time, or the sample interval as interval"
    )]
    NoTime,
    /// The text holds no rows of numbers.
    #[error("no rows of numbers were found ({lines} lines{}); save the record as text with a row a sample", looked(.line))]
    NoRows {
        /// How many lines there are.
        lines: usize,
        /// The first line that is not blank.
        line: Option<String>,
    },
    /// A field is no number.
    #[error("line {line} is no row of numbers (`{text}`), but rows follow after it; remove it or tell header_lines")]
    NotNumbers {
        /// The line, from 1.
        line: usize,
        /// The beginning of the line.
        text: String,
    },
    /// An option makes no sense.
    #[error("{option}: {why}")]
    Option {
        /// The option.
        option: &'static str,
        /// What is wrong with it and what to try.
        why: String,
    },
    /// One column plays two parts.
    #[error("column `{name}` is taken for {first} and for {second}; tell the columns as time, positive and negative")]
    SameColumn {
        /// The column.
        name: String,
        /// One part.
        first: &'static str,
        /// The other part.
        second: &'static str,
    },
    /// There are not enough columns for two legs.
    #[error(
        "{found} column(s) are left for {wanted} leg(s) besides time; save both legs in one file, or a file for each leg"
    )]
    TooFewColumns {
        /// Columns that hold numbers, time aside.
        found: usize,
        /// Legs that need one.
        wanted: usize,
    },
    /// There are too few samples.
    #[error("only {found} samples in common; a record needs at least {needed}")]
    TooShort {
        /// How many there are.
        found: usize,
        /// How many it takes.
        needed: usize,
    },
    /// A column's unit is not one of volts.
    #[error("column `{column}` is in seconds, so it cannot be the {leg} leg; tell the leg's column as {leg}")]
    WrongUnit {
        /// The column.
        column: String,
        /// `positive` or `negative`.
        leg: &'static str,
    },
}

/// The line that was looked at, for [`ImportError::NoRows`].
fn looked(line: &Option<String>) -> String {
    line.as_ref().map(|line| format!(", the first is `{line}`")).unwrap_or_default()
}
