//! The world as the scope sees it: what was put in comes out, twice the same, and drifts as it should.

use std::f64::consts::TAU;

use super::fixture::{bridge, component, ideal, reference, scenario, scope, spread, volts};
use super::*;

/// Skew, gain and offset of both channels from a sine at `frequency_hz`, whole periods.
fn measured(world: &mut World, controls: &Controls, scope: &ScopeSettings, frequency_hz: f64) -> (f64, f64, [f64; 2]) {
    let [p, n] = volts(world, controls, scope);
    let (size_p, angle_p) = component(&p, scope.interval_s, frequency_hz);
    let (size_n, angle_n) = component(&n, scope.interval_s, frequency_hz);
    let late = (angle_p - angle_n + TAU / 2.0).rem_euclid(TAU) - TAU / 2.0;
    (late / (TAU * frequency_hz), size_n / size_p, [spread(&p).0, spread(&n).0])
}

fn dithered() -> Scenario {
    let mut scenario = scenario();
    scenario.legs.iter_mut().for_each(|leg| leg.noise_of_span = 0.7 / 256.0);
    scenario
}

#[test]
fn skew_gain_and_offset_come_back_from_a_sine() {
    let scenario = dithered();
    let mut world = World::new(&scenario);
    let mut scope = ScopeSettings { averages: 256, ..scope(2.0, 0.5, 0.5e-9, 4000) };
    let truth = world.truth(&scope.channels, 0, 1);
    // By hand: 5.7 − 4 ns, 1/(2π·300 MHz) − 1/(2π·400 MHz) = 0.530516 − 0.397887 ns.
    assert!((truth.skew_s - 1.832_629e-9).abs() < 1e-14, "{truth:?}");
    assert!((truth.gain_dc - 0.955 / 0.99).abs() < 1e-12, "{truth:?}");
    assert!((truth.gain - 0.955 / 0.99 * 0.9997 / 1.0002).abs() < 1e-12, "{truth:?}");
    assert!((truth.offset_v - (-0.05 - 0.955 / 0.99 * 0.02)).abs() < 1e-12, "{truth:?}");

    let (skew_s, gain, [mean_p, mean_n]) = measured(&mut world, &reference(Shape::Sine, 5e6), &scope, 5e6);
    // Noise of 0.76 steps (with the converter's own) on an amplitude of 64 steps, 256·4000 values: 1.7e-5 rad and the
    // same part of the gain per channel, √2 of it between the two.
    let sd = 2.4e-5;
    assert!((skew_s - truth.skew_s).abs() < 4.0 * sd / (TAU * 5e6), "{skew_s} {truth:?}");
    // At 5 MHz the two poles alone differ by (f/300 MHz)²/2 − (f/400 MHz)²/2 = 6.1e-5.
    let poles = ((1.0 + (5.0_f64 / 400.0).powi(2)) / (1.0 + (5.0_f64 / 300.0).powi(2))).sqrt();
    assert!((gain - truth.gain * poles).abs() < 4.0 * sd, "{gain} {truth:?}");
    let offset_v = 10.0 * (mean_n - truth.gain_dc * mean_p);
    assert!((offset_v - truth.offset_v).abs() < 1e-3, "{offset_v} {truth:?}");

    // The scope's own setting takes the late leg back.
    scope.channels[1].delay_s = 1.8e-9;
    assert!((world.truth(&scope.channels, 0, 1).skew_s - 32.629e-12).abs() < 1e-14);
    let (left_s, ..) = measured(&mut world, &reference(Shape::Sine, 5e6), &scope, 5e6);
    assert!((left_s - 32.629e-12).abs() < 4.0 * sd / (TAU * 5e6), "{left_s}");
}

#[test]
fn each_range_has_its_own_gain_and_offset() {
    let world = World::new(&scenario());
    let truths = [1.0, 2.0, 5.0].map(|span_v| world.truth(&scope(span_v, 0.0, 1e-9, 10).channels, 0, 1));
    assert!(truths[0].gain != truths[1].gain && truths[1].gain != truths[2].gain, "{truths:?}");
    assert!(truths[0].offset_v != truths[2].offset_v && truths[0].skew_s != truths[2].skew_s, "{truths:?}");
}

#[test]
fn the_demo_has_the_faults_that_its_file_states() {
    let scenario = Scenario::read(include_str!("../../../configs/scenarios/greenhouse-fan.toml")).unwrap();
    let world = World::new(&scenario);
    for (span_v, skew_s, gain) in
        [(1.0, 2.32e-9, 0.970_6), (2.0, 2.32e-9, 0.972_16), (5.0, 2.3e-9, 0.976_27), (10.0, 2.3e-9, 0.976_26)]
    {
        let truth = world.truth(&scope(span_v, 0.0, 1e-9, 10).channels, 0, 1);
        assert!((truth.skew_s - skew_s).abs() < 1e-13, "{span_v}: {truth:?}");
        assert!((truth.gain_dc - gain).abs() < 5e-5, "{span_v}: {truth:?}");
        assert!((0.01..0.1).contains(&truth.offset_v.abs()), "{span_v}: {truth:?}");
        // What skew and gain cannot take away, from steady voltages to fast ones: 70 dB and better.
        assert!((truth.gain / truth.gain_dc - 1.0).abs() < 10_f64.powf(-70.0 / 20.0), "{truth:?}");
    }
}

#[test]
fn the_same_calls_give_the_same_samples() {
    let mut noisy = dithered();
    noisy.scope.trigger_jitter_s = 20e-12;
    let scope = ScopeSettings { averages: 4, ..scope(2.0, 0.5, 1e-9, 500) };
    let controls = reference(Shape::Square, 1e6);
    let run = |scenario: &Scenario| {
        let mut world = World::new(scenario);
        [(); 3].map(|()| world.acquire(&controls, &scope).unwrap())
    };
    let first = run(&noisy);
    assert_eq!(first, run(&noisy));
    assert_eq!(first.each_ref().map(|acquisition| acquisition.number), [1, 2, 3]);
    assert_ne!(first[0].channels[0], first[1].channels[0]);
    assert_ne!(first[0].channels[0], first[0].channels[1]);
    noisy.seed += 1;
    assert_ne!(first, run(&noisy));
}

#[test]
fn jitter_moves_both_channels_together() {
    let mut scenario = scenario();
    scenario.scope.trigger_jitter_s = 2e-9;
    let mut world = World::new(&scenario);
    let scope = scope(2.0, 0.5, 0.5e-9, 4000);
    let controls = reference(Shape::Sine, 5e6);
    let mut shifts = Vec::new();
    let mut skews = Vec::new();
    for _ in 0..40 {
        let [p, n] = volts(&mut world, &controls, &scope);
        let angles = [&p, &n].map(|record| component(record, 0.5e-9, 5e6).1 / (TAU * 5e6));
        shifts.push(angles[0]);
        skews.push(angles[0] - angles[1]);
    }
    // 40 draws: the standard deviation is known to 11 %.
    let (common_s, own_s) = (spread(&shifts).1, spread(&skews).1);
    assert!((common_s / 2e-9 - 1.0).abs() < 0.4, "{common_s}");
    // What is left between the channels is the converter's rounding without dither.
    assert!(own_s < 30e-12, "{own_s}");
}

#[test]
fn the_trigger_is_where_the_record_says() {
    // The channel's own crossing at 0.4 of a record: there, and not half a sample away, the signal is at the level.
    let mut world = World::new(&scenario());
    let trigger = Trigger { source: TriggerSource::Channel(0), level_v: 2.4, rising: true };
    let scope = ScopeSettings { trigger, trigger_position: 0.4, ..scope(10.0, 2.5, 1e-9, 1001) };
    let acquisition = world.acquire(&bridge(1.0, 103), &scope).unwrap();
    assert!((acquisition.start_s + 400e-9).abs() < 1e-18);
    let [p, _] = volts(&mut world, &bridge(1.0, 103), &scope);
    // The gate edge moves about 1.1 V per 10 ns at the tip: a sample is 0.1 V at the input, a step 39 mV.
    assert!((p[400] - 2.4).abs() < 0.03 && p[395] < 2.4 && p[405] > 2.4, "{:?}", &p[395..406]);
}

#[test]
fn a_missing_trigger_leaves_the_world_as_it_was() {
    let mut world = World::new(&dithered());
    let mut other = world.clone();
    let scope = scope(2.0, 0.5, 1e-9, 100);
    assert_eq!(world.acquire(&Controls::default(), &scope), Err(NoTrigger));
    let controls = reference(Shape::Square, 1e6);
    assert_eq!(world.acquire(&controls, &scope), other.acquire(&controls, &scope));
}

#[test]
fn delay_and_gain_drift_by_virtual_time() {
    let mut scenario = scenario();
    scenario.scope.acquisition_time_s = 1800.0;
    scenario.legs[1].delay_drift_s_per_h = 10e-12;
    scenario.legs[1].gain_drift_per_h = 1e-4;
    let mut world = World::new(&scenario);
    let scope = scope(2.0, 0.5, 1e-9, 100);
    let before = world.truth(&scope.channels, 0, 1);
    for _ in 0..4 {
        world.acquire(&reference(Shape::Square, 1e6), &scope).unwrap();
    }
    // Four half hours.
    let after = world.truth(&scope.channels, 0, 1);
    assert!((after.skew_s - before.skew_s - 20e-12).abs() < 1e-16);
    assert!((after.gain / before.gain - 1.0 - 2e-4).abs() < 1e-12);
}

#[test]
fn a_channel_without_a_leg_is_at_nought() {
    let mut world = World::new(&dithered());
    let mut scope = scope(2.0, 0.0, 1e-9, 100);
    scope.channels.push(scope.channels[0].clone());
    let acquisition = world.acquire(&reference(Shape::Square, 1e6), &scope).unwrap();
    assert_eq!(acquisition.channels[2].codes, [0; 100]);
}

/// Volts at the inputs of an acquisition that something befell, and the acquisition.
fn disturbed(disturbance: &Disturbance, controls: &Controls) -> ([Vec<f64>; 2], Acquisition) {
    let mut world = World::new(&scenario());
    let scope = scope(2.0, 0.5, 1e-9, 2000);
    let acquisition = world.acquire_disturbed(controls, &scope, disturbance).unwrap();
    let volts = [0, 1].map(|index| {
        let data: &ChannelData = &acquisition.channels[index];
        data.codes.iter().map(|&code| data.zero_v + f64::from(code) * data.volts_per_code).collect()
    });
    (volts, acquisition)
}

#[test]
fn a_probe_that_fell_off_shows_the_offset_alone() {
    let controls = reference(Shape::Square, 1e6);
    let (volts, _) = disturbed(&Disturbance { flat: vec![1], ..Disturbance::default() }, &controls);
    // The fixture's offset of the range is -5 mV at the input; one converter step is 7.8 mV.
    assert!(volts[1].iter().all(|v| (v + 0.005).abs() < 0.0079), "{:?}", &volts[1][..3]);
    let swing = volts[0].iter().fold(0.0_f64, |most, v| most.max(*v));
    assert!(swing > 0.9, "the other leg is as ever: {swing}");
}

#[test]
fn exchanged_probes_change_the_sign_of_the_difference() {
    // The bridge with the gate on P and the node on N: while the gate is high, P lies some 12 V above N.
    let controls = bridge(0.5, 103);
    let mean = |volts: &[Vec<f64>; 2]| spread(&volts[0]).0 - spread(&volts[1]).0;
    let mut found = Vec::new();
    for swapped in [false, true] {
        let mut world = World::new(&ideal(scenario().device));
        let scope = scope(10.0, 3.0, 5e-9, 2000);
        let acquisition =
            world.acquire_disturbed(&controls, &scope, &Disturbance { swapped, ..Disturbance::default() }).unwrap();
        let volts = [0, 1].map(|index| {
            let data: &ChannelData = &acquisition.channels[index];
            data.codes.iter().map(|&code| data.zero_v + f64::from(code) * data.volts_per_code).collect()
        });
        found.push(mean(&volts));
    }
    assert!(found[0] > 0.3, "{found:?}");
    assert!((found[0] + found[1]).abs() < 0.02 * found[0], "{found:?}");
}

#[test]
fn a_stuck_bit_is_set_in_every_code() {
    let controls = reference(Shape::Square, 1e6);
    let (_, acquisition) = disturbed(&Disturbance { stuck: vec![(0, 4)], ..Disturbance::default() }, &controls);
    let stuck = |channel: usize| {
        let data = &acquisition.channels[channel];
        data.codes.iter().filter(|code| (i32::from(**code) - data.low_code) & 16 != 0).count()
    };
    assert_eq!(stuck(0), 2000);
    assert!(stuck(1) < 2000, "the other channel is as ever");
    let data = &acquisition.channels[0];
    assert!(data.codes.iter().all(|code| (data.low_code..=data.high_code).contains(&i32::from(*code))));
}

#[test]
fn a_clipped_leg_stops_at_its_level_and_says_the_end_code() {
    // 0 to 1 V at the input on -0.5 V to 1.5 V: the top lies at half the upper half, 0.3 of it clips.
    let controls = reference(Shape::Square, 1e6);
    let clipped = Disturbance { clipped: vec![(0, 0.3)], ..Disturbance::default() };
    let (_, acquisition) = disturbed(&clipped, &controls);
    let data = &acquisition.channels[0];
    let ends = data.codes.iter().filter(|code| i32::from(**code) == data.high_code).count();
    assert!((800..1200).contains(&ends), "about half of the time: {ends}");
    let inside = data.codes.iter().map(|code| i32::from(*code)).filter(|code| *code != data.high_code);
    assert!(inside.max().is_some_and(|code| f64::from(code) < 0.3 * f64::from(data.high_code)));
}

#[test]
fn without_a_trigger_nothing_is_taken_and_a_disturbance_leaves_no_trace() {
    let controls = reference(Shape::Square, 1e6);
    let scope = scope(2.0, 0.5, 1e-9, 200);
    let (mut one, mut other) = (World::new(&scenario()), World::new(&scenario()));
    let silent = Disturbance { no_trigger: true, ..Disturbance::default() };
    assert_eq!(one.acquire_disturbed(&controls, &scope, &silent), Err(NoTrigger));
    let flat = Disturbance { flat: vec![0], ..Disturbance::default() };
    one.acquire_disturbed(&controls, &scope, &flat).unwrap();
    other.acquire(&controls, &scope).unwrap();
    assert_eq!(one.acquire(&controls, &scope), other.acquire(&controls, &scope));
}
