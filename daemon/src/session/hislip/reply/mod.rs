//! A whole HiSLIP reply to a message: as on a raw socket, but that its end is known.
//!
//! So a line or a block needs no LF at its end, and a block may be of indefinite length (`#0`, 488.2, 8.7.10, from
//! memory): it ends with the reply.

use evenpair_core::dialect::Message;
use evenpair_core::scpi::frame::{Limits, Reason, Scan, ScanState, Want, scan};

use super::super::codec::CodecError;
use super::super::error::shown;

/// `#`, a digit, nine digits of a length.
const MOST_BLOCK_HEAD: usize = 11;
/// CR LF.
const ENDING: usize = 2;

/// The most bytes that a reply of this kind can have.
pub(super) fn most_bytes(want: Want, limits: &Limits) -> usize {
    match want {
        Want::Line => limits.most_line_bytes.saturating_add(ENDING),
        Want::Block { most_bytes } => {
            most_bytes.saturating_add(limits.most_lead_bytes).saturating_add(MOST_BLOCK_HEAD + ENDING)
        }
    }
}

/// Reads a whole reply.
///
/// # Errors
/// When it is malformed, cut short, or more than one.
pub(super) fn read(mut bytes: Vec<u8>, want: Want, limits: &Limits) -> Result<Message, CodecError> {
    let came = bytes.len();
    let mut progress = ScanState::new();
    let mut found = scan(&bytes, &mut progress, want, limits);
    if matches!(found, Ok(Scan::NeedMore { .. })) {
        // The end of the reply ends the line.
        bytes.push(b'\n');
        found = scan(&bytes, &mut progress, want, limits);
    }
    match (found, want) {
        (Ok(Scan::NeedMore { .. }), _) => Err(CodecError::Cut { bytes: came }),
        (Ok(Scan::Frame { consumed, .. }), _) if consumed < bytes.len() => {
            Err(CodecError::Unsolicited { shown: shown(bytes.get(consumed..).unwrap_or_default()) })
        }
        (Ok(Scan::Frame { body, .. }), Want::Line) => Ok(Message::line(bytes.get(body).unwrap_or_default())),
        (Ok(Scan::Frame { body, .. }), Want::Block { .. }) => {
            bytes.truncate(body.end);
            bytes.drain(..body.start.min(body.end));
            Ok(Message::Block(bytes))
        }
        (Err(malformed), Want::Block { most_bytes }) if malformed.reason == Reason::IndefiniteBlock => {
            bytes.drain(..=malformed.offset.min(bytes.len().saturating_sub(1)));
            // One LF stands before the end of the reply; any other belongs to the data.
            if bytes.last() == Some(&b'\n') {
                bytes.pop();
            }
            match bytes.len() {
                declared if declared > most_bytes => {
                    let reason = Reason::BlockTooLong { declared, most: most_bytes };
                    Err(CodecError::Malformed(evenpair_core::scpi::frame::Malformed { reason, ..malformed }))
                }
                _ => Ok(Message::Block(bytes)),
            }
        }
        (Err(malformed), _) => Err(malformed.into()),
    }
}

#[cfg(test)]
mod tests;
