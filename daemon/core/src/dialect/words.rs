//! Maps between the daemon's words and an instrument's, such as `positive` and `POSitive`.

use super::{DialectError, Value};
use crate::scpi::value;

/// The key that stands for every whole number from 1 without a key of its own: the others are no suffixes.
const ANY: &str = "*";
/// Where the number goes in the word of [`ANY`].
const HOLE: &str = "{}";

/// One map.
///
/// An instrument's word is written as the standard's manuals write it, capitals for the short form; either form in
/// any case is understood when it comes back (SCPI-99 volume 1, 6.2.1).
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Words {
    name: String,
    entries: Vec<(String, String)>,
}

impl Words {
    pub(super) fn new(name: String, entries: Vec<(String, String)>) -> Self {
        Self { name, entries }
    }

    /// Which of these keys it lacks.
    pub(super) fn lacks<'k>(&self, keys: &[&'k str]) -> Vec<&'k str> {
        keys.iter().copied().filter(|key| self.of(key).is_none()).collect()
    }

    /// Whether it has a word for every whole number from 1.
    pub(super) fn takes_any(&self) -> bool {
        self.of(ANY).is_some()
    }

    /// Why a word may not stand in a map; `None` if it may.
    pub(super) fn refuse(key: &str, word: &str) -> Option<&'static str> {
        let printable = word.bytes().all(|byte| matches!(byte, b' '..=b'~'));
        if word.trim().is_empty() || !printable {
            return Some("a word must be printable ASCII and not empty");
        }
        if word.contains([';', '?', '\n']) {
            return Some("a word must not hold `;` or `?`: it is one word of a command");
        }
        let plain = word.replace(HOLE, "");
        if plain.contains(['{', '}']) || (key != ANY && word.contains(HOLE)) || word.matches(HOLE).count() > 1 {
            return Some("`{}` may stand once, in the word of the key `*`, for the number");
        }
        None
    }

    /// The instrument's word for a value.
    pub(super) fn write(&self, value: &Value) -> Result<String, DialectError> {
        let key = match value {
            Value::Flag(flag) => flag.to_string(),
            Value::Keyword(word) | Value::Text(word) => word.clone(),
            Value::Whole(whole) => whole.to_string(),
            Value::Number(number) => number.to_string(),
            Value::List(_) => return Err(self.missing(value.kind())),
        };
        let any = || matches!(value, Value::Whole(1..)).then(|| self.of(ANY)).flatten();
        // `*` itself is no value that somebody could ask for.
        let word = if key == ANY { None } else { self.of(&key).or_else(any) };
        word.map(|word| word.replace(HOLE, &key)).ok_or_else(|| self.missing(&key))
    }

    /// The value's key for an instrument's word; for `*`, the number in it.
    pub(super) fn read(&self, reply: &str) -> Result<String, DialectError> {
        let reply = value::loose_text(reply);
        let exact = self.entries.iter().filter(|(key, _)| key != ANY).find(|(_, word)| same(word, &reply));
        if let Some((key, _)) = exact {
            return Ok(key.clone());
        }
        self.of(ANY)
            .and_then(|word| number_in(word, &reply))
            .map(|number| number.to_string())
            .ok_or_else(|| self.missing(&value::shorten(&reply)))
    }

    fn of(&self, key: &str) -> Option<&str> {
        self.entries.iter().find(|(known, _)| known == key).map(|(_, word)| word.as_str())
    }

    fn missing(&self, value: &str) -> DialectError {
        DialectError::NoWord { words: self.name.clone(), value: value.to_owned() }
    }
}

/// The capitals, digits and signs of a word: its short form.
fn short(word: &str) -> String {
    word.chars().filter(|c| !c.is_ascii_lowercase()).collect()
}

/// Whether what came back is this word, in its long or its short form.
pub(super) fn same(word: &str, reply: &str) -> bool {
    if word.eq_ignore_ascii_case(reply) {
        return true;
    }
    let short = short(word);
    if !short.is_empty() && short.eq_ignore_ascii_case(reply) {
        return true;
    }
    // `1` and `+1.0E0` are the same word where words are numbers.
    matches!((value::number(word), value::number(reply)), (Ok(a), Ok(b)) if a.to_bits() == b.to_bits())
}

/// The number where the pattern has its hole; 1 where the instrument leaves it out (SCPI-99 volume 1, 6.2.5.2).
fn number_in(pattern: &str, reply: &str) -> Option<u32> {
    let (before, after) = pattern.split_once(HOLE)?;
    [(before.to_owned(), after.to_owned()), (short(before), short(after))].iter().find_map(|(before, after)| {
        let tail = reply
            .get(..before.len())
            .filter(|head| head.eq_ignore_ascii_case(before))
            .map(|_| &reply[before.len()..])?;
        let cut = tail.len().checked_sub(after.len())?;
        let digits = tail.get(cut..).filter(|end| end.eq_ignore_ascii_case(after)).and_then(|_| tail.get(..cut))?;
        if digits.is_empty() {
            return (!before.is_empty()).then_some(1);
        }
        digits.bytes().all(|byte| byte.is_ascii_digit()).then(|| digits.parse().ok()).flatten()
    })
}
