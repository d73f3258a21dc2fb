//! What generator and supply have in common: outputs with a level and a state, whose settings are the bench's controls.

use super::bench::{Bench, lock};
use super::tree::{Action, Call, Model, Place, number};
use crate::message::{Limits, Quantity};
use crate::status::Fault;
use crate::world::Controls;

/// The outputs of a kind of instrument.
pub(super) struct Outputs {
    /// How many there are.
    pub(super) count: usize,
    /// What level each can give, in volts; the last one holds for all that follow.
    pub(super) level: &'static [Limits],
    /// Where an output's level lives.
    pub(super) level_v: fn(&mut Controls, usize) -> &mut f64,
    /// Where it is written whether an output is connected.
    pub(super) on: fn(&mut Controls, usize) -> &mut bool,
}

impl Outputs {
    /// The headers that every output has, after SCPI-99's source classes, and then `own`.
    pub(super) fn headers<M: Model<Settings = Controls>>(
        &self,
        own: Vec<(&'static str, Action<M>)>,
    ) -> Vec<(&'static str, Action<M>)> {
        let level = number(Quantity::Volt, self.level, self.count, self.level_v);
        let mut all = vec![
            ("[:SOURce#]:VOLTage[:LEVel][:IMMediate][:AMPLitude]", Action::Number(level)),
            (":OUTPut#[:STATe]", Action::Flag(Place { count: self.count, of: self.on })),
        ];
        all.extend(own);
        all
    }

    /// A query about one output, without parameters.
    ///
    /// # Errors
    /// Parameters, or an output that there is not.
    pub(super) fn asked(&self, call: &mut Call<'_>) -> Result<usize, Fault> {
        call.args.finish()?;
        if call.index < self.count { Ok(call.index) } else { Err(Fault::HeaderSuffix) }
    }
}

/// Runs `act` on the controls of `bench`; see [`Model::with`].
pub(super) fn with<R>(bench: &Bench, act: impl FnOnce(&mut Controls) -> R) -> R {
    act(&mut lock(&bench.controls))
}
