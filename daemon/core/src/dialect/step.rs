//! The steps of an intent, and the questions about errors and completion.

use super::convert::Conversions;
use super::reply::{Manner, Shape, without_header};
use super::split::{between, parts};
use super::template::Template;
use super::{Completion, DialectError, Expect};
use crate::scpi::value;

/// How an intent is spoken.
#[derive(Debug)]
pub(super) struct Spoken {
    pub(super) steps: Vec<Step>,
    pub(super) conversions: Conversions,
}

/// What comes back for one step.
#[derive(Debug)]
pub(super) enum Wanted {
    /// A block of samples.
    Block,
    /// A line of this shape.
    Line(Shape),
    /// Nothing.
    Nothing,
}

impl Wanted {
    /// Whether it gives the field of this name.
    pub(super) fn gives(&self, field: &str) -> bool {
        match self {
            Self::Block => field == "block",
            Self::Line(shape) => shape.names().any(|name| name == field),
            Self::Nothing => false,
        }
    }

    /// What the task that owns the connection has to wait for.
    pub(super) fn expect(&self) -> Expect {
        match self {
            Self::Block => Expect::Block,
            Self::Line(_) => Expect::Line,
            Self::Nothing => Expect::Nothing,
        }
    }

    /// The names of the fields of a line.
    pub(super) fn names(&self) -> Vec<&str> {
        match self {
            Self::Line(shape) => shape.names().collect(),
            Self::Block | Self::Nothing => Vec::new(),
        }
    }
}

/// One command or question.
#[derive(Debug)]
pub(super) struct Step {
    pub(super) template: Template,
    pub(super) wanted: Wanted,
    /// How the reply looks in general.
    pub(super) manner: Manner,
    pub(super) pause_s: f64,
}

/// How the error queue is read.
#[derive(Debug)]
pub(super) struct Errors {
    pub(super) ask: Template,
    pub(super) shape: Shape,
    /// What stands between the parts of a reply.
    pub(super) between: char,
    pub(super) empty: Empty,
}

/// What says that the error queue is empty.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Empty {
    /// This number.
    Number(i64),
    /// This text, in the place of everything else.
    Text(String),
}

impl Errors {
    /// Reads one entry. Parts behind the known ones, and a missing text, are no reason to lose a number.
    pub(super) fn read(
        &self,
        line: &str,
        command: &str,
        manner: Manner,
    ) -> Result<Option<(i64, String)>, DialectError> {
        let body = without_header(line, manner);
        if matches!(&self.empty, Empty::Text(text) if value::loose_text(body).eq_ignore_ascii_case(text.trim())) {
            return Ok(None);
        }
        let parts = self.parts(body);
        let part = |name| self.shape.place_of(name).and_then(|place| parts.get(place).copied());
        let number = value::whole(part("number").unwrap_or_default()).map_err(|source| DialectError::Read {
            command: command.to_owned(),
            reply: value::shorten(line),
            name: "number".to_owned(),
            source,
        })?;
        if self.empty == Empty::Number(number) {
            return Ok(None);
        }
        Ok(Some((number, part("text").map(value::loose_text).unwrap_or_default())))
    }

    /// The parts of a reply. A text at its end that stands in no quotes may hold what parts the others.
    fn parts<'l>(&self, body: &'l str) -> Vec<&'l str> {
        let count = self.shape.len();
        let few = || between(body, self.between, count);
        let Ok(parts) = parts(body, self.between) else { return few() };
        let quoted =
            count.checked_sub(1).and_then(|last| parts.get(last)).is_some_and(|last| last.starts_with(['"', '\'']));
        let text_last = self.shape.place_of("text").is_some_and(|place| place + 1 == count);
        if parts.len() > count && text_last && !quoted { few() } else { parts }
    }
}

/// Which reply says that everything is complete.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Until {
    /// These bits are 0.
    Clear(u16),
    /// The reply is this text or this number.
    Equals(String),
    /// These bits are 1.
    Set(u16),
}

/// How completion is asked for.
#[derive(Debug)]
pub(super) struct Waiting {
    pub(super) ask: Template,
    pub(super) until: Until,
    pub(super) how: Completion,
}

impl Waiting {
    /// Whether this reply says that everything is complete.
    pub(super) fn done(&self, line: &str, command: &str, manner: Manner) -> Result<bool, DialectError> {
        let body = without_header(line, manner);
        let bits = || {
            value::whole(body).map_err(|source| DialectError::Read {
                command: command.to_owned(),
                reply: value::shorten(line),
                name: "done".to_owned(),
                source,
            })
        };
        Ok(match &self.until {
            Until::Clear(mask) => bits()? & i64::from(*mask) == 0,
            Until::Set(mask) => bits()? & i64::from(*mask) == i64::from(*mask),
            Until::Equals(text) => match (value::number(text), value::number(body)) {
                (Ok(wanted), Ok(found)) => wanted.to_bits() == found.to_bits(),
                _ => value::loose_text(body).eq_ignore_ascii_case(text.trim()),
            },
        })
    }
}
