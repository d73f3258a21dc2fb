//! What the probes take from the nodes they are put on: Ohm's law with the source's resistance and the probe's R ∥ C.
//!
//! With source resistance `r`, the tip sees `H(f) = 1/(1 + r/R + jωrC)` of the unloaded voltage (Kirchhoff's voltage
//! law); the loss is `1 − H`. At DC it is `r/(r + R)`; to an edge it is a lag of `(r ∥ R)·C`. A deskew with both tips
//! on one node cannot see it: there both are loaded alike.

use nalgebra::Complex;

use super::check::Checked;
use super::motion::Motion;
use super::outcome::Loading;

/// One tip on its node.
#[derive(Debug, Clone, Copy)]
pub(super) struct Loaded {
    /// The node's source resistance in ohms.
    pub(super) source_ohm: f64,
    /// The probe's resistance in ohms.
    pub(super) resistance_ohm: f64,
    /// The probe's capacitance in farads.
    pub(super) capacitance_f: f64,
}

impl Loaded {
    /// `1 − H` at a frequency.
    pub(super) fn loss(self, frequency_hz: f64) -> Complex<f64> {
        let omega = std::f64::consts::TAU * frequency_hz;
        let extra = Complex::new(self.source_ohm / self.resistance_ohm, omega * self.source_ohm * self.capacitance_f);
        // x/(1 + x) instead of 1 − 1/(1 + x): a small loss keeps all its digits.
        extra / (Complex::new(1.0, 0.0) + extra)
    }

    /// `1 − H` at DC.
    pub(super) fn loss_dc(self) -> f64 {
        self.source_ohm / (self.source_ohm + self.resistance_ohm)
    }

    /// The lag of the loaded node in seconds.
    pub(super) fn lag_s(self) -> f64 {
        (1.0 - self.loss_dc()) * self.source_ohm * self.capacitance_f
    }
}

/// The positive and the negative tip of the plan.
pub(super) fn tips(plan: &Checked) -> [Loaded; 2] {
    plan.sources_ohm.map(|source_ohm| Loaded {
        source_ohm,
        resistance_ohm: plan.resistance_ohm,
        capacitance_f: plan.capacitance_f,
    })
}

/// The largest error on settled levels: the common mode's as far as the two losses differ, and the difference's own.
pub(super) fn settled_error_v(plan: &Checked) -> f64 {
    let [positive, negative] = tips(plan).map(Loaded::loss_dc);
    plan.common_most_v() * (positive - negative).abs() + plan.difference_v * positive
}

/// The largest error while the common mode moves, in volts. An edge sees the difference of the two lags as a skew, a
/// sine the difference of the two losses; the difference's own loss comes on top, as if it moved as fast.
pub(super) fn moving_error_v(plan: &Checked) -> f64 {
    let [positive, negative] = tips(plan);
    match plan.motion {
        Motion::Edge(_) => {
            let apart_s = positive.lag_s() - negative.lag_s();
            plan.motion.skew_error_v(plan.swing_v, apart_s)
                + plan.motion.skew_error_v(plan.difference_v, positive.lag_s())
        }
        Motion::Sine(frequency_hz) => {
            let (positive, negative) = (positive.loss(frequency_hz), negative.loss(frequency_hz));
            plan.swing_v / 2.0 * (positive - negative).norm() + plan.difference_v * positive.norm()
        }
    }
}

/// The losses, for the record.
pub(super) fn parts(plan: &Checked) -> Vec<Loading> {
    let frequency_hz = plan.motion.frequency_hz();
    let part = |(tip, loaded): (&str, Loaded)| Loading {
        tip: tip.to_owned(),
        at_dc: loaded.loss_dc(),
        at_frequency: loaded.loss(frequency_hz).norm(),
        lag_s: loaded.lag_s(),
    };
    ["positive", "negative"].into_iter().zip(tips(plan)).map(part).collect()
}
