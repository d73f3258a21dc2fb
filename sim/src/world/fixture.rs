//! A bench for the tests: two legs with known faults on channels 1 and 2, and usual settings.

use super::controls::{SourceOutput, SupplyOutput};
use super::{ChannelSettings, Controls, Coupling, ScopeSettings, Shape, Trigger, TriggerSource, World};
use crate::scenario::{DeviceSpec, RangeSpec, Scenario};

/// The demo scenario with other legs than the demo's: no noise, no jitter, no drift, one listed range of 2 V.
pub(crate) fn scenario() -> Scenario {
    let mut scenario = Scenario::read(include_str!("../../../configs/scenarios/greenhouse-fan.toml")).unwrap();
    scenario.seed = 7;
    scenario.scope.trigger_jitter_s = 0.0;
    let faults = [(0.99, 4e-9, 400e6, 2e-4, 0.002), (0.955, 5.7e-9, 300e6, -3e-4, -0.005)];
    for (leg, (gain, delay_s, bandwidth_hz, error, offset_v)) in scenario.legs.iter_mut().zip(faults) {
        (leg.gain, leg.delay_s, leg.bandwidth_hz, leg.compensation_error) = (gain, delay_s, bandwidth_hz, error);
        (leg.noise_of_span, leg.noise_v, leg.gain_drift_per_h, leg.delay_drift_s_per_h) = (0.0, 0.0, 0.0, 0.0);
        leg.ranges = vec![RangeSpec { span_v: 2.0, gain: 1.01, offset_v, delay_s: 0.1e-9 }];
    }
    scenario
}

/// As [`scenario`], with legs that change nothing but the load and the ×10 of the probes.
pub(crate) fn ideal(device: DeviceSpec) -> Scenario {
    let mut scenario = scenario();
    for leg in &mut scenario.legs {
        (leg.gain, leg.delay_s, leg.bandwidth_hz, leg.compensation_error) = (1.0, 0.0, 1e15, 0.0);
        leg.unlisted = Default::default();
        leg.ranges.clear();
    }
    scenario.device = device;
    scenario
}

/// Generator output 1 on, 0 to 10 V, on both tips.
pub(crate) fn reference(shape: Shape, frequency_hz: f64) -> Controls {
    let mut controls = Controls::default();
    let (amplitude_vpp, offset_v) = (10.0, 5.0);
    controls.generator[0] =
        SourceOutput { on: true, shape, frequency_hz, amplitude_vpp, offset_v, duty: 0.5, edge_s: 3e-9 };
    controls.closed.insert(101);
    controls
}

/// The bridge running at 100 kHz on a bus of 48 V with `brake_a` in the brake, on a route.
pub(crate) fn bridge(brake_a: f64, route: u32) -> Controls {
    let mut controls = Controls::default();
    let (shape, frequency_hz, amplitude_vpp, offset_v) = (Shape::Square, 100e3, 5.0, 2.5);
    controls.generator[1] =
        SourceOutput { on: true, shape, frequency_hz, amplitude_vpp, offset_v, duty: 0.5, edge_s: 3e-9 };
    controls.supply[0] = SupplyOutput { on: true, voltage_v: 48.0, current_a: 5.0 };
    controls.supply[1] = SupplyOutput { on: true, voltage_v: 12.0, current_a: brake_a };
    controls.closed.insert(route);
    controls
}

/// Both channels on `span_v` around `offset_v`, triggered by the sync edge at the record's start.
pub(crate) fn scope(span_v: f64, offset_v: f64, interval_s: f64, points: usize) -> ScopeSettings {
    let channel = ChannelSettings { span_v, offset_v, coupling: Coupling::Dc, delay_s: 0.0 };
    let trigger = Trigger { source: TriggerSource::External, level_v: 0.0, rising: true };
    ScopeSettings { channels: vec![channel; 2], interval_s, points, trigger_position: 0.0, trigger, averages: 1 }
}

/// The volts at the inputs of both channels.
pub(crate) fn volts(world: &mut World, controls: &Controls, scope: &ScopeSettings) -> [Vec<f64>; 2] {
    let acquisition = world.acquire(controls, scope).unwrap();
    [0, 1].map(|index| {
        let data = &acquisition.channels[index];
        data.codes.iter().map(|&code| data.zero_v + f64::from(code) * data.volts_per_code).collect()
    })
}

/// The component of a record at `frequency_hz` (whole periods): volts and radians, of a cosine from sample 0 on.
pub(crate) fn component(record: &[f64], interval_s: f64, frequency_hz: f64) -> (f64, f64) {
    let turn = std::f64::consts::TAU * frequency_hz * interval_s;
    let sum = |of: fn(f64) -> f64| {
        let products = record.iter().enumerate().map(|(i, v)| v * of(turn * i as f64));
        2.0 * products.sum::<f64>() / record.len() as f64
    };
    let (re, im) = (sum(f64::cos), -sum(f64::sin));
    (re.hypot(im), im.atan2(re))
}

/// Mean and standard deviation.
pub(crate) fn spread(values: &[f64]) -> (f64, f64) {
    let n = values.len() as f64;
    let mean = values.iter().sum::<f64>() / n;
    (mean, (values.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / (n - 1.0)).sqrt())
}
