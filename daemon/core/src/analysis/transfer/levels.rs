//! Gain and offset of a pair on another vertical range, by one straight line for each leg.
//!
//! With `V_B = k·V_A + c` for either leg, A the old range and B the new one, and `N_A = g_A·P_A + o_A`:
//! `g_B = g_A·k_N/k_P`, `o_B = k_N·o_A + c_N − g_B·c_P`. Uncertainty to first order (JCGM 100, 5.2.2), with the
//! correlations of gain and offset and of each line's slope and intercept; the three pairs come from different
//! records and are taken as uncorrelated with each other.

use super::super::deskew::Combined;
use super::super::{Correction, Estimate};

/// One leg read on two ranges: `reading on the new range = gain·(reading on the old one) + offset`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RangeLine {
    /// k, about 1.
    pub gain: Estimate,
    /// c in volts at the tip.
    pub offset_v: Estimate,
    /// Correlation coefficient of the errors of both.
    pub gain_offset: f64,
}

impl RangeLine {
    /// The line that repeats of one leg on both ranges gave together.
    #[must_use]
    pub fn of(combined: &Combined) -> Self {
        Self { gain: combined.gain.estimate, offset_v: combined.offset_v.estimate, gain_offset: combined.gain_offset }
    }
}

/// Gain and offset with what connects them.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Levels {
    /// g, negative leg relative to positive leg.
    pub gain: Estimate,
    /// o in volts at the tips.
    pub offset_v: Estimate,
    /// Correlation coefficient of the errors of both; 0 where either has no uncertainty.
    pub gain_offset: f64,
}

/// Gain and offset on the new range, from `correction` on the old one and the lines of both legs.
#[must_use]
pub fn levels(correction: &Correction, p: &RangeLine, n: &RangeLine) -> Levels {
    let (gain_a, offset_a) = (correction.gain.value, correction.offset_v.value);
    let (k_p, c_p, k_n, c_n) = (p.gain.value, p.offset_v.value, n.gain.value, n.offset_v.value);
    let ratio = k_n / k_p;
    let gain = gain_a * ratio;
    let offset_v = k_n * offset_a + c_n - gain * c_p;
    // Sensitivities of gain and offset to each pair's first and second quantity.
    let terms = [
        Term {
            pair: [correction.gain.u, correction.offset_v.u],
            correlation: correction.gain_offset,
            of_gain: [ratio, 0.0],
            of_offset: [-ratio * c_p, k_n],
        },
        Term {
            pair: [p.gain.u, p.offset_v.u],
            correlation: p.gain_offset,
            of_gain: [-gain / k_p, 0.0],
            of_offset: [gain / k_p * c_p, -gain],
        },
        Term {
            pair: [n.gain.u, n.offset_v.u],
            correlation: n.gain_offset,
            of_gain: [gain_a / k_p, 0.0],
            of_offset: [offset_a - gain_a / k_p * c_p, 1.0],
        },
    ];
    let total = |left: fn(&Term) -> [f64; 2], right: fn(&Term) -> [f64; 2]| {
        terms.iter().map(|term| term.covariance(left(term), right(term))).sum::<f64>()
    };
    let u_gain = total(|t| t.of_gain, |t| t.of_gain).max(0.0).sqrt();
    let u_offset = total(|t| t.of_offset, |t| t.of_offset).max(0.0).sqrt();
    let product = u_gain * u_offset;
    let both = total(|t| t.of_gain, |t| t.of_offset);
    Levels {
        gain: Estimate { value: gain, u: u_gain },
        offset_v: Estimate { value: offset_v, u: u_offset },
        gain_offset: if product > 0.0 { (both / product).clamp(-1.0, 1.0) } else { 0.0 },
    }
}

/// Two correlated quantities, and how gain and offset depend on them.
struct Term {
    pair: [f64; 2],
    correlation: f64,
    of_gain: [f64; 2],
    of_offset: [f64; 2],
}

impl Term {
    /// What the pair adds to the covariance of two results that depend on it by `left` and `right`.
    fn covariance(&self, left: [f64; 2], right: [f64; 2]) -> f64 {
        let [a, b] = self.pair;
        left[0] * right[0] * a * a
            + left[1] * right[1] * b * b
            + (left[0] * right[1] + left[1] * right[0]) * self.correlation * a * b
    }
}
