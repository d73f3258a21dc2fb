//! When the sweeps of an acquisition start.

#[cfg(test)]
mod tests;

use rand::RngExt;
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;

use super::acquisition::{NoTrigger, Trigger, TriggerSource};
use super::controls::{Controls, Shape, SourceOutput};
use super::leg::Signal;
use super::source;

/// A sweep starts at one of this many sync edges: those of a reference that is no multiple of the device's period meet
/// it at changing phases.
const SYNC_EDGES: u32 = 1000;

/// Halvings that bring a crossing down to the last digit.
const HALVINGS: usize = 60;

/// Where triggers come from.
#[derive(Debug)]
pub(crate) struct Triggers {
    source: Source,
    jitter_s: f64,
}

#[derive(Debug)]
enum Source {
    /// A sweep is armed anywhere in the period and starts at the next of these instants.
    Crossings { instants_s: Vec<f64>, period_s: f64 },
    /// A sweep starts anywhere.
    Free { period_s: f64 },
    /// A sweep starts at any of the edges `first + k·period`.
    Sync { first_s: f64, period_s: f64 },
}

impl Triggers {
    /// Finds the instants at which sweeps can start. `spans_v` belong to `signals`; a channel must have gone back by
    /// `hysteresis` of its span before it crosses the level again.
    ///
    /// # Errors
    /// [`NoTrigger`]: the channel does not cross the level or does not exist, or the generator has no sync edge.
    pub(crate) fn new(
        trigger: &Trigger,
        controls: &Controls,
        signals: &[Signal],
        hysteresis_v: f64,
        jitter_s: f64,
    ) -> Result<Self, NoTrigger> {
        let source = match trigger.source {
            TriggerSource::Channel(index) => {
                let signal = signals.get(index).ok_or(NoTrigger)?;
                let instants_s = crossings(signal, trigger, hysteresis_v);
                if instants_s.is_empty() {
                    return Err(NoTrigger);
                }
                Source::Crossings { instants_s, period_s: signal.wave.period_s() }
            }
            TriggerSource::External => {
                let has_edges = |output: &&SourceOutput| output.on && output.shape != Shape::Dc;
                let output = controls.generator.iter().find(has_edges).ok_or(NoTrigger)?;
                let first_s = if trigger.rising { 0.0 } else { source::high_s(output) };
                Source::Sync { first_s, period_s: 1.0 / output.frequency_hz }
            }
            TriggerSource::Immediate => {
                let period_s = signals.iter().map(|signal| signal.wave.period_s()).fold(0.0, f64::max);
                Source::Free { period_s }
            }
        };
        Ok(Self { source, jitter_s })
    }

    /// The instant of the next sweep's trigger, with its jitter.
    pub(crate) fn next(&self, rng: &mut ChaCha8Rng) -> f64 {
        let at_s = match &self.source {
            Source::Crossings { instants_s, period_s } => {
                let armed_s = rng.random::<f64>() * period_s;
                let next = instants_s.iter().find(|&&at_s| at_s >= armed_s).or_else(|| instants_s.first());
                next.copied().unwrap_or(0.0)
            }
            Source::Free { period_s } => rng.random::<f64>() * period_s,
            Source::Sync { first_s, period_s } => first_s + f64::from(rng.random_range(0..SYNC_EDGES)) * period_s,
        };
        at_s + self.jitter_s * rng.sample::<f64, _>(StandardNormal)
    }
}

/// The instants of one period, from 0 on, at which the signal crosses the level in the wanted direction.
fn crossings(signal: &Signal, trigger: &Trigger, hysteresis_v: f64) -> Vec<f64> {
    let sign = if trigger.rising { 1.0 } else { -1.0 };
    let over = |time_s: f64| sign * (signal.at(time_s) - trigger.level_v);
    let period_s = signal.wave.period_s();
    let mut grid: Vec<f64> = signal.wave.grid().iter().map(|at_s| at_s + signal.delay_s).collect();
    let Some(&first_s) = grid.first() else { return Vec::new() };
    grid.push(first_s + period_s);
    let values: Vec<f64> = grid.iter().map(|&at_s| over(at_s)).collect();
    let mut found = Vec::new();
    let mut armed = false;
    // The first round only tells whether the trigger is armed where the second begins.
    for round in 0..2 {
        for (times, values) in grid.windows(2).zip(values.windows(2)) {
            let (&[mut low_s, mut high_s], &[before, after]) = (times, values) else { continue };
            armed |= before < -hysteresis_v;
            if !(armed && before < 0.0 && after >= 0.0) {
                continue;
            }
            armed = false;
            if round == 0 {
                continue;
            }
            for _ in 0..HALVINGS {
                let middle_s = 0.5 * (low_s + high_s);
                if over(middle_s) < 0.0 { low_s = middle_s } else { high_s = middle_s }
            }
            found.push(high_s.rem_euclid(period_s));
        }
    }
    found.sort_by(f64::total_cmp);
    found
}
