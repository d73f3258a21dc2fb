//! Values as instruments send them: numbers, flags, words, quoted strings, comma lists.
//!
//! After the response data of IEEE Std 488.2-1992, 8.7, but as lenient as the forms are unambiguous: instruments send
//! `1`, `+1.0E+00` and `1.` for the same thing.

/// Why a text is not the value that it should be. The text is shortened.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum ValueError {
    /// A quote is missing, or something stands behind the last one.
    #[error("`{0}` is not a text in quotes")]
    BadQuotes(String),
    /// Neither 0 nor 1, ON nor OFF.
    #[error("`{0}` is neither 0 nor 1, ON nor OFF")]
    NotAFlag(String),
    /// No number.
    #[error("`{0}` is not a number")]
    NotANumber(String),
    /// No word.
    #[error("`{0}` is not a word of letters, digits and `_` that begins with a letter")]
    NotAWord(String),
    /// The number has a fraction or is too large.
    #[error("`{0}` is not a whole number")]
    NotWhole(String),
    /// The number by which SCPI says that there is no number (SCPI-99 volume 1, 7.2.1).
    #[error("the instrument sent {0}, which means that it has no value: overrange, or not measured")]
    NoValue(&'static str),
    /// The unit behind the number is not one that is known.
    #[error("`{0}` is not a unit that is understood")]
    UnknownUnit(String),
}

/// SCPI-99 volume 1, 7.2.1.4 and 7.2.1.5 (from memory): 9.9E37 stands for infinity, 9.91E37 for not a number.
const INFINITY: f64 = 9.9e37;
const NOT_A_NUMBER: f64 = 9.91e37;

/// Units and by what they may be multiplied (488.2, 7.7.3; SCPI-99 volume 1, 7.1): `M` is milli except before `HZ` and
/// `OHM`, where it is mega.
const UNITS: [&str; 9] = ["V", "A", "S", "HZ", "OHM", "W", "PCT", "SA/S", "DB"];
const MULTIPLIERS: [(&str, f64); 10] = [
    ("", 1.0),
    ("T", 1e12),
    ("G", 1e9),
    ("MA", 1e6),
    ("K", 1e3),
    ("M", 1e-3),
    ("U", 1e-6),
    ("N", 1e-9),
    ("P", 1e-12),
    ("F", 1e-15),
];

/// A number in any of the decimal forms NR1, NR2 and NR3.
///
/// # Errors
/// When it is none, or one of the numbers that say that there is no value.
pub fn number(text: &str) -> Result<f64, ValueError> {
    let trimmed = text.trim();
    let decimal = trimmed.bytes().all(|byte| byte.is_ascii_digit() || b"+-.eE".contains(&byte));
    let value = decimal
        .then(|| trimmed.parse::<f64>().ok())
        .flatten()
        .filter(|value| value.is_finite())
        .ok_or_else(|| ValueError::NotANumber(shorten(text)))?;
    let is = |special: f64| (value.abs() - special).abs() < special * 1e-6;
    if is(NOT_A_NUMBER) {
        return Err(ValueError::NoValue("9.91E37"));
    }
    if is(INFINITY) {
        return Err(ValueError::NoValue("9.9E37"));
    }
    Ok(value)
}

/// A number that a unit may follow, such as `5.00E-3 V`, `20 NS` or `1 MHZ`; the result is in the unit itself.
///
/// # Errors
/// As [`number`], and when the unit is not known.
pub fn number_with_unit(text: &str) -> Result<f64, ValueError> {
    let trimmed = text.trim();
    // The longest head that is a number, so that the E of an exponent is not taken for a unit.
    let ends = (1..=trimmed.len()).rev().filter(|&end| trimmed.is_char_boundary(end));
    let found = ends.map(|end| trimmed.split_at(end)).find_map(|(head, tail)| match number(head) {
        Ok(value) => Some(Ok((value, tail))),
        Err(ValueError::NoValue(which)) => Some(Err(ValueError::NoValue(which))),
        Err(_) => None,
    });
    let (value, tail) = found.unwrap_or_else(|| Err(ValueError::NotANumber(shorten(text))))?;
    let unit = tail.trim().to_ascii_uppercase();
    if unit.is_empty() {
        return Ok(value);
    }
    UNITS
        .iter()
        .filter_map(|known| unit.strip_suffix(known).map(|multiplier| (*known, multiplier)))
        .find_map(|(known, multiplier)| match (known, multiplier) {
            ("HZ" | "OHM", "M") => Some(1e6),
            _ => MULTIPLIERS.iter().find(|(name, _)| *name == multiplier).map(|(_, factor)| *factor),
        })
        .map(|factor| if factor < 1.0 { value / (1.0 / factor).round() } else { value * factor })
        .ok_or_else(|| ValueError::UnknownUnit(shorten(tail.trim())))
}

/// A whole number: NR1, a NR2 or NR3 without a fraction, or `#H`, `#Q`, `#B` (488.2, 8.7.5 to 8.7.7).
///
/// # Errors
/// When it is none, or does not fit.
pub fn whole(text: &str) -> Result<i64, ValueError> {
    let trimmed = text.trim();
    let not_whole = || ValueError::NotWhole(shorten(text));
    if let Some(rest) = trimmed.strip_prefix('#') {
        let radix = match rest.bytes().next().map(|byte| byte.to_ascii_uppercase()) {
            Some(b'H') => 16,
            Some(b'Q') => 8,
            Some(b'B') => 2,
            _ => return Err(not_whole()),
        };
        let digits = &rest[1..];
        // A sign would be understood by the conversion, but has no place here.
        return digits
            .starts_with(|first: char| first.is_ascii_alphanumeric())
            .then(|| i64::from_str_radix(digits, radix).ok())
            .flatten()
            .ok_or_else(not_whole);
    }
    if let Ok(whole) = trimmed.parse::<i64>() {
        return Ok(whole);
    }
    let value = number(trimmed)?;
    // 2^53: beyond it a double no longer holds every whole number.
    if value.trunc().to_bits() == value.to_bits() && value.abs() <= 9_007_199_254_740_992.0 {
        Ok(value as i64)
    } else {
        Err(not_whole())
    }
}

/// A flag: `0`, `1`, `ON`, `OFF` (SCPI-99 volume 1, 7.3).
///
/// # Errors
/// When it is neither.
pub fn boolean(text: &str) -> Result<bool, ValueError> {
    let trimmed = text.trim();
    if trimmed.eq_ignore_ascii_case("ON") {
        return Ok(true);
    }
    if trimmed.eq_ignore_ascii_case("OFF") {
        return Ok(false);
    }
    match whole(trimmed) {
        Ok(0) => Ok(false),
        Ok(1) => Ok(true),
        _ => Err(ValueError::NotAFlag(shorten(text))),
    }
}

/// A word, as it was sent (character response data, 488.2, 8.7.1).
///
/// # Errors
/// When it is none.
pub fn keyword(text: &str) -> Result<&str, ValueError> {
    let trimmed = text.trim();
    let rest = |byte: u8| byte.is_ascii_alphanumeric() || byte == b'_';
    let good = trimmed.bytes().next().is_some_and(|first| first.is_ascii_alphabetic()) && trimmed.bytes().all(rest);
    if good { Ok(trimmed) } else { Err(ValueError::NotAWord(shorten(text))) }
}

/// A text in double or single quotes; a doubled quote inside stands for one (488.2, 7.7.5 and 8.7.8).
///
/// # Errors
/// When a quote is missing or something stands behind the last.
pub fn quoted(text: &str) -> Result<String, ValueError> {
    let bad = || ValueError::BadQuotes(shorten(text));
    let trimmed = text.trim();
    let quote = trimmed.chars().next().filter(|first| matches!(first, '"' | '\'')).ok_or_else(bad)?;
    let inner = trimmed[1..].strip_suffix(quote).ok_or_else(bad)?;
    let mut plain = String::with_capacity(inner.len());
    let mut chars = inner.chars();
    while let Some(next) = chars.next() {
        // A quote inside must have its twin behind it.
        if next == quote && chars.next() != Some(quote) {
            return Err(bad());
        }
        plain.push(next);
    }
    Ok(plain)
}

/// A text in quotes without them, or any other text as it is: instruments differ.
#[must_use]
pub fn loose_text(text: &str) -> String {
    quoted(text).unwrap_or_else(|_| text.trim().to_owned())
}

/// The parts of a comma list; commas inside quotes or parentheses do not part it. An empty text has no parts.
///
/// # Errors
/// When a quote is not closed.
pub fn list(text: &str) -> Result<Vec<&str>, ValueError> {
    let text = text.trim();
    if text.is_empty() {
        return Ok(Vec::new());
    }
    let (mut parts, mut begin, mut depth) = (Vec::new(), 0, 0_u32);
    // Only a quote at the start of a part opens a quoted string; elsewhere it is an apostrophe.
    let (mut open, mut fresh) = (None, true);
    for (at, byte) in text.bytes().enumerate() {
        if let Some(quote) = open {
            if byte == quote {
                // A doubled quote opens again at once.
                open = None;
                fresh = true;
            }
            continue;
        }
        match byte {
            b'"' | b'\'' if fresh => open = Some(byte),
            b'(' => depth += 1,
            b')' => depth = depth.saturating_sub(1),
            b',' if depth == 0 => {
                parts.push(text[begin..at].trim());
                begin = at + 1;
            }
            _ => {}
        }
        fresh = matches!(byte, b',' | b'(') || fresh && byte == b' ';
    }
    if open.is_some() {
        return Err(ValueError::BadQuotes(shorten(text)));
    }
    parts.push(text[begin..].trim());
    Ok(parts)
}

/// At most this many characters of an instrument's text go into a message for people: one line on a terminal.
const SHOWN: usize = 60;

/// A text short enough to be shown, without control characters.
#[must_use]
pub fn shorten(text: &str) -> String {
    let clean = |c: char| if c.is_control() { '·' } else { c };
    let mut short: String = text.chars().take(SHOWN).map(clean).collect();
    if text.chars().nth(SHOWN).is_some() {
        short.push('…');
    }
    short
}

#[cfg(test)]
mod tests;
