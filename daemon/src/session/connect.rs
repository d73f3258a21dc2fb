//! How a session gets its byte stream: over TCP in earnest, from memory in tests.

use std::fmt;
use std::future::Future;
use std::io;
use std::net::SocketAddr;

use tokio::io::{AsyncRead, AsyncWrite};
use tokio::net::{TcpSocket, TcpStream, lookup_host};

/// Makes connections, one after another.
pub(crate) trait Connect: Send + 'static {
    /// What it makes.
    type Stream: AsyncRead + AsyncWrite + Send + Unpin + 'static;

    /// Makes a new connection; the session bounds how long that may take.
    ///
    /// # Cancel safety
    /// Dropping the future gives the attempt up and leaves nothing open.
    fn connect(&mut self) -> impl Future<Output = io::Result<Self::Stream>> + Send;

    /// Where to, for errors.
    fn place(&self) -> String;
}

/// TCP to a host and a port.
#[derive(Debug, Clone)]
pub(crate) struct Tcp {
    /// Host name or address.
    pub(crate) host: String,
    /// Port.
    pub(crate) port: u16,
}

impl fmt::Display for Tcp {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.host.contains(':') {
            true => write!(f, "[{}]:{}", self.host, self.port),
            false => write!(f, "{}:{}", self.host, self.port),
        }
    }
}

impl Connect for Tcp {
    type Stream = TcpStream;

    async fn connect(&mut self) -> io::Result<TcpStream> {
        let mut last = io::Error::new(io::ErrorKind::NotFound, "the name has no address");
        // A name may have several addresses (IPv6 and IPv4) of which only one is listened to.
        for address in lookup_host((self.host.as_str(), self.port)).await? {
            match connect_to(address).await {
                Ok(stream) => return Ok(stream),
                Err(error) => last = error,
            }
        }
        Err(last)
    }

    fn place(&self) -> String {
        self.to_string()
    }
}

async fn connect_to(address: SocketAddr) -> io::Result<TcpStream> {
    let socket = if address.is_ipv4() { TcpSocket::new_v4()? } else { TcpSocket::new_v6()? };
    // An instrument that lost its power says nothing: only keep-alive notices while no query is under way.
    socket.set_keepalive(true)?;
    // Commands are short and answers waited for: holding back small packets would cost up to 40 ms per query.
    socket.set_nodelay(true)?;
    socket.connect(address).await
}
