//! Literal values as instruments send them, and the way there and back.

#![allow(clippy::unwrap_used, clippy::float_cmp)]

use proptest::prelude::*;

use super::*;
use crate::scpi::write;

#[test]
fn numbers_in_all_decimal_forms() {
    // IEEE 488.2, 8.7.2 to 8.7.4: NR1, NR2, NR3; the lenient ones are common practice, no source.
    for (text, value) in [
        ("5", 5.0),
        ("-5", -5.0),
        ("+1.0E+00", 1.0),
        (" 2.50 ", 2.5),
        (".5", 0.5),
        ("5.", 5.0),
        ("1e-9", 1e-9),
        ("-0", 0.0),
    ] {
        assert_eq!(number(text), Ok(value), "{text}");
    }
    for text in ["", " ", "inf", "NaN", "1,0", "1_000", "0x10", "1 V", "--1", "1e", "1E999", "ON", "١"] {
        assert_eq!(number(text), Err(ValueError::NotANumber(text.to_owned())), "{text}");
    }
}

#[test]
fn the_numbers_that_stand_for_no_number() {
    assert_eq!(number("9.9E37"), Err(ValueError::NoValue("9.9E37")));
    assert_eq!(number("-9.900000E+37"), Err(ValueError::NoValue("9.9E37")));
    assert_eq!(number("9.91E37"), Err(ValueError::NoValue("9.91E37")));
    assert_eq!(number("9.8E37"), Ok(9.8e37));
    assert_eq!(number_with_unit("9.9E37 V"), Err(ValueError::NoValue("9.9E37")));
}

#[test]
fn units_with_multipliers() {
    // IEEE 488.2, 7.7.3 (from memory): M is milli, except before HZ and OHM, where it is mega; MA is mega.
    for (text, value) in [
        ("48.0 V", 48.0),
        ("5.00E-3V", 5e-3),
        ("20 NS", 20e-9),
        ("20ns", 20e-9),
        ("1 MHZ", 1e6),
        ("10 MOHM", 10e6),
        ("3 MV", 3e-3),
        ("3 MAV", 3e6),
        ("7 MA", 7e-3),
        ("2 GSA/S", 2e9),
        ("1 S", 1.0),
        ("3E3", 3e3),
    ] {
        assert_eq!(number_with_unit(text), Ok(value), "{text}");
    }
    assert_eq!(number_with_unit("3 VOLT"), Err(ValueError::UnknownUnit("VOLT".to_owned())));
    assert_eq!(number_with_unit("V"), Err(ValueError::NotANumber("V".to_owned())));
}

#[test]
fn whole_numbers_in_every_base() {
    for (text, value) in [
        ("42", 42),
        ("-1", -1),
        ("+16", 16),
        ("1.0E3", 1000),
        ("#H1F", 31),
        ("#q17", 15),
        ("#B101", 5),
        ("9007199254740993", 9_007_199_254_740_993),
    ] {
        assert_eq!(whole(text), Ok(value), "{text}");
    }
    for text in ["1.5", "1E300", "#H", "#H-1", "#X1", "#", "#B2", "#é1"] {
        assert_eq!(whole(text), Err(ValueError::NotWhole(text.to_owned())), "{text}");
    }
}

#[test]
fn flags_and_words() {
    for (text, flag) in [("1", true), ("0", false), ("ON", true), ("off", false), ("+1.0", true)] {
        assert_eq!(boolean(text), Ok(flag), "{text}");
    }
    for text in ["2", "", "TRUE", "-1", "O N"] {
        assert_eq!(boolean(text), Err(ValueError::NotAFlag(text.to_owned())), "{text}");
    }
    assert_eq!(keyword(" POS_2 "), Ok("POS_2"));
    for text in ["", "2POS", "_P", "POS NEG", "POS;", "PÖS"] {
        assert_eq!(keyword(text), Err(ValueError::NotAWord(text.to_owned())), "{text}");
    }
}

#[test]
fn quoted_texts() {
    for (text, plain) in [
        ("\"\"", ""),
        ("\"No error\"", "No error"),
        ("\"say \"\"on\"\"\"", "say \"on\""),
        ("'it''s'", "it's"),
        ("'\"'", "\""),
        (" \"é\" ", "é"),
    ] {
        assert_eq!(quoted(text).unwrap(), plain, "{text}");
    }
    for text in ["", "\"", "\"a", "a\"", "\"a\"b\"", "\"a'", "plain"] {
        assert!(matches!(quoted(text), Err(ValueError::BadQuotes(_))), "{text}");
    }
}

#[test]
fn lists_part_at_commas_outside_quotes_and_parentheses() {
    assert_eq!(list("1, 2 ,3").unwrap(), ["1", "2", "3"]);
    assert_eq!(list("-113,\"a, b\"\", c\",x").unwrap(), ["-113", "\"a, b\"\", c\"", "x"]);
    assert_eq!(list("(@101,102),1").unwrap(), ["(@101,102)", "1"]);
    assert_eq!(list("Joe's,5\"").unwrap(), ["Joe's", "5\""]);
    assert_eq!(list(",").unwrap(), ["", ""]);
    assert!(list(" ").unwrap().is_empty());
    assert!(list("1,\"open").is_err());
}

#[test]
fn shown_texts_are_one_short_line() {
    assert_eq!(shorten("a\nb\u{7}"), "a·b·");
    assert_eq!(shorten(&"x".repeat(61)), "x".repeat(60) + "…");
}

proptest! {
    #[test]
    fn nothing_panics(text in "\\PC{0,60}") {
        let _ = (number(&text), number_with_unit(&text), whole(&text), boolean(&text), keyword(&text).is_ok());
        let _ = (quoted(&text), list(&text).is_ok(), loose_text(&text), shorten(&text));
    }

    #[test]
    fn parts_and_commas_make_the_list_again(text in "[a-c\"',() ]{0,30}") {
        // Only blanks may get lost.
        if let Ok(parts) = list(&text) {
            prop_assert_eq!(parts.join(",").replace(' ', ""), text.replace(' ', ""));
        }
    }

    #[test]
    fn what_is_written_is_read_back(value in any::<f64>(), whole_value in any::<i64>(), flag in any::<bool>(), text in "[ -~]{0,30}") {
        if value.is_finite() && (value.abs() - 9.9e37).abs() > 1e35 {
            prop_assert_eq!(number(&write::number(value).unwrap()), Ok(value));
        }
        prop_assert_eq!(whole(&write::whole(whole_value)), Ok(whole_value));
        prop_assert_eq!(boolean(&write::boolean(flag)), Ok(flag));
        prop_assert_eq!(quoted(&write::quoted(&text).unwrap()), Ok(text));
    }
}
