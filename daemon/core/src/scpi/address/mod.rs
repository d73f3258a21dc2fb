//! Addresses of instruments: VISA resource strings (VPP-4.3, 4.3.1; from memory).
//!
//! Understood are `TCPIP[board]::host::port::SOCKET`, `TCPIP[board]::host::hislipN[,port]::INSTR` (IVI-6.1) and
//! `TCPIP[board]::host[::device]::INSTR`, in capitals or not, an IPv6 address in brackets. Other interfaces have no
//! place here: an instrument is reached over TCP.

use std::fmt;
use std::str::FromStr;

/// The address of an instrument.
#[derive(Debug, Clone, PartialEq, Eq, Hash)]
pub enum Resource {
    /// `TCPIP::host::port::SOCKET`: plain text over a TCP connection.
    Socket {
        /// The board number; 0 unless the string gives another. It chooses nothing here, and is kept as written.
        board: u16,
        /// A name or an address; an IPv6 address without its brackets.
        host: String,
        /// The TCP port.
        port: u16,
    },
    /// `TCPIP::host::hislip0::INSTR`: HiSLIP (IVI-6.1).
    Hislip {
        /// As for [`Resource::Socket`].
        board: u16,
        /// As for [`Resource::Socket`].
        host: String,
        /// The sub-address, such as `hislip0`.
        device: String,
        /// The TCP port; [`HISLIP_PORT`] unless the string gives another.
        port: u16,
    },
    /// `TCPIP::host::inst0::INSTR`: remote procedure calls (VXI-11).
    Instr {
        /// As for [`Resource::Socket`].
        board: u16,
        /// As for [`Resource::Socket`].
        host: String,
        /// The device's name; `inst0` unless the string gives another.
        device: String,
    },
}

/// The TCP port that is registered for HiSLIP (IVI-6.1, 2.1; from memory).
pub const HISLIP_PORT: u16 = 4880;

/// What is understood, for messages.
const FORMS: &str = "`TCPIP::host::port::SOCKET`, `TCPIP::host::hislip0::INSTR` or `TCPIP::host::inst0::INSTR`";

/// Why a text is no resource string.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum AddressError {
    /// The board number is no number.
    #[error("`{found}`: the board number `{board}` is not a number from 0 to 65535; leave it out")]
    BadBoard {
        /// The whole text.
        found: String,
        /// The board.
        board: String,
    },
    /// The device's name is no name.
    #[error("`{found}`: `{device}` is no device name; `hislip0` or `inst0` are usual")]
    BadDevice {
        /// The whole text.
        found: String,
        /// The device's name.
        device: String,
    },
    /// The host is no name and no address.
    #[error("`{found}`: `{host}` is no host name and no address; write an IPv6 address in brackets")]
    BadHost {
        /// The whole text.
        found: String,
        /// The host.
        host: String,
    },
    /// The port is no port.
    #[error("`{found}`: `{port}` is not a port from 1 to 65535")]
    BadPort {
        /// The whole text.
        found: String,
        /// The port.
        port: String,
    },
    /// Not one of the forms.
    #[error("`{found}` is no address of an instrument that is understood; write {FORMS}")]
    Form {
        /// The whole text.
        found: String,
    },
    /// Another interface than TCP/IP.
    #[error("`{found}`: instruments on `{interface}` cannot be reached; write {FORMS}")]
    Interface {
        /// The whole text.
        found: String,
        /// The interface.
        interface: String,
    },
}

/// The longest resource string: a host name has at most 253 characters (RFC 1035), the rest fits in as many again.
const LONGEST: usize = 512;

impl Resource {
    /// Reads a resource string.
    ///
    /// # Errors
    /// When it is none of the forms that are understood, saying which are.
    pub fn parse(text: &str) -> Result<Self, AddressError> {
        let text = text.trim();
        let found = super::value::shorten(text);
        let form = || AddressError::Form { found: found.clone() };
        if text.len() > LONGEST {
            return Err(form());
        }
        let (interface, rest) = text.split_once("::").ok_or_else(form)?;
        let board = board(interface, &found)?;
        let (host, rest) = host(rest, &found)?;
        let parts: Vec<&str> = rest.split("::").collect();
        let kind = |wanted: &str| parts.last().is_some_and(|last| last.eq_ignore_ascii_case(wanted));
        match parts.as_slice() {
            [number, _] if kind("SOCKET") => Ok(Self::Socket { board, host, port: port(number, &found)? }),
            [_] if kind("INSTR") => Ok(Self::Instr { board, host, device: "inst0".to_owned() }),
            [name, _] if kind("INSTR") => device(board, host, name, &found),
            _ => Err(form()),
        }
    }

    /// The host: a name, or an address without brackets.
    #[must_use]
    pub fn host(&self) -> &str {
        match self {
            Self::Socket { host, .. } | Self::Hislip { host, .. } | Self::Instr { host, .. } => host,
        }
    }

    /// The TCP port to connect to; `None` where it has to be asked for first.
    #[must_use]
    pub fn port(&self) -> Option<u16> {
        match self {
            Self::Socket { port, .. } | Self::Hislip { port, .. } => Some(*port),
            Self::Instr { .. } => None,
        }
    }
}

fn board(interface: &str, found: &str) -> Result<u16, AddressError> {
    let digits = interface.find(|c: char| c.is_ascii_digit()).unwrap_or(interface.len());
    let (name, number) = interface.split_at(digits);
    if !name.eq_ignore_ascii_case("TCPIP") {
        return Err(AddressError::Interface { found: found.to_owned(), interface: super::value::shorten(name) });
    }
    if number.is_empty() {
        return Ok(0);
    }
    plain_number(number)
        .ok_or_else(|| AddressError::BadBoard { found: found.to_owned(), board: super::value::shorten(number) })
}

/// The host and what follows its `::`.
fn host<'t>(rest: &'t str, found: &str) -> Result<(String, &'t str), AddressError> {
    let bad = |host: &str| AddressError::BadHost { found: found.to_owned(), host: super::value::shorten(host) };
    let form = || AddressError::Form { found: found.to_owned() };
    if let Some(inner) = rest.strip_prefix('[') {
        let (address, rest) = inner.split_once(']').ok_or_else(|| bad(rest))?;
        let (number, zone) = address.split_once('%').map_or((address, None), |(number, zone)| (number, Some(zone)));
        // `core::net` has the grammar of addresses; nothing is opened.
        let good = number.parse::<core::net::Ipv6Addr>().is_ok() && zone.is_none_or(is_name);
        if !good {
            return Err(bad(address));
        }
        return Ok((address.to_owned(), rest.strip_prefix("::").ok_or_else(form)?));
    }
    let (name, rest) = rest.split_once("::").ok_or_else(form)?;
    if is_name(name) { Ok((name.to_owned(), rest)) } else { Err(bad(name)) }
}

fn port(text: &str, found: &str) -> Result<u16, AddressError> {
    plain_number(text)
        .filter(|port| *port != 0)
        .ok_or_else(|| AddressError::BadPort { found: found.to_owned(), port: super::value::shorten(text) })
}

fn device(board: u16, host: String, name: &str, found: &str) -> Result<Resource, AddressError> {
    let (device, number) = name.split_once(',').map_or((name, None), |(device, number)| (device, Some(number)));
    let hislip = device.get(..6).is_some_and(|head| head.eq_ignore_ascii_case("hislip"));
    if !is_name(device) || (number.is_some() && !hislip) {
        return Err(AddressError::BadDevice { found: found.to_owned(), device: super::value::shorten(name) });
    }
    if hislip {
        let port = number.map_or(Ok(HISLIP_PORT), |number| port(number, found))?;
        return Ok(Resource::Hislip { board, host, device: device.to_owned(), port });
    }
    Ok(Resource::Instr { board, host, device: device.to_owned() })
}

/// A number without a sign, which `parse` alone would let pass.
fn plain_number(text: &str) -> Option<u16> {
    text.bytes().all(|byte| byte.is_ascii_digit()).then(|| text.parse().ok()).flatten()
}

/// Letters, digits, `.`, `-`, `_`: host names (RFC 1123, with the `_` that networks at work use), device names, zones.
fn is_name(text: &str) -> bool {
    !text.is_empty() && text.bytes().all(|byte| byte.is_ascii_alphanumeric() || b".-_".contains(&byte))
}

impl FromStr for Resource {
    type Err = AddressError;

    fn from_str(text: &str) -> Result<Self, AddressError> {
        Self::parse(text)
    }
}

impl fmt::Display for Resource {
    /// The same address in its shortest usual form; reading it gives the same value back.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let head = |board: u16, host: &str| {
            let board = if board == 0 { String::new() } else { board.to_string() };
            if host.contains(':') { format!("TCPIP{board}::[{host}]") } else { format!("TCPIP{board}::{host}") }
        };
        match self {
            Self::Socket { board, host, port } => write!(f, "{}::{port}::SOCKET", head(*board, host)),
            Self::Hislip { board, host, device, port: HISLIP_PORT } => {
                write!(f, "{}::{device}::INSTR", head(*board, host))
            }
            Self::Hislip { board, host, device, port } => {
                write!(f, "{}::{device},{port}::INSTR", head(*board, host))
            }
            Self::Instr { board, host, device } => write!(f, "{}::{device}::INSTR", head(*board, host)),
        }
    }
}

#[cfg(test)]
mod tests;
