//! Replies with and without the endings that a raw socket needs.

#![allow(clippy::unwrap_used)]

use proptest::prelude::*;

use super::*;

const BLOCK: Want = Want::Block { most_bytes: 5 };

fn reply(bytes: &[u8], want: Want) -> Result<Message, CodecError> {
    read(bytes.to_vec(), want, &Limits { most_line_bytes: 20, most_lead_bytes: 6 })
}

#[test]
fn a_line_may_end_with_the_reply() {
    for bytes in [b"1.5\n".as_slice(), b"1.5\r\n", b"1.5"] {
        assert_eq!(reply(bytes, Want::Line), Ok(Message::Line("1.5".to_owned())));
    }
    assert_eq!(reply(b"", Want::Line), Ok(Message::Line(String::new())));
    assert_eq!(reply(b"1\n2\n", Want::Line), Err(CodecError::Unsolicited { shown: "2".to_owned() }));
    // A quote without its end swallows the LF, but not the end of the reply.
    assert!(matches!(reply(b"\"open\n", Want::Line), Err(CodecError::Cut { bytes: 6 })));
}

#[test]
fn a_block_may_end_with_the_reply() {
    for bytes in [b"#13a\nb\n".as_slice(), b"#13a\nb\r\n", b"#13a\nb", b"#0a\nb\n", b"DATA #13a\nb"] {
        assert_eq!(reply(bytes, BLOCK), Ok(Message::Block(b"a\nb".to_vec())), "{bytes:?}");
    }
    assert_eq!(reply(b"#12\r\n", BLOCK), Ok(Message::Block(b"\r\n".to_vec())));
    assert_eq!(reply(b"#14ab", BLOCK), Err(CodecError::Cut { bytes: 5 }));
    assert_eq!(reply(b"#11a\n#11b\n", BLOCK), Err(CodecError::Unsolicited { shown: "#11b".to_owned() }));
    for (bytes, declared) in [(b"#16abcdef\n".as_slice(), 6), (b"#9999999999", 999_999_999), (b"#0abcdef\n", 6)] {
        let Err(CodecError::Malformed(malformed)) = reply(bytes, BLOCK) else { panic!("{bytes:?}") };
        assert_eq!(malformed.reason, Reason::BlockTooLong { declared, most: 5 });
    }
    assert!(matches!(reply(b"1.5\n", BLOCK), Err(CodecError::Malformed(_))));
}

proptest! {
    #[test]
    fn no_bytes_panic_or_make_more_than_was_asked_for(bytes in proptest::collection::vec(prop_oneof![any::<u8>(), Just(b'#'), Just(b'1')], 0..40)) {
        if let Ok(message) = reply(&bytes, Want::Line) {
            prop_assert!(matches!(message, Message::Line(_)));
        }
        if let Ok(message) = reply(&bytes, BLOCK) {
            prop_assert!(matches!(message, Message::Block(data) if data.len() <= 5));
        }
    }
}
