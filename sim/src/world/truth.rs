//! What is true of a pair: for the tests, and said nowhere over the network.
//!
//! In the sense of "both tips on one node `s`: `P = s`, `N = g·s(t − τ) + o`", with `P` and `N` read with the nominal
//! attenuation. `τ` is the difference of the group delays well above the compensation's corner (some kilohertz) and
//! well below the bandwidth: there the pole and zero of the compensation only add to the gain.

use std::f64::consts::TAU;

use super::{ChannelSettings, World, leg};

/// The correction that a perfect deskew would find.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Truth {
    /// Positive: the negative leg arrives late.
    pub(crate) skew_s: f64,
    /// N over P for slow signals.
    pub(crate) gain_dc: f64,
    /// N over P above the compensation's corner.
    pub(crate) gain: f64,
    /// Of N over `gain_dc·P`, in volts at the tips.
    pub(crate) offset_v: f64,
}

impl World {
    /// The truth for the legs at the indices `p` and `n` of `channels`, in the coming acquisition.
    pub(crate) fn truth(&self, channels: &[ChannelSettings], p: usize, n: usize) -> Truth {
        let side = |index: usize| {
            let leg = self.scenario.legs.iter().find(|leg| leg.channel == index + 1).unwrap();
            let range = leg::range(leg, self.scenario.seed, channels[index].span_v);
            let gain = leg::gain(leg, &range, self.hours());
            let pole_s = 1.0 / (TAU * leg.bandwidth_hz);
            let delay_s = leg::delay_s(leg, &range, self.hours()) + pole_s - channels[index].delay_s;
            (gain, 1.0 + leg.compensation_error, range.offset_v * leg.attenuation, delay_s)
        };
        let ((gain_p, fast_p, offset_p, delay_p), (gain_n, fast_n, offset_n, delay_n)) = (side(p), side(n));
        let gain_dc = gain_n / gain_p;
        Truth {
            skew_s: delay_n - delay_p,
            gain_dc,
            gain: gain_dc * fast_n / fast_p,
            offset_v: offset_n - gain_dc * offset_p,
        }
    }
}
