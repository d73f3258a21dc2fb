//! TOML texts read with every mistake collected, each with its place.
//!
//! A bench, a dialect or a sequence is read by asking a [`Table`] for its keys one by one. What is missing, of the
//! wrong kind or left over becomes a [`Mistake`] with the bytes it stands at; reading goes on, so a person sees all
//! of them at once. Who prints them (with line and caret) is the reader's business, not this module's.

mod layers;
mod table;

use std::ops::Range;

pub use layers::{Rules, peek, read_layers};
pub use table::{Item, Table};
use toml::Spanned;
use toml::de::DeTable;

/// Something wrong in a TOML text.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Mistake {
    /// The bytes of the text it concerns.
    pub span: Range<usize>,
    /// What is wrong.
    pub what: String,
    /// What to try.
    pub help: String,
}

/// Every mistake found so far in one text.
#[derive(Debug, Default)]
pub struct Mistakes(std::cell::RefCell<Vec<Mistake>>);

impl Mistakes {
    /// Adds one.
    pub fn add(&self, span: Range<usize>, what: impl Into<String>, help: impl Into<String>) {
        self.0.borrow_mut().push(Mistake { span, what: what.into(), help: help.into() });
    }

    /// Whether none was found.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.0.borrow().is_empty()
    }

    /// All of them in the order of the text.
    #[must_use]
    pub fn into_sorted(self) -> Vec<Mistake> {
        let mut all = self.0.into_inner();
        all.sort_by_key(|mistake| (mistake.span.start, mistake.span.end));
        all.dedup();
        all
    }
}

/// The longest text that is read: 1 MiB, a hundred times the largest sequence that a person would write.
pub const LONGEST_TEXT: usize = 1 << 20;

/// Reads `text` by `read`, which asks the top table for what it needs.
///
/// # Errors
/// Every mistake in the text, sorted by place, if there is one.
pub fn read<T>(text: &str, read: impl FnOnce(&mut Table<'_>) -> Option<T>) -> Result<T, Vec<Mistake>> {
    let mistakes = Mistakes::default();
    if text.len() > LONGEST_TEXT {
        mistakes.add(0..0, format!("the text has {} bytes", text.len()), format!("at most {LONGEST_TEXT} are read"));
        return Err(mistakes.into_sorted());
    }
    let value = parse(text, &mistakes).and_then(|parsed| {
        let mut top = Table::new(parsed.get_ref(), 0..text.len().min(1), String::new(), &mistakes);
        let value = read(&mut top);
        top.refuse_others();
        value
    });
    understood(value, mistakes)
}

fn parse<'t>(text: &'t str, mistakes: &Mistakes) -> Option<Spanned<DeTable<'t>>> {
    let note = |error: &toml::de::Error| {
        let span = error.span().unwrap_or(0..0);
        mistakes.add(span, error.message().to_owned(), "this is not TOML 1.0; see the place marked");
    };
    DeTable::parse(text).inspect_err(note).ok()
}

/// What was read, if it was read without a mistake.
fn understood<T>(value: Option<T>, mistakes: Mistakes) -> Result<T, Vec<Mistake>> {
    match value {
        Some(value) if mistakes.is_empty() => Ok(value),
        _ => {
            if mistakes.is_empty() {
                let help = "this is a fault of the program: it gave no reason";
                mistakes.add(0..0, "the text could not be understood", help);
            }
            Err(mistakes.into_sorted())
        }
    }
}

/// The line and the column, both from 1 and the column in characters, of the byte at `offset`.
#[must_use]
pub fn line_and_column(text: &str, offset: usize) -> (u32, u32) {
    let mut offset = offset.min(text.len());
    while !text.is_char_boundary(offset) {
        offset -= 1;
    }
    let before = &text[..offset];
    let line = before.matches('\n').count() + 1;
    let column = before.rsplit('\n').next().map_or(0, |rest| rest.chars().count()) + 1;
    (u32::try_from(line).unwrap_or(u32::MAX), u32::try_from(column).unwrap_or(u32::MAX))
}

#[cfg(test)]
mod tests;
