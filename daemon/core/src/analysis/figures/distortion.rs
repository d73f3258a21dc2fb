//! Total harmonic distortion of a difference that is a sine: harmonics 2 to 10, as far as they lie below four tenths of
//! the sample rate, relative to the fundamental (the ratio of rms values; noise power removed).

use super::super::harmonics::{self, Harmonics};
use super::compute::{Bench, Found};
use super::sources::Parts;

/// What is no harmonic and no noise may have this part of the fundamental's power: beyond it the waveform is more than a
/// distorted sine.
const MOST_REST: f64 = 0.05;

/// Beyond this the waveform is no sine (a triangle has 0.12, a square wave 0.48).
const MOST_DISTORTION: f64 = 0.4;

impl Bench<'_> {
    pub(super) fn distortion(&self) -> Result<Found, String> {
        if self.layout.levels.is_ok() {
            return Err("the waveform has two states: it is no sine".to_owned());
        }
        let period = self.shape.period.clone()?.value;
        let corrected = self.input.corrected;
        let noise = self.sources.mean_noise_v;
        let found = harmonics::fit(&corrected.difference_v, 1.0 / period).map_err(|why| why.to_string())?;
        let m = &self.moments;
        let fundamental = 0.5 * found.phasors[0].norm_sqr();
        let rest = m.dd - m.d * m.d - found.explained - self.sources.noise_v.powi(2);
        let (value, u) = found.distortion(noise);
        if fundamental.is_nan() || rest > MOST_REST * fundamental || value > MOST_DISTORTION {
            return Err("the waveform is no sine: too much of it is neither its fundamental nor noise".to_owned());
        }
        let rms = fundamental.sqrt();
        let change = |error: usize, along: &dyn Fn() -> Option<Vec<realfft::num_complex::Complex<f64>>>| {
            let step = self.sources.step(error);
            let along = if step > 0.0 { along() } else { None };
            along.map_or(0.0, |along| {
                let read = |step| found.moved(&along, step).distortion(noise).0;
                0.5 * (read(step) - read(-step)) / step
            })
        };
        // Least squares is linear, so that the fit of N_c at the same frequency tells what gain and skew do.
        let negative: Option<Harmonics> = harmonics::at(&corrected.negative_v, found.frequency).ok();
        let gain = change(0, &|| negative.as_ref().map(|n| n.phasors.clone()));
        let skew = change(1, &|| negative.as_ref().map(|n| n.slope(corrected.interval_s)));
        let quantisation = self.sources.quantisation_v / rms;
        let parts = Parts { noise: u, gain, skew: -skew, quantisation, ..Parts::default() };
        Ok(Found { value, parts, leak: self.input.leak.rms_v / rms, size: value })
    }
}
