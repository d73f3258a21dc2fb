//! Any cut of the bytes gives the same messages, no bytes panic, and no length is believed.

#![allow(clippy::unwrap_used)]

use proptest::prelude::*;

use super::*;

/// A header and its payload.
type Whole = (Header, Vec<u8>);

/// All messages in the pieces, with their payloads put together.
fn feed<'a>(pieces: impl Iterator<Item = &'a [u8]>) -> (Vec<Whole>, Result<(), Malformed>) {
    let (mut state, mut buffer, mut messages) = (ScanState::new(), Vec::new(), Vec::<Whole>::new());
    for piece in pieces {
        buffer.extend_from_slice(piece);
        loop {
            match scan(&buffer, &mut state) {
                Ok(Scan::NeedMore { at_least }) => {
                    assert!((1..=MOST_HINT).contains(&at_least));
                    break;
                }
                Ok(Scan::Head(header)) => {
                    buffer.drain(..HEADER_BYTES);
                    messages.push((header, Vec::new()));
                }
                Ok(Scan::Payload { bytes, last }) => {
                    let (header, payload) = messages.last_mut().unwrap();
                    payload.extend(buffer.drain(..bytes));
                    assert_eq!(last, payload.len() as u64 == header.length);
                }
                Err(error) => return (messages, Err(error)),
            }
        }
    }
    (messages, Ok(()))
}

fn message() -> impl Strategy<Value = Whole> {
    let payload = proptest::collection::vec(any::<u8>(), 0..60);
    (any::<u8>(), any::<u8>(), any::<u32>(), payload).prop_map(|(kind, control, parameter, payload)| {
        let header = Header::new(kind.into()).control(control).parameter(parameter);
        (Header { length: payload.len() as u64, ..header }, payload)
    })
}

proptest! {
    #[test]
    fn any_cut_of_the_bytes_gives_the_same_messages(
        messages in proptest::collection::vec(message(), 1..6),
        cuts in proptest::collection::vec(1_usize..50, 1..20),
    ) {
        let wire: Vec<u8> = messages.iter().flat_map(|(header, payload)| header.message(payload)).collect();
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
        prop_assert_eq!(feed(pieces.into_iter()), (messages, Ok(())));
    }

    #[test]
    fn random_bytes_never_panic_and_end_alike_however_they_are_cut(
        bytes in proptest::collection::vec(prop_oneof![Just(b'H'), Just(b'S'), 0_u8..30, any::<u8>()], 0..200),
        proper in any::<bool>(),
    ) {
        let mut wire = if proper { b"HS".to_vec() } else { Vec::new() };
        wire.extend(bytes);
        prop_assert_eq!(feed(std::iter::once(wire.as_slice())), feed(wire.chunks(1)));
    }
}

#[test]
fn a_wrong_beginning_is_seen_after_two_bytes() {
    let malformed = scan(b"*I", &mut ScanState::new()).unwrap_err();
    assert_eq!(malformed.reason, Reason::NoPrologue { found: *b"*I" });
    assert_eq!(scan(b"H", &mut ScanState::new()), Ok(Scan::NeedMore { at_least: 15 }));
}

#[test]
fn a_length_is_not_believed() {
    let absurd = |kind: u8| [b"HS".as_slice(), &[kind, 0], &[0; 4], &[0xFF; 8]].concat();
    for (kind, most) in [(3, MOST_CONTROL_BYTES), (16, MOST_CONTROL_BYTES), (99, MOST_UNKNOWN_BYTES)] {
        let malformed = scan(&absurd(kind), &mut ScanState::new()).unwrap_err();
        assert_eq!(malformed.reason, Reason::TooLong { kind: kind.into(), declared: u64::MAX, most });
    }
    // Data may be as long as they like: whoever awaits them decides on the header, and otherwise they are passed over.
    let mut state = ScanState::new();
    let Ok(Scan::Head(header)) = scan(&absurd(7), &mut state) else { panic!("a header") };
    assert_eq!(header.length, u64::MAX);
    assert_eq!(scan(b"", &mut state), Ok(Scan::NeedMore { at_least: MOST_HINT }));
    assert_eq!(scan(b"abc", &mut state), Ok(Scan::Payload { bytes: 3, last: false }));
}
