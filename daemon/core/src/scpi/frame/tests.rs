//! Literal replies, faults, and any cut of the stream giving the same.

#![allow(clippy::unwrap_used)]

use proptest::prelude::*;

use super::*;

const BLOCK: Want = Want::Block { most_bytes: 64 };

/// Feeds `bytes` in pieces that end at each of `cuts`, and gives the first frame's body with what it consumed.
fn feed(bytes: &[u8], cuts: &[usize], want: Want, limits: &Limits) -> Result<Option<(Vec<u8>, usize)>, Malformed> {
    let mut progress = ScanState::new();
    for &cut in cuts.iter().chain([&bytes.len()]) {
        match scan(&bytes[..cut.min(bytes.len())], &mut progress, want, limits)? {
            Scan::Frame { body, consumed } => return Ok(Some((bytes[body].to_vec(), consumed))),
            Scan::NeedMore { at_least } => assert!((1..=MOST_HINT).contains(&at_least)),
        }
    }
    Ok(None)
}

fn whole(bytes: &[u8], want: Want) -> Result<Option<(Vec<u8>, usize)>, Malformed> {
    feed(bytes, &[], want, &Limits::default())
}

fn body(bytes: &[u8], want: Want) -> Vec<u8> {
    whole(bytes, want).unwrap().unwrap().0
}

#[test]
fn lines_end_at_lf_or_cr_lf() {
    assert_eq!(whole(b"1.0\n2.0\n", Want::Line), Ok(Some((b"1.0".to_vec(), 4))));
    assert_eq!(whole(b"1.0\r\n2.0\n", Want::Line), Ok(Some((b"1.0".to_vec(), 5))));
    assert_eq!(whole(b"\n", Want::Line), Ok(Some((vec![], 1))));
    assert_eq!(whole(b"1.0\r", Want::Line), Ok(None));
    assert_eq!(body(b"a\rb\n", Want::Line), b"a\rb");
}

#[test]
fn a_line_end_inside_quotes_or_a_block_is_data() {
    assert_eq!(body(b"-1,\"two\nlines\"\n", Want::Line), b"-1,\"two\nlines\"");
    assert_eq!(body(b"'a\"\n',\"b\"\"\n\"\n", Want::Line), b"'a\"\n',\"b\"\"\n\"");
    assert_eq!(body(b"7,#13\n\"\n;\"x\n\"\n", Want::Line), b"7,#13\n\"\n;\"x\n\"");
    assert_eq!(body(b"#10\n", Want::Line), b"#10");
}

#[test]
fn an_apostrophe_inside_a_word_is_no_quote() {
    assert_eq!(body(b"Joe's Instruments,Model #0,#H1F\n", Want::Line), b"Joe's Instruments,Model #0,#H1F");
    assert_eq!(body(b"ACME, 5\" scope\n", Want::Line), b"ACME, 5\" scope");
}

#[test]
fn blocks_take_their_length_and_check_their_end() {
    // 488.2, 8.7.9: `#`, how many digits, the digits, the data.
    assert_eq!(whole(b"#15a\n#\"b\nrest", BLOCK), Ok(Some((b"a\n#\"b".to_vec(), 9))));
    assert_eq!(whole(b"#800000005hello\r\n", BLOCK), Ok(Some((b"hello".to_vec(), 17))));
    assert_eq!(whole(b"#10\n", BLOCK), Ok(Some((vec![], 4))));
    assert_eq!(whole(b"#15hello", BLOCK), Ok(None));
    assert_eq!(whole(b"#15hello\r", BLOCK), Ok(None));
}

#[test]
fn what_can_never_become_a_reply() {
    let limits = Limits { most_line_bytes: 8, most_lead_bytes: 0 };
    let cases: [(&[u8], Want, usize, Reason); 13] = [
        (b"#0abc\n", BLOCK, 1, Reason::IndefiniteBlock),
        (b"#0abc\n", Want::Line, 1, Reason::IndefiniteBlock),
        (b"1.0\n", BLOCK, 0, Reason::NotABlock { found: b'1' }),
        (b"\n", BLOCK, 0, Reason::NotABlock { found: b'\n' }),
        (b"#x", BLOCK, 1, Reason::BadDigit { found: b'x' }),
        (b"#31x", BLOCK, 3, Reason::BadDigit { found: b'x' }),
        (b"#31x", Want::Line, 3, Reason::BadDigit { found: b'x' }),
        // Refused at the last digit of the length, before a byte of data is there.
        (b"#265", BLOCK, 3, Reason::BlockTooLong { declared: 65, most: 64 }),
        (b"#9999999999", BLOCK, 10, Reason::BlockTooLong { declared: 999_999_999, most: 64 }),
        (b"#299", Want::Line, 3, Reason::LineTooLong { most: 8 }),
        (b"#12hello\n", BLOCK, 5, Reason::NotEnded { found: b'l' }),
        (b"#12he\rx", BLOCK, 5, Reason::NotEnded { found: b'\r' }),
        (b"123456789\n", Want::Line, 8, Reason::LineTooLong { most: 8 }),
    ];
    for (bytes, want, offset, reason) in cases {
        // Whole and byte by byte: the same fault at the same place.
        let every: Vec<usize> = (0..bytes.len()).collect();
        assert_eq!(feed(bytes, &[], want, &limits), Err(Malformed { offset, reason }), "{bytes:?}");
        assert_eq!(feed(bytes, &every, want, &limits), Err(Malformed { offset, reason }), "{bytes:?} byte by byte");
    }
}

#[test]
fn a_line_may_be_just_as_long_as_the_limit() {
    let limits = Limits { most_line_bytes: 8, most_lead_bytes: 0 };
    for line in [&b"12345678\n"[..], b"12345678\r\n"] {
        assert_eq!(feed(line, &[], Want::Line, &limits).unwrap().unwrap().0, b"12345678");
    }
    assert!(feed(b"123456789\r\n", &[], Want::Line, &limits).is_err());
}

#[test]
fn text_before_a_block_only_where_it_is_allowed() {
    let limits = Limits { most_lead_bytes: 6, ..Limits::default() };
    assert_eq!(feed(b"CURVE #12hi\n", &[], BLOCK, &limits).unwrap(), Some((b"hi".to_vec(), 12)));
    assert!(feed(b"CURVES #12hi\n", &[], BLOCK, &limits).is_err());
    assert!(whole(b"CURVE #12hi\n", BLOCK).is_err());
}

#[test]
fn the_hint_is_what_is_left_but_never_what_a_length_claims() {
    let mut progress = ScanState::new();
    let limits = Limits::default();
    assert_eq!(scan(b"#210abc", &mut progress, BLOCK, &limits), Ok(Scan::NeedMore { at_least: 8 }));
    let huge = Want::Block { most_bytes: usize::MAX };
    let mut progress = ScanState::new();
    assert_eq!(scan(b"#9999999999", &mut progress, huge, &limits), Ok(Scan::NeedMore { at_least: MOST_HINT }));
}

#[test]
fn a_shortened_buffer_starts_afresh() {
    let mut progress = ScanState::new();
    let limits = Limits::default();
    assert_eq!(scan(b"\"abc", &mut progress, Want::Line, &limits), Ok(Scan::NeedMore { at_least: 1 }));
    assert_eq!(scan(b"a\n", &mut progress, Want::Line, &limits), Ok(Scan::Frame { body: 0..1, consumed: 2 }));
    assert_eq!(progress, ScanState::new());
}

/// A literal reply with `noise` at every place of the data.
fn blocks() -> impl Strategy<Value = Vec<u8>> {
    prop::collection::vec(prop_oneof![Just(b'\n'), Just(b'#'), Just(b'"'), Just(b'\r'), any::<u8>()], 0..64)
}

proptest! {
    #[test]
    fn any_cut_of_a_block_gives_the_same(data in blocks(), cuts in prop::collection::vec(0_usize..80, 0..6)) {
        let digits = data.len().to_string();
        let mut bytes = format!("#{}{digits}", digits.len()).into_bytes();
        bytes.extend(&data);
        bytes.extend(b"\n1.0\n");
        let mut cuts = cuts;
        cuts.sort_unstable();
        let found = feed(&bytes, &cuts, BLOCK, &Limits::default()).unwrap().unwrap();
        prop_assert_eq!(&found.0, &data);
        prop_assert_eq!(found.1, bytes.len() - 4);
        // Every prefix of it is not yet a reply, and no fault.
        for end in 0..found.1 {
            prop_assert_eq!(whole(&bytes[..end], BLOCK), Ok(None));
        }
    }

    #[test]
    fn any_cut_of_any_bytes_gives_the_same(
        bytes in prop::collection::vec(prop_oneof![Just(b'\n'), Just(b'#'), Just(b'"'), Just(b'2'), Just(b','), any::<u8>()], 0..80),
        cuts in prop::collection::vec(0_usize..80, 0..80),
        block in any::<bool>(),
        most_line_bytes in 0_usize..40,
        most_lead_bytes in 0_usize..10,
    ) {
        let limits = Limits { most_line_bytes, most_lead_bytes };
        let want = if block { Want::Block { most_bytes: 30 } } else { Want::Line };
        let mut cuts = cuts;
        cuts.sort_unstable();
        let once = feed(&bytes, &[], want, &limits);
        prop_assert_eq!(feed(&bytes, &cuts, want, &limits), once.clone());
        if let Ok(Some((body, consumed))) = once {
            prop_assert!(consumed <= bytes.len() && body.len() < consumed);
        }
    }

    #[test]
    fn any_buffers_in_any_order_never_panic(buffers in prop::collection::vec(prop::collection::vec(any::<u8>(), 0..20), 0..10), block in any::<bool>()) {
        let mut progress = ScanState::new();
        for (index, buffer) in buffers.iter().enumerate() {
            let want = if block == (index % 2 == 0) { BLOCK } else { Want::Line };
            if let Ok(Scan::Frame { body, consumed }) = scan(buffer, &mut progress, want, &Limits::default()) {
                prop_assert!(body.start <= body.end && body.end <= consumed && consumed <= buffer.len());
            }
        }
    }
}
