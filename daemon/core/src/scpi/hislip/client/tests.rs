//! The client against literal bytes: how a connection is made, used, cleared, and given up.

#![allow(clippy::unwrap_used)]

use proptest::prelude::*;

use super::super::frame::{Scan, ScanState, scan};
use super::super::header::{ErrorCode, FatalCode};
use super::*;

/// Feeds whole messages as the wire would bring them.
fn feed(client: &mut Client, channel: Channel, mut bytes: &[u8]) -> Result<Vec<Event>, Fault> {
    let (mut state, mut events) = (ScanState::new(), Vec::new());
    loop {
        let event = match scan(bytes, &mut state)? {
            Scan::NeedMore { .. } => return Ok(events),
            Scan::Head(header) => {
                bytes = &bytes[HEADER_BYTES..];
                client.take(channel, Piece::Head(header))?
            }
            Scan::Payload { bytes: count, last } => {
                let (piece, rest) = bytes.split_at(count);
                bytes = rest;
                client.take(channel, Piece::Payload { bytes: piece, last })?
            }
        };
        events.extend(event);
    }
}

fn sync(client: &mut Client, kind: Kind, control: u8, id: u32, payload: &[u8]) -> Result<Vec<Event>, Fault> {
    feed(client, Channel::Sync, &Header::new(kind).control(control).parameter(id).message(payload))
}

fn asynchronous(client: &mut Client, kind: Kind, control: u8, payload: &[u8]) -> Result<Vec<Event>, Fault> {
    feed(client, Channel::Async, &Header::new(kind).control(control).message(payload))
}

fn outputs(client: &mut Client) -> Vec<(Channel, Vec<u8>)> {
    std::iter::from_fn(|| client.next_output()).collect()
}

fn size(bytes: u64) -> Vec<u8> {
    bytes.to_be_bytes().to_vec()
}

fn ready_with(most: u64) -> Client {
    let mut client = Client::new("hislip0");
    outputs(&mut client);
    sync(&mut client, Kind::InitializeResponse, 0, 0x0100_0007, b"").unwrap();
    asynchronous(&mut client, Kind::AsyncInitializeResponse, 0, b"").unwrap();
    let events = asynchronous(&mut client, Kind::AsyncMaximumMessageSizeResponse, 0, &size(most)).unwrap();
    assert_eq!(events, [Event::Ready]);
    outputs(&mut client);
    client
}

fn ready() -> Client {
    ready_with(1 << 20)
}

#[test]
fn a_connection_is_made_in_the_standards_order() {
    // IVI-6.1, initialization (from memory): version 1.0 and the maker in the parameter, the sub-address as payload.
    let mut client = Client::new("hislip0");
    let first = b"HS\x00\x00\x01\x00XX\x00\x00\x00\x00\x00\x00\x00\x07hislip0".to_vec();
    assert_eq!(outputs(&mut client), [(Channel::Sync, first)]);
    let events = feed(&mut client, Channel::Sync, b"HS\x01\x00\x01\x00\x12\x34\0\0\0\0\0\0\0\0").unwrap();
    assert_eq!(events, [Event::OpenAsync]);
    let second = b"HS\x11\x00\x00\x00\x12\x34\0\0\0\0\0\0\0\0".to_vec();
    assert_eq!(outputs(&mut client), [(Channel::Async, second)]);
    assert_eq!(feed(&mut client, Channel::Async, b"HS\x12\x00\0\0ZZ\0\0\0\0\0\0\0\0").unwrap(), []);
    let sizes = b"HS\x0f\x00\0\0\0\0\0\0\0\0\0\0\0\x08\0\0\0\0\0\x10\0\0".to_vec();
    assert_eq!(outputs(&mut client), [(Channel::Async, sizes)]);
    assert!(!client.ready());
    assert_eq!(client.request(b"*IDN?\n", Some(10)), Err(Fault::NotReady { doing: "a request" }));
    let answer = b"HS\x10\x00\0\0\0\0\0\0\0\0\0\0\0\x08\0\0\0\0\0\x04\0\0";
    assert_eq!(feed(&mut client, Channel::Async, answer).unwrap(), [Event::Ready]);
    assert!(client.ready());
}

#[test]
fn messages_are_numbered_in_twos_and_say_that_the_last_reply_was_taken() {
    let mut client = ready();
    for (id, delivered) in [(0xFFFF_FF00_u32, 0), (0xFFFF_FF02, 1)] {
        client.request(b"*IDN?\n", Some(100)).unwrap();
        let sent = Header::new(Kind::DataEnd).control(delivered).parameter(id).message(b"*IDN?\n");
        assert_eq!(outputs(&mut client), [(Channel::Sync, sent)]);
        assert_eq!(sync(&mut client, Kind::Data, 0, id, b"Greenhouse,").unwrap(), []);
        let events = sync(&mut client, Kind::DataEnd, 0, id, b"Fan\n").unwrap();
        assert_eq!(events, [Event::Reply(b"Greenhouse,Fan\n".to_vec())]);
    }
    // A command without a reply leaves nothing to be taken.
    client.request(b"*CLS\n", None).unwrap();
    client.request(b"*RST\n", None).unwrap();
    let controls: Vec<u8> = outputs(&mut client).iter().map(|(_, bytes)| bytes[3]).collect();
    assert_eq!(controls, [1, 0]);
}

#[test]
fn a_long_message_goes_in_pieces_that_the_server_takes() {
    let mut client = ready_with(20);
    client.request(b"VOLT 48.0\n", Some(9)).unwrap();
    let bytes = |kind, id, text: &[u8]| (Channel::Sync, Header::new(kind).parameter(id).message(text));
    assert_eq!(
        outputs(&mut client),
        [
            bytes(Kind::Data, 0xFFFF_FF00, b"VOLT"),
            bytes(Kind::Data, 0xFFFF_FF02, b" 48."),
            bytes(Kind::DataEnd, 0xFFFF_FF04, b"0\n"),
        ]
    );
    // The reply carries the number of the message that ended the request.
    assert_eq!(sync(&mut client, Kind::DataEnd, 0, 0xFFFF_FF04, b"").unwrap(), [Event::Reply(Vec::new())]);
}

#[test]
fn a_late_reply_is_known_by_its_number() {
    let mut client = ready();
    client.request(b"A?\n", Some(100)).unwrap();
    sync(&mut client, Kind::DataEnd, 0, 0xFFFF_FF00, b"a\n").unwrap();
    client.request(b"B?\n", Some(100)).unwrap();
    // Data whose request is not known yet are ours until the end says otherwise.
    assert_eq!(sync(&mut client, Kind::Data, 0, NO_ID, b"late").unwrap(), []);
    let stale = sync(&mut client, Kind::DataEnd, 0, 0xFFFF_FF00, b"r\n").unwrap();
    assert_eq!(stale, [Event::Stale { id: 0xFFFF_FF00 }]);
    assert_eq!(sync(&mut client, Kind::DataEnd, 0, NO_ID, b"x\n").unwrap(), [Event::Stale { id: NO_ID }]);
    assert_eq!(sync(&mut client, Kind::Data, 0, NO_ID, b"b").unwrap(), []);
    assert_eq!(sync(&mut client, Kind::DataEnd, 0, 0xFFFF_FF02, b"\n").unwrap(), [Event::Reply(b"b\n".to_vec())]);
    let twice = sync(&mut client, Kind::DataEnd, 0, 0xFFFF_FF02, b"b\n");
    assert_eq!(twice, Err(Fault::Unsolicited { bytes: 2 }));
}

#[test]
fn a_reply_longer_than_asked_for_is_refused_on_its_header() {
    let mut client = ready();
    client.request(b"A?\n", Some(4)).unwrap();
    sync(&mut client, Kind::Data, 0, 0xFFFF_FF00, b"abc").unwrap();
    let head = Header { length: 1 << 60, ..Header::new(Kind::Data).parameter(0xFFFF_FF00) };
    let fault = client.take(Channel::Sync, Piece::Head(head)).unwrap_err();
    assert_eq!(fault, Fault::ReplyTooLong { declared: (1 << 60) + 3, most: 4 });
    assert!(fault.curable());
    // What follows of it is let go by, and the clear that comes next finds the end of it.
    client.take(Channel::Sync, Piece::Payload { bytes: &[0; 100], last: false }).unwrap();
    assert_eq!(client.reply, b"abc");
}

#[test]
fn a_device_clear_empties_both_directions_and_numbers_anew() {
    // IVI-6.1, device clear transaction (from memory).
    let mut client = ready();
    client.request(b"A?\n", Some(100)).unwrap();
    outputs(&mut client);
    let head = Header { length: 6, ..Header::new(Kind::DataEnd).parameter(0xFFFF_FF00) };
    client.take(Channel::Sync, Piece::Head(head)).unwrap();
    client.take(Channel::Sync, Piece::Payload { bytes: b"lat", last: false }).unwrap();
    client.clear().unwrap();
    assert_eq!(outputs(&mut client), [(Channel::Async, Header::new(Kind::AsyncDeviceClear).message(b""))]);
    assert_eq!(client.clear(), Err(Fault::NotReady { doing: "a device clear" }));
    assert_eq!(client.take(Channel::Sync, Piece::Payload { bytes: b"e1\n", last: true }), Ok(None));
    assert_eq!(asynchronous(&mut client, Kind::AsyncDeviceClearAcknowledge, 0, b"").unwrap(), []);
    assert_eq!(outputs(&mut client), [(Channel::Sync, Header::new(Kind::DeviceClearComplete).message(b""))]);
    assert_eq!(sync(&mut client, Kind::DataEnd, 0, 0xFFFF_FF00, b"late2\n").unwrap(), []);
    assert_eq!(sync(&mut client, Kind::Interrupted, 0, 0, b"").unwrap(), []);
    assert_eq!(sync(&mut client, Kind::DeviceClearAcknowledge, 0, 0, b"").unwrap(), [Event::Cleared]);
    client.request(b"B?\n", Some(100)).unwrap();
    let sent = Header::new(Kind::DataEnd).parameter(0xFFFF_FF00).message(b"B?\n");
    assert_eq!(outputs(&mut client), [(Channel::Sync, sent)]);
    assert_eq!(sync(&mut client, Kind::DataEnd, 0, 0xFFFF_FF00, b"b").unwrap(), [Event::Reply(b"b".to_vec())]);
}

#[test]
fn a_server_that_prefers_overlap_is_asked_for_synchronised_mode() {
    for (answer, expected) in [(0, Ok(vec![Event::Ready])), (1, Err(Fault::OverlapOnly))] {
        let mut client = Client::new("hislip0");
        sync(&mut client, Kind::InitializeResponse, 1, 7, b"").unwrap();
        asynchronous(&mut client, Kind::AsyncInitializeResponse, 0, b"").unwrap();
        outputs(&mut client);
        assert_eq!(asynchronous(&mut client, Kind::AsyncMaximumMessageSizeResponse, 0, &size(999)).unwrap(), []);
        assert_eq!(outputs(&mut client), [(Channel::Async, Header::new(Kind::AsyncDeviceClear).message(b""))]);
        asynchronous(&mut client, Kind::AsyncDeviceClearAcknowledge, 1, b"").unwrap();
        assert_eq!(sync(&mut client, Kind::DeviceClearAcknowledge, answer, 0, b""), expected);
    }
}

#[test]
fn the_second_connection_goes_past_the_first() {
    let mut client = ready();
    client.request(b"A?\n", Some(100)).unwrap();
    outputs(&mut client);
    client.ask_status().unwrap();
    let query = Header::new(Kind::AsyncStatusQuery).parameter(0xFFFF_FF00).message(b"");
    assert_eq!(outputs(&mut client), [(Channel::Async, query)]);
    assert_eq!(asynchronous(&mut client, Kind::AsyncStatusResponse, 0x10, b"").unwrap(), [Event::Status(0x10)]);
    let events = asynchronous(&mut client, Kind::AsyncServiceRequest, 0x60, b"").unwrap();
    assert_eq!(events, [Event::ServiceRequest(0x60)]);
    client.lock(250).unwrap();
    client.unlock().unwrap();
    let lock = |control, parameter| Header::new(Kind::AsyncLock).control(control).parameter(parameter).message(b"");
    let sent = outputs(&mut client);
    assert_eq!(sent, [(Channel::Async, lock(1, 250)), (Channel::Async, lock(0, 0xFFFF_FF00))]);
    for (control, answer) in [(0, LockAnswer::Refused), (1, LockAnswer::Done), (3, LockAnswer::Invalid)] {
        assert_eq!(asynchronous(&mut client, Kind::AsyncLockResponse, control, b"").unwrap(), [Event::Lock(answer)]);
    }
    assert_eq!(asynchronous(&mut client, Kind::AsyncInterrupted, 0, b""), Err(Fault::Interrupted));
}

#[test]
fn messages_that_are_not_known_are_answered_and_change_nothing() {
    let mut client = ready();
    client.request(b"A?\n", Some(100)).unwrap();
    outputs(&mut client);
    for (channel, number, code) in
        [(Channel::Sync, 26, 1), (Channel::Sync, 127, 1), (Channel::Async, 128, 3), (Channel::Async, 255, 3)]
    {
        let message = Header::new(Kind::Unknown(number)).control(9).message(b"whatever");
        assert_eq!(feed(&mut client, channel, &message).unwrap(), []);
        let answers = outputs(&mut client);
        assert_eq!((answers.len(), answers[0].0, &answers[0].1[..4]), (1, channel, [b'H', b'S', 3, code].as_slice()));
    }
    assert_eq!(sync(&mut client, Kind::DataEnd, 0, 0xFFFF_FF00, b"a").unwrap(), [Event::Reply(b"a".to_vec())]);
}

#[test]
fn errors_are_told_with_their_words_and_say_whether_clearing_helps() {
    let fault = sync(&mut ready(), Kind::Error, 4, 0, b"too much\n").unwrap_err();
    assert_eq!(fault, Fault::Answered { code: ErrorCode::TooLarge, text: "too much".to_owned() });
    assert_eq!(fault.to_string(), "the instrument answered with a HiSLIP error: message too large, \"too much\"");
    assert!(fault.curable());
    let fault = asynchronous(&mut ready(), Kind::FatalError, 4, b"").unwrap_err();
    assert_eq!(fault, Fault::Fatal { code: FatalCode::TooManyClients, text: String::new() });
    assert!(!fault.curable());
    let fault = sync(&mut ready(), Kind::AsyncServiceRequest, 0, 0, b"").unwrap_err();
    assert_eq!(fault, Fault::Unexpected { kind: Kind::AsyncServiceRequest, channel: Channel::Sync });
    let mut client = Client::new("hislip0");
    sync(&mut client, Kind::InitializeResponse, 0, 0, b"").unwrap();
    asynchronous(&mut client, Kind::AsyncInitializeResponse, 0, b"").unwrap();
    let fault = asynchronous(&mut client, Kind::AsyncMaximumMessageSizeResponse, 0, &size(16)).unwrap_err();
    assert_eq!(fault, Fault::Size { size: 16 });
}

proptest! {
    #[test]
    fn no_messages_make_the_client_panic_or_keep_more_than_was_asked_for(
        messages in proptest::collection::vec(
            (any::<bool>(), 0_u8..30, 0_u8..6, prop_oneof![Just(0xFFFF_FF00), Just(NO_ID), any::<u32>()],
             proptest::collection::vec(any::<u8>(), 0..30)),
            0..30,
        ),
        made in any::<bool>(),
    ) {
        let mut client = if made { ready() } else { Client::new("hislip0") };
        for (on_sync, kind, control, id, payload) in messages {
            if client.ready() && client.awaited.is_none() {
                client.request(b"A?\n", Some(20)).unwrap();
            }
            let channel = if on_sync { Channel::Sync } else { Channel::Async };
            let message = Header::new(kind.into()).control(control).parameter(id).message(&payload);
            match feed(&mut client, channel, &message) {
                Ok(events) => for event in events {
                    if let Event::Reply(reply) = event {
                        prop_assert!(reply.len() <= 20);
                    }
                },
                Err(fault) if fault.curable() && client.ready() => client.clear().unwrap(),
                Err(fault) if fault.curable() => {}
                Err(_) => break,
            }
            prop_assert!(client.reply.len() <= 20);
            outputs(&mut client);
        }
    }
}
