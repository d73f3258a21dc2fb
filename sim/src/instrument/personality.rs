//! What makes a personality: a manner of speaking and the headers of every kind of instrument.

use super::generator::Generator;
use super::plain::Manner;
use super::scope::Scope;
use super::supply::Supply;
use super::switch::Switch;
use super::system::System;
use super::tree::Table;

/// A firmware personality.
pub(crate) trait Personality {
    /// How it speaks; none for the exchange of IEEE 488.2.
    const MANNER: Option<&'static Manner>;

    /// The generator's headers.
    fn generator() -> Table<Generator>;

    /// The scope's headers.
    fn scope() -> Table<Scope>;

    /// The supply's headers.
    fn supply() -> Table<Supply>;

    /// The switch unit's headers.
    fn switch() -> Table<Switch>;

    /// The headers of all kinds.
    fn system() -> Table<System>;

    /// By what the scope's settings after a reset differ from the usual ones.
    fn preset_scope(_: &Scope) {}
}
