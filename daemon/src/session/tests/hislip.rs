//! Sessions over HiSLIP: a time-out is cleared away, and what cannot be cleared is connected anew.

use evenpair_core::dialect::Message;
use evenpair_core::scpi::hislip::{HEADER_BYTES, Header, Kind};
use tokio::time::advance;

use super::*;

/// The instrument's ends of both connections.
pub(super) struct Server {
    pub(super) sync: DuplexStream,
    pub(super) r#async: DuplexStream,
}

pub(super) async fn hear(stream: &mut DuplexStream) -> (Header, Vec<u8>) {
    let mut head = [0; HEADER_BYTES];
    in_time(stream.read_exact(&mut head)).await.unwrap();
    let header = Header::read(&head).unwrap();
    let mut payload = vec![0; usize::try_from(header.length).unwrap()];
    in_time(stream.read_exact(&mut payload)).await.unwrap();
    (header, payload)
}

pub(super) async fn say(stream: &mut DuplexStream, header: Header, payload: &[u8]) {
    stream.write_all(&header.message(payload)).await.unwrap();
}

impl Server {
    /// Takes a connection as far as it goes before anything is asked.
    async fn opened(bench: &mut Bench, overlap: u8) -> Self {
        let mut sync = in_time(bench.peers.recv()).await.unwrap();
        let (header, device) = hear(&mut sync).await;
        assert_eq!((header.kind, device.as_slice()), (Kind::Initialize, b"hislip0".as_slice()));
        let welcome = Header::new(Kind::InitializeResponse).control(overlap).parameter(0x0100_0005);
        say(&mut sync, welcome, b"").await;
        let mut server = Self { sync, r#async: in_time(bench.peers.recv()).await.unwrap() };
        let (header, _) = hear(&mut server.r#async).await;
        assert_eq!((header.kind, header.parameter), (Kind::AsyncInitialize, 5));
        server.say_async(Kind::AsyncInitializeResponse, 0, b"").await;
        assert_eq!(hear(&mut server.r#async).await.0.kind, Kind::AsyncMaximumMessageSize);
        server.say_async(Kind::AsyncMaximumMessageSizeResponse, 0, &65536_u64.to_be_bytes()).await;
        server
    }

    pub(super) async fn greet(&mut self) {
        self.answer("*IDN?", &format!("{WHO}\n")).await;
        self.no_errors().await;
        self.told("*CLS").await;
    }

    async fn up(bench: &mut Bench) -> Self {
        let mut server = Self::opened(bench, 0).await;
        server.greet().await;
        bench.is_up().await;
        server
    }

    async fn say_async(&mut self, kind: Kind, control: u8, payload: &[u8]) {
        say(&mut self.r#async, Header::new(kind).control(control), payload).await;
    }

    /// The next message must be this line; its number.
    pub(super) async fn told(&mut self, line: &str) -> u32 {
        let (header, payload) = hear(&mut self.sync).await;
        assert_eq!(header.kind, Kind::DataEnd);
        assert_eq!(String::from_utf8(payload).unwrap(), format!("{line}\n"));
        header.parameter
    }

    pub(super) async fn reply(&mut self, id: u32, text: &[u8]) {
        say(&mut self.sync, Header::new(Kind::DataEnd).parameter(id), text).await;
    }

    async fn answer(&mut self, line: &str, text: &str) {
        let id = self.told(line).await;
        self.reply(id, text.as_bytes()).await;
    }

    pub(super) async fn no_errors(&mut self) {
        self.answer("SYSTem:ERRor?", "0,\"No error\"\n").await;
    }

    /// Waits for a device clear, says something late into it, and ends it.
    async fn cleared(&mut self, late: &[u8]) {
        self.cleared_with(0xFFFF_FF06, late).await;
    }

    pub(super) async fn cleared_with(&mut self, id: u32, late: &[u8]) {
        assert_eq!(hear(&mut self.r#async).await.0.kind, Kind::AsyncDeviceClear);
        self.reply(id, late).await;
        self.say_async(Kind::AsyncDeviceClearAcknowledge, 0, b"").await;
        assert_eq!(hear(&mut self.sync).await.0.kind, Kind::DeviceClearComplete);
        say(&mut self.sync, Header::new(Kind::DeviceClearAcknowledge), b"").await;
    }

    async fn closed(&mut self) {
        for stream in [&mut self.sync, &mut self.r#async] {
            assert_eq!(in_time(stream.read(&mut [0; 1])).await.unwrap(), 0);
        }
    }
}

fn bench() -> Bench {
    Bench::speaking(Protocol::Hislip { device: "hislip0".to_owned() }, bundled("scpi-99").unwrap())
}

pub(super) async fn up() -> (Bench, Server) {
    let mut bench = bench();
    let server = Server::up(&mut bench).await;
    (bench, server)
}

pub(super) fn counts(bench: &Bench) -> (u64, u64) {
    let watch = bench.handle.watch();
    let report = watch.borrow();
    (report.clears, report.reconnects)
}

#[tokio::test(start_paused = true)]
async fn requests_are_numbered_and_the_end_of_a_reply_needs_no_line_ending() {
    let (bench, mut server) = up().await;
    let call = bench.call(measure());
    // `*IDN?`, `SYSTem:ERRor?` and `*CLS` came before.
    assert_eq!(server.told(MEASURE).await, 0xFFFF_FF06);
    server.reply(0xFFFF_FF06, b"48").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 48);
    assert_eq!(counts(&bench), (0, 0));
}

#[tokio::test(start_paused = true)]
async fn a_reply_may_come_in_pieces_cut_anywhere() {
    let (bench, mut server) = up().await;
    let data =
        |id, last, text: &[u8]| Header::new(if last { Kind::DataEnd } else { Kind::Data }).parameter(id).message(text);
    for cut in 1..60 {
        let handle = bench.handle.clone();
        let call = Call::new(Intent::RecordData).with("channel", 1_i64);
        let reading = tokio::spawn(async move { handle.data(call, 3).await });
        let id = server.told("TRACe:DATA? CHANnel1").await;
        let wire = [data(id, false, b"#1"), data(id, false, b"6\n\"#\x00"), data(id, true, b";\xff")].concat();
        let (first, second) = wire.split_at(cut.min(wire.len() - 1));
        server.sync.write_all(first).await.unwrap();
        // The task sees the first piece alone before the second is there.
        advance(MS).await;
        server.sync.write_all(second).await.unwrap();
        assert_eq!(reading.await.unwrap(), Ok(Message::Block(b"\n\"#\x00;\xff".to_vec())), "cut at {cut}");
    }
    assert_eq!(counts(&bench), (0, 0));
}

#[tokio::test(start_paused = true)]
async fn a_time_out_is_cleared_and_the_query_asked_again_on_the_same_connection() {
    let (bench, mut server) = up().await;
    let started = Instant::now();
    let call = bench.call(measure());
    assert_eq!(server.told(MEASURE).await, 0xFFFF_FF06);
    advance(REPLY - MS).await;
    assert!(bench.handle.watch().borrow().up);
    server.cleared(b"24\n").await;
    assert_eq!(started.elapsed(), REPLY);
    server.greet().await;
    // The numbers have begun anew, so this has the number of the first one, whose late reply came during the clear.
    assert_eq!(server.told(MEASURE).await, 0xFFFF_FF06);
    server.reply(0xFFFF_FF06, b"48\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 48);
    assert_eq!(counts(&bench), (1, 0));
    assert_eq!(bench.attempts.lock().unwrap().len(), 2, "two connections, and no more");
}

#[tokio::test(start_paused = true)]
async fn a_late_reply_to_an_earlier_query_is_thrown_away_by_its_number() {
    let (bench, mut server) = up().await;
    let call = bench.call(measure());
    let id = server.told(MEASURE).await;
    server.reply(id - 2, b"12\n").await;
    server.reply(id, b"48\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 48);
    server.reply(id - 2, b"12\n").await;
    let call = bench.call(measure());
    server.answer(MEASURE, "5\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 5);
    assert_eq!(counts(&bench), (0, 0));
}

#[tokio::test(start_paused = true)]
async fn a_second_reply_to_the_same_query_is_cleared_away() {
    let (bench, mut server) = up().await;
    let call = bench.call(measure());
    let id = server.told(MEASURE).await;
    server.reply(id, b"48\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 48);
    server.reply(id, b"48\n").await;
    server.cleared(b"").await;
    server.greet().await;
    bench.is_up().await;
    assert_eq!(counts(&bench), (1, 0));
}

#[tokio::test(start_paused = true)]
async fn a_clear_that_is_not_answered_gives_way_to_a_new_connection_with_its_settings() {
    let (mut bench, mut server) = up().await;
    let call = bench.call(output(true));
    server.told("OUTPut1:STATe 1").await;
    server.no_errors().await;
    call.await.unwrap().unwrap();
    let started = Instant::now();
    let call = bench.call(measure());
    server.told(MEASURE).await;
    assert_eq!(hear(&mut server.r#async).await.0.kind, Kind::AsyncDeviceClear);
    assert_eq!(started.elapsed(), REPLY);
    server.closed().await;
    assert_eq!(started.elapsed(), REPLY + Timing::default().clear);
    let mut server = Server::opened(&mut bench, 0).await;
    server.greet().await;
    server.told("OUTPut1:STATe 1").await;
    server.no_errors().await;
    server.answer(MEASURE, "48\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 48);
    assert_eq!(counts(&bench), (0, 1));
}

#[tokio::test(start_paused = true)]
async fn a_clear_after_which_nobody_answers_gives_way_to_a_new_connection() {
    let (mut bench, mut server) = up().await;
    let call = bench.call(measure());
    server.told(MEASURE).await;
    server.cleared(b"").await;
    server.told("*IDN?").await;
    server.closed().await;
    let mut server = Server::up(&mut bench).await;
    server.answer(MEASURE, "48\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 48);
    assert_eq!(counts(&bench), (0, 1));
}

#[tokio::test(start_paused = true)]
async fn a_silent_query_is_explained_by_the_error_queue_after_a_clear() {
    let (bench, mut server) = up().await;
    let call = bench.call(measure());
    server.told(MEASURE).await;
    server.cleared(b"").await;
    server.answer("*IDN?", &format!("{WHO}\n")).await;
    server.answer("SYSTem:ERRor?", "-113,\"Undefined header\"\n").await;
    server.no_errors().await;
    server.told("*CLS").await;
    let error = call.await.unwrap().unwrap_err();
    assert!(matches!(error, SessionError::Refused { number: -113, .. }), "{error}");
}

#[tokio::test(start_paused = true)]
async fn a_caller_that_goes_away_and_a_reply_that_is_too_long_are_cleared_away() {
    let (bench, mut server) = up().await;
    let call = bench.call(measure());
    server.told(MEASURE).await;
    call.abort();
    assert!(call.await.unwrap_err().is_cancelled());
    server.cleared(b"12\n").await;
    server.greet().await;
    bench.is_up().await;
    let handle = bench.handle.clone();
    let call = Call::new(Intent::RecordData).with("channel", 1_i64);
    let reading = tokio::spawn(async move { handle.data(call, 3).await });
    let id = server.told("TRACe:DATA? CHANnel1").await;
    server.reply(id, &[b'#'; 1000]).await;
    server.cleared(b"").await;
    server.greet().await;
    server.answer("TRACe:DATA? CHANnel1", "#16abcdef\n").await;
    assert_eq!(reading.await.unwrap(), Ok(Message::Block(b"abcdef".to_vec())));
    assert_eq!(counts(&bench), (2, 0));
}

#[tokio::test(start_paused = true)]
async fn what_spoils_the_messages_themselves_costs_the_connection() {
    for (bytes, on_async) in [
        (Header::new(Kind::FatalError).message(b"no more"), true),
        (Header::new(Kind::DeviceClearAcknowledge).message(b""), false),
        (b"17\n48\n".to_vec(), false),
        ([b"HS\x03\x00\0\0\0\0".as_slice(), &[0xFF; 8]].concat(), false),
    ] {
        let (mut bench, mut server) = up().await;
        let stream = if on_async { &mut server.r#async } else { &mut server.sync };
        stream.write_all(&bytes).await.unwrap();
        server.closed().await;
        let mut server = Server::up(&mut bench).await;
        let call = bench.call(measure());
        server.answer(MEASURE, "48\n").await;
        assert_eq!(value(&call.await.unwrap().unwrap()), 48);
        assert_eq!(counts(&bench), (0, 1));
    }
}

#[tokio::test(start_paused = true)]
async fn service_requests_and_unknown_messages_break_nothing() {
    let (bench, mut server) = up().await;
    server.say_async(Kind::AsyncServiceRequest, 0x60, b"").await;
    server.say_async(Kind::Unknown(200), 0, b"hello").await;
    let (header, _) = hear(&mut server.r#async).await;
    assert_eq!((header.kind, header.control), (Kind::Error, 3));
    let call = bench.call(measure());
    server.say_async(Kind::AsyncServiceRequest, 0x60, b"").await;
    server.answer(MEASURE, "48\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 48);
    assert_eq!(counts(&bench), (0, 0));
}

#[tokio::test(start_paused = true)]
async fn a_server_that_prefers_overlap_is_brought_to_synchronised_mode_or_refused() {
    let mut bench = bench();
    let mut server = Server::opened(&mut bench, 1).await;
    server.cleared(b"").await;
    server.greet().await;
    bench.is_up().await;
    drop(server);
    let mut server = Server::opened(&mut bench, 1).await;
    assert_eq!(hear(&mut server.r#async).await.0.kind, Kind::AsyncDeviceClear);
    server.say_async(Kind::AsyncDeviceClearAcknowledge, 1, b"").await;
    assert_eq!(hear(&mut server.sync).await.0.kind, Kind::DeviceClearComplete);
    say(&mut server.sync, Header::new(Kind::DeviceClearAcknowledge).control(1), b"").await;
    server.closed().await;
    let trouble = bench.handle.watch().borrow().trouble.clone().unwrap();
    assert!(trouble.contains("overlap"), "{trouble}");
}
