//! Typed arguments written as program data (IEEE Std 488.2-1992, 7.7): nothing that ends, joins or nests a message can
//! come out of here outside quotes, whatever goes in.

/// Why a value cannot be written.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum WriteError {
    /// A character that has no place in a message.
    #[error("it holds {0:?}; only printable ASCII characters can be sent")]
    BadCharacter(char),
    /// A channel number below 1.
    #[error("{0} is no channel; channels count from 1")]
    BadChannel(i64),
    /// An empty list.
    #[error("the list of channels is empty")]
    NoChannels,
    /// No word.
    #[error("`{0}` is not a word of letters, digits and `_` that begins with a letter")]
    NotAWord(String),
    /// Infinite or not a number.
    #[error("{0} is not a finite number")]
    NotFinite(String),
}

/// A number as NR3 with the fewest digits that give the same double back (7.7.2).
///
/// # Errors
/// When it is not finite.
pub fn number(value: f64) -> Result<String, WriteError> {
    // Adding 0 turns −0, which some instruments do not know, into 0.
    if value.is_finite() { Ok(format!("{:E}", value + 0.0)) } else { Err(WriteError::NotFinite(value.to_string())) }
}

/// A fraction as a percentage, rounded to 15 digits so that 0.07 becomes 7 and not 7.000000000000001.
///
/// # Errors
/// When it is not finite.
pub fn percent(fraction: f64) -> Result<String, WriteError> {
    let rounded = format!("{:.14e}", fraction * 100.0);
    number(rounded.parse().unwrap_or(f64::NAN))
}

/// A whole number as NR1.
#[must_use]
pub fn whole(value: i64) -> String {
    value.to_string()
}

/// A flag as `1` or `0` (SCPI-99 volume 1, 7.3).
#[must_use]
pub fn boolean(value: bool) -> String {
    if value { "1".to_owned() } else { "0".to_owned() }
}

/// A word (character program data, 7.7.1).
///
/// # Errors
/// When it is none.
pub fn keyword(word: &str) -> Result<String, WriteError> {
    super::value::keyword(word)
        .ok()
        .filter(|trimmed| *trimmed == word)
        .map(str::to_owned)
        .ok_or_else(|| WriteError::NotAWord(super::value::shorten(word)))
}

/// A text in double quotes, quotes inside doubled (7.7.5). A line end would end the message on a raw socket even
/// inside quotes, so control characters are refused; what is not ASCII too (the standard's text is 7-bit).
///
/// # Errors
/// When a character has no place in a message.
pub fn quoted(text: &str) -> Result<String, WriteError> {
    printable(text)?;
    Ok(format!("\"{}\"", text.replace('"', "\"\"")))
}

/// Whether every character is printable ASCII, so that the text is one line of a message and no more.
///
/// # Errors
/// With the first character that is not.
pub fn printable(text: &str) -> Result<(), WriteError> {
    match text.chars().find(|c| !matches!(c, ' '..='~')) {
        Some(bad) => Err(WriteError::BadCharacter(bad)),
        None => Ok(()),
    }
}

/// A channel list such as `(@101,102)` (SCPI-99 volume 1, 8.3.2).
///
/// # Errors
/// When it is empty or a number is below 1.
pub fn channels(list: &[i64]) -> Result<String, WriteError> {
    if list.is_empty() {
        return Err(WriteError::NoChannels);
    }
    if let Some(bad) = list.iter().find(|channel| **channel < 1) {
        return Err(WriteError::BadChannel(*bad));
    }
    let numbers: Vec<String> = list.iter().map(i64::to_string).collect();
    Ok(format!("(@{})", numbers.join(",")))
}

#[cfg(test)]
mod tests;
