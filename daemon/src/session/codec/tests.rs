//! The codec: any cut of the bytes gives the same messages, and no bytes make it panic.

#![allow(clippy::unwrap_used)]

use evenpair_core::scpi::frame::Reason;
use proptest::prelude::*;

use super::*;

const BLOCK: Want = Want::Block { most_bytes: 4096 };

/// Feeds the pieces one after another while `wants` are awaited in turn, as a link does.
fn feed<'a>(pieces: impl Iterator<Item = &'a [u8]>, wants: &[Want]) -> (Vec<Message>, Result<(), CodecError>) {
    let mut codec = Codec::new();
    let mut buffer = BytesMut::new();
    let mut wants = wants.iter();
    let mut messages = Vec::new();
    let limits = Limits { most_line_bytes: 4096, most_lead_bytes: 0 };
    for piece in pieces {
        buffer.extend_from_slice(piece);
        loop {
            if codec.want.is_none() {
                let Some(want) = wants.next() else { break };
                codec.await_one(*want, limits);
            }
            match codec.decode(&mut buffer) {
                Ok(Some(message)) => messages.push(message),
                Ok(None) => break,
                Err(error) => return (messages, Err(error)),
            }
        }
    }
    let end = if codec.want.is_none() { codec.decode(&mut buffer).map(drop) } else { Ok(()) };
    (messages, end)
}

/// A line or a block as it goes over the wire, what is awaited for it, and what must come of it.
fn reply() -> impl Strategy<Value = (Vec<u8>, Want, Message)> {
    let line = "[ !$%&(-+\\--:<-~]{0,40}".prop_map(|text| {
        let wire = format!("{text}\n").into_bytes();
        (wire, Want::Line, Message::Line(text))
    });
    // Quotes and line ends inside a block are data.
    let block = proptest::collection::vec(prop_oneof![any::<u8>(), Just(b'\n'), Just(b'#'), Just(b'"')], 0..200)
        .prop_map(|data| {
            let count = data.len().to_string();
            let mut wire = format!("#{}{count}", count.len()).into_bytes();
            wire.extend_from_slice(&data);
            wire.push(b'\n');
            (wire, BLOCK, Message::Block(data))
        });
    prop_oneof![line, block]
}

proptest! {
    #[test]
    fn any_cut_of_the_bytes_gives_the_same_messages(
        replies in proptest::collection::vec(reply(), 1..5),
        cuts in proptest::collection::vec(1_usize..40, 1..20),
    ) {
        let wire: Vec<u8> = replies.iter().flat_map(|(wire, ..)| wire.iter().copied()).collect();
        let wants: Vec<Want> = replies.iter().map(|(_, want, _)| *want).collect();
        let expected: Vec<Message> = replies.into_iter().map(|(.., message)| message).collect();
        let mut rest = wire.as_slice();
        let mut pieces = Vec::new();
        for size in cuts.iter().cycle() {
            if rest.is_empty() {
                break;
            }
            let (piece, after) = rest.split_at((*size).min(rest.len()));
            pieces.push(piece);
            rest = after;
        }
        let (messages, end) = feed(pieces.into_iter(), &wants);
        prop_assert_eq!(messages, expected);
        prop_assert_eq!(end, Ok(()));
    }

    #[test]
    fn random_bytes_never_panic_and_end_alike_however_they_are_cut(
        bytes in proptest::collection::vec(prop_oneof![any::<u8>(), Just(b'#'), Just(b'\n'), Just(b'4')], 0..300),
        blocks in proptest::collection::vec(any::<bool>(), 1..8),
    ) {
        let wants: Vec<Want> = blocks.iter().map(|block| if *block { BLOCK } else { Want::Line }).collect();
        let (whole, whole_end) = feed(std::iter::once(bytes.as_slice()), &wants);
        let (single, single_end) = feed(bytes.chunks(1), &wants);
        prop_assert_eq!(whole, single);
        prop_assert_eq!(whole_end.is_err(), single_end.is_err());
    }
}

#[test]
fn bytes_that_nobody_asked_for_are_an_error() {
    let (messages, end) = feed(std::iter::once(b"1\n+2.5E-3\n".as_slice()), &[Want::Line]);
    assert_eq!(messages, [Message::Line("1".to_owned())]);
    assert_eq!(end, Err(CodecError::Unsolicited { shown: "+2.5E-3".to_owned() }));
}

#[test]
fn a_declared_length_beyond_what_was_asked_for_fails_on_the_header_and_takes_no_memory() {
    let mut codec = Codec::new();
    codec.await_one(Want::Block { most_bytes: 10 }, Limits::default());
    let mut buffer = BytesMut::from(b"#9999999999".as_slice());
    let error = codec.decode(&mut buffer).unwrap_err();
    let CodecError::Malformed(malformed) = error else { panic!("{error}") };
    assert_eq!(malformed.reason, Reason::BlockTooLong { declared: 999_999_999, most: 10 });
    assert!(buffer.capacity() < 1 << 10, "{}", buffer.capacity());
}

#[test]
fn an_end_within_a_reply_is_told_from_an_end_between_replies() {
    let mut codec = Codec::new();
    assert_eq!(codec.decode_eof(&mut BytesMut::new()), Ok(None));
    codec.await_one(BLOCK, Limits::default());
    assert_eq!(codec.decode_eof(&mut BytesMut::from(b"#15ab".as_slice())), Err(CodecError::Cut { bytes: 5 }));
}
