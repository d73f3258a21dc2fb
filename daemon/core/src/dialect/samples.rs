//! Samples out of the bytes or the text that an instrument sends.

use super::{DialectError, Message};
use crate::analysis::record::Samples;
use crate::scpi::value::{self, ValueError};

/// How one sample is sent.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Format {
    /// 8 bits with a sign.
    I8,
    /// 8 bits without a sign.
    U8,
    /// 16 bits with a sign.
    I16,
    /// 16 bits without a sign.
    U16,
    /// IEEE 754 binary32.
    F32,
    /// Decimal numbers with commas between.
    Text,
}

/// Which byte of a sample comes first.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Order {
    /// The most significant.
    Big,
    /// The least significant.
    Little,
}

/// The longest decimal form of a number with its comma: `-1.7976931348623157E+308,` and a few blanks.
const LONGEST_NUMBER: usize = 32;

/// By how much 16-bit codes without a sign are shifted to fit into codes with one.
pub(super) const SHIFT: i32 = 32_768;

impl Format {
    /// Every format with its name in a dialect.
    pub(super) const NAMES: [(&'static str, Self); 6] = [
        ("i8", Self::I8),
        ("u8", Self::U8),
        ("i16", Self::I16),
        ("u16", Self::U16),
        ("f32", Self::F32),
        ("text", Self::Text),
    ];

    /// The bytes of one sample, at most.
    pub(super) fn bytes(self) -> usize {
        match self {
            Self::I8 | Self::U8 => 1,
            Self::I16 | Self::U16 => 2,
            Self::F32 => 4,
            Self::Text => LONGEST_NUMBER,
        }
    }

    /// Reads the reply to `command`; numbers in text may have `units`. Codes of [`Format::U16`] come out lower by [`SHIFT`].
    pub(super) fn decode(
        self,
        order: Order,
        data: &Message,
        command: &str,
        units: bool,
    ) -> Result<Samples, DialectError> {
        let wrong = |wanted, found| DialectError::WrongMessage { command: command.to_owned(), wanted, found };
        match (self, data) {
            (Self::Text, Message::Line(text)) => numbers(text, units),
            (Self::Text, Message::Block(bytes)) => numbers(&String::from_utf8_lossy(bytes), units),
            (_, Message::Line(_)) => Err(wrong("a block", "a line of text")),
            (Self::I8, Message::Block(bytes)) => {
                Ok(Samples::Codes(bytes.iter().map(|&byte| i16::from(byte.cast_signed())).collect()))
            }
            (Self::U8, Message::Block(bytes)) => {
                Ok(Samples::Codes(bytes.iter().map(|&byte| i16::from(byte)).collect()))
            }
            (Self::I16, Message::Block(bytes)) => {
                let read = if order == Order::Big { i16::from_be_bytes } else { i16::from_le_bytes };
                Ok(Samples::Codes(parts(bytes)?.iter().map(|pair| read(*pair)).collect()))
            }
            (Self::U16, Message::Block(bytes)) => {
                let read = if order == Order::Big { u16::from_be_bytes } else { u16::from_le_bytes };
                // Turning the top bit takes 32768 off.
                Ok(Samples::Codes(parts(bytes)?.iter().map(|pair| (read(*pair) ^ 0x8000).cast_signed()).collect()))
            }
            (Self::F32, Message::Block(bytes)) => {
                let read = if order == Order::Big { f32::from_be_bytes } else { f32::from_le_bytes };
                let samples: Vec<f32> = parts(bytes)?.iter().map(|four| read(*four)).collect();
                match samples.iter().position(|sample| !sample.is_finite()) {
                    Some(index) => {
                        Err(DialectError::Sample { index, source: ValueError::NotANumber(samples[index].to_string()) })
                    }
                    None => Ok(Samples::Numbers(samples)),
                }
            }
        }
    }
}

fn parts<const N: usize>(bytes: &[u8]) -> Result<&[[u8; N]], DialectError> {
    let (parts, rest) = bytes.as_chunks::<N>();
    if rest.is_empty() { Ok(parts) } else { Err(DialectError::Ragged { bytes: bytes.len(), each: N }) }
}

fn numbers(text: &str, units: bool) -> Result<Samples, DialectError> {
    let read = if units { value::number_with_unit } else { value::number };
    let text = text.trim();
    if text.is_empty() {
        return Ok(Samples::Numbers(Vec::new()));
    }
    let one = |(index, part)| {
        // Single precision holds seven digits: more than any converter has.
        let sample = read(part).map_err(|source| DialectError::Sample { index, source })? as f32;
        let overflow = || ValueError::NotANumber(value::shorten(part));
        if sample.is_finite() { Ok(sample) } else { Err(DialectError::Sample { index, source: overflow() }) }
    };
    text.split(',').enumerate().map(one).collect::<Result<_, _>>().map(Samples::Numbers)
}
