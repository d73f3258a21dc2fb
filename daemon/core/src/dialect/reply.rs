//! How a line that came back is taken apart into fields.

use std::collections::BTreeMap;

use super::intent::BESIDES;
use super::template::{Refusal, Spelling};
use super::words::Words;
use super::{DialectError, Fields, Intent, ReplyKind, Value};
use crate::scpi::value::{self, ValueError};

/// How lines look in general.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub(super) struct Manner {
    /// Replies begin with the header of what was asked, and a blank.
    pub(super) header: bool,
    /// Numbers are followed by their unit.
    pub(super) units: bool,
}

/// One part of a comma list.
#[derive(Debug, Clone, PartialEq)]
struct Field {
    /// `None` for a part that is passed over.
    name: Option<String>,
    spelling: Spelling,
}

/// The shape of a line: a comma list, or one field that takes it as a whole.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Shape {
    fields: Vec<Field>,
    whole_line: bool,
}

impl Shape {
    /// A comma list of these places, each `name`, `name:spelling` or `_`.
    pub(super) fn list<'p>(
        places: impl Iterator<Item = &'p str>,
        intent: Intent,
        words: &BTreeMap<String, Words>,
    ) -> Result<Self, Refusal> {
        let fields = places.map(|place| field(place, intent, words)).collect::<Result<_, _>>()?;
        Ok(Self { fields, whole_line: false })
    }

    /// The whole line as one field.
    pub(super) fn line(place: &str, intent: Intent, words: &BTreeMap<String, Words>) -> Result<Self, Refusal> {
        Ok(Self { fields: vec![field(place, intent, words)?], whole_line: true })
    }

    /// The names of its fields.
    pub(super) fn names(&self) -> impl Iterator<Item = &str> {
        self.fields.iter().filter_map(|field| field.name.as_deref())
    }

    /// Where in the list the field of this name stands.
    pub(super) fn place_of(&self, name: &str) -> Option<usize> {
        self.fields.iter().position(|field| field.name.as_deref() == Some(name))
    }

    /// Reads `line`, the reply to `command`, into `fields`.
    pub(super) fn read(
        &self,
        line: &str,
        command: &str,
        manner: Manner,
        words: &BTreeMap<String, Words>,
        fields: &mut Fields,
    ) -> Result<(), DialectError> {
        let shown = || value::shorten(line);
        let body = without_header(line, manner);
        let parts = if self.whole_line {
            vec![body]
        } else {
            value::list(body).map_err(|source| DialectError::Reply {
                command: command.to_owned(),
                reply: shown(),
                source,
            })?
        };
        if parts.len() != self.fields.len() {
            return Err(DialectError::Parts {
                command: command.to_owned(),
                reply: shown(),
                wanted: self.fields.len(),
                found: parts.len(),
            });
        }
        for (field, part) in self.fields.iter().zip(parts) {
            let Some(name) = &field.name else { continue };
            let unreadable =
                |source| DialectError::Read { command: command.to_owned(), reply: shown(), name: name.clone(), source };
            let value = match &field.spelling {
                Spelling::Words(map) => in_words(part, name, map, words)?,
                spelling => plain(part, spelling, manner).map_err(unreadable)?,
            };
            fields.set(name.clone(), value);
        }
        Ok(())
    }
}

/// The line without the header that some instruments repeat before their reply.
pub(super) fn without_header(line: &str, manner: Manner) -> &str {
    let line = line.trim();
    if !manner.header || !line.starts_with(|first: char| first.is_ascii_alphabetic() || matches!(first, ':' | '*')) {
        return line;
    }
    line.split_once(' ').map_or(line, |(_, rest)| rest.trim_start())
}

fn plain(part: &str, spelling: &Spelling, manner: Manner) -> Result<Value, ValueError> {
    let number = |text: &str| if manner.units { value::number_with_unit(text) } else { value::number(text) };
    Ok(match spelling {
        Spelling::Flag => Value::Flag(value::boolean(part)?),
        Spelling::List => {
            // Both `1,0` and `(@101,102)`.
            let inner = part.trim().strip_prefix("(@").and_then(|rest| rest.strip_suffix(')')).unwrap_or(part);
            Value::List(value::list(inner)?.into_iter().map(value::whole).collect::<Result<_, _>>()?)
        }
        Spelling::Number => Value::Number(number(part)?),
        Spelling::Percent => Value::Number(number(part)? / 100.0),
        // Words are read with their map, in the caller.
        Spelling::Text | Spelling::Words(_) => Value::Text(value::loose_text(part)),
        Spelling::Whole => Value::Whole(value::whole(part)?),
    })
}

/// A word by its map; which kind of value it is shows in the field's specification, or else in the key's form.
fn in_words(part: &str, name: &str, map: &str, words: &BTreeMap<String, Words>) -> Result<Value, DialectError> {
    let missing = || DialectError::NoWord { words: map.to_owned(), value: name.to_owned() };
    let key = words.get(map).ok_or_else(missing)?.read(part)?;
    Ok(match key.as_str() {
        "true" => Value::Flag(true),
        "false" => Value::Flag(false),
        other => other.parse().map_or_else(|_| Value::Keyword(key.clone()), Value::Whole),
    })
}

fn field(place: &str, intent: Intent, words: &BTreeMap<String, Words>) -> Result<Field, Refusal> {
    let (name, spelling) = place.split_once(':').map_or((place, None), |(name, spelling)| (name, Some(spelling)));
    let (name, spelling) = (name.trim(), spelling.map(|spelling| Spelling::parse(spelling.trim())));
    if name == "_" {
        return Ok(Field { name: None, spelling: Spelling::Text });
    }
    let spec = intent.spec();
    let besides = BESIDES.iter().filter(|(known, ..)| *known == intent).map(|(_, name, kind)| (*name, *kind));
    let kind = match spec.reply.iter().copied().chain(besides).find(|(known, _)| *known == name) {
        Some((_, kind)) => kind,
        // A preamble may hold numbers of the instrument's own, for the expressions of `[record]`.
        None if intent == Intent::RecordPreamble && is_name(name) => ReplyKind::Number,
        None => {
            let known: Vec<&str> = spec.reply.iter().map(|(name, _)| *name).collect();
            return Err((
                format!("`{name}` is no field of `{intent}`"),
                format!("known here: _, {}", known.join(", ")),
            ));
        }
    };
    if let Some(Spelling::Words(map)) = &spelling {
        refuse_words(name, kind, map, words)?;
    }
    let spelling = match (spelling, kind) {
        (Some(spelling), _) => spelling,
        (None, ReplyKind::Flag) => Spelling::Flag,
        (None, ReplyKind::List) => Spelling::List,
        (None, ReplyKind::Number) => Spelling::Number,
        (None, ReplyKind::Text | ReplyKind::Block) => Spelling::Text,
        (None, ReplyKind::Whole) => Spelling::Whole,
        (None, ReplyKind::Keyword(_)) => {
            let help = format!("say its map of words: `{name}:MAP` and `[words.MAP]`");
            return Err((format!("`{name}` is a keyword"), help));
        }
    };
    let fits = matches!(
        (&spelling, kind),
        (Spelling::Words(_), _)
            | (Spelling::Flag, ReplyKind::Flag)
            | (Spelling::List, ReplyKind::List)
            | (Spelling::Number, ReplyKind::Number | ReplyKind::Whole)
            | (Spelling::Percent, ReplyKind::Number)
            | (Spelling::Text, ReplyKind::Text | ReplyKind::Block)
            | (Spelling::Whole, ReplyKind::Whole | ReplyKind::Number)
    );
    if fits {
        Ok(Field { name: Some(name.to_owned()), spelling })
    } else {
        Err((format!("`{place}` cannot be spelled so"), "it is a field of another kind".to_owned()))
    }
}

fn refuse_words(name: &str, kind: ReplyKind, map: &str, words: &BTreeMap<String, Words>) -> Result<(), Refusal> {
    let Some(map_found) = words.get(map) else {
        let help = "spellings are flag, list, number, percent, text, whole, or the name of a `[words.…]`";
        return Err((format!("`{map}` is neither a spelling nor a map of words"), help.to_owned()));
    };
    let lacking = match kind {
        ReplyKind::Keyword(keys) => map_found.lacks(keys),
        ReplyKind::Flag => map_found.lacks(&["true", "false"]),
        ReplyKind::Whole => Vec::new(),
        _ => {
            return Err((format!("`{name}` is no word"), "leave its map of words out".to_owned()));
        }
    };
    if lacking.is_empty() {
        return Ok(());
    }
    Err((format!("`{map}` has nothing for {}", lacking.join(", ")), format!("add it to `[words.{map}]`")))
}

/// A name that an expression can use.
pub(super) fn is_name(name: &str) -> bool {
    name.bytes().next().is_some_and(|first| first.is_ascii_lowercase())
        && name.bytes().all(|byte| byte.is_ascii_lowercase() || byte.is_ascii_digit() || byte == b'_')
}
