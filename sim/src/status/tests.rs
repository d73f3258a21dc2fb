//! The status model against IEEE 488.2 chapter 11 and SCPI-99 (clauses from memory).

use super::*;

#[test]
fn power_on_is_told_once() {
    // IEEE 488.2 11.5.1.1.1: bit 7 (PON); 11.5.1.3: reading clears.
    let mut status = Status::new();
    assert_eq!(status.take_events(), 128);
    assert_eq!(status.take_events(), 0);
}

#[test]
fn an_error_sets_the_bit_of_its_class() {
    // IEEE 488.2 11.5.1.1: CME is bit 5, EXE bit 4, DDE bit 3, QYE bit 2.
    for (fault, bit) in [
        (Fault::UndefinedHeader, 32),
        (Fault::OutOfRange, 16),
        (Fault::InputOverrun, 8),
        (Fault::QueryAfterIndefinite, 4),
    ] {
        let mut status = Status::new();
        status.clear();
        status.report(fault);
        assert_eq!(status.take_events(), bit, "{fault}");
    }
}

#[test]
fn a_full_queue_ends_with_overflow_and_keeps_the_oldest() {
    // SCPI-99 vol. 2, 21.8.1: the last entry becomes -350; earlier ones stay.
    let mut status = Status::new();
    for _ in 0..QUEUE_LENGTH + 3 {
        status.report(Fault::Syntax);
    }
    let mut numbers = Vec::new();
    while let Some(fault) = status.next_error() {
        numbers.push(fault.number());
    }
    assert_eq!(numbers.len(), QUEUE_LENGTH);
    assert!(numbers[..QUEUE_LENGTH - 1].iter().all(|number| *number == -102));
    assert_eq!(numbers.last(), Some(&-350));
}

#[test]
fn the_status_byte_sums_up_through_the_masks() {
    // IEEE 488.2 11.2.1 and 11.3: ESB needs *ESE, MSS needs *SRE; SCPI-99: bit 2 while the error queue holds something.
    let mut status = Status::new();
    status.clear();
    status.report(Fault::UndefinedHeader);
    assert_eq!(status.status_byte(false), 4);
    status.event_enable = 32;
    assert_eq!(status.status_byte(true), 4 | 16 | 32);
    status.enable_requests(0xFF);
    assert_eq!(status.request_enable(), 0xBF, "bit 6 of the mask cannot be set");
    assert_eq!(status.status_byte(false), 4 | 32 | 64);
    status.clear();
    assert_eq!(status.status_byte(false), 0);
    assert_eq!(status.event_enable, 32, "*CLS leaves masks alone");
}

#[test]
fn transition_filters_latch_what_they_let_through() {
    // SCPI-99 vol. 1, 9: after PRESet only the beginning of a condition makes an event.
    let mut register = Register::new();
    register.set_condition(operation::MEASURING);
    assert_eq!((register.condition(), register.take_events()), (16, 16));
    register.set_condition(0);
    assert_eq!(register.take_events(), 0);
    (register.positive, register.negative, register.enable) = (0, 16, 16);
    register.set_condition(operation::MEASURING);
    assert!(!register.summary());
    register.set_condition(0);
    assert!(register.summary());
    assert_eq!(register.take_events(), 16);
    register.preset();
    assert_eq!((register.enable, register.positive, register.negative), (0, 0x7FFF, 0));
}

#[test]
fn the_operation_summary_is_bit_seven() {
    let mut status = Status::new();
    status.clear();
    status.operation.enable = operation::WAITING_FOR_TRIGGER;
    status.operation.set_condition(operation::WAITING_FOR_TRIGGER);
    status.questionable.enable = 1;
    status.questionable.set_condition(1);
    assert_eq!(status.status_byte(false), 128 | 8);
}
