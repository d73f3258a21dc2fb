//! One field as a number.

use super::super::Decimal;

/// The longest text that can be a number: a double needs at most 24 characters, a wordy writer a few more.
const LONGEST: usize = 64;

/// From here on up a number stands for "overload" or "no value" (SCPI-99, volume 1, 7.2.1.4 and 7.2.1.5: 9.9E37 and
/// 9.91E37).
const NOT_A_VALUE: f64 = 9.9e37;

/// A field as a finite number: digits, one decimal mark, an exponent. `None` for everything else.
pub(super) fn read(field: &str, decimal: Decimal) -> Option<f64> {
    let bytes = field.as_bytes();
    if bytes.is_empty() || bytes.len() > LONGEST {
        return None;
    }
    let mut buffer = [0_u8; LONGEST];
    let mut length = 0;
    let mut digits = false;
    let mut put = |byte: u8| {
        buffer[length] = byte;
        length += 1;
    };
    let mut rest = bytes;
    // The typographic minus sign, U+2212.
    if let Some(after) = rest.strip_prefix("\u{2212}".as_bytes()) {
        put(b'-');
        rest = after;
    }
    let mark = match decimal {
        Decimal::Point => b'.',
        Decimal::Comma => b',',
    };
    for &byte in rest {
        match byte {
            b'0'..=b'9' => {
                digits = true;
                put(byte);
            }
            b'+' | b'-' | b'e' | b'E' => put(byte),
            _ if byte == mark => put(b'.'),
            _ => return None,
        }
    }
    // `1,` is a number before a separating comma rather than one with a decimal comma.
    if !digits || (decimal == Decimal::Comma && rest.last() == Some(&mark)) {
        return None;
    }
    let value: f64 = std::str::from_utf8(&buffer[..length]).ok()?.parse().ok()?;
    (value.is_finite() && value.abs() < NOT_A_VALUE).then_some(value)
}

/// Whether a field says that there is no value.
pub(super) fn is_missing(field: &str) -> bool {
    let words = ["", "nan", "inf", "+inf", "-inf", "-nan"];
    words.iter().any(|word| field.eq_ignore_ascii_case(word))
        || read(field, Decimal::Point).is_none()
            && field.parse::<f64>().is_ok_and(|value| value.abs() >= NOT_A_VALUE && field.contains(['e', 'E']))
}
