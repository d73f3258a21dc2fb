//! Where sweeps start.

use rand::SeedableRng;

use super::*;
use crate::world::fixture::{bridge, ideal, reference, scenario, scope};
use crate::world::leg::Signal;
use crate::world::{ScopeSettings, device};

const HYSTERESIS_V: f64 = 0.02;

fn signals(scenario: &crate::scenario::Scenario, controls: &Controls, scope: &ScopeSettings) -> Vec<Signal> {
    let tips = device::tips(scenario, controls);
    let channel = &scope.channels[0];
    [(0, &tips.p), (1, &tips.n)].map(|(i, tip)| Signal::new(&scenario.legs[i], 1, 0.0, channel, tip)).to_vec()
}

fn on_channel(level_v: f64, rising: bool) -> Trigger {
    Trigger { source: TriggerSource::Channel(0), level_v, rising }
}

#[test]
fn a_sine_crosses_where_its_arcsine_says() {
    let scenario = ideal(scenario().device);
    let signals = signals(&scenario, &reference(Shape::Sine, 1e3), &scope(2.0, 0.5, 1e-6, 10));
    // 0.5 V + 0.5 V·sin at the input: 0.75 V at 30° going up, 150° going down; the load's pole of 0.95 ns delays it,
    // and its divider of 50 Ω on 5 MΩ takes 10 parts in a million.
    let up = crossings(&signals[0], &on_channel(0.75, true), HYSTERESIS_V);
    let down = crossings(&signals[0], &on_channel(0.75, false), HYSTERESIS_V);
    assert!(up.len() == 1 && (up[0] - 1e-3 / 12.0).abs() < 5e-9, "{up:?}");
    assert!(down.len() == 1 && (down[0] - 5e-3 / 12.0).abs() < 5e-9, "{down:?}");
}

#[test]
fn the_signal_is_at_the_level_at_the_instant() {
    let scenario = scenario();
    let signals = signals(&scenario, &bridge(1.0, 102), &scope(10.0, 2.5, 1e-9, 10));
    for rising in [true, false] {
        let found = crossings(&signals[0], &on_channel(2.4, rising), 0.2);
        assert_eq!(found.len(), 1, "{found:?}");
        assert!((signals[0].at(found[0]) - 2.4).abs() < 1e-9);
        let later = signals[0].at(found[0] + 1e-9);
        assert_eq!(later > 2.4, rising);
    }
}

#[test]
fn ringing_does_not_trigger_within_the_hysteresis() {
    let scenario = scenario();
    let signals = signals(&scenario, &bridge(0.0, 102), &scope(10.0, 2.5, 1e-9, 10));
    // The level in the ringing: it is crossed often, but with 1 V of hysteresis only once a period.
    let level_v = 4.8;
    assert!(crossings(&signals[0], &on_channel(level_v, true), 0.0).len() > 1);
    assert_eq!(crossings(&signals[0], &on_channel(level_v, true), 1.0).len(), 1);
}

#[test]
fn no_crossing_and_no_edge_is_no_trigger() {
    let scenario = scenario();
    let controls = reference(Shape::Square, 1e6);
    let signals = signals(&scenario, &controls, &scope(2.0, 0.5, 1e-9, 10));
    let outcome = |trigger: &Trigger, controls: &Controls| Triggers::new(trigger, controls, &signals, 0.02, 0.0).err();
    assert_eq!(outcome(&on_channel(0.5, true), &controls), None);
    assert_eq!(outcome(&on_channel(1.5, true), &controls), Some(NoTrigger));
    assert_eq!(outcome(&on_channel(-0.1, false), &controls), Some(NoTrigger));
    let missing = Trigger { source: TriggerSource::Channel(9), level_v: 0.5, rising: true };
    assert_eq!(outcome(&missing, &controls), Some(NoTrigger));
    let external = Trigger { source: TriggerSource::External, level_v: 0.0, rising: true };
    assert_eq!(outcome(&external, &Controls::default()), Some(NoTrigger));
    let mut steady = controls;
    steady.generator[0].shape = Shape::Dc;
    assert_eq!(outcome(&external, &steady), Some(NoTrigger));
}

#[test]
fn the_sync_edge_is_output_1_s_if_it_is_on_and_else_output_2_s() {
    let scenario = scenario();
    let mut controls = bridge(1.0, 102);
    let signals = signals(&scenario, &controls, &scope(10.0, 2.5, 1e-9, 10));
    let mut rng = ChaCha8Rng::seed_from_u64(1);
    let mut phases = |controls: &Controls, rising: bool, period_s: f64| {
        let trigger = Trigger { source: TriggerSource::External, level_v: 0.0, rising };
        let triggers = Triggers::new(&trigger, controls, &signals, 0.0, 0.0).unwrap();
        (0..50).map(|_| (triggers.next(&mut rng) / period_s).fract()).collect::<Vec<f64>>()
    };
    let near = |phase: &f64, wanted: f64| ((phase - wanted + 0.5).rem_euclid(1.0) - 0.5).abs() < 1e-6;
    assert!(phases(&controls, true, 10e-6).iter().all(|phase| near(phase, 0.0)));
    assert!(phases(&controls, false, 10e-6).iter().all(|phase| near(phase, 0.5)));
    controls.generator[0] = reference(Shape::Square, 1e6).generator[0].clone();
    // Now ten edges fall into each period of the bridge, and sweeps start at all of them.
    let seen: std::collections::BTreeSet<i64> =
        phases(&controls, true, 10e-6).iter().map(|phase| (phase * 10.0).round() as i64 % 10).collect();
    assert!(seen.len() > 5, "{seen:?}");
}

#[test]
fn an_immediate_sweep_starts_anywhere() {
    let scenario = scenario();
    let controls = reference(Shape::Square, 1e6);
    let signals = signals(&scenario, &controls, &scope(2.0, 0.5, 1e-9, 10));
    let trigger = Trigger { source: TriggerSource::Immediate, level_v: 0.0, rising: true };
    let triggers = Triggers::new(&trigger, &controls, &signals, 0.0, 0.0).unwrap();
    let mut rng = ChaCha8Rng::seed_from_u64(3);
    let phases: Vec<f64> = (0..1000).map(|_| triggers.next(&mut rng) * 1e6).collect();
    // Uniform on 0…1: mean 0.5 with a standard error of 0.0091.
    let mean = phases.iter().sum::<f64>() / 1000.0;
    assert!((mean - 0.5).abs() < 0.04 && phases.iter().all(|phase| (0.0..1.0).contains(phase)), "{mean}");
}
