//! How a reply is sent when a fault strikes it. Pure: the pieces are carried out by the connection.

#[cfg(test)]
mod tests;

use std::ops::Range;
use std::time::Duration;

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use super::Struck;
use crate::scenario::{FaultSpec, What};

/// Connections refused when nothing else is said.
pub(crate) const USUAL_REFUSALS: u32 = 3;
/// Bytes of garbage when nothing else is said.
const USUAL_GARBAGE: usize = 16;
/// Bytes that a block declares too many when nothing else is said.
const USUAL_EXCESS: usize = 1000;
/// What stands between a reply and its end.
const JUNK: &[u8] = b" ~+?9,x";

/// One step of sending a reply.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) enum Piece {
    /// These bytes leave.
    Bytes(Vec<u8>),
    /// The connection is closed.
    Close,
    /// These bytes leave before the next reply; beyond the connection's end if so said.
    Keep {
        /// The reply.
        bytes: Vec<u8>,
        /// Whether it outlives the connection.
        across: bool,
    },
    /// The error queue runs over.
    Overflow,
    /// Nothing leaves for so long.
    Pause(Duration),
    /// The instrument is switched off and on.
    Reboot,
    /// The instrument carries this message out, which came from somebody else.
    Run(Vec<u8>),
}

/// The pieces of a reply that faults have struck.
pub(crate) fn pieces(struck: &[Struck], reply: Vec<u8>) -> Vec<Piece> {
    let mut pieces = match struck.iter().find(|strike| strike.spec.what.of_wire()) {
        Some(strike) => sent(strike, reply),
        None => vec![Piece::Bytes(reply)],
    };
    // What befalls the instrument comes behind the reply, so that it stands between this message and the next.
    for strike in struck {
        match strike.spec.what {
            What::Meddle => {
                pieces.push(Piece::Run(strike.spec.send.clone().unwrap_or_default().into_bytes()));
            }
            What::Overflow => pieces.push(Piece::Overflow),
            _ => {}
        }
    }
    pieces
}

fn sent(strike: &Struck, mut reply: Vec<u8>) -> Vec<Piece> {
    let spec = &strike.spec;
    let pause = Piece::Pause(Duration::from_secs_f64(spec.seconds.unwrap_or(0.0)));
    let end = reply.len() - ending(&reply);
    match spec.what {
        What::Cut => {
            reply.truncate(spec.bytes.or(strike.offset).unwrap_or(reply.len() / 2));
            vec![Piece::Bytes(reply), Piece::Close]
        }
        What::Drip => {
            let parts = reply.chunks(spec.bytes.unwrap_or(1).max(1));
            parts.flat_map(|part| [Piece::Bytes(part.to_vec()), pause.clone()]).collect()
        }
        What::Garbage => {
            let mut rng = ChaCha8Rng::seed_from_u64(strike.seed);
            let mut bytes: Vec<u8> = (0..spec.bytes.unwrap_or(USUAL_GARBAGE)).map(|_| rng.random()).collect();
            bytes.append(&mut reply);
            vec![Piece::Bytes(bytes)]
        }
        What::Junk => {
            reply.splice(end..end, JUNK.iter().copied());
            vec![Piece::Bytes(reply)]
        }
        What::Late => vec![Piece::Keep { bytes: reply, across: spec.across }],
        What::LengthAbsurd | What::LengthLong | What::LengthShort | What::Truncate => {
            vec![Piece::Bytes(wrong_length(spec, reply))]
        }
        What::Mute => Vec::new(),
        What::Reboot => vec![Piece::Reboot],
        What::Refuse => vec![Piece::Close],
        What::Stall => {
            let rest = reply.split_off(spec.bytes.or(strike.offset).unwrap_or(0).min(reply.len()));
            vec![Piece::Bytes(reply), pause, Piece::Bytes(rest)]
        }
        What::Twice => vec![Piece::Bytes(reply.clone()), Piece::Bytes(reply)],
        // These do not befall the wire.
        What::Clamp
        | What::Clipped
        | What::Flat
        | What::Meddle
        | What::NoTrigger
        | What::Overflow
        | What::StuckBit
        | What::Swapped => vec![Piece::Bytes(reply)],
    }
}

fn wrong_length(spec: &FaultSpec, mut reply: Vec<u8>) -> Vec<u8> {
    let Some(Block { head, contents }) = block(&reply) else { return reply };
    let length = contents.len();
    let half = length.div_ceil(2);
    let declared = match spec.what {
        What::LengthLong => length + spec.bytes.unwrap_or(USUAL_EXCESS),
        What::LengthShort => length - spec.bytes.unwrap_or(half).min(length),
        What::Truncate => {
            let lost = spec.bytes.unwrap_or(half).min(length);
            reply.drain(contents.end - lost..contents.end);
            return reply;
        }
        // Nine digits follow, of which the first is taken for one too many: the largest block that can be declared.
        _ => {
            reply.splice(head.start..contents.start, b"#9999999999".iter().copied());
            return reply;
        }
    };
    let digits = declared.to_string();
    reply.splice(head.start..contents.start, format!("#{}{digits}", digits.len()).into_bytes());
    reply
}

/// Where a block lies in a reply.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct Block {
    /// `#`, the number of digits, the length.
    pub(crate) head: Range<usize>,
    /// The bytes.
    pub(crate) contents: Range<usize>,
}

/// The first definite-length block of a reply (IEEE 488.2 8.7.9, from memory).
pub(crate) fn block(reply: &[u8]) -> Option<Block> {
    let start = reply.iter().position(|byte| *byte == b'#')?;
    let digits = usize::from(reply.get(start + 1)?.checked_sub(b'0').filter(|digits| (1..=9).contains(digits))?);
    let first = start + 2 + digits;
    let length: usize = std::str::from_utf8(reply.get(start + 2..first)?).ok()?.parse().ok()?;
    let contents = first..first.checked_add(length)?;
    reply.get(contents.clone())?;
    Some(Block { head: start..first, contents })
}

/// The bytes of a reply's end.
fn ending(reply: &[u8]) -> usize {
    if reply.ends_with(b"\r\n") { 2 } else { usize::from(reply.ends_with(b"\n")) }
}
