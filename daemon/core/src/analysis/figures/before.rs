//! The pre-transition aberration (IEEE Std 181): how far the waveform departs from its level before it leaves it.

use std::ops::Range;

use super::super::peaks;
use super::super::signal::Signal;
use super::compute::{Bench, Found};
use super::shape::{Read, Reading, mean};
use super::sources::Parts;

/// At most so many transitions are looked at, spread over those measured.
const MOST: usize = 64;

/// A stretch before a transition, and whether it is in the high state.
type Place = (Range<usize>, bool);

impl Bench<'_> {
    pub(super) fn pre_aberration(&self) -> Result<Found, String> {
        self.layout.levels.as_ref().map_err(ToString::to_string)?;
        let places = self.before();
        let noise = self.sources.mean_noise_v;
        let difference = &self.input.corrected.difference_v;
        let Read { value, u } = read(difference, &places, self.layout.between(), noise)?;
        let [gain, skew] =
            self.by_moving(|signal, between| read(signal, &places, between, noise).ok().map(|read| read.value));
        let amplitude = self.shape.amplitude;
        let quantisation = self.sources.quantisation_v / amplitude;
        let parts = Parts { noise: u, gain, skew, quantisation, ..Parts::default() };
        Ok(Found { value, parts, leak: self.input.leak.peak_v / amplitude, size: value })
    }

    /// The pre-transition regions: ten durations, but no further back than half-way to the transition before.
    fn before(&self) -> Vec<Place> {
        let measured = &self.shape.measured;
        let step = measured.len().div_ceil(MOST).max(1);
        let region = |(i, t): &(usize, super::super::transition::Transition)| {
            // The transition begins as long before its middle as it ends after it; a duration earlier nothing of an edge of
            // Gaussian shape is left (6·10⁻⁵).
            let start = 2.0 * t.middle - t.end - t.duration;
            let last = i.checked_sub(1).and_then(|i| self.layout.edges.get(i)).map_or(0, |e| e.middle()) as f64;
            let from = (start - (10.0 * t.duration).max(16.0)).max(0.5 * (start + last)).max(0.0);
            let range = from.ceil() as usize..start.max(0.0) as usize;
            (range.len() >= 3).then_some((range, !t.rising))
        };
        measured.iter().step_by(step).filter_map(region).collect()
    }
}

/// The larger of the departures upwards and downwards, each the mean over the transitions.
fn read<S: Signal + ?Sized>(signal: &S, places: &[Place], (low, high): (f64, f64), noise: f64) -> Reading {
    let found: Vec<[Read; 2]> = places
        .iter()
        .map(|(range, is_high)| {
            let level = if *is_high { high } else { low };
            let (bottom, top) = peaks::extremes_within(signal, range.clone(), noise);
            let part = |volts: f64, u: f64| Read { value: volts / (high - low), u: u / (high - low) };
            [part(top.value - level, top.u), part(level - bottom.value, bottom.u)]
        })
        .collect();
    let either = [0, 1].map(|side| mean(found.iter().map(|both| both[side])));
    match either {
        [Some(up), Some(down)] => {
            let larger = if up.value >= down.value { up } else { down };
            Ok(Read { value: larger.value.max(0.0), ..larger })
        }
        _ => Err("the record holds no transition with room before it".to_owned()),
    }
}
