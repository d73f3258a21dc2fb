//! One line: its fields, and whether they are a row of numbers.

use super::super::Separator;
use super::{Style, number};

/// What a line is.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Row {
    /// A row; NaN where a field is empty or says that there is no value.
    Numbers(Vec<f64>),
    /// Something else.
    Other,
}

/// Reads a line as a row; with `width` given, only one of that many fields is a row.
pub(super) fn row(line: &str, style: Style, width: Option<usize>) -> Row {
    let mut values = Vec::with_capacity(width.unwrap_or(4));
    let mut any = false;
    let mut read = |field: &str| {
        let value = number::read(field, style.decimal);
        any |= value.is_some();
        let value = value.or_else(|| number::is_missing(field).then_some(f64::NAN));
        value.map(|value| values.push(value)).is_some()
    };
    let all = match plain_mark(line, style.separator) {
        // The usual case needs no list of fields.
        Some(mark) => line.split(mark).all(|field| read(field.trim())),
        None => split(line, style.separator).into_iter().all(read),
    };
    if all && any && width.is_none_or(|width| width == values.len()) { Row::Numbers(values) } else { Row::Other }
}

/// The fields of a line, trimmed, and without the quotes around them (RFC 4180; a doubled quote stays doubled).
pub(super) fn split(line: &str, separator: Separator) -> Vec<&str> {
    let Some(mark) = mark(separator) else { return line.split_whitespace().map(unquoted).collect() };
    let mut quoted = false;
    let between = |c: char| {
        if c == '"' {
            quoted = !quoted;
        }
        c == mark && !quoted
    };
    line.split(between).map(|field| unquoted(field.trim())).collect()
}

fn unquoted(field: &str) -> &str {
    field.strip_prefix('"').and_then(|field| field.strip_suffix('"')).unwrap_or(field).trim()
}

fn mark(separator: Separator) -> Option<char> {
    match separator {
        Separator::Comma => Some(','),
        Separator::Semicolon => Some(';'),
        Separator::Tab => Some('\t'),
        Separator::Blank => None,
    }
}

/// The mark that a line can be cut at without a look at quotes.
fn plain_mark(line: &str, separator: Separator) -> Option<char> {
    mark(separator).filter(|_| !line.contains('"'))
}
