//! HiSLIP, the protocol of `TCPIP::host::hislip0::INSTR` (IVI-6.1, protocol version 1.0): messages with a header of
//! sixteen bytes on two TCP connections, a synchronous one for what is said and an asynchronous one for what must not
//! wait behind it.
//!
//! Everything here is written from memory of the standard, as no copy of it was at hand; where a clause matters, it is
//! described instead of cited by its number. All of it is pure: bytes and messages in, bytes and events out.
//!
//! Against a raw socket three things are won. A reply carries the number of the message that asked for it, so a late one
//! is known as such. A message has an end of its own, so it needs no LF and a block needs no length. And *device clear*
//! empties both directions in an orderly way, so a time-out need not cost the connection.
//!
//! What of the standard is not here, and why:
//!
//! - overlap mode, in which several requests may be under way: one request at a time is the rule of this house. A server
//!   that prefers overlap is asked by device clear for synchronised mode, and refused if it does not give it;
//! - encryption and authentication (version 2.0): instruments that offer them accept version 1.0 too unless told not to;
//! - remote and local control, trigger messages and the question who holds locks: nothing here asks for them.

mod client;
mod frame;
mod header;

pub use client::{Client, Event, Fault, LockAnswer, MAXIMUM_MESSAGE_BYTES, Piece};
pub use frame::{MOST_CONTROL_BYTES, MOST_UNKNOWN_BYTES, Malformed, Reason, Scan, ScanState, scan};
pub use header::{Channel, ErrorCode, FatalCode, HEADER_BYTES, Header, Kind};
