//! A sine through a bridge of four diodes into a load.
//!
//! While no diode changes its state the network is linear and every node is `a + b·v` of the input `v`. The states and
//! the input voltages at which they change come from the network; between two changes a node is an arc of a sine.

use std::f64::consts::{PI, TAU};

use super::{Probes, Tips};
use crate::scenario::RectifierSpec;
use crate::world::complex::Complex;
use crate::world::network::{EARTH, Network, Solution};
use crate::world::wave::{Event, Mode, Wave};

/// Angles at which the states are looked at before the changes are narrowed down.
const ANGLES: usize = 720;

/// Halvings that bring a change of state down to the last digit of an angle.
const HALVINGS: usize = 60;

/// Both outputs of the bridge.
pub(super) fn tips(spec: &RectifierSpec, probes: Probes) -> Tips {
    let bridge = Bridge { spec, probes };
    let arcs = bridge.arcs();
    let n = bridge.wave(&arcs, NEGATIVE);
    if probes.in_situ { Tips::same(n) } else { Tips { p: bridge.wave(&arcs, POSITIVE), n } }
}

/// The bridge's nodes in the order in which [`Bridge::network`] makes them.
const POSITIVE: usize = 2;
const NEGATIVE: usize = 3;

struct Bridge<'a> {
    spec: &'a RectifierSpec,
    probes: Probes,
}

/// From an angle of the input on, the diodes that conduct.
struct Arc {
    from: f64,
    conducting: Vec<bool>,
}

impl Bridge<'_> {
    fn network(&self, volts: f64) -> Network {
        let drop_v = self.spec.drop_v;
        let mut network = Network::default();
        let (input, positive, negative) = (network.node(), network.node(), network.node());
        network.source(input, EARTH, volts, self.spec.source_ohm);
        network.diode(input, positive, drop_v);
        network.diode(EARTH, positive, drop_v);
        network.diode(negative, input, drop_v);
        network.diode(negative, EARTH, drop_v);
        network.resistor(positive, negative, self.spec.load_ohm);
        network.resistor(positive, EARTH, 1.0 / self.probes.p.conductance_s);
        network.resistor(negative, EARTH, 1.0 / self.probes.n.conductance_s);
        network
    }

    fn solve(&self, angle: f64) -> Solution {
        self.network(self.spec.peak_v * angle.sin()).solve()
    }

    /// The arcs of one period that begins where the input is largest, where no state changes.
    fn arcs(&self) -> Vec<Arc> {
        let start = PI / 2.0;
        let mut arcs = vec![Arc { from: start, conducting: self.solve(start).conducting }];
        for step in 1..=ANGLES {
            let angle = |step: usize| start + TAU * step as f64 / ANGLES as f64;
            let now = self.solve(angle(step)).conducting;
            let Some(before) = arcs.last().map(|arc| arc.conducting.clone()).filter(|before| *before != now) else {
                continue;
            };
            let (mut low, mut high) = (angle(step - 1), angle(step));
            for _ in 0..HALVINGS {
                let middle = 0.5 * (low + high);
                if self.solve(middle).conducting == before { low = middle } else { high = middle }
            }
            arcs.push(Arc { from: high, conducting: now });
        }
        arcs
    }

    /// The voltage of a node, arc by arc.
    fn wave(&self, arcs: &[Arc], node: usize) -> Wave {
        let omega = TAU * self.spec.frequency_hz;
        let period_s = 1.0 / self.spec.frequency_hz;
        // In one state two inputs give the straight line of the node's voltage over the input's.
        let line = |arc: &Arc| {
            let at = |volts: f64| self.network(volts).solve_in(&arc.conducting)[node];
            (at(0.0), at(1.0) - at(0.0))
        };
        let lines: Vec<(f64, f64)> = arcs.iter().map(line).collect();
        let base_v = lines.first().map_or(0.0, |first| first.0);
        let mut wave = Wave::constant(base_v, period_s);
        let mut last = (base_v, 0.0);
        let mut change = |from: f64, next: (f64, f64)| {
            // sin(ω(t₀ + t)) = Re(−j·e^(jωt₀)·e^(jωt))
            let phasor = Complex::new(0.0, from - PI / 2.0).exp() * self.spec.peak_v;
            let mode = Mode { pole: Complex::new(0.0, -omega), coefficient: phasor * (next.1 - last.1) };
            wave.push(Event { at_s: from / omega, jump_v: next.0 - last.0, slope_v_per_s: 0.0, modes: vec![mode] });
            last = next;
        };
        for (arc, line) in arcs.iter().zip(&lines) {
            change(arc.from, *line);
        }
        change(PI / 2.0 + TAU, (base_v, 0.0));
        wave
    }
}
