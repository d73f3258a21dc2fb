//! A query to an instrument, past the daemon: what the instrument itself says it is set to.

use tokio::io::{AsyncBufReadExt, AsyncWriteExt, BufReader};
use tokio::net::TcpStream;

use crate::process::PATIENCE;

/// Host and port of `TCPIP::host::port::SOCKET` (VPP-4.3).
pub(crate) fn host_and_port(resource: &str) -> String {
    let words: Vec<&str> = resource.split("::").collect();
    assert!(words.len() == 4 && words[3] == "SOCKET", "`{resource}` is no socket's resource string");
    format!("{}:{}", words[1], words[2])
}

/// The line that the instrument at `resource` answers to `query`.
///
/// # Panics
/// When it does not answer.
pub async fn ask(resource: &str, query: &str) -> String {
    let talk = async {
        let mut stream = TcpStream::connect(host_and_port(resource)).await.expect("the instrument listens");
        stream.write_all(format!("{query}\n").as_bytes()).await.expect("sending the query");
        let mut line = String::new();
        BufReader::new(stream).read_line(&mut line).await.expect("reading the reply");
        line.trim_end().to_owned()
    };
    tokio::time::timeout(PATIENCE, talk).await.unwrap_or_else(|_| panic!("{resource} does not answer `{query}`"))
}
