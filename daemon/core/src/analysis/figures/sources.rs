//! Where a figure's uncertainty comes from, and the budget made of it.

use super::super::budget::{self, Distribution, Kind, Term};
use super::FigureInput;

/// The sources that all figures of a capture share.
pub(super) struct Sources {
    /// Rms noise per sample of the difference.
    pub(super) noise_v: f64,
    /// Rms noise that counts wherever many samples are averaged, smoothed or fitted: interpolation passes slow noise
    /// whole.
    pub(super) mean_noise_v: f64,
    /// Rms noise per sample of the common mode.
    pub(super) common_noise_v: f64,
    /// What quantisation leaves in a level of the difference.
    pub(super) quantisation_v: f64,
    /// Standard uncertainty of the scale, relative.
    pub(super) scale: f64,
    pub(super) gain: f64,
    pub(super) u_gain: f64,
    pub(super) u_skew_s: f64,
    /// Standard uncertainty of the offset as it appears in the difference.
    pub(super) u_offset_v: f64,
}

/// A figure's contributions, each as a standard uncertainty of either sign; see [`Sources::budget`].
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct Parts {
    pub(super) noise: f64,
    pub(super) gain: f64,
    pub(super) skew: f64,
    pub(super) offset: f64,
    pub(super) scale: f64,
    pub(super) quantisation: f64,
    pub(super) common_mode: f64,
}

impl Sources {
    pub(super) fn of(input: &FigureInput<'_>) -> Self {
        let gain = input.correction.gain.value;
        let negative = input.noise_n_v / gain.abs();
        let noise_v = input.noise_p_v.hypot(negative * input.corrected.noise_gain.sqrt());
        let leg = |step_v: f64, noise_v: f64| {
            // Averaging takes noise away after the converter; what dithers it is the noise of one acquisition, less
            // the converter's own q²/12.
            let single = f64::from(input.averages.max(1)) * noise_v * noise_v - step_v * step_v / 12.0;
            budget::quantisation(step_v, single.max(0.0).sqrt())
        };
        Self {
            noise_v,
            mean_noise_v: input.noise_p_v.hypot(negative),
            common_noise_v: 0.5 * noise_v,
            quantisation_v: leg(input.step_p_v, input.noise_p_v)
                .hypot(leg(input.step_n_v, input.noise_n_v) / gain.abs()),
            scale: input.scale_spec / 3.0f64.sqrt(),
            gain,
            u_gain: input.correction.gain.u,
            u_skew_s: input.correction.skew_s.u,
            u_offset_v: (input.correction.offset_v.u / gain).abs(),
        }
    }
}

impl Parts {
    /// The same in another unit: every contribution times a factor.
    pub(super) fn times(self, factor: f64) -> Self {
        Self {
            noise: self.noise * factor,
            gain: self.gain * factor,
            skew: self.skew * factor,
            offset: self.offset * factor,
            scale: self.scale * factor,
            quantisation: self.quantisation * factor,
            common_mode: self.common_mode * factor,
        }
    }

    /// The terms that contribute anything, largest first. The correction's estimates count as type B: they were made
    /// before and elsewhere (JCGM 100, 4.3.1).
    pub(super) fn budget(self) -> Vec<Term> {
        let term = |name, u: f64, kind, distribution| Term { name, u: u.abs(), kind, distribution };
        let mut terms = vec![
            term("noise", self.noise, Kind::A, Distribution::Normal),
            term("gain", self.gain, Kind::B, Distribution::Normal),
            term("skew", self.skew, Kind::B, Distribution::Normal),
            term("offset", self.offset, Kind::B, Distribution::Normal),
            term("scale", self.scale, Kind::B, Distribution::Rectangular),
            term("quantisation", self.quantisation, Kind::B, Distribution::Normal),
            term("common mode", self.common_mode, Kind::B, Distribution::Normal),
        ];
        terms.retain(|t| t.u > 0.0);
        terms.sort_by(|a, b| b.u.total_cmp(&a.u));
        terms
    }
}
