//! Literal bytes over real connections, and over split ones.

use proptest::prelude::*;
use tokio::io::{AsyncBufReadExt, AsyncReadExt, AsyncWriteExt, BufReader};
use tokio::net::TcpStream;

use super::*;
use crate::instrument::Bench;
use crate::scenario::{InstrumentSpec, Kind, PersonalitySpec, Scenario};

pub(super) fn device(kind: Kind) -> Arc<Device> {
    let scenario = Scenario::read(include_str!("../../../configs/scenarios/greenhouse-fan.toml")).unwrap();
    let spec = InstrumentSpec {
        name: "one".into(),
        kind,
        protocol: Protocol::Socket,
        personality: PersonalitySpec::Standard,
        port: 0,
        serial: None,
        identity: Some("A,B,C,D".into()),
    };
    Arc::new(Device::new(&spec, &Arc::new(Bench::new(&scenario))))
}

async fn start(kind: Kind) -> std::net::SocketAddr {
    let listener = TcpListener::bind("127.0.0.1:0").await.unwrap();
    let address = listener.local_addr().unwrap();
    tokio::spawn(serve(listener, device(kind), Protocol::Socket, "one".into()));
    address
}

/// Sends bytes, then reads exactly the reply; what comes too much shows in the next exchange.
async fn exchange(stream: &mut BufReader<TcpStream>, bytes: &[u8], reply: &[u8]) {
    stream.write_all(bytes).await.unwrap();
    let mut found = vec![0; reply.len()];
    stream.read_exact(&mut found).await.unwrap();
    assert_eq!(String::from_utf8_lossy(&found), String::from_utf8_lossy(reply));
}

async fn connect(address: std::net::SocketAddr) -> BufReader<TcpStream> {
    BufReader::new(TcpStream::connect(address).await.unwrap())
}

#[tokio::test]
async fn literal_bytes_over_tcp() {
    let mut stream = connect(start(Kind::Switch).await).await;
    exchange(&mut stream, b"*IDN?\n", b"A,B,C,D\n").await;
    exchange(&mut stream, b"*CLS\r\n*ESR?\r\n", b"0\n").await;
    exchange(&mut stream, b"*ESE?;*SRE?\n*TST?\n", b"0;0\n0\n").await;
    exchange(&mut stream, b"ROUT:CLOS (@102);CLOS? (@101:103)\n", b"0,1,0\n").await;
    exchange(&mut stream, b"\n\n;\nSYST:ERR?\n", b"-102,\"Syntax error\"\n").await;
}

#[tokio::test]
async fn connections_share_the_device_but_not_their_buffers() {
    let address = start(Kind::Switch).await;
    let (mut one, mut two) = (connect(address).await, connect(address).await);
    one.write_all(b"*ESE 3").await.unwrap();
    exchange(&mut two, b"*ESE 4;*ESE?\n", b"4\n").await;
    exchange(&mut one, b"2;*ESE?\n", b"32\n").await;
    exchange(&mut two, b"*ESE?\n", b"32\n").await;
}

#[tokio::test]
async fn an_overlong_message_is_reported_and_the_connection_lives() {
    // SCPI-99: -363 "Input buffer overrun"
    let mut stream = connect(start(Kind::Supply).await).await;
    let mut long = vec![b'A'; 100_000];
    long.extend_from_slice(b"\nSYST:ERR?;ERR?\n");
    exchange(&mut stream, &long, b"-363,\"Input buffer overrun\";0,\"No error\"\n").await;
}

#[tokio::test]
async fn another_connection_can_end_a_wait() {
    let address = start(Kind::Scope).await;
    let (mut waiting, mut other) = (connect(address).await, connect(address).await);
    waiting.write_all(b"TRIG:SOUR EXT;:SWE:POIN 10;*CLS;:INIT\n*OPC?\n").await.unwrap();
    // Polled, as a controller would: the first connection may not have been served yet.
    loop {
        other.write_all(b"STAT:OPER:COND?\n").await.unwrap();
        let mut line = String::new();
        other.read_line(&mut line).await.unwrap();
        if line == "32\n" {
            break;
        }
    }
    exchange(&mut other, b"ABOR;*TST?\n", b"0\n").await;
    exchange(&mut waiting, b"", b"1\n").await;
}

#[tokio::test]
async fn what_the_peer_did_not_finish_has_no_effect() {
    let device = device(Kind::Switch);
    let (mut near, far) = tokio::io::duplex(64);
    near.write_all(b"ROUT:CLOS (@102)\nROUT:CLOS (@108)").await.unwrap();
    near.shutdown().await.unwrap();
    converse(far, &device).await.unwrap();
    assert_eq!(device.run(b"ROUT:CLOS:STAT?").await, b"(@102)\n");
}

/// All that a fresh device answers to bytes that arrive in pieces of `size`.
fn answers(bytes: &[u8], size: usize) -> Vec<u8> {
    let runtime = tokio::runtime::Builder::new_current_thread().build().unwrap();
    runtime.block_on(async {
        let device = device(Kind::Generator);
        let (near, far) = tokio::io::duplex(1 << 20);
        let (mut from, mut to) = tokio::io::split(near);
        let send = async move {
            for piece in bytes.chunks(size) {
                to.write_all(piece).await.unwrap();
                tokio::task::yield_now().await;
            }
            to.shutdown().await.unwrap();
        };
        let mut replies = Vec::new();
        let (_, served, read) = tokio::join!(send, converse(far, &device), from.read_to_end(&mut replies));
        served.unwrap();
        read.unwrap();
        replies
    })
}

/// Pieces of messages, good and bad.
const PIECES: &[&str] = &[
    "*IDN?",
    "*ESR?",
    "*STB?",
    "SYST:ERR?",
    ":OUTP",
    "1",
    " ON",
    "?",
    ";",
    "\n",
    "\r\n",
    ",",
    "FREQ",
    " 2 MHZ",
    "SOUR2:",
    "VOLT",
    ":OFFS?",
    " MAX",
    "\"",
    "'",
    "#",
    "#13abc",
    "(@1)",
    "*RST",
    "FUNC SQU",
    "FUNC?",
    "\0",
    "é",
];

/// Some of them in any order.
fn soup() -> impl Strategy<Value = Vec<u8>> {
    proptest::collection::vec(proptest::sample::select(PIECES), 0..40).prop_map(|pieces| pieces.concat().into_bytes())
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn any_split_gives_the_same_replies(mut bytes in soup(), size in 1usize..9) {
        bytes.extend_from_slice(b"\n\n*STB?\n");
        prop_assert_eq!(answers(&bytes, usize::MAX), answers(&bytes, size));
    }

    #[test]
    fn random_bytes_do_no_harm(mut bytes in proptest::collection::vec(any::<u8>(), 0..300)) {
        bytes.extend_from_slice(b"\n*CLS;*TST?\n");
        let replies = answers(&bytes, usize::MAX);
        // A block that swallowed the end is the only way not to be answered.
        prop_assert!(replies.ends_with(b"0\n") || bytes.contains(&b'#'));
    }
}
