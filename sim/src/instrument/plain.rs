//! Lines of one command each: what the personalities share that do not follow IEEE 488.2.
//!
//! A personality reads a line into the parts that a table of headers wants, and dresses the answer. Here the line is
//! carried out.

use std::time::Duration;

use super::Device;
use super::tree::{Call, Instrument};
use crate::message::{Args, Cursor, Data, Mnemonic, Reply};
use crate::status::Fault;

/// A manner of speaking.
pub(crate) struct Manner {
    /// Reads a line without its end.
    pub(crate) read: fn(&str) -> Result<Spoken, Fault>,
    /// Makes the reply of the answer to a line, without its end.
    pub(crate) dress: fn(&Spoken, Vec<u8>) -> Vec<u8>,
    /// What a question is answered that went wrong; nothing by itself.
    pub(crate) wrong: Option<&'static str>,
    /// What ends a reply.
    pub(crate) ending: &'static [u8],
    /// What is said to whoever connects.
    pub(crate) greeting: Option<&'static str>,
    /// Whether a second connection is turned away.
    pub(crate) one_client: bool,
    /// For how long nothing is heard after a line.
    pub(crate) deafness: Option<Duration>,
    /// Whether numbers are answered with their unit.
    pub(crate) units: bool,
}

/// A line as it was understood.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Spoken {
    /// The header as the tables have it.
    pub(crate) nodes: Vec<Mnemonic>,
    /// Whether something is asked.
    pub(crate) query: bool,
    /// The parameters.
    pub(crate) data: Vec<Data>,
    /// What is waited for first.
    pub(crate) wait: Wait,
}

/// What a line waits for before it is carried out.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Wait {
    /// The end of what is pending.
    Idle,
    /// Nothing.
    Nothing,
    /// A new acquisition, if the instrument runs free.
    Renewed,
}

impl Device {
    /// Carries out a line and returns the reply with its end; mistakes go to the error queue.
    pub(super) async fn converse(&self, manner: &Manner, line: &[u8]) -> Vec<u8> {
        let line = String::from_utf8_lossy(line);
        let line = line.trim();
        if line.is_empty() {
            return Vec::new();
        }
        let (query, answer) = match (manner.read)(line) {
            Ok(spoken) => (spoken.query, self.carry_out(manner, &spoken).await),
            Err(fault) => (line.contains('?'), Err(fault)),
        };
        let mut reply = match answer {
            Ok(answer) => answer,
            Err(fault) => {
                self.core.report(fault);
                let wrong = if query { manner.wrong } else { None };
                wrong.unwrap_or_default().as_bytes().to_vec()
            }
        };
        if !reply.is_empty() {
            reply.extend_from_slice(manner.ending);
        }
        reply
    }

    async fn carry_out(&self, manner: &Manner, spoken: &Spoken) -> Result<Vec<u8>, Fault> {
        match spoken.wait {
            Wait::Idle => self.core.idle().await,
            Wait::Renewed if self.instrument.renew()? => self.core.idle().await,
            Wait::Nothing | Wait::Renewed => {}
        }
        let mut reply = Reply::default();
        let args = Args::new(spoken.data.clone());
        let mut call = Call { index: 0, args, reply: &mut reply, units: manner.units, core: &self.core };
        let done = self.instrument.execute(&spoken.nodes, spoken.query, &mut call);
        done.or_else(|| self.system.execute(&spoken.nodes, spoken.query, &mut call))
            .unwrap_or(Err(Fault::UndefinedHeader))?;
        let answer = reply.into_bytes();
        Ok(if answer.is_empty() { answer } else { (manner.dress)(spoken, answer) })
    }
}

/// Reads parameters with `separator` between them.
///
/// # Errors
/// When one of them cannot be read.
pub(crate) fn parameters(text: &str, separator: char) -> Result<Vec<Data>, Fault> {
    // A list in parentheses holds commas of its own.
    let mut depth = 0_usize;
    let parts = text.split(|letter: char| {
        match letter {
            '(' => depth += 1,
            ')' => depth = depth.saturating_sub(1),
            _ => {}
        }
        letter == separator && depth == 0
    });
    parts.map(str::trim).filter(|part| !part.is_empty()).map(parameter).collect()
}

fn parameter(text: &str) -> Result<Data, Fault> {
    let mut cursor = Cursor::new(text.as_bytes());
    let data = cursor.data()?;
    cursor.skip_white();
    if cursor.peek().is_some() { Err(Fault::InvalidSeparator) } else { Ok(data) }
}
