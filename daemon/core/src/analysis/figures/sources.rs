//! Where a figure's uncertainty comes from, and the budget made of it.

use super::super::budget::{self, Correlated, Distribution, Kind, Term};
use super::super::compensation::Left;
use super::super::leak::Moving;
use super::super::montecarlo::Errors;
use super::{FigureInput, Freedom};

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
    /// Relative standard uncertainty of a scale that was calibrated.
    pub(super) scale_u: f64,
    pub(super) gain: f64,
    /// What the legs' compensation leaves.
    pub(super) compensation: Left,
    /// What the response leaves.
    pub(super) response: Moving,
    /// The correction's errors as they appear in the difference: gain relative, skew in seconds, offset over g.
    pub(super) errors: Errors,
    /// Degrees of freedom of their standard uncertainties, in the same order.
    pub(super) freedom: [Option<f64>; 3],
    /// Degrees of freedom of the noise.
    noise_freedom: Option<f64>,
}

/// What moves a figure: for the correction's errors sensitivities of either sign, for the rest standard uncertainties.
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct Parts {
    /// Standard uncertainty from noise.
    pub(super) noise: f64,
    /// What the figure changes per relative error of the gain.
    pub(super) gain: f64,
    /// What it changes per second of skew.
    pub(super) skew: f64,
    /// What it changes per volt in the difference.
    pub(super) offset: f64,
    /// What it changes per relative error of the scale.
    pub(super) scale: f64,
    /// Standard uncertainty from quantisation without enough noise.
    pub(super) quantisation: f64,
    /// Standard uncertainty from the correction's errors in second order.
    pub(super) common_mode: f64,
    /// Standard uncertainty from the legs' low-frequency compensation.
    pub(super) compensation: f64,
    /// Standard uncertainty from what the response leaves.
    pub(super) response: f64,
}

impl Sources {
    pub(super) fn of(input: &FigureInput<'_>) -> Self {
        let (correction, drift) = (input.correction, &input.allowance.drift);
        let gain = correction.gain.value;
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
            scale_u: input.allowance.scale_u,
            gain,
            compensation: input.allowance.compensation,
            response: input.allowance.response,
            errors: Errors {
                u: [correction.gain.u / gain.abs(), correction.skew_s.u, correction.offset_v.u / gain.abs()],
                drift: [drift.gain, drift.skew_s, drift.offset_v / gain.abs()],
                gain_offset: correction.gain_offset.clamp(-1.0, 1.0),
            },
            freedom: {
                let Freedom { gain, skew, offset } = input.allowance.freedom;
                [gain, skew, offset]
            },
            noise_freedom: (input.allowance.noise_bins > 0).then_some(input.allowance.noise_bins as f64),
        }
    }

    /// The correction's errors for the whole mean square: there the legs' compensation acts as an offset.
    pub(super) fn power_errors(&self) -> Errors {
        let [gain, skew, offset] = self.errors.u;
        let whole = offset.hypot(self.compensation.mean_v);
        let share = if whole > 0.0 { offset / whole } else { 1.0 };
        Errors { u: [gain, skew, whole], gain_offset: self.errors.gain_offset * share, ..self.errors }
    }

    /// Standard uncertainty of one of the correction's errors, drift included: the step by which sensitivities are
    /// found.
    pub(super) fn step(&self, error: usize) -> f64 {
        self.errors.u[error].hypot(self.errors.drift[error] / 3.0f64.sqrt())
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
            compensation: self.compensation * factor,
            response: self.response * factor,
        }
    }

    /// The terms that contribute anything, largest first. The correction's estimates count as type B: they were made
    /// before and elsewhere (JCGM 100, 4.3.1).
    pub(super) fn budget(self, sources: &Sources) -> Vec<Term> {
        let Errors { u, drift, gain_offset } = sources.errors;
        let term = |name, u: f64, kind, distribution, sensitivity| Term {
            name,
            u: u.abs(),
            kind,
            distribution,
            sensitivity,
            correlated: None,
            freedom: None,
        };
        let own = |name, u, kind| term(name, u, kind, Distribution::Normal, None);
        // As sensitivities to g, τ and o themselves.
        let per = [self.gain / sources.gain.abs(), self.skew, self.offset / sources.gain.abs()];
        let normal = |name, part: f64, u: f64, per| term(name, part * u, Kind::B, Distribution::Normal, Some(per));
        let within = |name, part: f64, half: f64, per| {
            term(name, part * half / 3.0f64.sqrt(), Kind::B, Distribution::Rectangular, Some(per))
        };
        let mut terms = vec![
            own("noise", self.noise, Kind::A),
            normal("gain", self.gain, u[0], per[0]),
            normal("skew", self.skew, u[1], per[1]),
            normal("offset", self.offset, u[2], per[2]),
            within("gain drift", self.gain, drift[0], per[0]),
            within("skew drift", self.skew, drift[1], per[1]),
            within("offset drift", self.offset, drift[2], per[2]),
            term("scale", self.scale * sources.scale, Kind::B, Distribution::Rectangular, Some(self.scale)),
            normal("calibration", self.scale, sources.scale_u, self.scale),
            own("quantisation", self.quantisation, Kind::B),
            own("common mode", self.common_mode, Kind::B),
            own("compensation", self.compensation, Kind::B),
            own("response", self.response, Kind::B),
        ];
        terms[0].freedom = sources.noise_freedom;
        (1..=3).zip(sources.freedom).for_each(|(term, freedom)| terms[term].freedom = freedom);
        let coefficient = gain_offset * (self.gain * self.offset).signum();
        if gain_offset != 0.0 && terms[1].u > 0.0 && terms[3].u > 0.0 {
            terms[1].correlated = Some(Correlated { with: "offset", coefficient });
            terms[3].correlated = Some(Correlated { with: "gain", coefficient });
        }
        terms.retain(|t| t.u > 0.0);
        terms.sort_by(|a, b| b.u.total_cmp(&a.u));
        terms
    }
}
