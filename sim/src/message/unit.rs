//! A program message as a series of units (IEEE 488.2 7.3, from memory).

use super::data::{Cursor, LONGEST_WORD, is_word, upper};
use super::{Data, Header, Mnemonic};
use crate::status::Fault;

/// A header with its parameters.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Unit {
    /// What is meant.
    pub(crate) header: Header,
    /// Whether a question mark followed.
    pub(crate) query: bool,
    /// The parameters.
    pub(crate) data: Vec<Data>,
}

/// The units of one message, read as they are carried out: what stands before a mistake has its effect. After a mistake
/// there is nothing more.
#[derive(Debug)]
pub(crate) struct Units<'a> {
    cursor: Option<Cursor<'a>>,
}

impl<'a> Units<'a> {
    /// The units of a message without its NL. A blank message has none.
    pub(crate) fn new(message: &'a [u8]) -> Self {
        let mut cursor = Cursor::new(message);
        cursor.skip_white();
        Self { cursor: cursor.peek().map(|_| cursor) }
    }
}

impl Iterator for Units<'_> {
    type Item = Result<Unit, Fault>;

    fn next(&mut self) -> Option<Self::Item> {
        let mut cursor = self.cursor.take()?;
        let unit = read(&mut cursor);
        // `read` stops at the end or at a semicolon; behind that another unit must stand.
        if unit.is_ok() && cursor.take(b';') {
            self.cursor = Some(cursor);
        }
        Some(unit)
    }
}

fn read(cursor: &mut Cursor<'_>) -> Result<Unit, Fault> {
    cursor.skip_white();
    let header = header(cursor)?;
    let query = cursor.take(b'?');
    let white = cursor.skip_white();
    let mut data = Vec::new();
    if !matches!(cursor.peek(), None | Some(b';')) {
        if !white {
            return Err(Fault::HeaderSeparator);
        }
        loop {
            data.push(cursor.data()?);
            cursor.skip_white();
            match cursor.peek() {
                None | Some(b';') => break,
                Some(b',') => cursor.skip(),
                Some(_) => return Err(Fault::InvalidSeparator),
            }
            cursor.skip_white();
        }
    }
    Ok(Unit { header, query, data })
}

fn header(cursor: &mut Cursor<'_>) -> Result<Header, Fault> {
    if cursor.take(b'*') {
        return Ok(Header::Common(mnemonic(cursor)?));
    }
    let from_root = cursor.take(b':');
    let mut nodes = Vec::new();
    loop {
        nodes.push(Mnemonic::new(&mnemonic(cursor)?));
        if !cursor.take(b':') {
            return Ok(Header::Tree { from_root, nodes });
        }
    }
}

fn mnemonic(cursor: &mut Cursor<'_>) -> Result<String, Fault> {
    match cursor.peek() {
        Some(byte) if byte.is_ascii_alphabetic() => {}
        None | Some(b';' | b':' | b'?' | b',' | 0..=b' ') => return Err(Fault::Syntax),
        Some(_) => return Err(Fault::InvalidCharacter),
    }
    let word = cursor.run(is_word);
    if word.len() > LONGEST_WORD { Err(Fault::MnemonicTooLong) } else { Ok(upper(word)) }
}

#[cfg(test)]
mod tests;
