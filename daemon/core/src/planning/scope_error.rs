//! What one channel of the scope adds, whatever probe is in front of it.

use super::OF_LIMIT;
use super::outcome::RangeChoice;
use crate::analysis::budget;

/// How fine the converter is.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Fineness {
    /// Bits, with noise and non-linearity stated apart.
    Bits(f64),
    /// Effective bits, noise and non-linearity included.
    Effective(f64),
}

/// Noise, rms, at the scope's input.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Noise {
    /// As a ratio of the span.
    OfSpan(f64),
    /// In volts.
    Volts(f64),
}

/// A scope with nothing left open.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct CheckedScope {
    pub(super) fineness: Fineness,
    pub(super) spans_v: Vec<f64>,
    pub(super) shifts: bool,
    pub(super) scale_spec: f64,
    pub(super) noise: Noise,
    pub(super) linearity_steps: f64,
    pub(super) bandwidth_hz: Option<f64>,
    pub(super) rating_v: Option<f64>,
    pub(super) averages: f64,
}

/// Errors of one channel at the tip in volts, k = 2.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct ChannelError {
    pub(super) quantisation_v: f64,
    pub(super) linearity_v: f64,
    pub(super) noise_v: f64,
}

impl CheckedScope {
    /// Whether noise and non-linearity are in the effective number of bits.
    pub(super) fn is_effective(&self) -> bool {
        matches!(self.fineness, Fineness::Effective(_))
    }

    /// The smallest range that shows `wanted_v` at the tip behind this attenuation.
    pub(super) fn range_for(&self, wanted_v: f64, attenuation: f64) -> Option<RangeChoice> {
        // A span that is meant to be exact must not fail by the rounding of a quotient.
        let enough_v = wanted_v / attenuation * (1.0 - 1e-12);
        let input_span_v = self.spans_v.iter().copied().find(|span_v| *span_v >= enough_v)?;
        let span_v = input_span_v * attenuation;
        let (bits, noise_v) = match (self.fineness, self.noise) {
            (Fineness::Effective(bits), _) => (bits, 0.0),
            (Fineness::Bits(bits), Noise::OfSpan(ratio)) => (bits, ratio * span_v),
            (Fineness::Bits(bits), Noise::Volts(volts)) => (bits, volts * attenuation),
        };
        Some(RangeChoice { input_span_v, span_v, middle_v: 0.0, step_v: span_v / bits.exp2(), noise_v })
    }

    /// What one channel adds on this range.
    ///
    /// Quantisation has `u² = q²/12` on one sample (JCGM 100, 4.3.7); the part of it that no averaging removes is
    /// [`budget::quantisation`], the rest averages with the noise. Effective bits are defined by the rms of noise and
    /// distortion, `span/(2^ENOB·√12)` (IEEE Std 1057, from memory); how much of it averages is unknown, so nothing does.
    pub(super) fn channel_error(&self, range: &RangeChoice) -> ChannelError {
        let step_v = range.step_v;
        let whole = step_v * step_v / 12.0;
        match self.fineness {
            Fineness::Effective(_) => {
                ChannelError { quantisation_v: 2.0 * whole.sqrt(), linearity_v: 0.0, noise_v: 0.0 }
            }
            Fineness::Bits(_) => {
                let stays = budget::quantisation(step_v, range.noise_v).powi(2);
                ChannelError {
                    quantisation_v: 2.0 * (stays + (whole - stays) / self.averages).sqrt(),
                    linearity_v: OF_LIMIT * self.linearity_steps * step_v,
                    noise_v: 2.0 * range.noise_v / self.averages.sqrt(),
                }
            }
        }
    }
}
