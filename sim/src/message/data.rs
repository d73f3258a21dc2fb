//! Program data elements (IEEE 488.2 7.7, from memory) and the cursor that reads them.

use crate::status::Fault;

/// One parameter as it was sent.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Data {
    /// Contents of a definite-length block (7.7.6). No command of these instruments takes one, so they are only skipped.
    Block,
    /// A word, in upper case (7.7.1).
    Character(String),
    /// What stood between parentheses (7.7.7).
    Expression(String),
    /// A decimal number with its unit, in upper case (7.7.2, 7.7.3).
    Number {
        /// The number without its unit's multiplier.
        value: f64,
        /// Unit with multiplier, e.g. `MV`.
        suffix: Option<String>,
    },
    /// A number written `#H…`, `#Q…` or `#B…` (7.7.4).
    Radix(u64),
    /// A quoted string (7.7.5). No command of these instruments takes one, so only its extent matters.
    Text,
}

/// Longest word and longest unit (IEEE 488.2 7.6.1.4.1 and 7.7.3.4).
pub(crate) const LONGEST_WORD: usize = 12;
/// Most digits of a number, leading zeros aside (IEEE 488.2 7.7.2.4.1).
const MOST_DIGITS: usize = 255;
/// Largest magnitude of an exponent (IEEE 488.2 7.7.2.4.1).
const LARGEST_EXPONENT: i64 = 32_000;

/// Reads a message from left to right.
#[derive(Debug, Clone)]
pub(crate) struct Cursor<'a> {
    bytes: &'a [u8],
}

impl<'a> Cursor<'a> {
    /// A cursor at the beginning of `bytes`.
    pub(crate) fn new(bytes: &'a [u8]) -> Self {
        Self { bytes }
    }

    /// The next byte.
    pub(crate) fn peek(&self) -> Option<u8> {
        self.bytes.first().copied()
    }

    /// Steps over the next byte.
    pub(crate) fn skip(&mut self) {
        self.bytes = self.bytes.get(1..).unwrap_or_default();
    }

    /// Steps over the next byte if it is `byte`.
    pub(crate) fn take(&mut self, byte: u8) -> bool {
        let found = self.peek() == Some(byte);
        if found {
            self.skip();
        }
        found
    }

    /// Steps over the longest run of bytes that `belongs` accepts and returns it.
    pub(crate) fn run(&mut self, belongs: impl Fn(u8) -> bool) -> &'a [u8] {
        let length = self.bytes.iter().position(|byte| !belongs(*byte)).unwrap_or(self.bytes.len());
        let (run, rest) = self.bytes.split_at(length);
        self.bytes = rest;
        run
    }

    /// Steps over white space (IEEE 488.2 7.4.1.2: every control character and the blank) and says whether there was any.
    pub(crate) fn skip_white(&mut self) -> bool {
        !self.run(|byte| byte <= b' ').is_empty()
    }

    /// Reads one parameter.
    pub(crate) fn data(&mut self) -> Result<Data, Fault> {
        match self.peek() {
            Some(byte) if byte.is_ascii_alphabetic() => {
                let word = self.run(is_word);
                if word.len() > LONGEST_WORD {
                    Err(Fault::CharacterDataTooLong)
                } else {
                    Ok(Data::Character(upper(word)))
                }
            }
            Some(b'0'..=b'9' | b'+' | b'-' | b'.') => self.number(),
            Some(quote @ (b'"' | b'\'')) => self.text(quote),
            Some(b'#') => self.hash(),
            Some(b'(') => self.expression(),
            None | Some(b',' | b';') => Err(Fault::Syntax),
            Some(_) => Err(Fault::InvalidCharacter),
        }
    }

    fn number(&mut self) -> Result<Data, Fault> {
        let mut text = String::new();
        if let Some(sign @ (b'+' | b'-')) = self.peek() {
            text.push(char::from(sign));
            self.skip();
        }
        let whole = self.run(|byte| byte.is_ascii_digit());
        let fraction = if self.take(b'.') { self.run(|byte| byte.is_ascii_digit()) } else { &[] };
        if whole.is_empty() && fraction.is_empty() {
            return Err(Fault::NumberCharacter);
        }
        let zeros = whole.iter().take_while(|digit| **digit == b'0').count();
        if whole.len() - zeros + fraction.len() > MOST_DIGITS {
            return Err(Fault::TooManyDigits);
        }
        // Zeros on both sides make every legal form (`.5`, `5.`) one that Rust reads.
        text.push('0');
        text.push_str(&upper(whole));
        text.push('.');
        text.push_str(&upper(fraction));
        text.push('0');
        if let Some(exponent) = self.exponent()? {
            text.push_str(&format!("e{exponent}"));
        }
        let suffix = self.suffix()?;
        let value = text.parse().map_err(|_| Fault::NumberCharacter)?;
        Ok(Data::Number { value, suffix })
    }

    /// An exponent, if one follows; `E` without digits behind it belongs to a unit.
    fn exponent(&mut self) -> Result<Option<i64>, Fault> {
        let mut ahead = self.clone();
        ahead.skip_white();
        if !ahead.take(b'E') && !ahead.take(b'e') {
            return Ok(None);
        }
        ahead.skip_white();
        let negative = ahead.peek() == Some(b'-');
        if matches!(ahead.peek(), Some(b'+' | b'-')) {
            ahead.skip();
        }
        let digits = ahead.run(|byte| byte.is_ascii_digit());
        if digits.is_empty() {
            return Ok(None);
        }
        *self = ahead;
        let magnitude =
            digits.iter().fold(0i64, |sum, digit| sum.saturating_mul(10).saturating_add(i64::from(digit - b'0')));
        if magnitude > LARGEST_EXPONENT {
            return Err(Fault::ExponentTooLarge);
        }
        Ok(Some(if negative { -magnitude } else { magnitude }))
    }

    fn suffix(&mut self) -> Result<Option<String>, Fault> {
        match self.peek() {
            None | Some(b',' | b';' | 0..=b' ') => {}
            Some(byte) if byte.is_ascii_alphabetic() => {}
            Some(_) => return Err(Fault::NumberCharacter),
        }
        let mut ahead = self.clone();
        ahead.skip_white();
        if !ahead.peek().is_some_and(|byte| byte.is_ascii_alphabetic()) {
            return Ok(None);
        }
        let suffix = ahead.run(|byte| byte.is_ascii_alphanumeric() || matches!(byte, b'/' | b'.' | b'-'));
        *self = ahead;
        if suffix.len() > LONGEST_WORD { Err(Fault::SuffixTooLong) } else { Ok(Some(upper(suffix))) }
    }

    fn text(&mut self, quote: u8) -> Result<Data, Fault> {
        self.skip();
        loop {
            self.run(|byte| byte != quote);
            if !self.take(quote) {
                return Err(Fault::InvalidString);
            }
            // A doubled quote stands for one quote inside the string.
            if !self.take(quote) {
                return Ok(Data::Text);
            }
        }
    }

    fn hash(&mut self) -> Result<Data, Fault> {
        self.skip();
        let kind = self.peek().ok_or(Fault::Syntax)?;
        self.skip();
        let radix = match kind.to_ascii_uppercase() {
            b'H' => 16,
            b'Q' => 8,
            b'B' => 2,
            b'1'..=b'9' => return self.block(usize::from(kind - b'0')),
            _ => return Err(Fault::InvalidBlock),
        };
        let digits = self.run(|byte| byte.is_ascii_alphanumeric());
        let text = std::str::from_utf8(digits).map_err(|_| Fault::NumberCharacter)?;
        u64::from_str_radix(text, radix).map(Data::Radix).map_err(|_| Fault::NumberCharacter)
    }

    fn block(&mut self, digits: usize) -> Result<Data, Fault> {
        let length = self.bytes.get(..digits).ok_or(Fault::InvalidBlock)?;
        let length = std::str::from_utf8(length).ok().filter(|text| text.bytes().all(|byte| byte.is_ascii_digit()));
        let length: usize = length.and_then(|text| text.parse().ok()).ok_or(Fault::InvalidBlock)?;
        self.bytes = self.bytes.get(digits.saturating_add(length)..).ok_or(Fault::InvalidBlock)?;
        Ok(Data::Block)
    }

    fn expression(&mut self) -> Result<Data, Fault> {
        self.skip();
        let inside = self.run(|byte| !matches!(byte, b')' | b'(' | b'"' | b'\'' | b';'));
        if self.take(b')') { Ok(Data::Expression(upper(inside))) } else { Err(Fault::InvalidExpression) }
    }
}

/// Whether a byte may stand inside a mnemonic or a word.
pub(crate) fn is_word(byte: u8) -> bool {
    byte.is_ascii_alphanumeric() || byte == b'_'
}

/// Upper-case text of bytes; what is not ASCII becomes U+FFFD and matches nothing.
pub(crate) fn upper(bytes: &[u8]) -> String {
    String::from_utf8_lossy(bytes).to_ascii_uppercase()
}
