use proptest::prelude::*;

use super::*;

#[test]
fn reads_numbers_with_prefixes_and_units() {
    for (text, value, unit) in [
        ("12 V", 12.0, Unit::Volt),
        ("10 ns", 1e-8, Unit::Second),
        ("-3.5mV", -3.5e-3, Unit::Volt),
        ("1e3 Hz", 1e3, Unit::Hertz),
        ("1.25 GSa/s", 1.25e9, Unit::SamplePerSecond),
        ("10 MΩ", 1e7, Unit::Ohm),
        ("9.5 pF", 9.5e-12, Unit::Farad),
        ("1 F", 1.0, Unit::Farad),
        ("0.98", 0.98, Unit::One),
        ("60 dB", 60.0, Unit::Decibel),
        ("2 V/s", 2.0, Unit::VoltPerSecond),
        ("5 µV·s", 5e-6, Unit::VoltSecond),
    ] {
        assert_eq!(Amount::parse(text), Ok(Amount { value, unit }), "{text}");
    }
}

#[test]
fn refuses_what_is_no_amount() {
    assert!(matches!(Amount::parse("fast"), Err(AmountError::NoNumber(_))));
    assert!(matches!(Amount::parse("inf V"), Err(AmountError::NoNumber(_))));
    assert!(matches!(Amount::parse("1e999 V"), Err(AmountError::NoNumber(_))));
    assert!(matches!(Amount::parse("3 parsec"), Err(AmountError::UnknownUnit(_))));
    assert!(matches!(Amount::parse("3 kdB"), Err(AmountError::UnknownUnit(_))));
    assert_eq!(
        Amount::parse_in("3 ns", Unit::Volt),
        Err(AmountError::WrongUnit { found: Unit::Second, wanted: Unit::Volt })
    );
}

#[test]
fn shows_significant_digits() {
    assert_eq!(show(1.23456e-9, Unit::Second, 4), "1.235 ns");
    assert_eq!(show(-12.0, Unit::Volt, 3), "-12.0 V");
    assert_eq!(show(0.0, Unit::Volt, 3), "0.00 V");
    assert_eq!(show(999.99e-12, Unit::Second, 3), "1.00 ns");
    assert_eq!(show(0.012345, Unit::One, 3), "0.0123");
    assert_eq!(show(39.9565, Unit::Decibel, 4), "39.96 dB");
}

proptest! {
    #[test]
    fn what_is_shown_reads_back(mantissa in 1.0f64..10.0, power in -14i32..14, negative: bool) {
        let value = mantissa * 10f64.powi(power) * if negative { -1.0 } else { 1.0 };
        let back = Amount::parse(&show(value, Unit::Volt, 9)).unwrap();
        prop_assert_eq!(back.unit, Unit::Volt);
        prop_assert!((back.value - value).abs() <= 1e-8 * value.abs());
    }

    #[test]
    fn no_text_panics(text in "\\PC{0,20}") {
        let _ = Amount::parse(&text);
    }
}
