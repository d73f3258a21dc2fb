//! Registers bit by bit, and error-queue entries.

#![allow(clippy::unwrap_used)]

use proptest::prelude::*;

use super::*;

#[test]
fn bits_have_their_names() {
    // IEEE 488.2, 11.2 and 11.5.1; SCPI-99 volume 1, 9 (from memory).
    let byte = StatusByte::parse("+100").unwrap();
    assert!(byte.error_queue() && byte.event() && byte.master());
    assert!(!byte.message_available() && !byte.questionable() && !byte.operation());
    let event = EventStatus::parse("#H81").unwrap();
    assert!(event.power_on() && event.operation_complete());
    assert!(!event.command_error() && !event.execution_error() && !event.query_error());
    let operation = OperationCondition::parse("32").unwrap();
    assert!(operation.waiting_for_trigger() && !operation.sweeping() && !operation.measuring());
}

#[test]
fn unknown_bits_survive() {
    assert_eq!(StatusByte::parse("3").unwrap().unknown(), 3);
    assert_eq!(EventStatus::parse("65535").unwrap(), EventStatus(0xFFFF));
    assert_eq!(EventStatus(0xFFFF).unknown(), 0xFF00);
    for bad in ["-1", "65536", "", "ON"] {
        assert!(StatusByte::parse(bad).is_err(), "{bad}");
    }
}

#[test]
fn error_entries_in_several_manners() {
    let entry = |number, text: &str| ErrorEntry { number, text: text.to_owned() };
    for (reply, wanted) in [
        ("0,\"No error\"", entry(0, "No error")),
        ("-113,\"Undefined header;TRIG:LEV\"", entry(-113, "Undefined header;TRIG:LEV")),
        ("+7", entry(7, "")),
        ("-222,Data out of range", entry(-222, "Data out of range")),
        ("-310,\"System error\",12:30", entry(-310, "System error")),
        ("-350,\"Queue overflow", entry(-350, "\"Queue overflow")),
    ] {
        assert_eq!(ErrorEntry::parse(reply).unwrap(), wanted);
    }
    for bad in ["", "\"No error\",0", "x,1"] {
        assert!(ErrorEntry::parse(bad).is_err(), "{bad}");
    }
}

#[test]
fn classes_by_hundreds() {
    let class = |number| ErrorEntry { number, text: String::new() }.class();
    for (number, wanted) in [
        (0, ErrorClass::None),
        (-99, ErrorClass::Own),
        (-100, ErrorClass::Command),
        (-199, ErrorClass::Command),
        (-222, ErrorClass::Execution),
        (-350, ErrorClass::Device),
        (-410, ErrorClass::Query),
        (-500, ErrorClass::Event),
        (-900, ErrorClass::Own),
        (31, ErrorClass::Own),
    ] {
        assert_eq!(class(number), wanted, "{number}");
    }
}

proptest! {
    #[test]
    fn nothing_panics(reply in "\\PC{0,40}") {
        let _ = (ErrorEntry::parse(&reply), StatusByte::parse(&reply));
    }
}
