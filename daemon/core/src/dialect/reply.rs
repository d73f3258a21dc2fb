//! How a line that came back is taken apart into fields.

use std::collections::BTreeMap;

use super::intent::BESIDES;
use super::split::parts;
use super::template::{Listing, Refusal, SPELLINGS, Spelling};
use super::words::{Words, same};
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

/// How the parts of a line are told apart.
#[derive(Debug, Clone, PartialEq)]
enum Form {
    /// By their place in a list, which has this sign between them.
    List(char),
    /// By their keys, one for each field.
    Keys { keys: Vec<String>, signs: Signs },
    /// There is one part, the line.
    Whole,
}

/// What stands between the entries of a line with keys, and between a key and its value.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Signs {
    pub(super) between: char,
    pub(super) joint: char,
}

/// The shape of a line.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Shape {
    fields: Vec<Field>,
    form: Form,
}

/// Whose reply a shape is of, and which fields it may have.
#[derive(Debug, Clone, Copy)]
pub(super) struct Whose<'w> {
    pub(super) intent: Intent,
    /// Whether fields of the dialect's own are taken, for the expressions that use them.
    pub(super) free: bool,
    pub(super) words: &'w BTreeMap<String, Words>,
}

impl Shape {
    /// A list of these places, each `name`, `name:spelling` or `_`.
    pub(super) fn list<'p>(
        places: impl Iterator<Item = &'p str>,
        between: char,
        whose: Whose<'_>,
    ) -> Result<Self, Refusal> {
        let fields = places.map(|place| field(place, whose)).collect::<Result<_, _>>()?;
        Ok(Self { fields, form: Form::List(between) })
    }

    /// Entries with keys: the place of each, and the instrument's key for it.
    pub(super) fn keyed(entries: &[(String, String)], signs: Signs, whose: Whose<'_>) -> Result<Self, Refusal> {
        let fields = entries.iter().map(|(place, _)| field(place, whose)).collect::<Result<_, _>>()?;
        Ok(Self { fields, form: Form::Keys { keys: entries.iter().map(|(_, key)| key.clone()).collect(), signs } })
    }

    /// The whole line as one field.
    pub(super) fn line(place: &str, whose: Whose<'_>) -> Result<Self, Refusal> {
        Ok(Self { fields: vec![field(place, whose)?], form: Form::Whole })
    }

    /// How many parts it has.
    pub(super) fn len(&self) -> usize {
        self.fields.len()
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
        let unparted = |source| DialectError::Reply { command: command.to_owned(), reply: shown(), source };
        let parts = match &self.form {
            Form::Whole => vec![body],
            Form::List(between) => parts(body, *between).map_err(unparted)?,
            Form::Keys { keys, signs } => {
                let entries = parts(body, signs.between).map_err(unparted)?;
                let pairs: Vec<(&str, &str)> = entries
                    .into_iter()
                    .filter_map(|entry| entry.split_once(signs.joint))
                    .map(|(key, value)| (key.trim(), value.trim()))
                    .collect();
                let one = |key: &String| {
                    let mut found = pairs.iter().filter(|(name, _)| same(key, name)).map(|(_, value)| *value);
                    match (found.next(), found.count()) {
                        (Some(value), 0) => Ok(value),
                        (first, more) => Err(DialectError::Key {
                            command: command.to_owned(),
                            reply: shown(),
                            key: key.clone(),
                            found: usize::from(first.is_some()) + more,
                        }),
                    }
                };
                keys.iter().map(one).collect::<Result<_, _>>()?
            }
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
        Spelling::Listed(_) => {
            // Both `1,0` and `(@101,102)`.
            let inner = part.trim().strip_prefix("(@").and_then(|rest| rest.strip_suffix(')')).unwrap_or(part);
            let sign = if matches!(spelling, Spelling::Listed(Listing::Blanks)) { ' ' } else { ',' };
            Value::List(parts(inner, sign)?.into_iter().map(value::whole).collect::<Result<_, _>>()?)
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

fn field(place: &str, whose: Whose<'_>) -> Result<Field, Refusal> {
    let Whose { intent, words, .. } = whose;
    let (name, spelling) = place.split_once(':').map_or((place, None), |(name, spelling)| (name, Some(spelling)));
    let (name, spelling) = (name.trim(), spelling.map(|spelling| Spelling::parse(spelling.trim())));
    if name == "_" {
        return Ok(Field { name: None, spelling: Spelling::Text });
    }
    let kind = match kind_of(intent, name) {
        Some(kind) => kind,
        None if whose.free && is_name(name) => {
            // Numbers, or words that stand for numbers.
            if matches!(spelling, Some(Spelling::Words(_))) { ReplyKind::Whole } else { ReplyKind::Number }
        }
        None => return Err(no_field(intent, name)),
    };
    if let Some(Spelling::Words(map)) = &spelling {
        refuse_words(name, kind, map, words)?;
    }
    let spelling = match (spelling, kind) {
        (Some(spelling), _) => spelling,
        (None, ReplyKind::Flag) => Spelling::Flag,
        (None, ReplyKind::List) => Spelling::Listed(Listing::Channels),
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
            | (Spelling::Listed(_), ReplyKind::List)
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
        return Err((format!("`{map}` is neither a spelling nor a map of words"), SPELLINGS.to_owned()));
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

/// The kind of the field of this name, if the intent's reply may have it.
pub(super) fn kind_of(intent: Intent, name: &str) -> Option<ReplyKind> {
    let besides = BESIDES.iter().filter(|(known, ..)| *known == intent).map(|(_, name, kind)| (*name, *kind));
    intent.spec().reply.iter().copied().chain(besides).find(|(known, _)| *known == name).map(|(_, kind)| kind)
}

/// The refusal of a field that nothing uses.
pub(super) fn no_field(intent: Intent, name: &str) -> Refusal {
    let known: Vec<&str> = intent.spec().reply.iter().map(|(name, _)| *name).collect();
    (format!("`{name}` is no field of `{intent}`"), format!("known here: _, {}", known.join(", ")))
}

/// A name that an expression can use.
pub(super) fn is_name(name: &str) -> bool {
    name.bytes().next().is_some_and(|first| first.is_ascii_lowercase())
        && name.bytes().all(|byte| byte.is_ascii_lowercase() || byte.is_ascii_digit() || byte == b'_')
}
