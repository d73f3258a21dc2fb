//! The values that the world can compute with.

use super::{
    BalancedSpec, CONTROL, DeviceSpec, DividerSpec, HalfBridgeSpec, LegSpec, RectifierSpec, Scenario, ScenarioError,
};

type Checked = Result<(), ScenarioError>;

/// Channels of the scope.
const CHANNELS: usize = 4;

/// Checks what the types cannot say.
///
/// # Errors
/// The first value out of range.
pub(super) fn check(scenario: &Scenario) -> Checked {
    let scope = &scenario.scope;
    let bits = scope.converter_bits;
    require((4..=8).contains(&bits), "scope.converter_bits", bits, "between 4 and 8")?;
    not_negative("scope.trigger_jitter_s", scope.trigger_jitter_s)?;
    not_negative("scope.acquisition_time_s", scope.acquisition_time_s)?;
    let hysteresis = scope.trigger_hysteresis;
    require((0.0..=0.5).contains(&hysteresis), "scope.trigger_hysteresis", hysteresis, "between 0 and 0.5")?;
    not_negative("reference.source_ohm", scenario.reference.source_ohm)?;
    let tones = scenario.reference.multitone_tones;
    require((1..=1000).contains(&tones), "reference.multitone_tones", tones, "between 1 and 1000")?;
    for (i, instrument) in scenario.instruments.iter().enumerate() {
        let twice = scenario.instruments.iter().take(i).any(|other| other.name == instrument.name);
        require(!twice && !instrument.name.is_empty(), "instrument.name", &instrument.name, "a name used only once")?;
    }
    let hidden = scenario.control.is_some() && scenario.instruments.iter().any(|other| other.name == CONTROL);
    require(!hidden, "instrument.name", CONTROL, "another name: the control port has this one")?;
    for (i, one) in scenario.legs.iter().enumerate() {
        let twice = scenario.legs.iter().take(i).any(|other| other.channel == one.channel);
        let right = (1..=CHANNELS).contains(&one.channel) && !twice;
        require(right, "leg.channel", one.channel, "between 1 and 4 and used only once")?;
        leg(one)?;
    }
    scenario.faults.iter().try_for_each(|fault| fault.check(scenario))?;
    match &scenario.device {
        DeviceSpec::Balanced(spec) => balanced(spec),
        DeviceSpec::Divider(spec) => divider(spec),
        DeviceSpec::HalfBridge(spec) => half_bridge(spec),
        DeviceSpec::Rectifier(spec) => rectifier(spec),
    }
}

fn leg(leg: &LegSpec) -> Checked {
    for (key, value) in [
        ("attenuation", leg.attenuation),
        ("resistance_ohm", leg.resistance_ohm),
        ("gain", leg.gain),
        ("bandwidth_hz", leg.bandwidth_hz),
        ("compensation_time_s", leg.compensation_time_s),
    ] {
        positive(&format!("leg.{key}"), value)?;
    }
    for (key, value) in [
        ("capacitance_f", leg.capacitance_f),
        ("noise_of_span", leg.noise_of_span),
        ("noise_v", leg.noise_v),
        ("unlisted.gain", leg.unlisted.gain),
        ("unlisted.offset_of_span", leg.unlisted.offset_of_span),
        ("unlisted.delay_s", leg.unlisted.delay_s),
    ] {
        not_negative(&format!("leg.{key}"), value)?;
    }
    for (key, value) in [
        ("delay_s", leg.delay_s),
        ("compensation_error", leg.compensation_error),
        ("gain_drift_per_h", leg.gain_drift_per_h),
        ("delay_drift_s_per_h", leg.delay_drift_s_per_h),
    ] {
        finite(&format!("leg.{key}"), value)?;
    }
    require(leg.unlisted.gain < 1.0, "leg.unlisted.gain", leg.unlisted.gain, "below 1")?;
    for range in &leg.ranges {
        positive("leg.range.span_v", range.span_v)?;
        positive("leg.range.gain", range.gain)?;
        finite("leg.range.offset_v", range.offset_v)?;
        finite("leg.range.delay_s", range.delay_s)?;
    }
    Ok(())
}

fn balanced(spec: &BalancedSpec) -> Checked {
    positive("device.frequency_hz", spec.frequency_hz)?;
    not_negative("device.swing_v", spec.swing_v)?;
    finite("device.middle_v", spec.middle_v)?;
    positive("device.edge_s", spec.edge_s)?;
    let whole_edge = spec.edge_s / 0.8 * spec.frequency_hz;
    require(whole_edge < 0.49, "device.edge_s", spec.edge_s, "such that an edge ends within half a period")?;
    not_negative("device.source_ohm", spec.source_ohm)?;
    not_negative("device.sine_v", spec.sine_v)?;
    let multiple = spec.sine_hz / spec.frequency_hz;
    let whole = multiple >= 1.0 && (multiple - multiple.round()).abs() < 1e-9 * multiple;
    require(whole, "device.sine_hz", spec.sine_hz, "a whole multiple of frequency_hz")
}

fn divider(spec: &DividerSpec) -> Checked {
    spec.resistors_ohm.iter().try_for_each(|&ohm| positive("device.resistors_ohm", ohm))
}

fn rectifier(spec: &RectifierSpec) -> Checked {
    not_negative("device.peak_v", spec.peak_v)?;
    positive("device.frequency_hz", spec.frequency_hz)?;
    positive("device.source_ohm", spec.source_ohm)?;
    not_negative("device.drop_v", spec.drop_v)?;
    positive("device.load_ohm", spec.load_ohm)
}

fn half_bridge(spec: &HalfBridgeSpec) -> Checked {
    for (key, value) in [
        ("dead_time_s", spec.dead_time_s),
        ("gate_source_ohm", spec.gate_source_ohm),
        ("on_ohm", spec.on_ohm),
        ("idle_load_a", spec.idle_load_a),
        ("load_a_per_brake_a", spec.load_a_per_brake_a),
        ("ripple_a", spec.ripple_a),
        ("quiescent_a", spec.quiescent_a),
        ("node_edge_s_per_a", spec.node_edge_s_per_a),
        ("ring_of_bus", spec.ring_of_bus),
        ("ring_per_a", spec.ring_per_a),
    ] {
        not_negative(&format!("device.{key}"), value)?;
    }
    for (key, value) in [
        ("gate_time_constant_s", spec.gate_time_constant_s),
        ("transconductance_a_per_v", spec.transconductance_a_per_v),
        ("brake_ohm", spec.brake_ohm),
        ("node_edge_s", spec.node_edge_s),
        ("ring_hz", spec.ring_hz),
        ("ring_decay_s", spec.ring_decay_s),
    ] {
        positive(&format!("device.{key}"), value)?;
    }
    finite("device.logic_threshold_v", spec.logic_threshold_v)?;
    finite("device.gate_low_v", spec.gate_low_v)?;
    finite("device.gate_high_v", spec.gate_high_v)?;
    let threshold = spec.switch_threshold_v;
    let inside = spec.gate_low_v < threshold && threshold < spec.gate_high_v;
    require(inside, "device.switch_threshold_v", threshold, "between gate_low_v and gate_high_v")
}

fn positive(key: &str, value: f64) -> Checked {
    require(value.is_finite() && value > 0.0, key, value, "above 0")
}

fn not_negative(key: &str, value: f64) -> Checked {
    require(value.is_finite() && value >= 0.0, key, value, "0 or more")
}

fn finite(key: &str, value: f64) -> Checked {
    require(value.is_finite(), key, value, "a finite number")
}

pub(super) fn require(right: bool, key: &str, value: impl ToString, wanted: &'static str) -> Checked {
    if right { Ok(()) } else { Err(ScenarioError::Range { key: key.to_owned(), value: value.to_string(), wanted }) }
}
