//! Taking a line apart at a sign of the dialect's choice.

use crate::scpi::value::{self, ValueError};

/// Why a text cannot be what stands between parts; `None` if it can.
pub(super) fn refuse_sign(text: &str) -> Option<&'static str> {
    let mut chars = text.chars();
    match (chars.next(), chars.next()) {
        (Some(sign), None)
            if sign == ' ' || (sign.is_ascii_punctuation() && !matches!(sign, '"' | '\'' | '+' | '-' | '.')) =>
        {
            None
        }
        _ => Some("it must be one sign, such as `,` or `;`, that is no part of a number and no quote"),
    }
}

/// The parts between these signs, but not where they stand in quotes. An empty text has no parts. Blanks count as one.
pub(super) fn parts(text: &str, sign: char) -> Result<Vec<&str>, ValueError> {
    if sign == ',' {
        return value::list(text);
    }
    let text = text.trim();
    if text.is_empty() {
        return Ok(Vec::new());
    }
    let (mut parts, mut begin, mut open, mut fresh) = (Vec::new(), 0, None, true);
    for (at, c) in text.char_indices() {
        match open {
            Some(quote) => {
                if c == quote {
                    // A doubled quote opens again at once.
                    open = None;
                    fresh = true;
                }
            }
            None if matches!(c, '"' | '\'') && fresh => open = Some(c),
            None if c == sign => {
                parts.push(text[begin..at].trim());
                begin = at + c.len_utf8();
                fresh = true;
            }
            // Only a quote at the start of a part, or of what it is equal to, opens a quoted string.
            None => fresh = matches!(c, '=' | ':' | ' '),
        }
    }
    if open.is_some() {
        return Err(ValueError::BadQuotes(value::shorten(text)));
    }
    parts.push(text[begin..].trim());
    if sign == ' ' {
        parts.retain(|part| !part.is_empty());
    }
    Ok(parts)
}

/// At most `count` parts between these signs, wherever they stand: the last takes the rest.
pub(super) fn between(text: &str, sign: char, count: usize) -> Vec<&str> {
    text.trim().splitn(count.max(1), sign).map(str::trim).collect()
}
