//! The server against literal messages, as IVI-6.1 has them (from memory), over in-memory pipes.

use std::time::Duration;

use proptest::prelude::*;
use tokio::io::{AsyncReadExt, AsyncWriteExt, DuplexStream, duplex};

use super::*;
use crate::scenario::Kind;
use crate::server::tests::device;

fn server(kind: Kind) -> Arc<Server> {
    Arc::new(Server::new(device(kind)))
}

fn connect(server: &Arc<Server>) -> DuplexStream {
    let (near, far) = duplex(1 << 20);
    let server = Arc::clone(server);
    tokio::spawn(async move { server.converse(far).await });
    near
}

async fn say(stream: &mut DuplexStream, kind: u8, control: u8, parameter: u32, payload: &[u8]) {
    stream.write_all(&Frame::new(kind, control, parameter).with(payload).bytes()).await.unwrap();
}

async fn hear(stream: &mut DuplexStream) -> Frame {
    let Got::Frame(frame) = tokio::time::timeout(Duration::from_secs(60), wire::read(stream)).await.unwrap().unwrap()
    else {
        panic!("no message")
    };
    frame
}

/// Both connections of a client.
struct Client {
    sync: DuplexStream,
    other: DuplexStream,
}

impl Client {
    async fn new(server: &Arc<Server>) -> Self {
        let (mut sync, mut other) = (connect(server), connect(server));
        say(&mut sync, kind::INITIALIZE, 0, 0x0100_5858, b"hislip0").await;
        let welcome = hear(&mut sync).await;
        assert_eq!((welcome.kind, welcome.control, welcome.parameter >> 16), (kind::INITIALIZE_RESPONSE, 0, 0x0100));
        say(&mut other, kind::ASYNC_INITIALIZE, 0, welcome.parameter & 0xFFFF, b"").await;
        assert_eq!(hear(&mut other).await.kind, kind::ASYNC_INITIALIZE_RESPONSE);
        Self { sync, other }
    }

    async fn tell(&mut self, id: u32, delivered: u8, text: &[u8]) {
        say(&mut self.sync, kind::DATA_END, delivered, id, text).await;
    }

    async fn replied(&mut self, id: u32, text: &str) {
        assert_eq!(hear(&mut self.sync).await, Frame::new(kind::DATA_END, 0, id).with(text));
    }

    async fn asked(&mut self, kind: u8, control: u8, parameter: u32, payload: &[u8]) -> Frame {
        say(&mut self.other, kind, control, parameter, payload).await;
        hear(&mut self.other).await
    }

    async fn status(&mut self, delivered: u8) -> u8 {
        let answer = self.asked(kind::ASYNC_STATUS_QUERY, delivered, 0xFFFF_FF00, b"").await;
        assert_eq!(answer.kind, kind::ASYNC_STATUS_RESPONSE);
        answer.control
    }
}

#[tokio::test]
async fn literal_bytes_of_a_whole_conversation() {
    let server = server(Kind::Switch);
    let (mut sync, mut other) = (connect(&server), connect(&server));
    let exchange = async |stream: &mut DuplexStream, sent: &[u8], expected: &[u8]| {
        stream.write_all(sent).await.unwrap();
        let mut found = vec![0; expected.len()];
        stream.read_exact(&mut found).await.unwrap();
        assert_eq!(found, expected);
    };
    // A client of version 2.0 is answered with 1.0, the lower of the two.
    let hello = b"HS\0\0\x02\x00XX\0\0\0\0\0\0\0\x07hislip0";
    exchange(&mut sync, hello, b"HS\x01\0\x01\x00\x00\x01\0\0\0\0\0\0\0\0").await;
    exchange(&mut other, b"HS\x11\0\0\0\0\x01\0\0\0\0\0\0\0\0", b"HS\x12\0\0\0ZZ\0\0\0\0\0\0\0\0").await;
    let sizes = b"HS\x0f\0\0\0\0\0\0\0\0\0\0\0\0\x08\0\0\0\0\0\0\0\x14";
    exchange(&mut other, sizes, b"HS\x10\0\0\0\0\0\0\0\0\0\0\0\0\x08\0\0\0\0\0\x04\0\0").await;
    // Twenty bytes a message leave four for the payload; each piece has the number of the request.
    let ask = b"HS\x07\0\xff\xff\xff\x00\0\0\0\0\0\0\0\x06*IDN?\n";
    let replies = [
        b"HS\x06\0\xff\xff\xff\x00\0\0\0\0\0\0\0\x04A,B,".as_slice(),
        b"HS\x07\0\xff\xff\xff\x00\0\0\0\0\0\0\0\x04C,D\n",
    ];
    exchange(&mut sync, ask, &replies.concat()).await;
}

#[tokio::test]
async fn a_message_ends_with_its_last_part_or_with_a_line() {
    let mut client = Client::new(&server(Kind::Switch)).await;
    say(&mut client.sync, kind::DATA, 0, 0xFFFF_FF00, b"*ES").await;
    client.tell(0xFFFF_FF02, 0, b"E 4;*ESE?").await;
    client.replied(0xFFFF_FF02, "4\n").await;
    client.tell(0xFFFF_FF04, 1, b"*ESE?\n*TST?").await;
    client.replied(0xFFFF_FF04, "4\n0\n").await;
}

#[tokio::test]
async fn a_query_whose_reply_was_not_taken_is_interrupted_by_the_next() {
    // 488.2, 6.3.2.3 (from memory): -410, and the reply is no more.
    let mut client = Client::new(&server(Kind::Switch)).await;
    client.tell(0xFFFF_FF00, 0, b"*CLS;*TST?\n").await;
    client.replied(0xFFFF_FF00, "0\n").await;
    assert_eq!(client.status(0).await & 0x10, 0x10, "a reply waits as long as nobody says that it was taken");
    client.tell(0xFFFF_FF02, 0, b"SYST:ERR?\n").await;
    assert_eq!(hear(&mut client.sync).await, Frame::new(kind::INTERRUPTED, 0, 0xFFFF_FF02));
    assert_eq!(hear(&mut client.other).await, Frame::new(kind::ASYNC_INTERRUPTED, 0, 0xFFFF_FF02));
    client.replied(0xFFFF_FF02, "-410,\"Query INTERRUPTED\"\n").await;
    assert_eq!(client.status(1).await & 0x10, 0, "taken");
}

#[tokio::test]
async fn a_device_clear_ends_a_wait_and_everything_under_way() {
    let mut client = Client::new(&server(Kind::Scope)).await;
    client.tell(0xFFFF_FF00, 0, b"TRIG:SOUR EXT;:SWE:POIN 10;*CLS;:INIT;*OPC?\n").await;
    client.tell(0xFFFF_FF02, 0, b"*ESE 4").await;
    let cleared = client.asked(kind::ASYNC_DEVICE_CLEAR, 0, 0, b"").await;
    assert_eq!(cleared.kind, kind::ASYNC_DEVICE_CLEAR_ACKNOWLEDGE);
    say(&mut client.sync, kind::DATA, 0, 0xFFFF_FF04, b"*ESE 8").await;
    say(&mut client.sync, kind::DEVICE_CLEAR_COMPLETE, 1, 0, b"").await;
    // No overlap mode, though it was asked for.
    assert_eq!(hear(&mut client.sync).await, Frame::new(kind::DEVICE_CLEAR_ACKNOWLEDGE, 0, 0));
    client.tell(0xFFFF_FF00, 0, b"*ESE?;:STAT:OPER:COND?\n").await;
    let reply = String::from_utf8(hear(&mut client.sync).await.payload).unwrap();
    let condition: u16 = reply.trim_end().strip_prefix("0;").unwrap().parse().unwrap();
    // It still sweeps, or waits for its trigger by now: a device clear is about messages, not about acquisitions.
    assert!(matches!(condition, 24 | 32), "{condition}");
}

#[tokio::test]
async fn service_is_asked_for_when_an_enabled_bit_comes_up() {
    let server = server(Kind::Scope);
    let (mut client, mut second) = (Client::new(&server).await, Client::new(&server).await);
    client.tell(0xFFFF_FF00, 0, b"*CLS;*SRE 4;:NONE\n").await;
    // Bit 2: the error queue holds something; bit 6: service is requested.
    for one in [&mut client, &mut second] {
        assert_eq!(hear(&mut one.other).await, Frame::new(kind::ASYNC_SERVICE_REQUEST, 0x44, 0));
        assert_eq!((one.status(0).await, one.status(0).await), (0x44, 0x04), "reading takes the request back");
    }
    client.tell(0xFFFF_FF02, 0, b"*CLS;*SRE 16\n").await;
    client.tell(0xFFFF_FF04, 0, b"*TST?\n").await;
    client.replied(0xFFFF_FF04, "0\n").await;
    assert_eq!(hear(&mut client.other).await, Frame::new(kind::ASYNC_SERVICE_REQUEST, 0x50, 0));
    assert_eq!(second.status(0).await, 0, "the reply is the other's");
}

#[tokio::test(start_paused = true)]
async fn locks_keep_others_out_and_end_with_their_client() {
    use super::locks::answer::{DONE, INVALID, REFUSED, SHARED_RELEASED};
    let server = server(Kind::Switch);
    let (mut one, mut two) = (Client::new(&server).await, Client::new(&server).await);
    let lock = async |client: &mut Client, control, within, name: &[u8]| {
        let answer = client.asked(kind::ASYNC_LOCK, control, within, name).await;
        assert_eq!(answer.kind, kind::ASYNC_LOCK_RESPONSE);
        answer.control
    };
    assert_eq!(lock(&mut one, 0, 0, b"").await, INVALID);
    assert_eq!(lock(&mut one, 1, 0, b"fan").await, DONE);
    assert_eq!(lock(&mut two, 1, 0, b"fan").await, DONE);
    assert_eq!(lock(&mut two, 1, 0, b"fan").await, INVALID);
    assert_eq!(lock(&mut two, 1, 500, b"").await, DONE, "on top of the shared one");
    let info = one.asked(kind::ASYNC_LOCK_INFO, 0, 0, b"").await;
    assert_eq!((info.kind, info.control, info.parameter), (kind::ASYNC_LOCK_INFO_RESPONSE, 1, 2));
    let started = tokio::time::Instant::now();
    assert_eq!(lock(&mut one, 1, 500, b"").await, REFUSED);
    assert_eq!(started.elapsed(), Duration::from_millis(500));
    // What is not admitted waits, and a clear ends the wait.
    one.tell(0xFFFF_FF00, 0, b"*ESE 4\n").await;
    two.tell(0xFFFF_FF00, 0, b"*ESE?\n").await;
    two.replied(0xFFFF_FF00, "0\n").await;
    assert_eq!(lock(&mut two, 0, 0, b"").await, DONE);
    assert_eq!(lock(&mut two, 0, 0, b"").await, SHARED_RELEASED);
    assert_eq!(lock(&mut one, 1, 0, b"").await, DONE);
    one.tell(0xFFFF_FF02, 0, b"*ESE?\n").await;
    one.replied(0xFFFF_FF02, "4\n").await;
    two.tell(0xFFFF_FF02, 1, b"*ESE?\n").await;
    drop(one);
    two.replied(0xFFFF_FF02, "4\n").await;
}

#[tokio::test]
async fn what_is_not_known_is_answered_and_harms_nothing() {
    let mut client = Client::new(&server(Kind::Switch)).await;
    for (number, code) in [(26, 1), (127, 1), (128, 3), (255, 3), (kind::INITIALIZE_RESPONSE, 1)] {
        say(&mut client.sync, number, 0, 0, b"whatever").await;
        let error = hear(&mut client.sync).await;
        assert_eq!((error.kind, error.control), (kind::ERROR, code), "{number}");
        let error = client.asked(number, 0, 0, b"whatever").await;
        assert_eq!((error.kind, error.control), (kind::ERROR, code), "{number}");
    }
    let error = client.asked(kind::ASYNC_LOCK, 7, 0, b"").await;
    assert_eq!((error.kind, error.control), (kind::ERROR, 2), "control code");
    say(&mut client.sync, kind::DATA_END, 0, 0xFFFF_FF00, &vec![b' '; wire::LARGEST]).await;
    let error = hear(&mut client.sync).await;
    assert_eq!((error.kind, error.control), (kind::ERROR, 4), "too large");
    client.tell(0xFFFF_FF02, 0, b"*TST?\n").await;
    client.replied(0xFFFF_FF02, "0\n").await;
}

#[tokio::test]
async fn what_cannot_be_gone_on_with_is_fatal() {
    let start = |kind: u8, parameter: u32, payload: &[u8]| Frame::new(kind, 0, parameter).with(payload).bytes();
    for (bytes, code) in [
        (b"*IDN?\n".to_vec(), 1),
        (start(kind::DATA_END, 0xFFFF_FF00, b"*IDN?\n"), 2),
        (start(kind::ASYNC_INITIALIZE, 77, b""), 3),
        (start(kind::ASYNC_STATUS_QUERY, 0, b""), 3),
        (start(kind::INITIALIZE, 0x0100_0000, b"hislip9"), 0),
        ([start(kind::INITIALIZE, 0x0100_0000, b""), start(kind::DATA_END, 0, b"*IDN?\n")].concat(), 2),
    ] {
        let mut stream = connect(&server(Kind::Switch));
        stream.write_all(&bytes).await.unwrap();
        let mut frame = hear(&mut stream).await;
        if frame.kind == kind::INITIALIZE_RESPONSE {
            frame = hear(&mut stream).await;
        }
        assert_eq!((frame.kind, frame.control), (kind::FATAL_ERROR, code), "{bytes:?}");
        assert_eq!(stream.read(&mut [0; 1]).await.unwrap(), 0, "closed");
    }
    // On one connection it ends both.
    let mut client = Client::new(&server(Kind::Switch)).await;
    client.other.write_all(b"what?").await.unwrap();
    let error = hear(&mut client.other).await;
    assert_eq!((error.kind, error.control), (kind::FATAL_ERROR, 1));
    assert_eq!(client.sync.read(&mut [0; 1]).await.unwrap(), 0, "closed");
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn random_messages_do_no_harm(
        messages in proptest::collection::vec((any::<bool>(), 0_u8..30, 0_u8..3, "[*A-Z?;\n]{0,12}"), 0..20),
    ) {
        let runtime = tokio::runtime::Builder::new_current_thread().enable_time().start_paused(true).build().unwrap();
        runtime.block_on(async {
            let server = server(Kind::Switch);
            let mut client = Client::new(&server).await;
            for (on_sync, number, control, text) in messages {
                let stream = if on_sync { &mut client.sync } else { &mut client.other };
                say(stream, number, control, 5, text.as_bytes()).await;
            }
            drop(client);
            // Whatever that client did, the next is served once its lock is gone.
            let mut client = Client::new(&server).await;
            client.tell(0xFFFF_FF00, 0, b"*TST?\n").await;
            client.replied(0xFFFF_FF00, "0\n").await;
        });
    }
}
