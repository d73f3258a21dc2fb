//! Replies as each fault of the wire sends them, byte by byte.

use super::*;
use crate::faults::Struck;

/// What becomes of `reply` under a fault in a scenario's words.
fn under(fault: &str, reply: &[u8]) -> Vec<Piece> {
    let spec = toml::from_str(&format!("instrument = \"scope\"\nwhat = {fault}")).unwrap();
    pieces(&[Struck { number: 1, spec, offset: None, seed: 3 }], reply.to_vec())
}

fn bytes(bytes: &[u8]) -> Piece {
    Piece::Bytes(bytes.to_vec())
}

const BLOCK: &[u8] = b"WF1 #210abcdefghij\n";

#[test]
fn blocks_are_found() {
    assert_eq!(block(BLOCK), Some(Block { head: 4..8, contents: 8..18 }));
    assert_eq!(block(b"#10\n"), Some(Block { head: 0..3, contents: 3..3 }));
    for none in [&b"1\n"[..], b"#", b"#1", b"#0abc\n", b"#15abc", b"#1x", b"#H1F\n"] {
        assert_eq!(block(none), None, "{none:?}");
    }
}

#[test]
fn the_connection_is_cut() {
    assert_eq!(under("\"cut\"\nbytes = 12", BLOCK), [bytes(b"WF1 #210abcd"), Piece::Close]);
    assert_eq!(under("\"cut\"\nbytes = 0", BLOCK), [bytes(b""), Piece::Close]);
    assert_eq!(under("\"cut\"", b"12345\n"), [bytes(b"123"), Piece::Close]);
    assert_eq!(under("\"cut\"\nbytes = 100", b"12345\n"), [bytes(b"12345\n"), Piece::Close]);
}

#[test]
fn a_count_of_bytes_cuts_at_the_byte() {
    let spec = toml::from_str("instrument = \"scope\"\nwhat = \"cut\"\nwhen = { bytes = 4 }").unwrap();
    let strike = Struck { number: 1, spec, offset: Some(4), seed: 3 };
    assert_eq!(pieces(&[strike], b"12345\n".to_vec()), [bytes(b"1234"), Piece::Close]);
}

#[test]
fn it_stalls_and_it_drips() {
    let pause = Piece::Pause(Duration::from_millis(250));
    let stalled = [bytes(b"12"), pause.clone(), bytes(b"345\n")];
    assert_eq!(under("\"stall\"\nseconds = 0.25\nbytes = 2", b"12345\n"), stalled);
    let dripping = [bytes(b"1234"), pause.clone(), bytes(b"5\n"), pause];
    assert_eq!(under("\"drip\"\nseconds = 0.25\nbytes = 4", b"12345\n"), dripping);
}

#[test]
fn lengths_are_wrong() {
    assert_eq!(under("\"length-short\"\nbytes = 3", BLOCK), [bytes(b"WF1 #17abcdefghij\n")]);
    assert_eq!(under("\"length-short\"", BLOCK), [bytes(b"WF1 #15abcdefghij\n")]);
    assert_eq!(under("\"length-long\"\nbytes = 5", BLOCK), [bytes(b"WF1 #215abcdefghij\n")]);
    assert_eq!(under("\"length-long\"", BLOCK), [bytes(b"WF1 #41010abcdefghij\n")]);
    assert_eq!(under("\"length-absurd\"", BLOCK), [bytes(b"WF1 #9999999999abcdefghij\n")]);
    assert_eq!(under("\"truncate\"\nbytes = 4", BLOCK), [bytes(b"WF1 #210abcdef\n")]);
    assert_eq!(under("\"truncate\"", b"#15abcde\r\n"), [bytes(b"#15ab\r\n")]);
}

#[test]
fn what_does_not_belong_there() {
    assert_eq!(under("\"junk\"", b"12\r\n"), [bytes(b"12 ~+?9,x\r\n")]);
    assert_eq!(under("\"junk\"", BLOCK), [bytes(b"WF1 #210abcdefghij ~+?9,x\n")]);
    assert_eq!(under("\"twice\"", b"12\n"), [bytes(b"12\n"), bytes(b"12\n")]);
    let garbage = under("\"garbage\"\nbytes = 8", b"12\n");
    let [Piece::Bytes(found)] = garbage.as_slice() else { panic!("{garbage:?}") };
    assert_eq!((found.len(), &found[8..]), (11, &b"12\n"[..]));
    assert_eq!(under("\"garbage\"\nbytes = 8", b"12\n"), garbage, "the same chance every time");
}

#[test]
fn replies_that_do_not_come_when_they_should() {
    assert_eq!(under("\"mute\"", b"12\n"), []);
    assert_eq!(under("\"late\"", b"12\n"), [Piece::Keep { bytes: b"12\n".to_vec(), across: false }]);
    assert_eq!(under("\"late\"\nacross = true", b"12\n"), [Piece::Keep { bytes: b"12\n".to_vec(), across: true }]);
    assert_eq!(under("\"refuse\"", b"12\n"), [Piece::Close]);
    assert_eq!(under("\"reboot\"", b"12\n"), [Piece::Reboot]);
}

#[test]
fn what_befalls_the_instrument_comes_behind_the_reply() {
    assert_eq!(under("\"meddle\"\nsend = \"*RST\"", b"1\n"), [bytes(b"1\n"), Piece::Run(b"*RST".to_vec())]);
    assert_eq!(under("\"overflow\"", b"1\n"), [bytes(b"1\n"), Piece::Overflow]);
}
