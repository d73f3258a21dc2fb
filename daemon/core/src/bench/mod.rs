//! The bench file: the instruments, pairs, references, settings, routes and safe states that one daemon owns.
//!
//! [`read()`] turns the text into a checked [`Bench`], or into every mistake in it at once. What a bench says is kept in
//! plain types ([`spec`]); whether a reference suits a pair is decided in one place ([`fit`]) for the file, for a
//! sequence and for a request alike; [`conditions`] holds what a correction was made under and what voids it.
//!
//! Voltages of pairs, references and at-tip settings are at the probe's tip; the daemon divides by the attenuation on
//! the way to the scope.

mod acquisition;
mod call;
pub mod conditions;
pub(crate) mod field;
pub mod fit;
mod read;
pub mod spec;

pub use acquisition::{Acquisition, Overrides, Slope, Trigger};
pub use call::BenchCall;
pub use fit::Role;
pub(crate) use read::overrides;
pub use read::read;
pub use read::{OFFSETS_V, SPANS_V};
pub use spec::{
    Bench, Coupling, InstrumentSpec, LegSpec, PairSpec, ProbeSpec, ReferenceKind, ReferenceSpec, RouteSpec, SettingSpec,
};

#[cfg(test)]
pub(crate) mod tests;
