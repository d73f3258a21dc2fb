//! How the common mode moves: as an edge or as a sine, and what a skew makes of it.

use statrs::function::erf::{erf, erf_inv};

/// 10–90 % duration of a Gaussian edge in its standard deviations: twice the 90 % quantile of the normal distribution.
const EDGE_SIGMAS: f64 = 2.563_103_131_089_201;

/// −3 dB bandwidth times 10–90 % duration (common practice, no source; one pole gives ln 9/2π = 0.3497).
const BANDWIDTH_TIMES_EDGE: f64 = 0.35;

/// How the common mode moves.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Motion {
    /// Edges of this 10–90 % transition duration, in seconds, taken as Gaussian: `Φ(t/σ)`, `σ = t_r/2.563`.
    ///
    /// Its steepest slope is 1.02·swing/t_r; a straight edge has 0.8, a raised cosine 0.93, one pole's beginning 2.2.
    Edge(f64),
    /// A sine of this frequency, in hertz.
    Sine(f64),
}

impl Motion {
    /// How high it reaches, in hertz.
    pub(super) fn frequency_hz(self) -> f64 {
        match self {
            Self::Edge(duration_s) => BANDWIDTH_TIMES_EDGE / duration_s,
            Self::Sine(frequency_hz) => frequency_hz,
        }
    }

    /// The largest difference between two signals of this swing of which one is late by `skew_s`, in volts.
    ///
    /// Edge: `swing·erf(τ/(2√2·σ))`, the largest value of `Φ((t + τ/2)/σ) − Φ((t − τ/2)/σ)`. Sine:
    /// `swing·sin(πfτ)`, the amplitude of the difference of two phasors. Never above the swing.
    pub(super) fn skew_error_v(self, swing_v: f64, skew_s: f64) -> f64 {
        let skew_s = skew_s.abs();
        match self {
            Self::Edge(duration_s) => {
                let sigma_s = duration_s / EDGE_SIGMAS;
                swing_v * erf(skew_s / (2.0 * std::f64::consts::SQRT_2 * sigma_s))
            }
            Self::Sine(frequency_hz) if frequency_hz * skew_s >= 0.5 => swing_v,
            Self::Sine(frequency_hz) => swing_v * (std::f64::consts::PI * frequency_hz * skew_s).sin(),
        }
    }

    /// The skew that makes an error of `error_v`; nothing where no skew makes as much.
    pub(super) fn skew_for(self, swing_v: f64, error_v: f64) -> Option<f64> {
        let ratio = error_v / swing_v;
        if ratio >= 1.0 {
            return None;
        }
        Some(match self {
            Self::Edge(duration_s) => {
                let sigma_s = duration_s / EDGE_SIGMAS;
                2.0 * std::f64::consts::SQRT_2 * sigma_s * erf_inv(ratio)
            }
            Self::Sine(frequency_hz) => ratio.asin() / (std::f64::consts::PI * frequency_hz),
        })
    }
}
