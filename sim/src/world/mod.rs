//! The analog world behind the simulated bench: what the scope would see if the bench were there.
//!
//! Time is virtual. The generator's outputs share one clock and start a period together at the time 0; a sweep begins
//! at a trigger instant of that clock, and each channel is read at its own instants
//! `trigger + jitter + start + i·interval + delay setting − delay of the leg` from a wave in closed form ([`wave`]).
//! Noise and jitter come from the scenario's seed and the number of the acquisition: the same calls give the same
//! samples. Drift goes by the number of acquisitions.
//!
//! A leg is, in this order: the probe's load on the node, its attenuation, one pole of bandwidth, the pole and zero of
//! its compensation, a delay, the gain of leg and range, coupling, the offset of the range, noise, the converter.
//! A channel without a leg is quiet and at nought.

#![cfg_attr(test, allow(clippy::unwrap_used, clippy::float_cmp))]

pub(crate) mod acquisition;
mod complex;
pub(crate) mod controls;
mod converter;
mod device;
#[cfg(test)]
mod fixture;
mod leg;
mod network;
mod source;
#[cfg(test)]
mod tests;
mod trigger;
#[cfg(test)]
mod truth;
mod wave;

pub(crate) use acquisition::{
    Acquisition, ChannelData, ChannelSettings, Coupling, Disturbance, NoTrigger, ScopeSettings, Trigger, TriggerSource,
};
pub(crate) use controls::{Controls, Shape};

use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;

use self::converter::Converter;
use self::leg::Signal;
use self::trigger::Triggers;
use self::wave::Wave;
use crate::scenario::{Scenario, Tip};

/// Streams of random numbers per acquisition: one for the trigger, the others for the channels.
const STREAMS: u64 = 16;

/// The world of one scenario.
#[derive(Debug, Clone)]
pub(crate) struct World {
    scenario: Scenario,
    acquisitions: u64,
}

impl World {
    /// The world at the start of its virtual time.
    pub(crate) fn new(scenario: &Scenario) -> Self {
        Self { scenario: scenario.clone(), acquisitions: 0 }
    }

    /// Takes one acquisition of all channels with nothing wrong.
    ///
    /// # Errors
    /// [`NoTrigger`]; the world is then as before.
    #[cfg(test)]
    pub(crate) fn acquire(&mut self, controls: &Controls, scope: &ScopeSettings) -> Result<Acquisition, NoTrigger> {
        self.acquire_disturbed(controls, scope, &Disturbance::default())
    }

    /// Takes one acquisition of all channels, averaged as asked. Without a disturbance the samples are the same whatever
    /// befell acquisitions before.
    ///
    /// # Errors
    /// [`NoTrigger`]; the world is then as before.
    pub(crate) fn acquire_disturbed(
        &mut self,
        controls: &Controls,
        scope: &ScopeSettings,
        disturbance: &Disturbance,
    ) -> Result<Acquisition, NoTrigger> {
        if disturbance.no_trigger {
            return Err(NoTrigger);
        }
        let spec = &self.scenario.scope;
        let signals = self.signals(controls, scope, disturbance);
        let hysteresis_v = match scope.trigger.source {
            TriggerSource::Channel(index) => scope.channels.get(index).map_or(0.0, |channel| channel.span_v),
            TriggerSource::External | TriggerSource::Immediate => 0.0,
        } * spec.trigger_hysteresis;
        let triggers = Triggers::new(&scope.trigger, controls, &signals, hysteresis_v, spec.trigger_jitter_s)?;

        let start_s = -scope.trigger_position * scope.points.saturating_sub(1) as f64 * scope.interval_s;
        let mut rng = self.stream(0);
        let starts_s: Vec<f64> = (0..scope.averages.max(1)).map(|_| triggers.next(&mut rng) + start_s).collect();
        let record = |(index, (channel, signal)): (usize, (&ChannelSettings, &Signal))| {
            let converter = Converter::new(spec.converter_bits, channel);
            let mut rng = self.stream(1 + index as u64);
            let mut data = converter.record(signal, &starts_s, scope.interval_s, scope.points, &mut rng);
            disturbance.spoil(index, &mut data);
            data
        };
        let channels = scope.channels.iter().zip(&signals).enumerate().map(record).collect();
        self.acquisitions += 1;
        Ok(Acquisition { channels, start_s, number: self.acquisitions })
    }

    /// What a supply output measures of itself: volts and amperes.
    pub(crate) fn supply_reading(&self, controls: &Controls, output: usize) -> (f64, f64) {
        device::supply_reading(&self.scenario, controls, output)
    }

    /// The signal at every channel's converter.
    fn signals(&self, controls: &Controls, scope: &ScopeSettings, disturbance: &Disturbance) -> Vec<Signal> {
        let tips = device::tips(&self.scenario, controls);
        let signal = |(index, channel): (usize, &ChannelSettings)| {
            let Some(leg) = self.scenario.legs.iter().find(|leg| leg.channel == index + 1) else {
                return Signal::nothing();
            };
            let tip = match (leg.tip, disturbance.swapped) {
                (Tip::N, false) | (Tip::P, true) => &tips.n,
                (Tip::P, false) | (Tip::N, true) => &tips.p,
            };
            let fallen = Wave::constant(0.0, 1.0);
            let tip = if disturbance.flat.contains(&index) { &fallen } else { tip };
            Signal::new(leg, self.scenario.seed, self.hours(), channel, tip)
        };
        scope.channels.iter().enumerate().map(signal).collect()
    }

    /// Virtual time since the start.
    fn hours(&self) -> f64 {
        self.acquisitions as f64 * self.scenario.scope.acquisition_time_s / 3600.0
    }

    /// A stream of random numbers of the coming acquisition.
    fn stream(&self, stream: u64) -> ChaCha8Rng {
        let mut rng = ChaCha8Rng::seed_from_u64(self.scenario.seed);
        rng.set_stream(self.acquisitions * STREAMS + stream);
        rng
    }
}
