//! Program messages in, response messages out: IEEE 488.2 chapters 7 and 8, headers after SCPI-99 vol. 1 chapter 6
//! (clauses from memory). Pure: no connection, no instrument, no clock.
//!
//! Bytes become messages in [`Input`], a message becomes units in [`Units`], a unit's header is looked up with
//! [`Pattern`], its data are taken with [`Args`], and what a query answers is gathered in [`Reply`].
//!
//! What of the standard is different on a raw socket, where the END message does not exist:
//! - NL ends every message; a message may hold NL only inside a definite-length block. A string with NL in it is
//!   refused (-151): otherwise one forgotten quote would silence the connection for good. So is an indefinite
//!   block (`#0`), whose end could not be told.
//! - Replies leave as soon as they are formed and messages are carried out in the order they came, so query errors
//!   -410 (a new message before the reply was read), -420 (reading without a query) and -430 (both buffers full)
//!   cannot arise. -440 can, and does.
//!   Over HiSLIP, where a client says that it took a reply, -410 can arise too, and a message ends with END or NL.
//! - No macros, no expressions but channel lists.

mod args;
mod data;
mod header;
mod input;
mod reply;
mod unit;

pub(crate) use args::{Args, Limits, Quantity};
pub(crate) use data::{Cursor, Data};
pub(crate) use header::{Header, Mnemonic, Path, Pattern, is_form_of, short_form};
pub(crate) use input::{Arrival, Input};
pub(crate) use reply::{Reply, nr3};
pub(crate) use unit::{Unit, Units};
