//! Headers as literal bytes, and there and back.

#![allow(clippy::unwrap_used)]

use proptest::prelude::*;

use super::*;

#[test]
fn the_bytes_of_a_header_stand_where_the_standard_has_them() {
    // IVI-6.1, message header (from memory): "HS", type, control code, parameter, payload length, high bytes first.
    let data = Header::new(Kind::DataEnd).control(1).parameter(0xFFFF_FF02);
    assert_eq!(data.message(b"*IDN?\n"), b"HS\x07\x01\xff\xff\xff\x02\x00\x00\x00\x00\x00\x00\x00\x06*IDN?\n");
    let bytes = b"HS\x14\x50\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00";
    assert_eq!(Header::read(bytes), Some(Header::new(Kind::AsyncServiceRequest).control(0x50)));
    assert_eq!(Header::read(b"HT\x14\x50\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00"), None);
}

#[test]
fn the_types_have_the_standards_numbers() {
    // IVI-6.1, table of message types (from memory).
    for (number, kind) in [
        (0, Kind::Initialize),
        (2, Kind::FatalError),
        (3, Kind::Error),
        (6, Kind::Data),
        (7, Kind::DataEnd),
        (9, Kind::DeviceClearAcknowledge),
        (13, Kind::Interrupted),
        (17, Kind::AsyncInitialize),
        (21, Kind::AsyncStatusQuery),
        (25, Kind::AsyncLockInfoResponse),
        (26, Kind::Unknown(26)),
        (128, Kind::Unknown(128)),
    ] {
        assert_eq!(Kind::from(number), kind);
    }
}

proptest! {
    #[test]
    fn written_and_read_is_the_same(kind: u8, control: u8, parameter: u32, payload in proptest::collection::vec(any::<u8>(), 0..40)) {
        prop_assert_eq!(u8::from(Kind::from(kind)), kind);
        prop_assert_eq!(u8::from(ErrorCode::from(control)), control);
        let header = Header::new(kind.into()).control(control).parameter(parameter);
        let bytes = header.message(&payload);
        let read = Header::read(bytes[..HEADER_BYTES].try_into().unwrap()).unwrap();
        prop_assert_eq!(read, Header { length: payload.len() as u64, ..header });
        prop_assert_eq!(&bytes[HEADER_BYTES..], payload.as_slice());
    }
}
