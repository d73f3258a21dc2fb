//! A query to an instrument, past the daemon: what the instrument itself says it is set to.

use tokio::io::{AsyncBufReadExt, AsyncReadExt, AsyncWriteExt, BufReader};
use tokio::net::TcpStream;

use crate::process::PATIENCE;

/// Where an instrument is, as host and port of `TCPIP::host::port::SOCKET` or `TCPIP::host::hislip0,port::INSTR`
/// (VPP-4.3), and whether it is the latter.
pub(crate) fn place(resource: &str) -> (String, bool) {
    let words: Vec<&str> = resource.split("::").collect();
    match words.as_slice() {
        [_, host, port, "SOCKET"] => (format!("{host}:{port}"), false),
        [_, host, device, "INSTR"] => {
            let (_, port) = device.split_once(',').expect("the simulator tells its port");
            (format!("{host}:{port}"), true)
        }
        _ => panic!("`{resource}` is no resource string that is understood"),
    }
}

/// The line that the instrument at `resource` answers to `query`.
///
/// # Panics
/// When it does not answer.
pub async fn ask(resource: &str, query: &str) -> String {
    let talk = async {
        let (place, hislip) = place(resource);
        let mut stream = TcpStream::connect(&place).await.expect("the instrument listens");
        if hislip {
            return ask_hislip(stream, &place, query).await;
        }
        stream.write_all(format!("{query}\n").as_bytes()).await.expect("sending the query");
        let mut line = String::new();
        BufReader::new(stream).read_line(&mut line).await.expect("reading the reply");
        line.trim_end().to_owned()
    };
    tokio::time::timeout(PATIENCE, talk).await.unwrap_or_else(|_| panic!("{resource} does not answer `{query}`"))
}

/// The least that HiSLIP needs (IVI-6.1, from memory): both connections, then a message and its reply.
async fn ask_hislip(mut sync: TcpStream, place: &str, query: &str) -> String {
    say(&mut sync, [0, 0], 0x0100_5858, b"hislip0").await;
    let (kind, session, _) = hear(&mut sync).await;
    assert_eq!(kind, 1, "InitializeResponse");
    let mut other = TcpStream::connect(place).await.expect("the instrument listens");
    say(&mut other, [17, 0], session & 0xFFFF, b"").await;
    assert_eq!(hear(&mut other).await.0, 18, "AsyncInitializeResponse");
    say(&mut sync, [7, 0], 0xFFFF_FF00, format!("{query}\n").as_bytes()).await;
    let mut reply = Vec::new();
    loop {
        let (kind, id, payload) = hear(&mut sync).await;
        assert_eq!(id, 0xFFFF_FF00, "the reply has the number of its query");
        reply.extend(payload);
        match kind {
            6 => {}
            7 => return String::from_utf8_lossy(&reply).trim_end().to_owned(),
            other => panic!("message of type {other} in the place of a reply"),
        }
    }
}

async fn say(stream: &mut TcpStream, [kind, control]: [u8; 2], parameter: u32, payload: &[u8]) {
    let length = (payload.len() as u64).to_be_bytes();
    let message = [b"HS".as_slice(), &[kind, control], &parameter.to_be_bytes(), &length, payload].concat();
    stream.write_all(&message).await.expect("sending a message");
}

/// Type, parameter and payload of the next message.
async fn hear(stream: &mut TcpStream) -> (u8, u32, Vec<u8>) {
    let mut head = [0; 16];
    stream.read_exact(&mut head).await.expect("a message");
    let [b'H', b'S', kind, _, p0, p1, p2, p3, length @ ..] = head else { panic!("{head:?} is no header") };
    let length = usize::try_from(u64::from_be_bytes(length)).expect("a length");
    assert!(length < 1 << 20, "a reply of {length} bytes");
    let mut payload = vec![0; length];
    stream.read_exact(&mut payload).await.expect("a payload");
    (kind, u32::from_be_bytes([p0, p1, p2, p3]), payload)
}
