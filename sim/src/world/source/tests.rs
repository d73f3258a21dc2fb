//! The generator's waveforms, and loading by hand.

use std::f64::consts::TAU;

use super::*;
use crate::world::fixture::component;

fn output(shape: Shape) -> SourceOutput {
    let (frequency_hz, amplitude_vpp, offset_v) = (1e6, 4.0, 1.0);
    SourceOutput { on: true, shape, frequency_hz, amplitude_vpp, offset_v, duty: 0.2, edge_s: 3e-9 }
}

#[test]
fn a_square_has_its_levels_its_edges_and_half_the_period() {
    let sampler = Sampler::new(&open_circuit(&output(Shape::Square), 16));
    assert!((sampler.at(250e-9) - 3.0).abs() < 1e-9);
    assert!((sampler.at(750e-9) + 1.0).abs() < 1e-9);
    // 10 % and 90 % of the linear edge of 3.75 ns lie 3 ns apart.
    assert!((sampler.at(0.375e-9) - (-1.0 + 0.4)).abs() < 1e-9);
    assert!((sampler.at(3.375e-9) - (-1.0 + 3.6)).abs() < 1e-9);
    assert!((sampler.at(500e-9) - 3.0).abs() < 1e-9 && sampler.at(505e-9) < -0.999);
    assert!((sampler.mean() - 1.0).abs() < 1e-9);
}

#[test]
fn a_pulse_has_its_duty() {
    let wave = open_circuit(&output(Shape::Pulse), 16);
    assert!((wave.mean() - (-1.0 + 4.0 * 0.2)).abs() < 1e-9);
    let sampler = Sampler::new(&wave);
    assert!((sampler.at(150e-9) - 3.0).abs() < 1e-9 && (sampler.at(250e-9) + 1.0).abs() < 1e-9);
}

#[test]
fn a_sine_starts_upwards_through_its_middle() {
    let sampler = Sampler::new(&open_circuit(&output(Shape::Sine), 16));
    assert!((sampler.at(0.0) - 1.0).abs() < 1e-12);
    assert!((sampler.at(250e-9) - 3.0).abs() < 1e-12);
}

#[test]
fn a_multitone_has_equal_tones_within_its_amplitude() {
    let sampler = Sampler::new(&open_circuit(&output(Shape::Multitone), 8));
    let mut record = vec![0.0; 4096];
    sampler.read(0.0, 1e-6 / 4096.0, &mut record);
    let (low, high) = record.iter().fold((f64::MAX, f64::MIN), |(a, b), &v| (a.min(v), b.max(v)));
    assert!((high - low - 4.0).abs() < 0.02, "{low} {high}");
    let sizes: Vec<f64> = (1..=9).map(|k| component(&record, 1e-6 / 4096.0, f64::from(k) * 1e6).0).collect();
    assert!(sizes[..8].iter().all(|size| (size / sizes[0] - 1.0).abs() < 1e-9), "{sizes:?}");
    assert!(sizes[8] < 1e-9);
    // In phase, eight equal cosines would reach from about −1.9 to 8 times their size: 4 V over that is 0.40 V each.
    assert!(sizes[0] > 0.5, "the phases do not keep the peaks low: {sizes:?}");
}

#[test]
fn an_output_that_is_off_gives_nothing() {
    let off = SourceOutput { on: false, ..output(Shape::Square) };
    assert_eq!(open_circuit(&off, 16), Wave::constant(0.0, 1e-6));
}

#[test]
fn fifty_ohms_on_fifty_ohms_halve() {
    let load = Load::NONE.with(50.0, 0.0);
    assert!((load.on(Wave::constant(10.0, 1.0), 50.0).mean() - 5.0).abs() < 1e-12);
}

#[test]
fn a_probe_loads_ten_kilohms() {
    // 10 MΩ ∥ 9.5 pF on 10 kΩ: 10/10.01 for steady voltages, and a pole at 1/(2π·9.99 kΩ·9.5 pF) = 1.6770 MHz.
    let load = Load::NONE.with(10e6, 9.5e-12);
    let steady = load.on(Wave::constant(10.0, 1.0), 10e3).mean();
    assert!((steady - 9.990_01).abs() < 1e-5, "{steady}");
    let parallel_ohm = 1.0 / (1.0 / 10e3 + 1.0 / 10e6);
    let corner_hz = 1.0 / (TAU * parallel_ohm * 9.5e-12);
    assert!((corner_hz - 1.6770e6).abs() < 1e3, "{corner_hz}");
    let sine = SourceOutput { offset_v: 0.0, frequency_hz: corner_hz, ..output(Shape::Sine) };
    let sampler = Sampler::new(&load.on(open_circuit(&sine, 1), 10e3));
    let mut record = vec![0.0; 1000];
    sampler.read(0.0, 1e-3 / corner_hz, &mut record);
    let (size, angle) = component(&record, 1e-3 / corner_hz, corner_hz);
    // At the corner: 1/√2 of the steady value, an eighth of a turn late (a sine is a cosine a quarter late).
    assert!((size - 2.0 * 0.999_001 / 2_f64.sqrt()).abs() < 1e-6, "{size}");
    assert!((angle + TAU / 4.0 + TAU / 8.0).abs() < 1e-9, "{angle}");
}
