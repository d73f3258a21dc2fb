//! Messages, headers and data elements against IEEE 488.2 chapter 7 (clauses from memory).

use proptest::prelude::*;

use super::*;

fn units(message: &str) -> Vec<Result<Unit, Fault>> {
    Units::new(message.as_bytes()).collect()
}

fn data(text: &str) -> Result<Vec<Data>, Fault> {
    let message = format!("A {text}");
    let mut units = units(&message);
    assert_eq!(units.len(), 1, "{message}");
    units.remove(0).map(|unit| unit.data)
}

fn number(value: f64, suffix: &str) -> Result<Vec<Data>, Fault> {
    let suffix = if suffix.is_empty() { None } else { Some(suffix.to_owned()) };
    Ok(vec![Data::Number { value, suffix }])
}

#[test]
fn a_message_is_cut_at_semicolons() {
    // 7.3.1, 7.3.3
    let read = units(" *CLS ; :volt:dc 1 ,\t2;CURR? max\r");
    let tree = |from_root, text: &str| Header::Tree { from_root, nodes: text.split(':').map(Mnemonic::new).collect() };
    let one = |value| Data::Number { value, suffix: None };
    assert_eq!(
        read,
        vec![
            Ok(Unit { header: Header::Common("CLS".into()), query: false, data: vec![] }),
            Ok(Unit { header: tree(true, "VOLT:DC"), query: false, data: vec![one(1.0), one(2.0)] }),
            Ok(Unit { header: tree(false, "CURR"), query: true, data: vec![Data::Character("MAX".into())] }),
        ]
    );
    assert!(units("  \r").is_empty());
}

#[test]
fn decimal_numbers() {
    // 7.7.2: sign, digits, point anywhere, exponent with white space around E.
    for (text, value) in [
        ("1", 1.0),
        ("-.5", -0.5),
        ("+5.", 5.0),
        ("1E3", 1e3),
        ("1.5 e -3", 1.5e-3),
        ("007", 7.0),
        ("1e400", f64::INFINITY),
    ] {
        assert_eq!(data(text), number(value, ""), "{text}");
    }
    for (text, fault) in [
        ("1.2.3", Fault::NumberCharacter),
        ("+", Fault::NumberCharacter),
        ("--1", Fault::NumberCharacter),
        ("1e32001", Fault::ExponentTooLarge),
    ] {
        assert_eq!(data(text), Err(fault), "{text}");
    }
    assert_eq!(data(&"1".repeat(256)), Err(Fault::TooManyDigits));
    assert!(data(&"0".repeat(300)).is_ok(), "leading zeros do not count");
}

#[test]
fn numbers_with_units() {
    // 7.7.3: white space before the unit is allowed; E without digits belongs to the unit.
    assert_eq!(data("10 mV"), number(10.0, "MV"));
    assert_eq!(data("10mV"), number(10.0, "MV"));
    assert_eq!(data("1E3EV"), number(1e3, "EV"));
    assert_eq!(data("1 EX"), number(1.0, "EX"));
    assert_eq!(data("1 ABCDEFGHIJKLM"), Err(Fault::SuffixTooLong));
}

#[test]
fn other_kinds_of_data() {
    // 7.7.1, 7.7.4 to 7.7.7
    assert_eq!(data("#hFf,#q17,#B101"), Ok(vec![Data::Radix(255), Data::Radix(15), Data::Radix(5)]));
    assert_eq!(data("'it''s;',\"a,b\""), Ok(vec![Data::Text, Data::Text]));
    assert_eq!(data("#13;,\n,1"), Ok(vec![Data::Block, Data::Number { value: 1.0, suffix: None }]));
    assert_eq!(data("(@101,102:103)"), Ok(vec![Data::Expression("@101,102:103".into())]));
    assert_eq!(data("dc"), Ok(vec![Data::Character("DC".into())]));
}

#[test]
fn each_mistake_has_its_number() {
    for (message, fault) in [
        ("*CLS;;*CLS", Fault::Syntax),
        ("*CLS;", Fault::Syntax),
        ("A::B", Fault::Syntax),
        ("A:", Fault::Syntax),
        ("%A", Fault::InvalidCharacter),
        ("A\"x\"", Fault::HeaderSeparator),
        ("A??", Fault::HeaderSeparator),
        ("ABCDEFGHIJKLM", Fault::MnemonicTooLong),
        ("A ABCDEFGHIJKLM", Fault::CharacterDataTooLong),
        ("A 1,", Fault::Syntax),
        ("A B C", Fault::InvalidSeparator),
        ("A &", Fault::InvalidCharacter),
        ("A 'x", Fault::InvalidString),
        ("A #0abc", Fault::InvalidBlock),
        ("A #15abc", Fault::InvalidBlock),
        ("A #h", Fault::NumberCharacter),
        ("A (@1", Fault::InvalidExpression),
    ] {
        assert_eq!(units(message).pop(), Some(Err(fault)), "{message}");
    }
}

#[test]
fn what_stands_before_a_mistake_is_read_and_nothing_behind_it() {
    let read = units("*CLS;%;*CLS");
    assert_eq!(read.len(), 2);
    assert!(read[0].is_ok());
    assert_eq!(read[1], Err(Fault::InvalidCharacter));
}

proptest! {
    #[test]
    fn no_bytes_make_it_panic_or_go_on_for_ever(message in proptest::collection::vec(any::<u8>(), 0..300)) {
        prop_assert!(Units::new(&message).count() <= message.len());
    }

    #[test]
    fn no_text_near_the_grammar_makes_it_panic(message in "[ *:;,?#'\"()@+.eEmVA0-9]{0,60}") {
        prop_assert!(Units::new(message.as_bytes()).count() <= message.len());
    }
}
