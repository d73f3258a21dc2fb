//! Several TOML texts read as one: a file that states only its differences from another, which may do the same.

use std::ops::Range;

use toml::Spanned;
use toml::de::{DeTable, DeValue};

use super::{Item, LONGEST_TEXT, Mistake, Mistakes, Table, parse, understood};

/// How the tables of two texts are laid over one another.
///
/// A table is merged key by key, everything else is replaced; `false` in the place of a table takes that table away.
#[derive(Debug, Clone, Copy)]
pub struct Rules {
    /// Whether the table at this path is replaced as a whole.
    pub whole: fn(&[&str]) -> bool,
    /// Two tables whose entries of the same name belong together: who replaces the entry in the first does not inherit
    /// the one in the second.
    pub together: (&'static str, &'static str),
}

/// Reads `texts` as one: the first states its differences from the second, and so on.
///
/// # Errors
/// Every mistake, each with the number of the text it stands in.
pub fn read_layers<T>(
    texts: &[&str],
    rules: &Rules,
    read: impl FnOnce(&mut Table<'_>) -> Option<T>,
) -> Result<T, Vec<(usize, Mistake)>> {
    // Each text is pushed down by the length of those before it, so a place tells by itself which text it is in.
    let mut starts = Vec::with_capacity(texts.len());
    let mut padded = Vec::with_capacity(texts.len());
    let mut start = 0;
    for text in texts {
        starts.push(start);
        padded.push("\n".repeat(start) + text);
        start += text.len() + 1;
    }
    let mistakes = Mistakes::default();
    let value = padded
        .iter()
        .zip(&starts)
        .map(|(text, start)| {
            if text.len() - start > LONGEST_TEXT {
                mistakes.add(*start..*start, "the text is too long", format!("at most {LONGEST_TEXT} bytes are read"));
                return None;
            }
            parse(text, &mistakes)
        })
        .collect::<Option<Vec<_>>>()
        .and_then(|tables| {
            // From the last upwards: what a text takes away must not come back from further below.
            let tables = tables.into_iter().rev().map(Spanned::into_inner);
            let merged = tables.reduce(|base, own| merge(own, base, rules))?;
            let begin = 0..texts.first().map_or(0, |text| text.len().min(1));
            let mut top = Table::new(&merged, begin, String::new(), &mistakes);
            let value = read(&mut top);
            top.refuse_others();
            value
        });
    understood(value, mistakes).map_err(|found| found.into_iter().map(|mistake| placed(mistake, &starts)).collect())
}

/// The text at the top key `key`, when the text can be parsed and has one.
#[must_use]
pub fn peek(text: &str, key: &str) -> Option<Item<String>> {
    let parsed = DeTable::parse(text).ok()?;
    let (_, value) = parsed.get_ref().iter().find(|(name, _)| name.get_ref() == key)?;
    match value.get_ref() {
        DeValue::String(found) => Some(Item { value: found.to_string(), span: value.span() }),
        _ => None,
    }
}

/// A mistake with the number of its text and its place there.
fn placed(mistake: Mistake, starts: &[usize]) -> (usize, Mistake) {
    let layer = starts.iter().rposition(|start| *start <= mistake.span.start).unwrap_or(0);
    let start = starts.get(layer).copied().unwrap_or(0);
    let span: Range<usize> = mistake.span.start - start..mistake.span.end.saturating_sub(start);
    (layer, Mistake { span, ..mistake })
}

fn merge<'t>(mut own: DeTable<'t>, mut base: DeTable<'t>, rules: &Rules) -> DeTable<'t> {
    let (first, second) = rules.together;
    if let Some(DeValue::Table(replaced)) = entry(&own, first) {
        let names: Vec<String> = replaced.keys().map(|name| name.get_ref().to_string()).collect();
        if let Some((_, value)) = base.iter_mut().find(|(name, _)| name.get_ref() == second)
            && let DeValue::Table(inherited) = value.get_mut()
        {
            for name in &names {
                inherited.remove(name.as_str());
            }
        }
    }
    let mut path = Vec::new();
    lay(&mut own, base, &mut path, rules.whole);
    own
}

fn entry<'v, 't>(table: &'v DeTable<'t>, key: &str) -> Option<&'v DeValue<'t>> {
    table.iter().find(|(name, _)| name.get_ref() == key).map(|(_, value)| value.get_ref())
}

/// Lays `own` over `base`: what `own` does not say is taken from there.
fn lay<'t>(own: &mut DeTable<'t>, base: DeTable<'t>, path: &mut Vec<String>, whole: fn(&[&str]) -> bool) {
    let mut gone = Vec::new();
    for (name, inherited) in base {
        let key = name.get_ref().to_string();
        path.push(key.clone());
        let stays_whole = whole(&path.iter().map(String::as_str).collect::<Vec<_>>());
        let mine = own.iter_mut().find(|(mine, _)| mine.get_ref() == name.get_ref()).map(|(_, value)| value.get_mut());
        match (mine, inherited.get_ref()) {
            (Some(DeValue::Table(mine)), DeValue::Table(_)) if !stays_whole => {
                if let DeValue::Table(inherited) = inherited.into_inner() {
                    lay(mine, inherited, path, whole);
                }
            }
            (Some(DeValue::Boolean(false)), DeValue::Table(_)) => gone.push(key),
            (Some(_), _) => {}
            (None, _) => {
                own.insert(name, inherited);
            }
        }
        path.pop();
    }
    for key in gone {
        own.remove(key.as_str());
    }
}

#[cfg(test)]
mod tests;
