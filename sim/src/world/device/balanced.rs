//! Two outputs of opposite square waves, as of a balanced line, with a sine from elsewhere mixed onto both alike.

use super::{Probes, Tips};
use crate::scenario::BalancedSpec;
use crate::world::complex::Complex;
use crate::world::source::WHOLE_EDGE;
use crate::world::wave::{Tone, Wave};

/// Both outputs, each behind its source resistance with the probe on it. The positive one begins to rise at the time 0,
/// where the sine rises through its middle.
pub(super) fn tips(spec: &BalancedSpec, probes: Probes) -> Tips {
    let n = probes.n.on(output(spec, -1.0), spec.source_ohm);
    if probes.in_situ { Tips::same(n) } else { Tips { p: probes.p.on(output(spec, 1.0), spec.source_ohm), n } }
}

/// An output without a load; `sign` is that of its first edge.
fn output(spec: &BalancedSpec, sign: f64) -> Wave {
    let period_s = 1.0 / spec.frequency_hz;
    let half_v = sign * spec.swing_v / 2.0;
    let (low_v, high_v) = (spec.middle_v - half_v, spec.middle_v + half_v);
    let (edge_s, half_s) = (spec.edge_s * WHOLE_EDGE, period_s / 2.0);
    let square =
        Wave::polyline(period_s, &[(0.0, low_v), (edge_s, high_v), (half_s, high_v), (half_s + edge_s, low_v)]);
    let sine = Tone { frequency_hz: spec.sine_hz, amplitude: Complex::new(0.0, -spec.sine_v) };
    square.plus(&Wave::tones(period_s, 0.0, vec![sine]))
}
