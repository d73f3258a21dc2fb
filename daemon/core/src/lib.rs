//! The pure logic of Evenpair: mathematics, SCPI grammar, dialects, bench files and sequences.
//!
//! Nothing here touches the world: no runtime, no files, no sockets, no clock. Time, bytes and text come in as
//! arguments, decisions go out as values, so that everything can be tested, replayed and read without a bench.
//!
//! The floors, each using only those before it: [`units`] and [`analysis`]; [`import`], [`scpi`] and [`document`];
//! [`planning`], which knows no instrument; [`dialect`], [`mod@bench`] and [`sequence`].

pub mod analysis;
pub mod bench;
pub mod dialect;
pub mod document;
pub mod import;
pub mod planning;
pub mod scpi;
pub mod sequence;
pub mod units;
