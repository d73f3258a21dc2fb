//! The half bridge that drives the fan: its switching node, and the gate of its high-side switch that rides on it.
//!
//! The time 0 of a period is the rising edge of the drive. After the dead time the gate charges through its resistance
//! towards the drive voltage; at the plateau, `threshold + load/transconductance` above the node, it stays while the
//! node travels (Miller), and then goes on. The way back is the same from the drive's falling edge on, without a dead
//! time. More load means a higher plateau, a slower node and so a longer plateau, more drop across the closed switch,
//! and more ringing.

use super::{IDLE_PERIOD_S, Probes, Tips, limited};
use crate::scenario::HalfBridgeSpec;
use crate::world::complex::Complex;
use crate::world::controls::{Controls, Shape, SourceOutput};
use crate::world::source;
use crate::world::wave::{Event, Mode, Wave};

use std::f64::consts::TAU;

/// A linear edge takes this many times its 10–90 % time.
const WHOLE_EDGE: f64 = 1.0 / 0.8;

/// The gate's time constants that each half of a period must leave after its edge, or the pulse is swallowed.
const SETTLED: f64 = 5.0;

/// The highest plateau, as a fraction of the drive's swing.
const HIGHEST_PLATEAU: f64 = 0.9;

/// The current into the bus, in amperes, when the supply holds `volts`.
pub(super) fn bus_current_a(spec: &HalfBridgeSpec, controls: &Controls, volts: f64) -> f64 {
    if volts <= 0.0 {
        return 0.0;
    }
    let load = Timing::new(spec, controls).map_or(0.0, |timing| timing.load_a * timing.duty());
    spec.quiescent_a + load
}

/// Gate and node.
pub(super) fn tips(spec: &HalfBridgeSpec, controls: &Controls, probes: Probes) -> Tips {
    let supply = controls.supply.first().filter(|supply| supply.on);
    let bus_v = supply.map_or(0.0, |supply| limited(supply, bus_current_a(spec, controls, supply.voltage_v)).0);
    let (node, gate) = match Timing::new(spec, controls) {
        Some(timing) => {
            let load_a = if bus_v > 0.0 { timing.load_a } else { 0.0 };
            (node(spec, &timing, bus_v, load_a), gate_over_node(spec, &timing))
        }
        None => {
            let high = controls.generator.get(1).is_some_and(|drive| rests_high(spec, drive));
            let (node_v, gate_v) = if high { (bus_v, spec.gate_high_v) } else { (0.0, spec.gate_low_v) };
            (Wave::constant(node_v, IDLE_PERIOD_S), Wave::constant(gate_v, IDLE_PERIOD_S))
        }
    };
    let p = probes.p.on(gate.plus(&node), spec.gate_source_ohm);
    let n = probes.n.on(node, spec.on_ohm);
    if probes.in_situ { Tips::same(n) } else { Tips { p, n } }
}

/// The instants of one period, in seconds after the drive's rising edge.
struct Timing {
    period_s: f64,
    load_a: f64,
    plateau_v: f64,
    /// The gate begins to charge, reaches the plateau, leaves it.
    charge_s: f64,
    up_from_s: f64,
    up_to_s: f64,
    /// The gate begins to discharge, reaches the plateau, leaves it.
    discharge_s: f64,
    down_from_s: f64,
    down_to_s: f64,
}

impl Timing {
    /// Nothing when the bridge does not switch.
    fn new(spec: &HalfBridgeSpec, controls: &Controls) -> Option<Self> {
        let drive = controls.generator.get(1).filter(|drive| is_clock(spec, drive))?;
        let load_a = load_a(spec, controls);
        let swing_v = spec.gate_high_v - spec.gate_low_v;
        let wanted_v = spec.switch_threshold_v + load_a / spec.transconductance_a_per_v;
        let plateau_v = wanted_v.min(spec.gate_low_v + HIGHEST_PLATEAU * swing_v);
        let edge_s = spec.node_edge_s + spec.node_edge_s_per_a * (load_a - spec.idle_load_a);
        let tau_s = spec.gate_time_constant_s;
        let charge_s = spec.dead_time_s;
        let up_from_s = charge_s + tau_s * (swing_v / (spec.gate_high_v - plateau_v)).ln();
        let up_to_s = up_from_s + edge_s * WHOLE_EDGE;
        let discharge_s = source::high_s(drive);
        let down_from_s = discharge_s + tau_s * (swing_v / (plateau_v - spec.gate_low_v)).ln();
        let down_to_s = down_from_s + edge_s * WHOLE_EDGE;
        let period_s = 1.0 / drive.frequency_hz;
        let settled_s = SETTLED * tau_s;
        let fits = up_to_s + settled_s < discharge_s && down_to_s + settled_s < period_s + charge_s;
        fits.then_some(Self {
            period_s,
            load_a,
            plateau_v,
            charge_s,
            up_from_s,
            up_to_s,
            discharge_s,
            down_from_s,
            down_to_s,
        })
    }

    /// The part of the period in which the load hangs on the bus.
    fn duty(&self) -> f64 {
        0.5 * (self.down_from_s + self.down_to_s - self.up_from_s - self.up_to_s) / self.period_s
    }
}

/// Whether the drive's output crosses the logic threshold once each way in every period.
fn is_clock(spec: &HalfBridgeSpec, drive: &SourceOutput) -> bool {
    let half_v = drive.amplitude_vpp / 2.0;
    let crosses = (drive.offset_v - spec.logic_threshold_v).abs() < half_v;
    drive.on && crosses && matches!(drive.shape, Shape::Pulse | Shape::Sine | Shape::Square)
}

/// Whether a drive that is no clock holds the high side on.
fn rests_high(spec: &HalfBridgeSpec, drive: &SourceOutput) -> bool {
    drive.on && drive.shape == Shape::Dc && drive.offset_v > spec.logic_threshold_v
}

/// The fan's current: more the more the brake holds it.
fn load_a(spec: &HalfBridgeSpec, controls: &Controls) -> f64 {
    let brake = controls.supply.get(1).filter(|supply| supply.on);
    let brake_a = brake.map_or(0.0, |supply| limited(supply, supply.voltage_v / spec.brake_ohm).1);
    spec.idle_load_a + spec.load_a_per_brake_a * brake_a
}

/// The switching node: the bus or earth, less what the load drops across the closed switch, with ringing.
fn node(spec: &HalfBridgeSpec, timing: &Timing, bus_v: f64, load_a: f64) -> Wave {
    let (least_v, most_v) = if load_a > 0.0 {
        (spec.on_ohm * (load_a - spec.ripple_a / 2.0), spec.on_ohm * (load_a + spec.ripple_a / 2.0))
    } else {
        (0.0, 0.0)
    };
    let corners = [
        (timing.up_from_s, -least_v),
        (timing.up_to_s, bus_v - least_v),
        (timing.down_from_s, bus_v - most_v),
        (timing.down_to_s, -most_v),
    ];
    let mut wave = Wave::polyline(timing.period_s, &corners);
    let peak_v = spec.ring_of_bus * (1.0 + spec.ring_per_a * (timing.load_a - spec.idle_load_a)) * bus_v;
    let pole = Complex::new(1.0 / spec.ring_decay_s, -TAU * spec.ring_hz);
    // The damped sine's first peak lies where its derivative is nought: tan(ωt) = ω/α.
    let to_peak_s = (-pole.im).atan2(pole.re) / -pole.im;
    let amplitude_v = peak_v / ((-pole.re * to_peak_s).exp() * (-pole.im * to_peak_s).sin());
    for (at_s, sign) in [(timing.up_to_s, 1.0), (timing.down_to_s, -1.0)] {
        // Re(−j·A·e^(−(α − jω)t)) = A·e^(−αt)·sin(ωt)
        let mode = Mode { pole, coefficient: Complex::new(0.0, -sign * amplitude_v) };
        wave.push(Event { at_s, jump_v: 0.0, slope_v_per_s: 0.0, modes: vec![mode] });
    }
    wave
}

/// The gate, seen from the node: exponentials to and from the plateau.
fn gate_over_node(spec: &HalfBridgeSpec, timing: &Timing) -> Wave {
    let mut wave = Wave::constant(spec.gate_low_v, timing.period_s);
    let (low_v, high_v, plateau_v) = (spec.gate_low_v, spec.gate_high_v, timing.plateau_v);
    let pole = Complex::real(1.0 / spec.gate_time_constant_s);
    // Each event moves the level that is headed for, and adds the distance to it as a mode. On reaching the plateau
    // the mode's rest, which is known there, is taken away again.
    for (at_s, jump_v, mode_v) in [
        (timing.charge_s, high_v - low_v, low_v - high_v),
        (timing.up_from_s, plateau_v - high_v, high_v - plateau_v),
        (timing.up_to_s, high_v - plateau_v, plateau_v - high_v),
        (timing.discharge_s, low_v - high_v, high_v - low_v),
        (timing.down_from_s, plateau_v - low_v, low_v - plateau_v),
        (timing.down_to_s, low_v - plateau_v, plateau_v - low_v),
    ] {
        let mode = Mode { pole, coefficient: Complex::real(mode_v) };
        wave.push(Event { at_s, jump_v, slope_v_per_s: 0.0, modes: vec![mode] });
    }
    wave
}
