//! Parameters as values (clauses from memory).

use super::*;

const VOLTS: Limits = Limits { min: -5.0, max: 5.0, default: 1.0 };

fn args(text: &str) -> Args {
    let message = format!("A {text}");
    Args::new(super::super::Units::new(message.as_bytes()).next().unwrap().unwrap().data)
}

#[test]
fn multipliers_follow_the_table() {
    // IEEE 488.2 7.7.3.4: M is milli, MA is mega, but MHZ is megahertz.
    for (text, unit, value) in [
        ("10 MV", Quantity::Volt, 0.01),
        ("10 mav", Quantity::Volt, 1e7),
        ("3 KV", Quantity::Volt, 3e3),
        ("1 MHZ", Quantity::Hertz, 1e6),
        ("1 MAHZ", Quantity::Hertz, 1e6),
        ("2 GHZ", Quantity::Hertz, 2e9),
        ("2.5 NS", Quantity::Second, 2.5e-9),
        ("50 PS", Quantity::Second, 50e-12),
        ("5 MA", Quantity::Ampere, 5e-3),
        ("40 PCT", Quantity::Percent, 40.0),
    ] {
        let found = args(text).number(&VOLTS, unit).unwrap();
        assert!((found - value).abs() <= 1e-12 * value, "{text}: {found}");
    }
    for (text, unit, fault) in [
        ("1 HZ", Quantity::Volt, Fault::InvalidSuffix),
        ("1 XV", Quantity::Volt, Fault::InvalidSuffix),
        ("1 V", Quantity::None, Fault::SuffixNotAllowed),
        ("1 KPCT", Quantity::Percent, Fault::InvalidSuffix),
    ] {
        assert_eq!(args(text).number(&VOLTS, unit), Err(fault), "{text}");
    }
}

#[test]
fn limits_have_names() {
    // SCPI-99 vol. 1, 7.2.1.2
    for (text, value) in [("MIN", -5.0), ("MAXIMUM", 5.0), ("def", 1.0), ("#H3", 3.0)] {
        assert_eq!(args(text).number(&VOLTS, Quantity::Volt), Ok(value), "{text}");
    }
    assert_eq!(args("MAXI").number(&VOLTS, Quantity::Volt), Err(Fault::InvalidCharacterData));
    assert_eq!(args("'1'").number(&VOLTS, Quantity::Volt), Err(Fault::DataType));
    assert_eq!(args("MAX").asked_limit(&VOLTS), Ok(Some(5.0)));
    assert_eq!(Args::new(vec![]).asked_limit(&VOLTS), Ok(None));
}

#[test]
fn booleans_are_words_or_numbers() {
    // SCPI-99 vol. 1, 7.3: a number is rounded; what is not zero is ON.
    for (text, value) in [("ON", true), ("off", false), ("1", true), ("0", false), ("0.4", false), ("-3", true)] {
        assert_eq!(args(text).boolean(), Ok(value), "{text}");
    }
    assert_eq!(args("MAYBE").boolean(), Err(Fault::InvalidCharacterData));
}

#[test]
fn masks_are_rounded_and_bounded() {
    assert_eq!(args("31.6").mask(255), Ok(32));
    assert_eq!(args("256").mask(255), Err(Fault::OutOfRange));
    assert_eq!(args("-1").mask(255), Err(Fault::OutOfRange));
    assert_eq!(args("1 V").mask(255), Err(Fault::SuffixNotAllowed));
}

#[test]
fn channel_lists() {
    assert_eq!(args("(@101, 105:107,3)").channels(), Ok(vec![101, 105, 106, 107, 3]));
    assert_eq!(args("(@3:1)").channels(), Ok(vec![3, 2, 1]));
    for text in ["(101)", "(@)", "(@1,)", "(@a)", "(@1:2:3)", "(@-1)"] {
        assert_eq!(args(text).channels(), Err(Fault::InvalidExpression), "{text}");
    }
    assert_eq!(args("(@0:4294967295)").channels(), Err(Fault::OutOfRange));
    assert_eq!(args("101").channels(), Err(Fault::DataType));
}

#[test]
fn too_few_and_too_many() {
    assert_eq!(Args::new(vec![]).boolean(), Err(Fault::MissingParameter));
    let mut two = args("1,2");
    assert_eq!(two.boolean(), Ok(true));
    assert_eq!(two.finish(), Err(Fault::ParameterNotAllowed));
}

#[test]
fn words_with_and_without_number() {
    let forms = ["INTernal", "EXTernal"];
    assert_eq!(args("INT2").word(&forms), Ok((0, Some(2))));
    assert_eq!(args("EXTERNAL").word(&forms), Ok((1, None)));
    assert_eq!(args("INTERN").word(&forms), Err(Fault::InvalidCharacterData));
    assert_eq!(args("EXT1").plain_word(&forms), Err(Fault::InvalidCharacterData));
}
