//! Where a reply ends: lines and definite-length blocks in a stream of bytes.
//!
//! Three outcomes are kept apart: not all of it is there yet ([`Scan::NeedMore`], no error), one reply is there
//! ([`Scan::Frame`]), and this can never become a reply ([`Malformed`], after which the connection is of no use).
//! No byte is looked at twice, however finely the stream is cut, and nothing is set aside by a declared length.

use std::ops::Range;

/// Text lines up to 1 MiB: the longest that is expected is a record in text of some ten thousand samples.
pub const MOST_LINE_BYTES: usize = 1 << 20;

/// At most this many more bytes are ever hinted at, so that a caller who sets memory aside by the hint cannot be made
/// to set aside what a hostile length says: 64 KiB is about what one read of a socket gives.
pub const MOST_HINT: usize = 1 << 16;

/// A block's length has at most nine digits (488.2, 8.7.9: one digit says how many follow).
const MOST_DIGITS: u8 = 9;

/// What belongs here next.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Want {
    /// A line of text, ended by LF or CR LF.
    Line,
    /// A definite-length block, ended by LF or CR LF.
    Block {
        /// The most bytes that its data may have: what was asked for, and not what the instrument says.
        most_bytes: usize,
    },
}

/// How much is read before a peer counts as broken.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Limits {
    /// The most bytes of a line without its ending.
    pub most_line_bytes: usize,
    /// The most bytes of text before a block, for instruments that repeat the header there; 0 where none may be.
    pub most_lead_bytes: usize,
}

impl Default for Limits {
    fn default() -> Self {
        Self { most_line_bytes: MOST_LINE_BYTES, most_lead_bytes: 0 }
    }
}

/// What a look at the buffer gave.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Scan {
    /// The reply is not all there.
    NeedMore {
        /// At least so many more bytes are to come, from 1 to [`MOST_HINT`].
        at_least: usize,
    },
    /// One reply is there.
    Frame {
        /// The bytes of the line, or of the block's data.
        body: Range<usize>,
        /// How many bytes of the buffer it takes, with its ending.
        consumed: usize,
    },
}

/// This can never become a reply. Close the connection: what follows cannot be told from what was asked before.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
#[error("byte {offset} of the reply: {reason}")]
pub struct Malformed {
    /// Which byte of the buffer it was seen at.
    pub offset: usize,
    /// What is wrong.
    pub reason: Reason,
}

/// What makes a reply malformed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
pub enum Reason {
    /// A byte that is no digit stands in a block's length.
    #[error("0x{found:02X} stands where a digit of the block's length belongs")]
    BadDigit {
        /// The byte.
        found: u8,
    },
    /// The block says that it is longer than what was asked for.
    #[error("the block has {declared} bytes, but at most {most} were asked for")]
    BlockTooLong {
        /// What it says.
        declared: usize,
        /// What was asked for.
        most: usize,
    },
    /// A block without a length, whose end a raw socket cannot show.
    #[error("this is a block of indefinite length, whose end cannot be seen on a raw socket")]
    IndefiniteBlock,
    /// The line goes on and on.
    #[error("the line has more than {most} bytes")]
    LineTooLong {
        /// The limit.
        most: usize,
    },
    /// There is no block here.
    #[error("0x{found:02X} stands where a block should begin with `#`")]
    NotABlock {
        /// The byte.
        found: u8,
    },
    /// The block is not followed by the end of the line, so its length is wrong.
    #[error("0x{found:02X} follows the block where the line should end: the length it gave is wrong")]
    NotEnded {
        /// The byte.
        found: u8,
    },
}

/// How far a buffer was looked at. Keep one per connection; it goes back to the start with each frame.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct ScanState {
    at: usize,
    part: Part,
}

/// Which part of a reply the next byte belongs to.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
enum Part {
    /// Before an element's first byte: here a quote or a block may begin.
    #[default]
    Start,
    /// Inside an element that is neither quoted nor a block: a quote here is an apostrophe.
    Plain,
    /// Inside a quoted string.
    Quoted(u8),
    /// After `#`.
    Hash,
    /// Inside the length: how many digits are left, and what was read so far.
    Length(u8, usize),
    /// Inside the data, which end at this byte of the buffer.
    Data(usize),
    /// After the data of a wanted block: here the line must end. Where the data begin and end.
    End(usize, usize),
}

impl ScanState {
    /// At the start of a reply.
    #[must_use]
    pub fn new() -> Self {
        Self::default()
    }
}

/// Looks for the end of the reply that begins at the start of `buffer`.
///
/// Call it again with the same `progress` and the same buffer, grown at its end, after [`Scan::NeedMore`]; after
/// [`Scan::Frame`] take the consumed bytes off the buffer first.
///
/// # Errors
/// When no more bytes can make a reply of it.
pub fn scan(buffer: &[u8], progress: &mut ScanState, want: Want, limits: &Limits) -> Result<Scan, Malformed> {
    if progress.at > buffer.len() {
        // The buffer was cut by somebody; what was seen of it is worth nothing.
        *progress = ScanState::new();
    }
    let found = match want {
        Want::Line => line(buffer, progress, limits),
        Want::Block { most_bytes } => block(buffer, progress, most_bytes, limits),
    };
    if matches!(found, Ok(Scan::Frame { .. })) {
        *progress = ScanState::new();
    }
    found
}

fn line(buffer: &[u8], progress: &mut ScanState, limits: &Limits) -> Result<Scan, Malformed> {
    let most = limits.most_line_bytes;
    let too_long = |offset| Malformed { offset, reason: Reason::LineTooLong { most } };
    while let Some(&byte) = buffer.get(progress.at) {
        let at = progress.at;
        progress.part = match progress.part {
            Part::Data(end) => {
                // Data are passed over at once; the loop goes on behind them, or ends with what is there.
                progress.at = end.min(buffer.len());
                if progress.at == end {
                    progress.part = Part::Plain;
                }
                continue;
            }
            Part::Quoted(quote) => {
                // A doubled quote closes and opens again, which comes to the same.
                if byte == quote { Part::Start } else { Part::Quoted(quote) }
            }
            Part::Hash | Part::Length(..) => match length(progress.part, byte, at)? {
                Some(Part::Data(declared)) => {
                    let end = (at + 1).checked_add(declared).filter(|end| *end <= most).ok_or_else(|| too_long(at))?;
                    Part::Data(end)
                }
                Some(part) => part,
                // `#H1F` and the like: a number in another base, no block.
                None => Part::Plain,
            },
            Part::Start | Part::Plain | Part::End(..) => match byte {
                b'\n' => {
                    let end = if at > 0 && buffer[at - 1] == b'\r' { at - 1 } else { at };
                    return if end > most {
                        Err(too_long(most))
                    } else {
                        Ok(Scan::Frame { body: 0..end, consumed: at + 1 })
                    };
                }
                b',' | b';' => Part::Start,
                b' ' | b'\t' => progress.part,
                b'"' | b'\'' if progress.part == Part::Start => Part::Quoted(byte),
                b'#' if progress.part == Part::Start => Part::Hash,
                _ => Part::Plain,
            },
        };
        // One byte more than the limit may be the CR of the ending.
        if at > most {
            return Err(too_long(at));
        }
        progress.at = at + 1;
    }
    let at_least = match progress.part {
        Part::Data(end) => (end - progress.at).saturating_add(1),
        _ => 1,
    };
    Ok(Scan::NeedMore { at_least: at_least.min(MOST_HINT) })
}

fn block(buffer: &[u8], progress: &mut ScanState, most: usize, limits: &Limits) -> Result<Scan, Malformed> {
    while let Some(&byte) = buffer.get(progress.at) {
        let at = progress.at;
        progress.part = match progress.part {
            Part::Start | Part::Plain | Part::Quoted(_) => match byte {
                b'#' => Part::Hash,
                b'\n' => return Err(Malformed { offset: at, reason: Reason::NotABlock { found: byte } }),
                _ if at < limits.most_lead_bytes => Part::Plain,
                _ => return Err(Malformed { offset: at, reason: Reason::NotABlock { found: byte } }),
            },
            Part::Hash | Part::Length(..) => match length(progress.part, byte, at)? {
                Some(Part::Data(declared)) if declared > most => {
                    return Err(Malformed { offset: at, reason: Reason::BlockTooLong { declared, most } });
                }
                // Nine digits and a buffer's length: far from overflow where usize has 32 bits or more.
                Some(Part::Data(declared)) => Part::End(at + 1, (at + 1).saturating_add(declared)),
                Some(part) => part,
                None => return Err(Malformed { offset: at, reason: Reason::BadDigit { found: byte } }),
            },
            Part::Data(_) => Part::Start,
            Part::End(begin, end) => {
                let Some(&last) = buffer.get(end) else { break };
                let consumed = match (last, buffer.get(end + 1)) {
                    (b'\n', _) => end + 1,
                    (b'\r', Some(b'\n')) => end + 2,
                    (b'\r', None) => break,
                    (found, _) => return Err(Malformed { offset: end, reason: Reason::NotEnded { found } }),
                };
                return Ok(Scan::Frame { body: begin..end, consumed });
            }
        };
        progress.at = at + 1;
    }
    let at_least = match progress.part {
        Part::End(_, end) => end.saturating_add(1).saturating_sub(buffer.len()).max(1),
        _ => 1,
    };
    Ok(Scan::NeedMore { at_least: at_least.min(MOST_HINT) })
}

/// One byte of a block's head. `Part::Data` carries the declared length here, not the end. `None` when the byte after
/// `#` is no digit.
fn length(part: Part, byte: u8, offset: usize) -> Result<Option<Part>, Malformed> {
    let bad = Malformed { offset, reason: Reason::BadDigit { found: byte } };
    let digit = if byte.is_ascii_digit() { Some(byte - b'0') } else { None };
    Ok(match (part, digit) {
        (Part::Hash, Some(0)) => return Err(Malformed { offset, reason: Reason::IndefiniteBlock }),
        (Part::Hash, Some(digits)) if digits <= MOST_DIGITS => Some(Part::Length(digits, 0)),
        (Part::Length(left, so_far), Some(digit)) => {
            let value = so_far * 10 + usize::from(digit);
            Some(if left > 1 { Part::Length(left - 1, value) } else { Part::Data(value) })
        }
        (Part::Length(..), None) => return Err(bad),
        _ => None,
    })
}

#[cfg(test)]
mod tests;
