//! What the pair measures.

use serde::Deserialize;

/// One of the devices that the world knows.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(tag = "kind", rename_all = "kebab-case")]
pub(crate) enum DeviceSpec {
    /// Two inverted outputs with a sine mixed onto both.
    Balanced(BalancedSpec),
    /// Three resistors in series on supply output 1.
    Divider(DividerSpec),
    /// A half bridge that drives a fan.
    HalfBridge(HalfBridgeSpec),
    /// Four diodes and a load.
    Rectifier(RectifierSpec),
}

/// Two outputs of opposite square waves, as of a balanced line, with a sine from elsewhere on both alike. P is the output
/// that rises at the start of a period, N the inverted one, which is also the in-situ node.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct BalancedSpec {
    /// Frequency of the square wave, in hertz.
    pub(crate) frequency_hz: f64,
    /// How far each output moves, peak to peak, in volts.
    pub(crate) swing_v: f64,
    /// The middle that both move about, in volts.
    pub(crate) middle_v: f64,
    /// 10–90 % time of the edges, in seconds.
    pub(crate) edge_s: f64,
    /// Source resistance of each output, in ohms.
    pub(crate) source_ohm: f64,
    /// Peak of the sine on both, in volts.
    pub(crate) sine_v: f64,
    /// Its frequency in hertz, a whole multiple of the square wave's.
    pub(crate) sine_hz: f64,
}

/// Three resistors in series on supply output 1, the lowest of them earthed. P is the upper end of the middle one, N
/// its lower end; the in-situ node is the lower end.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct DividerSpec {
    /// From the supply to earth, in ohms.
    pub(crate) resistors_ohm: [f64; 3],
    /// An earthed ground lead is clipped to the middle resistor's lower end.
    #[serde(default)]
    pub(crate) earth_lead: bool,
}

/// A half bridge on supply output 1, switched by generator output 2, braked by supply output 2.
///
/// P is the gate of the high-side switch, N the switching node, which is also the in-situ node.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct HalfBridgeSpec {
    /// Above this the drive input is high, in volts.
    pub(crate) logic_threshold_v: f64,
    /// From the drive's edge to the gate's, in seconds.
    pub(crate) dead_time_s: f64,
    /// Gate over node when driven high, in volts.
    pub(crate) gate_high_v: f64,
    /// Gate over node when driven low, in volts.
    pub(crate) gate_low_v: f64,
    /// Gate resistance times input capacitance, in seconds.
    pub(crate) gate_time_constant_s: f64,
    /// Source resistance of the gate, as the probe on it sees it, in ohms.
    pub(crate) gate_source_ohm: f64,
    /// Gate over node at which the switch begins to conduct, in volts.
    pub(crate) switch_threshold_v: f64,
    /// Amperes per volt above the threshold; sets the height of the plateau.
    pub(crate) transconductance_a_per_v: f64,
    /// Resistance of a closed switch, in ohms.
    pub(crate) on_ohm: f64,
    /// The fan's current without brake, in amperes.
    pub(crate) idle_load_a: f64,
    /// More fan current per ampere in the brake.
    pub(crate) load_a_per_brake_a: f64,
    /// Resistance of the brake's coil, in ohms.
    pub(crate) brake_ohm: f64,
    /// Peak-to-peak ripple of the fan's current, in amperes.
    pub(crate) ripple_a: f64,
    /// Current of the bridge's own electronics from the bus, in amperes.
    pub(crate) quiescent_a: f64,
    /// 10–90 % time of the node's edges at the idle load, in seconds.
    pub(crate) node_edge_s: f64,
    /// More of it per ampere above the idle load, in seconds.
    pub(crate) node_edge_s_per_a: f64,
    /// First peak of the ringing, as a fraction of the bus voltage, at the idle load.
    pub(crate) ring_of_bus: f64,
    /// More of it per ampere above the idle load, as a fraction of itself.
    pub(crate) ring_per_a: f64,
    /// Frequency of the ringing, in hertz.
    pub(crate) ring_hz: f64,
    /// Time in which the ringing falls to 1/e, in seconds.
    pub(crate) ring_decay_s: f64,
}

/// A sine of its own, one end earthed, on a bridge of four diodes with a load between its outputs. P is the positive
/// output, N the negative one, which is also the in-situ node.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct RectifierSpec {
    /// Peak of the input, in volts.
    pub(crate) peak_v: f64,
    /// Frequency of the input, in hertz.
    pub(crate) frequency_hz: f64,
    /// Resistance of the input, in ohms.
    pub(crate) source_ohm: f64,
    /// Forward voltage of a conducting diode.
    pub(crate) drop_v: f64,
    /// The load, in ohms.
    pub(crate) load_ohm: f64,
}
