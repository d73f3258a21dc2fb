//! Response messages against IEEE 488.2 chapter 8 (clauses from memory).

use super::*;

#[test]
fn answers_are_joined_and_ended() {
    // 8.4.1 and 8.5: `;` between, NL behind.
    let mut reply = Reply::default();
    assert!(!reply.waits());
    reply.add(b"1");
    reply.add(b"2");
    assert!(reply.waits());
    assert_eq!(reply.finish(), b"1;2\n");
    assert_eq!(Reply::default().finish(), b"", "no query, no reply");
}

#[test]
fn blocks_carry_their_length() {
    // 8.7.9
    let mut reply = Reply::default();
    reply.add_block(b"\n;\"");
    reply.add_block(&[7; 12]);
    assert_eq!(reply.finish(), b"#13\n;\";#212\x07\x07\x07\x07\x07\x07\x07\x07\x07\x07\x07\x07\n");
    let mut empty = Reply::default();
    empty.add_block(b"");
    assert_eq!(empty.finish(), b"#10\n");
}

#[test]
fn numbers_have_a_point_and_a_signed_exponent() {
    // 8.7.4: NR3
    for (value, text) in [
        (0.0, "0.0E+0"),
        (1.0, "1.0E+0"),
        (-1.25e-9, "-1.25E-9"),
        (1e6, "1.0E+6"),
        (29.0 / 100.0 * 100.0, "2.9E+1"),
        (f64::NAN, "9.91E+37"),
        (f64::NEG_INFINITY, "-9.9E+37"),
    ] {
        assert_eq!(nr3(value), text);
    }
}
