//! Literal values as they are sent, and hostile ones.

#![allow(clippy::unwrap_used)]

use proptest::prelude::*;

use super::*;

#[test]
fn numbers_have_the_fewest_digits_that_come_back() {
    for (value, text) in [
        (8.0, "8E0"),
        (-0.25, "-2.5E-1"),
        (0.1, "1E-1"),
        (2.3e-9, "2.3E-9"),
        (-0.0, "0E0"),
        (1e300, "1E300"),
        (0.1 + 0.2, "3.0000000000000004E-1"),
    ] {
        assert_eq!(number(value).unwrap(), text);
    }
    assert!(matches!(number(f64::NAN), Err(WriteError::NotFinite(_))));
    assert!(matches!(number(f64::INFINITY), Err(WriteError::NotFinite(_))));
    assert_eq!(percent(0.07).unwrap(), "7E0");
    assert_eq!(percent(1.0 / 3.0).unwrap(), "3.33333333333333E1");
    assert!(matches!(percent(f64::MAX), Err(WriteError::NotFinite(_))));
}

#[test]
fn words_lists_and_texts() {
    assert_eq!(keyword("POSitive").unwrap(), "POSitive");
    for bad in ["", " POS", "POS;*RST", "POS\n", "1", "Ä"] {
        assert!(matches!(keyword(bad), Err(WriteError::NotAWord(_))), "{bad:?}");
    }
    assert_eq!(channels(&[101, 7]).unwrap(), "(@101,7)");
    assert_eq!(channels(&[]), Err(WriteError::NoChannels));
    assert_eq!(channels(&[1, 0]), Err(WriteError::BadChannel(0)));
    assert_eq!(quoted("say \"on\"; *RST").unwrap(), "\"say \"\"on\"\"; *RST\"");
    for (bad, what) in [("a\nb", '\n'), ("a\r", '\r'), ("\0", '\0'), ("grün", 'ü')] {
        assert_eq!(quoted(bad), Err(WriteError::BadCharacter(what)));
    }
}

/// Whether a line end or a `;` stands outside quotes: then there would be a second command.
fn splits(text: &str) -> bool {
    let mut inside = false;
    text.chars().any(|c| {
        inside ^= c == '"';
        matches!(c, '\n' | '\r') || (c == ';' && !inside)
    }) || inside
}

proptest! {
    #[test]
    fn nothing_written_makes_a_second_command(text in any::<String>(), value in any::<f64>(), list in prop::collection::vec(any::<i64>(), 0..5)) {
        for written in [quoted(&text), keyword(&text), number(value), percent(value), channels(&list)].into_iter().flatten() {
            prop_assert!(!splits(&written), "{written:?}");
        }
    }
}
