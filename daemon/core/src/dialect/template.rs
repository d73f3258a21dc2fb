//! Commands with places for arguments, such as `SENSe{channel}:VOLTage:RANGe:PTPeak {span_v}`.

use std::collections::BTreeMap;

use super::words::Words;
use super::{ArgKind, Args, DialectError, Intent};
use crate::scpi::write;

/// How a value is spelled.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Spelling {
    /// `1` or `0`.
    Flag,
    /// Whole numbers.
    Listed(Listing),
    /// A decimal number.
    Number,
    /// A fraction as a percentage.
    Percent,
    /// A text in quotes, or without them when read.
    Text,
    /// A whole number.
    Whole,
    /// A word of this map.
    Words(String),
}

/// How a list of whole numbers is spelled.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Listing {
    /// `101 102`.
    Blanks,
    /// `(@101,102)`, a channel list (SCPI-99 volume 1, 8.3.2).
    Channels,
    /// `101,102`.
    Commas,
}

/// Every spelling, for messages.
pub(super) const SPELLINGS: &str =
    "spellings are blanks, commas, flag, list, number, percent, text, whole, or the name of a `[words.…]`";

impl Spelling {
    /// The spelling of this name; every other name is that of a map of words.
    pub(super) fn parse(name: &str) -> Self {
        match name {
            "blanks" => Self::Listed(Listing::Blanks),
            "commas" => Self::Listed(Listing::Commas),
            "flag" => Self::Flag,
            "list" => Self::Listed(Listing::Channels),
            "number" => Self::Number,
            "percent" => Self::Percent,
            "text" => Self::Text,
            "whole" => Self::Whole,
            other => Self::Words(other.to_owned()),
        }
    }

    /// The spelling for an argument that says none; a keyword has to say its map.
    fn usual(kind: ArgKind) -> Option<Self> {
        match kind {
            ArgKind::Channel | ArgKind::Whole(..) => Some(Self::Whole),
            ArgKind::Channels => Some(Self::Listed(Listing::Channels)),
            ArgKind::Flag => Some(Self::Flag),
            ArgKind::Keyword(_) => None,
            ArgKind::Number => Some(Self::Number),
        }
    }

    /// Why a number that an expression gives cannot be spelled so; `None` if it can.
    fn refuse_derived(&self, words: &BTreeMap<String, Words>) -> Option<String> {
        match self {
            Self::Number | Self::Percent | Self::Whole => None,
            // Which numbers come is not known before: one without a word is refused when it does.
            Self::Words(name) if words.contains_key(name) => None,
            Self::Words(name) => Some(format!("`{name}` is neither a spelling nor a map of words")),
            Self::Flag | Self::Listed(_) | Self::Text => Some("an expression gives a number".to_owned()),
        }
    }

    /// Why a value of this kind cannot be spelled so; `None` if it can.
    fn refuse(&self, kind: ArgKind, words: &BTreeMap<String, Words>) -> Option<String> {
        let lacks = |map: &Words, keys: &[&str]| {
            let lacking = map.lacks(keys);
            (!lacking.is_empty()).then(|| format!("its words have nothing for {}", lacking.join(", ")))
        };
        match (self, kind) {
            (Self::Words(name), _) => {
                let Some(map) = words.get(name) else {
                    return Some(format!("`{name}` is neither a spelling nor a map of words"));
                };
                match kind {
                    ArgKind::Keyword(keys) => lacks(map, keys),
                    ArgKind::Flag => lacks(map, &["true", "false"]),
                    ArgKind::Channel | ArgKind::Whole(..) if map.takes_any() => None,
                    ArgKind::Channel | ArgKind::Whole(..) => {
                        Some("its words lack `*` for every other number".to_owned())
                    }
                    ArgKind::Channels | ArgKind::Number => {
                        Some("numbers and lists are not spelled in words".to_owned())
                    }
                }
            }
            (Self::Flag, ArgKind::Flag)
            | (Self::Listed(_), ArgKind::Channels)
            | (Self::Number, ArgKind::Number | ArgKind::Channel | ArgKind::Whole(..))
            | (Self::Percent, ArgKind::Number)
            | (Self::Whole, ArgKind::Channel | ArgKind::Whole(..)) => None,
            _ => Some("it is of another kind".to_owned()),
        }
    }
}

/// What may stand in the places of a command.
#[derive(Debug, Clone, Default)]
pub(super) struct Places<'p> {
    /// The arguments of the call.
    pub(super) args: Vec<(&'static str, ArgKind)>,
    /// Numbers that expressions make of them; they come before an argument of the same name.
    pub(super) derived: Vec<&'p str>,
}

#[derive(Debug, Clone, PartialEq)]
enum Part {
    Argument {
        name: String,
        spelling: Spelling,
    },
    /// A number out of an expression, which need not be whole where a whole one is written.
    Derived {
        name: String,
        spelling: Spelling,
    },
    Literal(String),
}

/// A command with places for arguments.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Template(Vec<Part>);

/// Why a text is no template: what is wrong, and what to try.
pub(super) type Refusal = (String, String);

/// The longest command that a dialect may hold: the shortest input buffer in use is larger (common practice, no source).
pub(super) const LONGEST: usize = 512;

impl Template {
    /// Reads a command without arguments.
    pub(super) fn plain(text: &str) -> Result<Self, Refusal> {
        Self::parse(text, &Places::default(), &BTreeMap::new())
    }

    /// Reads a command with places for arguments.
    pub(super) fn parse(text: &str, places: &Places<'_>, words: &BTreeMap<String, Words>) -> Result<Self, Refusal> {
        if text.trim().is_empty() || text.len() > LONGEST {
            return Err((format!("a command must have 1 to {LONGEST} characters"), "write the command".to_owned()));
        }
        if let Some(bad) = text.chars().find(|c| !matches!(c, ' '..='~')) {
            let help = "commands are printable ASCII; the line ending is added by itself".to_owned();
            return Err((format!("{bad:?} cannot stand in a command"), help));
        }
        let (mut parts, mut rest) = (Vec::new(), text.trim());
        while let Some((literal, tail)) = rest.split_once('{') {
            let Some((place, tail)) = tail.split_once('}') else {
                return Err(("a `{` has no `}`".to_owned(), "write a place as `{name}`".to_owned()));
            };
            parts.push(Part::Literal(literal.to_owned()));
            parts.push(argument(place, places, words)?);
            rest = tail;
        }
        parts.push(Part::Literal(rest.to_owned()));
        let stray = parts.iter().any(|part| matches!(part, Part::Literal(literal) if literal.contains('}')));
        if stray {
            return Err(("a `}` has no `{`".to_owned(), "write a place as `{name}`".to_owned()));
        }
        Ok(Self(parts))
    }

    /// The arguments that it uses.
    pub(super) fn uses(&self) -> impl Iterator<Item = &str> {
        self.0.iter().filter_map(|part| match part {
            Part::Argument { name, .. } | Part::Derived { name, .. } => Some(name.as_str()),
            Part::Literal(_) => None,
        })
    }

    /// Whether its own text asks for a reply.
    pub(super) fn asks(&self) -> bool {
        self.0.iter().any(|part| matches!(part, Part::Literal(literal) if literal.contains('?')))
    }

    /// The command with these arguments.
    pub(super) fn render(
        &self,
        intent: Intent,
        args: &Args,
        words: &BTreeMap<String, Words>,
    ) -> Result<String, DialectError> {
        let mut command = String::new();
        for part in &self.0 {
            match part {
                Part::Literal(literal) => command.push_str(literal),
                Part::Argument { name, spelling } => command.push_str(&spell(intent, name, spelling, args, words)?),
                Part::Derived { name, spelling } => {
                    let number = args.number(name)?;
                    let mut rounded = Args::new();
                    // The instrument takes whole numbers here; what it then has is read back.
                    let whole = matches!(spelling, Spelling::Whole | Spelling::Words(_));
                    rounded.set(name.clone(), if whole { number.round() } else { number });
                    command.push_str(&spell(intent, name, spelling, &rounded, words)?);
                }
            }
        }
        Ok(command)
    }
}

fn argument(place: &str, places: &Places<'_>, words: &BTreeMap<String, Words>) -> Result<Part, Refusal> {
    let (name, spelling) = place.split_once(':').map_or((place, None), |(name, spelling)| (name, Some(spelling)));
    let (name, spelling) = (name.trim(), spelling.map(|spelling| Spelling::parse(spelling.trim())));
    let unfit = |why: String| (format!("`{{{place}}}` cannot be spelled so: {why}"), SPELLINGS.to_owned());
    if places.derived.contains(&name) {
        let spelling = spelling.unwrap_or(Spelling::Number);
        return match spelling.refuse_derived(words) {
            Some(why) => Err(unfit(why)),
            None => Ok(Part::Derived { name: name.to_owned(), spelling }),
        };
    }
    let Some((name, kind)) = places.args.iter().find(|(known, _)| *known == name) else {
        let known: Vec<&str> =
            places.args.iter().map(|(name, _)| *name).chain(places.derived.iter().copied()).collect();
        let none = "there are no arguments here".to_owned();
        let help = if known.is_empty() { none } else { format!("known here: {}", known.join(", ")) };
        return Err((format!("`{{{place}}}` names no argument"), help));
    };
    let spelling = match spelling {
        Some(spelling) => spelling,
        None => Spelling::usual(*kind).ok_or_else(|| {
            (format!("`{name}` is a keyword"), format!("say its map of words: `{{{name}:MAP}}` and `[words.MAP]`"))
        })?,
    };
    match spelling.refuse(*kind, words) {
        Some(why) => Err(unfit(why)),
        None => Ok(Part::Argument { name: (*name).to_owned(), spelling }),
    }
}

fn spell(
    intent: Intent,
    name: &str,
    spelling: &Spelling,
    args: &Args,
    words: &BTreeMap<String, Words>,
) -> Result<String, DialectError> {
    let unwritten = |source| DialectError::Write { intent, name: name.to_owned(), source };
    let written = match spelling {
        Spelling::Flag => Ok(write::boolean(args.flag(name)?)),
        Spelling::Listed(listing) => {
            let sign = match listing {
                Listing::Blanks => " ",
                Listing::Channels => return write::channels(args.list(name)?).map_err(unwritten),
                Listing::Commas => ",",
            };
            let numbers: Vec<String> = args.list(name)?.iter().map(|number| write::whole(*number)).collect();
            Ok(numbers.join(sign))
        }
        Spelling::Number => write::number(args.number(name)?),
        Spelling::Percent => write::percent(args.number(name)?),
        Spelling::Text => write::quoted(args.text(name)?),
        Spelling::Whole => Ok(write::whole(args.whole(name)?)),
        Spelling::Words(map) => {
            let value = args.value(name).ok_or_else(|| DialectError::Missing { name: name.to_owned() })?;
            let map = words
                .get(map)
                .ok_or_else(|| DialectError::NoWord { words: map.clone(), value: value.kind().to_owned() })?;
            // A channel given as `1.0` is looked up as 1.
            return match args.whole(name) {
                Ok(whole) => map.write(&whole.into()),
                Err(_) => map.write(value),
            };
        }
    };
    written.map_err(unwritten)
}
