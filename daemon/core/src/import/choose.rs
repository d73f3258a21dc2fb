//! Which column is time, which is which leg.

use super::{Column, Guess, ImportError, Options, Table, header};
use crate::units::Unit;

/// A leg of the pair.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Leg {
    Positive,
    Negative,
}

impl Leg {
    /// Its name, which is also the option that tells its column.
    pub(super) fn name(self) -> &'static str {
        match self {
            Self::Positive => "positive",
            Self::Negative => "negative",
        }
    }

    /// How people call it in headers (common practice, no source).
    fn called(self, name: &str) -> bool {
        let words: &[&str] = match self {
            Self::Positive => &["p", "+", "plus", "high", "hi"],
            Self::Negative => &["n", "-", "−", "minus", "low", "lo"],
        };
        let stem = &self.name()[..3];
        name.split(|c: char| c.is_whitespace() || c == '_').any(|word| word.starts_with(stem) || words.contains(&word))
    }
}

/// Where a leg's samples and their times are, as columns' indices.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Place {
    pub(super) samples: usize,
    /// None where the interval comes from elsewhere.
    pub(super) time: Option<usize>,
}

/// Both legs in one table.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Roles {
    pub(super) positive: Place,
    pub(super) negative: Place,
    pub(super) guesses: Vec<Guess>,
}

/// Finds both legs and their time.
pub(super) fn both(table: &Table, options: &Options) -> Result<Roles, ImportError> {
    let mut guesses = Vec::new();
    let told = |option, name: &Option<String>| name.as_deref().map(|name| find(table, option, name)).transpose();
    let told_legs = [told("positive", &options.positive)?, told("negative", &options.negative)?];
    let time = time_of(table, options, &told_legs, &mut guesses)?;
    let own = match told("negative_time", &options.negative_time)? {
        Some(own) => Some(own),
        None => second_time(table, options, time, &told_legs, &mut guesses),
    };
    let is_taken = |i: usize, also: Option<usize>| [time, own, also].contains(&Some(i));
    let free: Vec<usize> = candidates(table).filter(|&i| !is_taken(i, None)).collect();
    let guess = |leg: Leg, other: Option<usize>| {
        let open = || free.iter().copied().filter(|&i| !is_taken(i, other) && !told_legs.contains(&Some(i)));
        let mut named = open().filter(|&i| leg.called(&header::bare(&table.columns[i].name).to_lowercase()));
        named.next().or_else(|| open().next())
    };
    let too_few = || ImportError::TooFewColumns { found: free.len(), wanted: 2 };
    let [positive, negative] = match told_legs {
        [Some(p), Some(n)] => [p, n],
        [Some(p), None] => [p, guess(Leg::Negative, Some(p)).ok_or_else(too_few)?],
        [None, Some(n)] => [guess(Leg::Positive, Some(n)).ok_or_else(too_few)?, n],
        [None, None] => {
            // A name may give away only one of them.
            let named = |leg: Leg| free.iter().copied().find(|&i| leg.called(&lower(table, i)));
            match (named(Leg::Positive), named(Leg::Negative)) {
                (None, Some(n)) => [guess(Leg::Positive, Some(n)).ok_or_else(too_few)?, n],
                _ => {
                    let p = guess(Leg::Positive, None).ok_or_else(too_few)?;
                    [p, guess(Leg::Negative, Some(p)).ok_or_else(too_few)?]
                }
            }
        }
    };
    for (leg, index, told) in [(Leg::Positive, positive, told_legs[0]), (Leg::Negative, negative, told_legs[1])] {
        if told.is_none() {
            guesses.push(Guess { option: leg.name(), taken: table.columns[index].name.clone() });
        }
    }
    distinct(table, &[(Some(positive), "positive"), (Some(negative), "negative"), (time, "time")])?;
    let place = |samples, time| Place { samples, time };
    Ok(Roles { positive: place(positive, time), negative: place(negative, own.or(time)), guesses })
}

/// Finds the one leg of a table.
pub(super) fn one(table: &Table, leg: Leg, options: &Options) -> Result<(Place, Vec<Guess>), ImportError> {
    let mut guesses = Vec::new();
    let name = match leg {
        Leg::Positive => &options.positive,
        Leg::Negative => &options.negative,
    };
    let told = name.as_deref().map(|name| find(table, leg.name(), name)).transpose()?;
    let time = time_of(table, options, &[told, None], &mut guesses)?;
    let samples = match told {
        Some(told) => told,
        None => {
            let mut free = candidates(table).filter(|&i| Some(i) != time);
            let first = free.next().ok_or(ImportError::TooFewColumns { found: 0, wanted: 1 })?;
            guesses.push(Guess { option: leg.name(), taken: table.columns[first].name.clone() });
            first
        }
    };
    distinct(table, &[(Some(samples), leg.name()), (time, "time")])?;
    Ok((Place { samples, time }, guesses))
}

/// The column that was told, or guessed by its unit, its name, or, as the first column, by its even rise. None where
/// the interval is known without one.
fn time_of(
    table: &Table,
    options: &Options,
    told_legs: &[Option<usize>],
    guesses: &mut Vec<Guess>,
) -> Result<Option<usize>, ImportError> {
    if let Some(name) = &options.time {
        return find(table, "time", name).map(Some);
    }
    let free = || (0..table.columns.len()).filter(|&i| !told_legs.contains(&Some(i)));
    let found = free().find(|&i| is_time(&table.columns[i])).or_else(|| {
        let first = free().next().filter(|&i| i == 0 && table.columns[i].unit.is_none())?;
        super::axis::rises_evenly(&table.columns[first].values).then_some(first)
    });
    if let Some(found) = found {
        guesses.push(Guess { option: "time", taken: table.columns[found].name.clone() });
    } else if options.interval_s.is_none() && table.interval.is_none() {
        return Err(ImportError::NoTime);
    }
    Ok(found)
}

/// A second time column stands before the second leg: time, leg, time, leg.
fn second_time(
    table: &Table,
    options: &Options,
    time: Option<usize>,
    told_legs: &[Option<usize>],
    guesses: &mut Vec<Guess>,
) -> Option<usize> {
    if options.time.is_some() {
        return None;
    }
    let time = time?;
    let second = (time + 2..table.columns.len())
        .find(|&i| is_time(&table.columns[i]) && !told_legs.contains(&Some(i)) && i + 1 < table.columns.len())?;
    guesses.push(Guess { option: "negative_time", taken: table.columns[second].name.clone() });
    Some(second)
}

fn is_time(column: &Column) -> bool {
    if column.unit.is_some_and(|scale| scale.unit == Unit::Second) {
        return true;
    }
    let name = header::bare(&column.name).to_lowercase();
    column.unit.is_none() && (name.starts_with("time") || name == "t")
}

/// Columns that can be a leg: numbers, not in seconds, and not somebody's difference of two others.
fn candidates(table: &Table) -> impl Iterator<Item = usize> {
    (0..table.columns.len()).filter(|&i| {
        let column = &table.columns[i];
        let is_seconds = column.unit.is_some_and(|scale| scale.unit == Unit::Second);
        let name = lower(table, i);
        let is_made = ["diff", "common", "math"].iter().any(|word| name.contains(word));
        !is_seconds && !is_made && column.values.iter().any(|value| value.is_finite())
    })
}

fn lower(table: &Table, index: usize) -> String {
    header::bare(&table.columns[index].name).to_lowercase()
}

/// The column with this name, with or without its unit, or with this number.
fn find(table: &Table, option: &'static str, name: &str) -> Result<usize, ImportError> {
    let wanted = name.trim().to_lowercase();
    let all = |fits: &dyn Fn(&str) -> bool| -> Vec<usize> {
        (0..table.columns.len()).filter(|&i| fits(&table.columns[i].name)).collect()
    };
    let exact = all(&|known| known.trim().to_lowercase() == wanted);
    let found = if exact.is_empty() { all(&|known| header::bare(known).to_lowercase() == wanted) } else { exact };
    match found.as_slice() {
        [one] => Ok(*one),
        [] => {
            let by_number = wanted.parse::<usize>().ok().and_then(|number| number.checked_sub(1));
            by_number.filter(|&i| i < table.columns.len()).ok_or_else(|| ImportError::NoColumn {
                option,
                name: name.to_owned(),
                known: table.columns.iter().map(|column| format!("`{}`", column.name)).collect(),
            })
        }
        many => Err(ImportError::AmbiguousColumn { option, name: name.to_owned(), count: many.len() }),
    }
}

fn distinct(table: &Table, parts: &[(Option<usize>, &'static str)]) -> Result<(), ImportError> {
    for (i, (a, first)) in parts.iter().enumerate() {
        for (b, second) in &parts[i + 1..] {
            if let Some(index) = a.filter(|_| a == b) {
                return Err(ImportError::SameColumn { name: table.columns[index].name.clone(), first, second });
            }
        }
    }
    Ok(())
}
