//! The devices by Ohm's and Kirchhoff's laws, by the trade's rules of thumb and by the scenario's figures.

use super::*;
use crate::scenario::{BalancedSpec, DividerSpec, RectifierSpec};
use crate::world::Shape;
use crate::world::controls::SupplyOutput;
use crate::world::fixture::{bridge, ideal, reference, scenario};
use crate::world::wave::Sampler;

fn ten_volts(route: u32) -> Controls {
    let mut controls = Controls::default();
    controls.supply[0] = SupplyOutput { on: true, voltage_v: 10.0, current_a: 1.0 };
    controls.closed.insert(route);
    controls
}

fn equal_resistors(earth_lead: bool) -> Scenario {
    ideal(DeviceSpec::Divider(DividerSpec { resistors_ohm: [100.0; 3], earth_lead }))
}

/// Steady voltages at P and N.
fn steady(scenario: &Scenario, controls: &Controls) -> (f64, f64) {
    let tips = tips(scenario, controls);
    (tips.p.mean(), tips.n.mean())
}

/// Seconds from the last instant below a tenth of the way from `low_v` to `high_v` to the first above nine tenths.
fn rise_s(wave: &Wave, from_s: f64, low_v: f64, high_v: f64) -> f64 {
    let sampler = Sampler::new(wave);
    let crossing = |level_v: f64| {
        let steps = (0..200_000).map(|i| from_s + f64::from(i) * 1e-12);
        steps.into_iter().find(|&at_s| sampler.at(at_s) >= level_v).unwrap()
    };
    crossing(low_v + 0.9 * (high_v - low_v)) - crossing(low_v + 0.1 * (high_v - low_v))
}

#[test]
fn the_middle_of_three_equal_resistors_has_a_third() {
    // Common practice, no source: 3.33 V of 10 V across the middle one, 6.67 V from its upper end to earth.
    let (p, n) = steady(&equal_resistors(false), &ten_volts(103));
    assert!((p - 6.67).abs() < 0.005 && (p - n - 3.33).abs() < 0.005, "{p} {n}");
    // The probes' 10 MΩ on 66.7 Ω take less than 10 parts in a million.
    assert!((p - 20.0 / 3.0).abs() < 1e-4 && (n - 10.0 / 3.0).abs() < 1e-4, "{p} {n}");
    let (p, n) = steady(&equal_resistors(false), &ten_volts(102));
    assert!((p - 10.0 / 3.0).abs() < 1e-4 && (n - p).abs() < 1e-12, "{p} {n}");
}

#[test]
fn an_earthed_lead_at_its_lower_end_makes_it_a_half() {
    // Common practice, no source: the lead shorts the third resistor; 5 V appear, and half as much current again flows.
    let scenario = equal_resistors(true);
    let (p, n) = steady(&scenario, &ten_volts(103));
    assert!((p - 5.0).abs() < 1e-4 && n.abs() < 1e-4, "{p} {n}");
    assert!((supply_reading(&scenario, &ten_volts(103), 0).1 - 0.05).abs() < 1e-9);
    assert!((supply_reading(&equal_resistors(false), &ten_volts(103), 0).1 - 1.0 / 30.0).abs() < 1e-9);
}

#[test]
fn probes_load_a_divider_of_high_resistance() {
    // By hand, 10 MΩ throughout, probes too: lower end 10 ∥ 10 = 5 MΩ; upper end 10 ∥ (10 + 5) = 6 MΩ;
    // 10 V·6/16 = 3.75 V at the upper end, a third of it, 1.25 V, at the lower.
    let spec = DividerSpec { resistors_ohm: [10e6; 3], earth_lead: false };
    let (p, n) = steady(&ideal(DeviceSpec::Divider(spec)), &ten_volts(103));
    assert!((p - 3.75).abs() < 1e-6 && (n - 1.25).abs() < 1e-6, "{p} {n}");
}

#[test]
fn a_rectifier_gives_the_magnitude_less_two_drops() {
    let spec = RectifierSpec { peak_v: 10.0, frequency_hz: 50.0, source_ohm: 1e-3, drop_v: 0.7, load_ohm: 1e3 };
    let tips = tips(&ideal(DeviceSpec::Rectifier(spec)), &ten_volts(103));
    let (p, n) = (Sampler::new(&tips.p), Sampler::new(&tips.n));
    for i in 0..200 {
        let time_s = f64::from(i) * 1e-4 + 1e-5;
        let input = 10.0 * (std::f64::consts::TAU * 50.0 * time_s).sin();
        // Common practice, no source: two drops of about 0.7 V; below them nothing flows.
        let expected = (input.abs() - 1.4).max(0.0);
        let load = p.at(time_s) - n.at(time_s);
        assert!((load - expected).abs() < 1e-3, "{time_s}: {load} instead of {expected}");
        // Neither end is at earth: N lies a drop above the lower of input and earth while current flows.
        if input.abs() > 1.5 {
            assert!((n.at(time_s) - (input.min(0.0) + 0.7)).abs() < 1e-3, "{time_s}");
        }
    }
}

#[test]
fn the_sine_on_a_balanced_line_is_on_both_outputs_and_not_between_them() {
    let spec = BalancedSpec {
        frequency_hz: 100e3,
        swing_v: 2.0,
        middle_v: 2.5,
        edge_s: 20e-9,
        source_ohm: 50.0,
        sine_v: 3.0,
        sine_hz: 1e6,
    };
    let tips_of = |route| tips(&ideal(DeviceSpec::Balanced(spec.clone())), &ten_volts(route));
    let measured = tips_of(103);
    let (p, n) = (Sampler::new(&measured.p), Sampler::new(&measured.n));
    for i in 0..1000 {
        let time_s = f64::from(i) * 10e-9;
        // An edge takes 25 ns whole, and what 50 Ω and the probe's 9.5 pF make of it 0.5 ns more.
        if time_s.rem_euclid(5e-6) < 30e-9 {
            continue;
        }
        // Two outputs of ±1 V, opposite: ±2 V between them, less the 5 millionths that 50 Ω lose to 10 MΩ.
        let expected = if time_s < 5e-6 { 2.0 } else { -2.0 };
        assert!((p.at(time_s) - n.at(time_s) - expected).abs() < 2e-5, "{time_s}");
        // Half of their sum: the middle and the sine, late by the 50 Ω · 9.5 pF = 475 ps of the load.
        let common = 0.5 * (p.at(time_s) + n.at(time_s));
        let sine = 3.0 * (std::f64::consts::TAU * 1e6 * (time_s - 475e-12)).sin();
        assert!((common - 2.5 - sine).abs() < 1e-4, "{time_s}: {common}");
    }
    let in_situ = tips_of(102);
    assert_eq!(in_situ.p, in_situ.n);
}

#[test]
fn the_reference_is_on_both_tips_behind_fifty_ohms() {
    let tips = tips(&scenario(), &reference(Shape::Square, 1e6));
    assert_eq!(tips.p, tips.n);
    let sampler = Sampler::new(&tips.p);
    // 50 Ω on 2 × 10 MΩ: 5/5.00005 of 10 V.
    assert!((sampler.at(400e-9) - 9.9999).abs() < 1e-5, "{}", sampler.at(400e-9));
    // A ramp of 3.75 ns through 50 Ω · 19 pF = 0.95 ns ends at 1 − (0.95/3.75)·(1 − e^(−3.75/0.95)) of the swing.
    let expected = 10.0 * (1.0 - 0.95 / 3.75 * (1.0 - (-3.75_f64 / 0.95).exp()));
    assert!((sampler.at(3.75e-9) - expected).abs() < 1e-3, "{} {expected}", sampler.at(3.75e-9));
}

#[test]
fn open_tips_are_at_nought() {
    let mut controls = bridge(1.0, 103);
    controls.closed.clear();
    assert_eq!(steady(&scenario(), &controls), (0.0, 0.0));
}

#[test]
fn the_node_goes_to_the_bus_less_the_switch_s_drop() {
    for (brake_a, load_a) in [(0.0, 0.5), (2.0, 8.5)] {
        let node = Sampler::new(&tips(&scenario(), &bridge(brake_a, 102)).n);
        // In the middle of the high time the ripple is nearly at its middle.
        assert!((node.at(2.65e-6) - (48.0 - 0.05 * load_a)).abs() < 2e-3, "{}", node.at(2.65e-6));
        assert!((node.at(7.65e-6) + 0.05 * load_a).abs() < 2e-3, "{}", node.at(7.65e-6));
    }
}

#[test]
fn load_slows_the_node_from_25_to_45_ns() {
    for (brake_a, edge_s) in [(0.0, 25e-9), (1.0, 35e-9), (2.0, 45e-9)] {
        let node = tips(&scenario(), &bridge(brake_a, 102)).n;
        // Ringing begins after the edge; the levels of the edge are those of its corners, drops of the switch included.
        let load_a = 0.5 + 4.0 * brake_a;
        let drop_v = 0.05 * (load_a - 0.2);
        let found_s = rise_s(&node, 150e-9, -drop_v, 48.0 - drop_v);
        assert!((found_s - edge_s).abs() < 0.05e-9, "{found_s}");
    }
}

#[test]
fn the_node_rings_after_its_edges() {
    let node = Sampler::new(&tips(&scenario(), &bridge(0.0, 102)).n);
    let highest = (0..3000).map(|i| node.at(200e-9 + f64::from(i) * 1e-10)).fold(f64::MIN, f64::max);
    // First peak 6 % of the bus.
    assert!((highest - (48.0 * 1.06 - 0.05 * 0.3)).abs() < 0.02, "{highest}");
    let lowest = (0..3000).map(|i| node.at(5.0e-6 + f64::from(i) * 1e-10)).fold(f64::MAX, f64::min);
    assert!((lowest - (-48.0 * 0.06 - 0.05 * 0.7)).abs() < 0.02, "{lowest}");
}

#[test]
fn the_gate_rides_on_the_node_and_rests_on_its_plateau_while_that_moves() {
    // The plateau: 4 V + load / (4 A/V). It lasts as long as the whole edge, 1/0.8 of its 10–90 % time.
    for (brake_a, plateau_v, whole_edge_s) in [(0.0, 4.125, 31.25e-9), (2.0, 6.125, 56.25e-9)] {
        let mut quiet = scenario();
        // Without the probes' load the difference of the tips is the gate over the node exactly.
        quiet.legs.iter_mut().for_each(|leg| leg.capacitance_f = 1e-18);
        let tips = tips(&quiet, &bridge(brake_a, 103));
        let (p, n) = (Sampler::new(&tips.p), Sampler::new(&tips.n));
        let gate = |at_s: f64| p.at(at_s) - n.at(at_s);
        assert!((gate(3e-6) - 11.9).abs() < 1e-3 && gate(9e-6).abs() < 1e-3);
        assert!(gate(195e-9).abs() < 1e-3);
        let on: Vec<f64> = (0..4000).map(|i| gate(200e-9 + f64::from(i) * 1e-10)).collect();
        let resting = on.iter().filter(|&&v| (v - plateau_v).abs() < 1e-3).count() as f64 * 1e-10;
        assert!((resting - whole_edge_s).abs() < 0.3e-9, "{resting}");
        assert!(on.windows(2).all(|pair| pair[1] - pair[0] > -1e-3), "the gate falls while it is charged");
        // Charging towards 11.9 V through 20 ns: a time constant after the start 63 % or the plateau, what is less.
        let early = 11.9 * (1.0 - (-5.0_f64 / 20.0).exp());
        assert!((gate(205e-9) - early).abs() < 1e-2, "{} {early}", gate(205e-9));
    }
}

#[test]
fn the_bridge_switches_only_while_its_drive_does() {
    let scenario = scenario();
    let mut off = bridge(1.0, 103);
    off.generator[1].on = false;
    assert_eq!(steady(&scenario, &off).1, 0.0);
    let mut held = bridge(1.0, 103);
    held.generator[1].shape = Shape::Dc;
    held.generator[1].offset_v = 5.0;
    let (gate, node) = steady(&scenario, &held);
    assert!((node - 48.0).abs() < 1e-4 && (gate - 59.9).abs() < 1e-3, "{gate} {node}");
    let mut small = bridge(1.0, 103);
    small.generator[1].offset_v = 0.0;
    small.generator[1].amplitude_vpp = 1.0;
    assert_eq!(steady(&scenario, &small).1, 0.0);
    // A pulse too short for the gate is swallowed.
    let mut short = bridge(1.0, 103);
    short.generator[1].frequency_hz = 2e6;
    assert_eq!(steady(&scenario, &short).1, 0.0);
}

#[test]
fn in_situ_both_tips_see_the_same_node() {
    let tips = tips(&scenario(), &bridge(1.0, 102));
    assert_eq!(tips.p, tips.n);
}

#[test]
fn the_supply_reads_what_the_device_takes() {
    let scenario = scenario();
    let controls = bridge(2.0, 103);
    // Brake: limited to 2 A, 5 Ω.
    assert_eq!(supply_reading(&scenario, &controls, 1), (10.0, 2.0));
    // Bus: 8.5 A for the time between the middles of the node's edges. Both edges alike, the high time is 5 µs less the
    // dead time, less the difference of the ways to the plateau: 20 ns·(ln(11.9/5.775) − ln(11.9/6.125)) = 1.2 ns.
    let (volts, amperes) = supply_reading(&scenario, &controls, 0);
    let duty = (5e-6 - 200e-9 - 1.2e-9) / 10e-6;
    assert_eq!(volts, 48.0);
    assert!((amperes - (0.02 + 8.5 * duty)).abs() < 1e-3, "{amperes}");
    // In current limit the voltage gives way in proportion.
    let mut limit = controls.clone();
    limit.supply[0].current_a = amperes / 2.0;
    let (volts, half) = supply_reading(&scenario, &limit, 0);
    assert!((volts - 24.0).abs() < 1e-9 && (half - amperes / 2.0).abs() < 1e-12);
    let mut off = controls;
    off.supply[0].on = false;
    assert_eq!(supply_reading(&scenario, &off, 0), (0.0, 0.0));
    assert_eq!(supply_reading(&scenario, &off, 7), (0.0, 0.0));
}
