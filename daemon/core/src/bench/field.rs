//! Small readers that benches and sequences share: a key, its range, and a mistake that says both.

use std::ops::RangeInclusive;

use crate::document::{Item, Table};
use crate::units::{Unit, show};

/// An amount within `range`; a mistake and `None` outside it.
pub(crate) fn amount(table: &mut Table<'_>, key: &str, unit: Unit, range: &RangeInclusive<f64>) -> Option<f64> {
    let item = table.amount(key, unit)?;
    in_range(table, key, &item, unit, range)
}

/// A bare number within `range`; a mistake and `None` outside it.
pub(crate) fn number(table: &mut Table<'_>, key: &str, range: &RangeInclusive<f64>) -> Option<f64> {
    let item = table.number(key)?;
    in_range(table, key, &item, Unit::One, range)
}

/// A ratio within `range`, as a number or as a text in percent; a mistake and `None` outside it.
pub(crate) fn ratio(table: &mut Table<'_>, key: &str, range: &RangeInclusive<f64>) -> Option<f64> {
    if !table.is_text(key) {
        return number(table, key, range);
    }
    let item = table.text(key)?;
    match crate::planning::parse_ratio(&item.value) {
        Ok(value) => in_range(table, key, &Item { value, span: item.span }, Unit::One, range),
        Err(error) => {
            table.mistakes().add(item.span, format!("`{key}`: {error}"), format!("such as `{key} = \"2 %\"`"));
            None
        }
    }
}

/// `item`'s value if it lies within `range`; a mistake and `None` otherwise.
pub(crate) fn in_range(
    table: &Table<'_>,
    key: &str,
    item: &Item<f64>,
    unit: Unit,
    range: &RangeInclusive<f64>,
) -> Option<f64> {
    if range.contains(&item.value) {
        return Some(item.value);
    }
    table.mistakes().add(
        item.span.clone(),
        format!("`{key}` is {}", plain(item.value, unit)),
        format!("allowed here: {} to {}", plain(*range.start(), unit), plain(*range.end(), unit)),
    );
    None
}

/// A whole number within `range`; a mistake and `None` outside it.
pub(crate) fn whole(table: &mut Table<'_>, key: &str, range: &RangeInclusive<u32>) -> Option<u32> {
    let item = table.whole(key)?;
    match u32::try_from(item.value) {
        Ok(value) if range.contains(&value) => Some(value),
        _ => {
            table.mistakes().add(
                item.span,
                format!("`{key}` is {}", item.value),
                format!("allowed here: {} to {}", range.start(), range.end()),
            );
            None
        }
    }
}

/// One of a few words.
pub(crate) fn choice<T: Copy>(table: &mut Table<'_>, key: &str, words: &[(&str, T)]) -> Option<T> {
    let item = table.text(key)?;
    let found = words.iter().find(|(word, _)| *word == item.value).map(|(_, value)| *value);
    if found.is_none() {
        let known: Vec<&str> = words.iter().map(|(word, _)| *word).collect();
        table.mistakes().add(
            item.span,
            format!("`{key}` cannot be `{}`", item.value),
            format!("known here: {}", known.join(", ")),
        );
    }
    found
}

/// A name that must be among `known`; `thing` says what it names.
pub(crate) fn name(table: &mut Table<'_>, key: &str, thing: &str, known: &[String]) -> Option<String> {
    let item = table.text(key)?;
    if known.contains(&item.value) {
        return Some(item.value);
    }
    unknown(table, &item, thing, known);
    None
}

/// Records that no `thing` is called `item`.
pub(crate) fn unknown(table: &Table<'_>, item: &Item<String>, thing: &str, known: &[String]) {
    let help = if known.is_empty() {
        format!("the bench file declares no {thing}")
    } else {
        format!("known: {}", known.join(", "))
    };
    table.mistakes().add(item.span.clone(), format!("there is no {thing} `{}`", item.value), help);
}

/// A name that files, the API and a shell can all carry: a letter, then letters, digits, `_` and `-`, at most 64.
pub(crate) fn is_name(text: &str) -> bool {
    text.len() <= 64
        && text.starts_with(|first: char| first.is_ascii_alphabetic())
        && text.chars().all(|c| c.is_ascii_alphanumeric() || c == '_' || c == '-')
}

/// `value` as a person would write it: `48 V`, not `48.00 V`; six digits at most.
pub(crate) fn plain(value: f64, unit: Unit) -> String {
    let text = show(value, unit, 6);
    let (number, rest) = text.split_once(' ').map_or((text.as_str(), ""), |(number, rest)| (number, rest));
    let number = if number.contains('.') { number.trim_end_matches('0').trim_end_matches('.') } else { number };
    if rest.is_empty() { number.to_owned() } else { format!("{number} {rest}") }
}
