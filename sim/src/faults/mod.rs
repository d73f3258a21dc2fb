//! Faults: what is armed for an instrument, when it strikes, and what has struck.
//!
//! Everything that is left to chance comes from the scenario's seed and the fault's number: the same messages meet the
//! same faults. The [`Ledger`] of a bench holds every strike in the order they came.

mod ledger;
mod strike;
#[cfg(test)]
mod tests;
pub(crate) mod wire;

use std::sync::{Arc, Mutex};

use tokio::time::{Duration, Instant};

pub(crate) use ledger::{Entry, Ledger};
use strike::Armed;
pub(crate) use strike::Struck;

use crate::instrument::lock;
use crate::scenario::{FaultSpec, Setting, What};
use crate::world::Disturbance;

/// The faults of one instrument.
#[derive(Debug)]
pub(crate) struct Faults {
    instrument: String,
    seed: u64,
    ledger: Arc<Ledger>,
    state: Mutex<State>,
}

#[derive(Debug, Default)]
struct State {
    armed: Vec<Armed>,
    replies: u64,
    /// The clamps that hold.
    clamps: Vec<(u32, Setting, f64)>,
    /// Late replies that outlived their connection.
    late: Vec<u8>,
    refused_connections: u32,
    refused_until: Option<Instant>,
}

impl Faults {
    /// None yet, for the instrument of this name.
    pub(crate) fn new(instrument: &str, seed: u64, ledger: Arc<Ledger>) -> Self {
        Self { instrument: instrument.to_owned(), seed, ledger, state: Mutex::default() }
    }

    /// Arms a fault and returns its number.
    pub(crate) fn arm(&self, spec: FaultSpec) -> u32 {
        let number = self.ledger.next_fault();
        let mut armed = Armed::new(number, spec, self.seed);
        let mut state = lock(&self.state);
        // A clamp without a condition holds from now on, not only after the next reply.
        if armed.spec.what == What::Clamp && armed.spec.when == crate::scenario::When::default() {
            let struck = armed.strike();
            self.begin_clamp(&mut state, &struck);
            self.note(&struck, 0);
        }
        state.armed.push(armed);
        number
    }

    /// Disarms a fault, or all; returns how many were.
    pub(crate) fn disarm(&self, number: Option<u32>) -> usize {
        let meant = |other: u32| number.is_none_or(|number| number == other);
        let mut state = lock(&self.state);
        let before = state.armed.len();
        state.armed.retain(|armed| !meant(armed.number));
        state.clamps.retain(|(other, _, _)| !meant(*other));
        before - state.armed.len()
    }

    /// A reply is about to be sent; which faults strike it.
    pub(crate) fn reply(&self, message: &[u8], reply: &[u8]) -> Vec<Struck> {
        let mut state = lock(&self.state);
        state.replies += 1;
        let has_block = wire::block(reply).is_some();
        let mut struck: Vec<Struck> = Vec::new();
        for armed in &mut state.armed {
            let taken = struck.iter().any(|other| other.spec.what.of_wire());
            if let Some(strike) = armed.at_reply(message, reply.len(), has_block, taken) {
                struck.push(strike);
            }
        }
        let replies = state.replies;
        for strike in &struck {
            self.begin_clamp(&mut state, strike);
            self.begin_refusing(&mut state, strike);
            self.note(strike, replies);
        }
        struck
    }

    /// An acquisition begins; what befalls it. See [`Faults::confirm`].
    pub(crate) fn acquisition(&self) -> (Disturbance, Vec<Struck>) {
        let mut state = lock(&self.state);
        let struck: Vec<Struck> = state.armed.iter_mut().filter_map(Armed::at_acquisition).collect();
        let mut disturbance = Disturbance::default();
        for strike in &struck {
            strike.disturb(&mut disturbance);
        }
        (disturbance, struck)
    }

    /// Writes down what befell an acquisition; its number is 0 if no trigger came.
    pub(crate) fn confirm(&self, struck: &[Struck], acquisition: u64) {
        for strike in struck {
            self.note(strike, acquisition);
        }
    }

    /// What becomes of a number that is being set.
    pub(crate) fn clamped(&self, setting: Setting, value: f64) -> f64 {
        let state = lock(&self.state);
        let most = state.clamps.iter().filter(|(_, other, _)| *other == setting).map(|(_, _, most)| *most);
        most.fold(value, f64::min)
    }

    /// Whether a connection is refused now.
    pub(crate) fn refuses(&self) -> bool {
        let mut state = lock(&self.state);
        if state.refused_until.is_some_and(|until| Instant::now() < until) {
            return true;
        }
        let refuses = state.refused_connections > 0;
        state.refused_connections = state.refused_connections.saturating_sub(1);
        refuses
    }

    /// Keeps a late reply beyond its connection.
    pub(crate) fn keep(&self, reply: &[u8]) {
        lock(&self.state).late.extend_from_slice(reply);
    }

    /// Late replies of earlier connections.
    pub(crate) fn take_late(&self) -> Vec<u8> {
        std::mem::take(&mut lock(&self.state).late)
    }

    fn begin_clamp(&self, state: &mut State, strike: &Struck) {
        if let (What::Clamp, Some(setting), Some(most)) = (strike.spec.what, strike.spec.setting, strike.spec.most) {
            state.clamps.push((strike.number, setting, most));
        }
    }

    fn begin_refusing(&self, state: &mut State, strike: &Struck) {
        let spec = &strike.spec;
        match spec.what {
            What::Reboot => state.refused_connections += spec.connections.unwrap_or(0),
            What::Refuse => {
                let usual = if spec.seconds.is_some() { 0 } else { wire::USUAL_REFUSALS };
                state.refused_connections += spec.connections.unwrap_or(usual);
                state.refused_until = spec.seconds.map(|seconds| Instant::now() + Duration::from_secs_f64(seconds));
            }
            _ => {}
        }
    }

    fn note(&self, strike: &Struck, at: u64) {
        let what = strike.spec.what;
        tracing::info!(instrument = self.instrument, fault = strike.number, what = what.name(), at, "a fault strikes");
        self.ledger.note(Entry { fault: strike.number, instrument: self.instrument.clone(), what, at });
    }
}
