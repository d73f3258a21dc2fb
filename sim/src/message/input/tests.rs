//! Cutting bytes into messages.

use proptest::prelude::*;

use super::*;

fn message(text: &[u8]) -> Arrival {
    Arrival::Message(text.to_vec())
}

#[test]
fn a_newline_ends_a_message() {
    // IEEE 488.2 7.5: <PROGRAM MESSAGE TERMINATOR>; CR before NL is white space of the message.
    let mut input = Input::default();
    assert_eq!(input.push(b"*CLS\n*IDN?\r\n*OP"), vec![message(b"*CLS"), message(b"*IDN?\r")]);
    assert_eq!(input.push(b"C\n\n"), vec![message(b"*OPC"), message(b"")]);
}

#[test]
fn where_the_transport_has_an_end_it_ends_a_message_too() {
    // IEEE 488.2 7.5.2 (from memory): NL, NL with END, or END alone.
    let mut input = Input::default();
    assert_eq!(input.push(b"*CLS\n"), vec![message(b"*CLS")]);
    assert_eq!(input.end(), None, "NL with END is one ending");
    assert_eq!(input.push(b"*IDN?"), vec![]);
    assert_eq!(input.end(), Some(message(b"*IDN?")));
    // A string or a block that is not finished ends with it as well, and does not swallow the next message.
    assert_eq!(input.push(b"A \"b"), vec![]);
    assert_eq!(input.end(), Some(message(b"A \"b")));
    assert_eq!(input.push(b"A #19b"), vec![]);
    assert_eq!(input.end(), Some(message(b"A #19b")));
    assert_eq!(input.push(&vec![b'x'; LONGEST_MESSAGE + 1]), vec![Arrival::Overrun]);
    assert_eq!(input.end(), None, "what was too long is gone");
    assert_eq!(input.push(b"*TST?\n"), vec![message(b"*TST?")]);
}

#[test]
fn a_newline_inside_a_block_is_data() {
    // IEEE 488.2 7.7.6: the contents of a definite-length block are any bytes.
    let mut input = Input::default();
    assert_eq!(input.push(b"A #14\n\"#\n;B\nC\n"), vec![message(b"A #14\n\"#\n;B"), message(b"C")]);
    assert_eq!(input.push(b"A #10;B\n"), vec![message(b"A #10;B")], "an empty block");
}

#[test]
fn a_hash_inside_a_string_starts_no_block() {
    let mut input = Input::default();
    assert_eq!(input.push(b"A '#19'\n"), vec![message(b"A '#19'")]);
}

#[test]
fn a_forgotten_quote_costs_one_message_only() {
    let mut input = Input::default();
    assert_eq!(input.push(b"A 'x\n*IDN?\n"), vec![message(b"A 'x"), message(b"*IDN?")]);
}

#[test]
fn a_message_too_long_is_dropped_once() {
    // SCPI-99: -363 "Input buffer overrun".
    let mut input = Input::default();
    let mut bytes = vec![b'A'; LONGEST_MESSAGE + 5];
    bytes.extend_from_slice(b"\n*IDN?\n");
    assert_eq!(input.push(&bytes), vec![Arrival::Overrun, message(b"*IDN?")]);
    let mut fits = vec![b'A'; LONGEST_MESSAGE];
    fits.push(b'\n');
    assert_eq!(input.push(&fits).len(), 1);
}

#[test]
fn a_block_that_could_not_fit_is_refused_at_its_length() {
    let mut input = Input::default();
    assert_eq!(input.push(b"A #9999999999"), vec![Arrival::Overrun]);
    assert_eq!(input.push(b"zzz\nB\n"), vec![message(b"B")]);
}

proptest! {
    #[test]
    fn any_split_gives_the_same_messages(
        bytes in proptest::collection::vec(prop_oneof![Just(b'\n'), Just(b'#'), Just(b'"'), b'0'..=b'9', any::<u8>()], 0..200),
        cut in 1usize..20,
    ) {
        let whole = Input::default().push(&bytes);
        let mut input = Input::default();
        let parts: Vec<Arrival> = bytes.chunks(cut).flat_map(|part| input.push(part)).collect();
        prop_assert_eq!(whole, parts);
    }
}
