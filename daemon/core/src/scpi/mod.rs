//! The grammar of SCPI: how messages are told apart, how values are read and written, status bits, addresses.
//!
//! After IEEE Std 488.2-1992 and SCPI-99 (clause numbers are from memory unless said otherwise). Nothing here knows
//! what a number means; that is [`crate::dialect`]'s business. All of it is pure: bytes and text in, values out.
//!
//! What of the standards is *not* understood, and why:
//!
//! - indefinite-length blocks `#0` (488.2, 8.7.10) on a raw socket: their end is the END message, which it does not have
//!   ([`hislip`] has it);
//! - expression data, except for the channel lists that are written (SCPI-99 volume 1, 8.3.2);
//! - replies of several queries joined by `;`: one query is asked at a time.

pub mod address;
pub mod frame;
pub mod hislip;
pub mod status;
pub mod value;
pub mod write;
