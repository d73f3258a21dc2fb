//! Text → columns: separator, decimal mark, header lines, rows.

mod line;
mod number;

use super::header::{self, Scale};
use super::{Column, Decimal, Guess, ImportError, Options, Separator, Table};
use line::{Row, split};

/// How many lines, spread over the whole text, decide about separator and decimal mark.
const LOOKED_AT: usize = 200;

/// The most columns that are read: a scope has a few channels; what is wider is something else.
const MOST_COLUMNS: usize = 256;

/// The longest line that is shown in a message.
const SHOWN: usize = 60;

/// How the fields of a text are written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
struct Style {
    separator: Separator,
    decimal: Decimal,
}

/// Reads a text's columns.
///
/// # Errors
/// When there are no rows of numbers, or something stands between them that is none.
pub fn read(text: &str, options: &Options) -> Result<Table, ImportError> {
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    // A line ends with LF, with CR LF, or, where there is no LF at all, with CR.
    let lines: Vec<&str> = match text.contains('\n') {
        true => text.split('\n').map(|line| line.trim_end_matches('\r')).collect(),
        false => text.split('\r').collect(),
    };
    let no_rows = || ImportError::NoRows {
        lines: text.lines().count(),
        line: lines.iter().find(|line| !line.trim().is_empty()).map(|line| shown(line)),
    };
    let (style, width) = style_of(&lines, options)?.ok_or_else(no_rows)?;
    let mut guesses = Vec::new();
    if options.separator.is_none() && width > 1 {
        guesses.push(Guess { option: "separator", taken: style.separator.name().to_owned() });
    }
    if options.decimal.is_none() {
        guesses.push(Guess { option: "decimal", taken: style.decimal.name().to_owned() });
    }
    let begin = match options.header_lines {
        Some(count) => count,
        None => {
            let begin = first_row(&lines, style, width).ok_or_else(no_rows)?;
            guesses.push(Guess { option: "header_lines", taken: begin.to_string() });
            begin
        }
    };
    let mut notes = Vec::new();
    let (values, first) = rows(&lines, begin, style, width, &mut notes)?;
    let first = first.ok_or_else(no_rows)?;
    let header = &lines[..begin.min(lines.len())];
    let (names, units) = names(header, style, width);
    let number = |field: &str| number::read(field, style.decimal);
    let interval = header.iter().find_map(|line| header::interval(line, number));
    let columns = values.into_iter().zip(names).zip(units).map(|((values, name), unit)| Column { name, unit, values });
    let mut columns: Vec<Column> = columns.collect();
    // A separator at the end of every line makes a column of nothing.
    while columns.last().is_some_and(|last| last.values.iter().all(|value| value.is_nan())) {
        columns.pop();
    }
    Ok(Table { columns, first_line: first + 1, interval, guesses, notes })
}

/// The style in which most lines are rows of numbers, and how many fields these have. Of equally good styles the one
/// with more fields, then the more usual one.
fn style_of(lines: &[&str], options: &Options) -> Result<Option<(Style, usize)>, ImportError> {
    use Decimal as D;
    use Separator as S;
    if options.separator == Some(S::Comma) && options.decimal == Some(D::Comma) {
        let why = "commas cannot both separate fields and mark decimals; tell another separator".to_owned();
        return Err(ImportError::Option { option: "decimal", why });
    }
    let usual = [
        (S::Comma, D::Point),
        (S::Semicolon, D::Point),
        (S::Semicolon, D::Comma),
        (S::Tab, D::Point),
        (S::Tab, D::Comma),
        (S::Blank, D::Point),
        (S::Blank, D::Comma),
    ];
    let filled: Vec<&str> = lines.iter().copied().filter(|line| !line.trim().is_empty()).collect();
    let stride = filled.len().div_ceil(LOOKED_AT).max(1);
    // From the end, where no header is.
    let sample: Vec<&str> = filled.iter().rev().step_by(stride).copied().collect();
    let mut best: Option<(usize, usize, Style)> = None;
    for (separator, decimal) in usual {
        if options.separator.is_some_and(|told| told != separator)
            || options.decimal.is_some_and(|told| told != decimal)
        {
            continue;
        }
        let style = Style { separator, decimal };
        let mut widths: Vec<(usize, usize)> = Vec::new();
        for line in &sample {
            let width = match line::row(line, style, None) {
                Row::Numbers(fields) => fields.len(),
                Row::Other => continue,
            };
            match widths.iter_mut().find(|(known, _)| *known == width) {
                Some((_, count)) => *count += 1,
                None => widths.push((width, 1)),
            }
        }
        let Some((width, count)) = widths.into_iter().max_by_key(|(width, count)| (*count, *width)) else { continue };
        if best.is_none_or(|(most, widest, _)| (count, width) > (most, widest)) {
            best = Some((count, width, style));
        }
    }
    match best {
        Some((_, width, _)) if width > MOST_COLUMNS => {
            let why =
                format!("the rows come out with {width} fields, at most {MOST_COLUMNS} are read; tell the separator");
            Err(ImportError::Option { option: "separator", why })
        }
        best => Ok(best.map(|(_, width, style)| (style, width))),
    }
}

/// The index of the first line that is a row and is followed by rows only, as far as the next two filled lines go.
fn first_row(lines: &[&str], style: Style, width: usize) -> Option<usize> {
    let is_row = |line: &str| matches!(line::row(line, style, Some(width)), Row::Numbers(_));
    (0..lines.len()).find(|&i| {
        is_row(lines[i])
            && lines[i + 1..].iter().filter(|line| !line.trim().is_empty()).take(2).all(|line| is_row(line))
    })
}

/// The columns' values from line `begin` on, and the line of the first row.
fn rows(
    lines: &[&str],
    begin: usize,
    style: Style,
    width: usize,
    notes: &mut Vec<String>,
) -> Result<(Vec<Vec<f64>>, Option<usize>), ImportError> {
    let mut columns: Vec<Vec<f64>> = vec![Vec::with_capacity(lines.len().saturating_sub(begin)); width];
    let (mut first, mut odd) = (None, None);
    for (index, line) in lines.iter().enumerate().skip(begin) {
        if line.trim().is_empty() {
            continue;
        }
        match line::row(line, style, Some(width)) {
            Row::Numbers(fields) => {
                if let Some(odd) = odd {
                    return Err(not_a_row(lines, odd, style, width));
                }
                first.get_or_insert(index);
                columns.iter_mut().zip(fields).for_each(|(column, value)| column.push(value));
            }
            Row::Other => odd = odd.or(Some(index)),
        }
    }
    if let Some(odd) = odd {
        notes.push(format!("the text from line {} on holds no rows and was left out", odd + 1));
    }
    Ok((columns, first))
}

/// What is wrong with a line among rows.
fn not_a_row(lines: &[&str], index: usize, style: Style, width: usize) -> ImportError {
    match line::row(lines[index], style, None) {
        Row::Numbers(fields) => ImportError::Fields { line: index + 1, found: fields.len(), wanted: width },
        Row::Other => ImportError::NotNumbers { line: index + 1, text: shown(lines[index]) },
    }
}

/// Names and units of the columns, from the last header lines that have as many fields as the rows.
fn names(header: &[&str], style: Style, width: usize) -> (Vec<String>, Vec<Option<Scale>>) {
    let fitting: Vec<Vec<&str>> = header
        .iter()
        .rev()
        .map(|line| split(line.trim_start_matches(['#', '%', ' ']), style.separator))
        .filter(|fields| fields.len() == width && fields.iter().any(|field| !field.is_empty()))
        .take(2)
        .collect();
    let unit_line = |fields: &[&str]| fields.iter().all(|field| field.is_empty() || header::unit(field).is_some());
    let (names, units) = match fitting.as_slice() {
        [last, before, ..] if unit_line(last) => (Some(before), Some(last)),
        [last, ..] => (Some(last), None),
        [] => (None, None),
    };
    let at = |line: Option<&Vec<&str>>, i: usize| {
        line.and_then(|fields| fields.get(i)).map(|field| (*field).to_owned()).filter(|field| !field.is_empty())
    };
    (0..width)
        .map(|i| {
            let name = at(names, i);
            let unit = at(units, i).and_then(|unit| header::unit(&unit));
            let unit = unit.or_else(|| name.as_deref().and_then(header::unit_in));
            (name.unwrap_or_else(|| format!("column {}", i + 1)), unit)
        })
        .unzip()
}

/// The beginning of a line, for a message.
fn shown(line: &str) -> String {
    let mut text: String = line.trim().chars().take(SHOWN).collect();
    if line.trim().chars().count() > SHOWN {
        text.push('…');
    }
    text
}
