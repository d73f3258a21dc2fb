//! A table of a TOML text that knows which of its keys were asked for.

use std::collections::BTreeSet;
use std::ops::Range;

use toml::Spanned;
use toml::de::{DeTable, DeValue};

use super::Mistakes;
use crate::units::{Amount, Unit};

/// A value with its place in the text.
#[derive(Debug, Clone, PartialEq)]
pub struct Item<T> {
    /// The value.
    pub value: T,
    /// The bytes of the text it stands at.
    pub span: Range<usize>,
}

/// A table that is being read.
///
/// Each getter marks its key as known; [`Table::refuse_others`] then makes a mistake of every key that nobody asked
/// for. A getter that returns `None` for a key that is there has already recorded why.
#[derive(Debug)]
pub struct Table<'t> {
    entries: &'t DeTable<'t>,
    span: Range<usize>,
    path: String,
    asked: BTreeSet<String>,
    mistakes: &'t Mistakes,
}

impl<'t> Table<'t> {
    pub(super) fn new(entries: &'t DeTable<'t>, span: Range<usize>, path: String, mistakes: &'t Mistakes) -> Self {
        Self { entries, span, path, asked: BTreeSet::new(), mistakes }
    }

    /// The bytes of the text that the table's head (or the inline table) stands at.
    #[must_use]
    pub fn span(&self) -> Range<usize> {
        self.span.clone()
    }

    /// The table's dotted name; empty for the top.
    #[must_use]
    pub fn path(&self) -> &str {
        &self.path
    }

    /// Where to record a mistake that only the reader can see.
    #[must_use]
    pub fn mistakes(&self) -> &'t Mistakes {
        self.mistakes
    }

    /// Whether the key is there, without marking it as known.
    #[must_use]
    pub fn has(&self, key: &str) -> bool {
        self.entries.iter().any(|(name, _)| name.get_ref() == key)
    }

    /// Whether the key is there and holds a text, without marking it as known.
    #[must_use]
    pub fn is_text(&self, key: &str) -> bool {
        let text = |value: &Spanned<DeValue<'_>>| matches!(value.get_ref(), DeValue::String(_));
        self.entries.iter().any(|(name, value)| name.get_ref() == key && text(value))
    }

    /// Whether the key is there and holds a table, without marking it as known.
    #[must_use]
    pub fn has_table(&self, key: &str) -> bool {
        self.entries.iter().any(|(name, value)| name.get_ref() == key && matches!(value.get_ref(), DeValue::Table(_)))
    }

    /// Every key of the table, in the text's order of names, with its place; marks none as known.
    #[must_use]
    pub fn keys(&self) -> Vec<Item<String>> {
        self.entries.iter().map(|(name, _)| Item { value: name.get_ref().to_string(), span: name.span() }).collect()
    }

    /// A text.
    pub fn text(&mut self, key: &str) -> Option<Item<String>> {
        self.convert(key, "a text in quotes", |value| match value {
            DeValue::String(text) => Some(text.to_string()),
            _ => None,
        })
    }

    /// A number, whole or not.
    pub fn number(&mut self, key: &str) -> Option<Item<f64>> {
        self.convert(key, "a number", number)
    }

    /// A whole number.
    pub fn whole(&mut self, key: &str) -> Option<Item<i64>> {
        self.convert(key, "a whole number", |value| match value {
            DeValue::Integer(digits) => i64::from_str_radix(digits.as_str(), digits.radix()).ok(),
            _ => None,
        })
    }

    /// `true` or `false`.
    pub fn flag(&mut self, key: &str) -> Option<Item<bool>> {
        self.convert(key, "true or false", |value| match value {
            DeValue::Boolean(flag) => Some(*flag),
            _ => None,
        })
    }

    /// An amount: a text such as `"10 ns"`, or a bare number, which is then in `unit` without a prefix.
    pub fn amount(&mut self, key: &str, unit: Unit) -> Option<Item<f64>> {
        let found = self.find(key)?;
        let span = found.span();
        amount(found.get_ref(), unit, span, key, self.mistakes)
    }

    /// A list of amounts.
    pub fn amounts(&mut self, key: &str, unit: Unit) -> Option<Vec<Item<f64>>> {
        let found = self.find(key)?;
        let DeValue::Array(items) = found.get_ref() else {
            self.mistakes.add(
                found.span(),
                format!("`{key}` must be a list"),
                format!("such as `{key} = [\"1 {unit}\", \"2 {unit}\"]`"),
            );
            return None;
        };
        items.iter().map(|item| amount(item.get_ref(), unit, item.span(), key, self.mistakes)).collect()
    }

    /// A list of texts.
    pub fn texts(&mut self, key: &str) -> Option<Vec<Item<String>>> {
        let found = self.find(key)?;
        let DeValue::Array(items) = found.get_ref() else {
            self.mistakes.add(
                found.span(),
                format!("`{key}` must be a list of texts"),
                format!("such as `{key} = [\"one\", \"two\"]`"),
            );
            return None;
        };
        items
            .iter()
            .map(|item| match item.get_ref() {
                DeValue::String(text) => Some(Item { value: text.to_string(), span: item.span() }),
                _ => {
                    self.mistakes.add(
                        item.span(),
                        format!("`{key}` holds something that is no text"),
                        "put each entry in quotes",
                    );
                    None
                }
            })
            .collect()
    }

    /// A table within this one.
    pub fn table(&mut self, key: &str) -> Option<Self> {
        let path = self.path_of(key);
        let found = self.find(key)?;
        let DeValue::Table(entries) = found.get_ref() else {
            self.mistakes.add(
                found.span(),
                format!("`{path}` must be a table"),
                format!("such as `[{path}]` with its keys below"),
            );
            return None;
        };
        Some(Table::new(entries, found.span(), path, self.mistakes))
    }

    /// An array of tables within this one, written `[[key]]` or `key = [{…}, {…}]`.
    pub fn tables(&mut self, key: &str) -> Option<Vec<Self>> {
        let path = self.path_of(key);
        let found = self.find(key)?;
        let DeValue::Array(items) = found.get_ref() else {
            self.mistakes.add(
                found.span(),
                format!("`{path}` must be a list of tables"),
                format!("write each as `[[{path}]]` with its keys below"),
            );
            return None;
        };
        items
            .iter()
            .map(|item| match item.get_ref() {
                DeValue::Table(entries) => Some(Table::new(entries, item.span(), path.clone(), self.mistakes)),
                _ => {
                    self.mistakes.add(
                        item.span(),
                        format!("`{path}` holds something that is no table"),
                        format!("write each as `[[{path}]]` with its keys below"),
                    );
                    None
                }
            })
            .collect()
    }

    /// Every entry of a table whose keys are names that the person chose, such as `[pair.gate]`.
    pub fn named_tables(&mut self, key: &str) -> Vec<(Item<String>, Self)> {
        let Some(mut outer) = self.table(key) else { return Vec::new() };
        outer.keys().into_iter().filter_map(|name| outer.table(&name.value).map(|table| (name, table))).collect()
    }

    /// Records that a key is missing and returns nothing, for `table.text("x").or_else(|| table.missing("x", "…"))`.
    pub fn missing<T>(&self, key: &str, help: &str) -> Option<T> {
        // A key that is there but wrong has its mistake already.
        if !self.has(key) {
            let place = if self.path.is_empty() { "the file".to_owned() } else { format!("`{}`", self.path) };
            self.mistakes.add(self.span.clone(), format!("{place} has no `{key}`"), help);
        }
        None
    }

    /// Makes a mistake of every key that nobody asked for.
    pub fn refuse_others(&self) {
        for (name, _) in self.entries.iter() {
            let key = name.get_ref().as_ref();
            if !self.asked.contains(key) {
                let known: Vec<&str> = self.asked.iter().map(String::as_str).collect();
                let place =
                    if self.path.is_empty() { "the top of the file".to_owned() } else { format!("`{}`", self.path) };
                self.mistakes.add(
                    name.span(),
                    format!("`{key}` is not a key of {place}"),
                    format!("known here: {}", known.join(", ")),
                );
            }
        }
    }

    fn path_of(&self, key: &str) -> String {
        if self.path.is_empty() { key.to_owned() } else { format!("{}.{key}", self.path) }
    }

    fn find(&mut self, key: &str) -> Option<&'t Spanned<DeValue<'t>>> {
        self.asked.insert(key.to_owned());
        self.entries.iter().find(|(name, _)| name.get_ref() == key).map(|(_, value)| value)
    }

    fn convert<T>(&mut self, key: &str, wanted: &str, convert: impl Fn(&DeValue<'_>) -> Option<T>) -> Option<Item<T>> {
        let found = self.find(key)?;
        let value = convert(found.get_ref());
        if value.is_none() {
            self.mistakes.add(
                found.span(),
                format!("`{key}` must be {wanted}"),
                format!("write `{key} = ` and {wanted}"),
            );
        }
        value.map(|value| Item { value, span: found.span() })
    }
}

fn number(value: &DeValue<'_>) -> Option<f64> {
    match value {
        DeValue::Integer(digits) => i64::from_str_radix(digits.as_str(), digits.radix()).ok().map(|whole| whole as f64),
        DeValue::Float(digits) => digits.as_str().parse::<f64>().ok().filter(|number| number.is_finite()),
        _ => None,
    }
}

fn amount(value: &DeValue<'_>, unit: Unit, span: Range<usize>, key: &str, mistakes: &Mistakes) -> Option<Item<f64>> {
    if let DeValue::String(text) = value {
        return match Amount::parse_in(text, unit) {
            Ok(value) => Some(Item { value, span }),
            Err(error) => {
                mistakes.add(span, format!("`{key}`: {error}"), format!("such as `{key} = \"1 {unit}\"`"));
                None
            }
        };
    }
    match number(value) {
        Some(value) => Some(Item { value, span }),
        None => {
            mistakes.add(
                span,
                format!("`{key}` must be an amount in {unit}"),
                format!("such as `{key} = \"1 {unit}\"`"),
            );
            None
        }
    }
}
