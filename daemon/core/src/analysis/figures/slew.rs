//! How fast the difference's transitions and the common mode move.
//!
//! Of a transition the *mean* slope between its 10 % and 90 % points: 0.8 of the amplitude over the duration (IEEE Std 181
//! has both). An edge of Gaussian shape is 1.28 times as steep in its middle. The common mode has no states of its own
//! that it must go between, so that its steepest slope is read: a cubic fitted round the steepest place of each cycle.

use super::super::steepest::{Steepest, steepest};
use super::super::transition::duration_per_part;
use super::FigureKind;
use super::compute::{Bench, Found};
use super::shape::{CHOICE, Read, Reading, Shape, mean};
use super::sources::Parts;

/// At most so many cycles are searched for their steepest place, spread over the record.
const MOST_CYCLES: usize = 32;

/// Of many places noise alone makes one this many times steeper than a single one's uncertainty.
const CLEAR: f64 = 5.0;

impl Bench<'_> {
    /// The mean slope of the transitions whose duration `reading` gives.
    pub(super) fn transition_slew(&self, reading: fn(&Shape) -> &Reading) -> Result<Found, String> {
        let levels = self.level(FigureKind::Amplitude)?;
        let part = levels.parts.noise / levels.value;
        let read = |shape: &Shape| -> Reading {
            let duration = reading(shape).clone()?;
            let value = 0.8 * shape.amplitude / duration.value;
            Ok(Read { value, u: value * (duration.u / duration.value).hypot(part) })
        };
        // What moves both levels by a part of the amplitude, and the duration with them.
        let found = self.ratio(read, |part, value| value * (duration_per_part(part) + 2.0 * part))?;
        let found = Found { parts: Parts { scale: found.value, ..found.parts }, ..found };
        Ok(found.times(1.0 / self.input.corrected.interval_s))
    }

    /// The steepest slope of the common mode.
    pub(super) fn common_slew(&self) -> Result<Found, String> {
        let corrected = self.input.corrected;
        let common = corrected.common();
        let noise = self.sources.common_noise_v;
        let cycles = &self.layout.cycles;
        let step = cycles.len().div_ceil(MOST_CYCLES).max(1);
        let found: Vec<Steepest> =
            cycles.iter().step_by(step).filter_map(|range| steepest(&common, range.clone(), noise)).collect();
        let read = |s: &Steepest| Read { value: s.slope.abs(), u: s.u };
        let Some(Read { value, u }) = mean(found.iter().map(read)) else {
            return Err("the record is too short for a slope".to_owned());
        };
        let count = found.len() as f64;
        let over = |of: &dyn Fn(&Steepest) -> f64| found.iter().map(of).sum::<f64>() / count;
        let each = over(&|s| s.u);
        if value <= CLEAR * each {
            return Err("the common mode does not move beyond its noise".to_owned());
        }
        let parts = Parts {
            // The steepest of many places is where noise helped, in every cycle alike.
            noise: u.hypot(CHOICE * each / count.sqrt()),
            // C = (P + N_c)/2, N_c goes as 1/g.
            gain: over(&|s| -0.5 * s.again(&corrected.negative_v) * s.slope.signum()),
            // The slope is at its largest where the waveform's bend is nil, so that skew does nothing to first order.
            scale: value,
            // A step's error at each end of the window.
            quantisation: 0.5 * self.sources.quantisation_v * over(&|s| std::f64::consts::SQRT_2 / (2 * s.half) as f64),
            ..Parts::default()
        };
        let found = Found { value, parts, leak: 0.0, size: value };
        Ok(found.times(1.0 / corrected.interval_s))
    }
}
