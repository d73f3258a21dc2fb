//! The flags of `evenpair budget`: each stands for a key of the plan's file.

use clap::Args;
use evenpair_core::planning::{Agreement, Plan, Probe, Scope, Signal, Source, parse_ratio, parse_volts_or_ratio};
use evenpair_core::units::{Amount, AmountError, Unit};

/// What the plan's file does not say, or says otherwise. Amounts are a number and a unit, such as `25ns` or `"25 ns"`.
#[derive(Debug, Args)]
#[command(next_help_heading = "Plan")]
pub(crate) struct BudgetFlags {
    /// Swing of the common mode, peak to peak.
    #[arg(long, value_name = "V", value_parser = volts)]
    swing: Option<f64>,
    /// The common mode's lowest voltage to earth; 0 V if absent.
    #[arg(long, value_name = "V", value_parser = volts, allow_hyphen_values = true)]
    low: Option<f64>,
    /// 10-90 % duration of its edges.
    #[arg(long, value_name = "s", value_parser = seconds, conflicts_with = "frequency")]
    edge: Option<f64>,
    /// Frequency of a sinusoidal common mode.
    #[arg(long, value_name = "Hz", value_parser = hertz)]
    frequency: Option<f64>,
    /// The largest difference expected, either way.
    #[arg(long, value_name = "V", value_parser = volts)]
    difference: Option<f64>,
    /// What the tips may see beyond that, such as ringing.
    #[arg(long, value_name = "V", value_parser = volts)]
    headroom: Option<f64>,
    /// Wanted accuracy (k = 2): volts, or a part of the difference such as `2%`.
    #[arg(long, value_name = "V|%", value_parser = parse_volts_or_ratio)]
    accuracy: Option<(Option<f64>, Option<f64>)>,
    /// Source resistance under the positive tip.
    #[arg(long, value_name = "Ohm", value_parser = ohms)]
    source_positive: Option<f64>,
    /// Source resistance under the negative tip.
    #[arg(long, value_name = "Ohm", value_parser = ohms)]
    source_negative: Option<f64>,
    /// Attenuation of each probe: 10 for a x10 probe.
    #[arg(long, value_name = "N", value_parser = number)]
    attenuation: Option<f64>,
    /// Input resistance of each probe.
    #[arg(long, value_name = "Ohm", value_parser = ohms)]
    resistance: Option<f64>,
    /// Input capacitance of each probe.
    #[arg(long, value_name = "F", value_parser = farads)]
    capacitance: Option<f64>,
    /// Bandwidth of each probe.
    #[arg(long, value_name = "Hz", value_parser = hertz)]
    bandwidth: Option<f64>,
    /// Rating of each probe to earth at low frequency.
    #[arg(long, value_name = "V", value_parser = volts)]
    rating: Option<f64>,
    /// The frequency from which the rating falls.
    #[arg(long, value_name = "Hz", value_parser = hertz)]
    rating_corner: Option<f64>,
    /// How it falls: 1 is 20 dB per decade.
    #[arg(long, value_name = "N", value_parser = number)]
    rating_slope: Option<f64>,
    /// Bits of the scope's converter.
    #[arg(long, value_name = "N", value_parser = number, conflicts_with = "enob")]
    bits: Option<f64>,
    /// Effective number of bits instead, which counts noise and non-linearity.
    #[arg(long, value_name = "N", value_parser = number)]
    enob: Option<f64>,
    /// Full spans at the scope's input, the smallest first, such as `1V,2V,5V`.
    #[arg(long, value_name = "V,V,...", value_parser = volts, value_delimiter = ',')]
    spans: Vec<f64>,
    /// Whether the range can be shifted away from earth; it can if absent.
    #[arg(long, value_name = "true|false")]
    shifts: Option<bool>,
    /// Half-width of the vertical scale's specification, such as `1.5%`.
    #[arg(long, value_name = "%", value_parser = parse_ratio)]
    scale_spec: Option<f64>,
    /// Noise, rms: volts at the scope's input, or a part of the span.
    #[arg(long, value_name = "V|%", value_parser = parse_volts_or_ratio)]
    noise: Option<(Option<f64>, Option<f64>)>,
    /// Integral non-linearity in steps.
    #[arg(long, value_name = "N", value_parser = number)]
    linearity: Option<f64>,
    /// Bandwidth of the scope.
    #[arg(long, value_name = "Hz", value_parser = hertz)]
    scope_bandwidth: Option<f64>,
    /// Rating of the scope's input.
    #[arg(long, value_name = "V", value_parser = volts)]
    scope_rating: Option<f64>,
    /// Sweeps averaged.
    #[arg(long, value_name = "N", value_parser = number)]
    averages: Option<f64>,
    /// Skew before a deskew.
    #[arg(long, value_name = "s", value_parser = seconds)]
    skew_before: Option<f64>,
    /// Gain mismatch before a deskew.
    #[arg(long, value_name = "%", value_parser = parse_ratio)]
    gain_before: Option<f64>,
    /// Offset between the legs before a deskew, as a part of the span.
    #[arg(long, value_name = "%", value_parser = parse_ratio)]
    offset_before: Option<f64>,
    /// Skew that a deskew leaves.
    #[arg(long, value_name = "s", value_parser = seconds)]
    skew_after: Option<f64>,
    /// Gain mismatch that a deskew leaves.
    #[arg(long, value_name = "%", value_parser = parse_ratio)]
    gain_after: Option<f64>,
    /// Offset that a deskew leaves, as a part of the span.
    #[arg(long, value_name = "%", value_parser = parse_ratio)]
    offset_after: Option<f64>,
    /// Absolute scale after a deskew on a reference of known levels.
    #[arg(long, value_name = "%", value_parser = parse_ratio)]
    scale_after: Option<f64>,
}

impl BudgetFlags {
    /// The plan that the flags state.
    pub(crate) fn plan(self) -> Plan {
        let (accuracy_v, accuracy_ratio) = self.accuracy.unwrap_or_default();
        let (noise_v, noise_ratio) = self.noise.unwrap_or_default();
        Plan {
            signal: Signal {
                swing_v: self.swing,
                low_v: self.low,
                edge_s: self.edge,
                frequency_hz: self.frequency,
                difference_v: self.difference,
                headroom_v: self.headroom,
                accuracy_v,
                accuracy_ratio,
            },
            source: Source { positive_ohm: self.source_positive, negative_ohm: self.source_negative },
            probe: Probe {
                attenuation: self.attenuation,
                resistance_ohm: self.resistance,
                capacitance_f: self.capacitance,
                bandwidth_hz: self.bandwidth,
                rating_v: self.rating,
                rating_corner_hz: self.rating_corner,
                rating_slope: self.rating_slope,
                derating: Vec::new(),
            },
            scope: Scope {
                bits: self.bits,
                enob: self.enob,
                spans_v: self.spans,
                shifts: self.shifts,
                scale_spec: self.scale_spec,
                noise_v,
                noise_ratio,
                linearity_steps: self.linearity,
                bandwidth_hz: self.scope_bandwidth,
                rating_v: self.scope_rating,
                averages: self.averages,
            },
            before: Agreement {
                skew_s: self.skew_before,
                gain: self.gain_before,
                offset: self.offset_before,
                scale: None,
            },
            after: Agreement {
                skew_s: self.skew_after,
                gain: self.gain_after,
                offset: self.offset_after,
                scale: self.scale_after,
            },
        }
    }
}

/// An amount in `unit`; a bare number is one in `unit` without a prefix, as in a file.
fn amount(text: &str, unit: Unit) -> Result<f64, AmountError> {
    match Amount::parse(text)? {
        Amount { value, unit: Unit::One } => Ok(value),
        _ => Amount::parse_in(text, unit),
    }
}

fn volts(text: &str) -> Result<f64, AmountError> {
    amount(text, Unit::Volt)
}

fn seconds(text: &str) -> Result<f64, AmountError> {
    amount(text, Unit::Second)
}

fn hertz(text: &str) -> Result<f64, AmountError> {
    amount(text, Unit::Hertz)
}

fn ohms(text: &str) -> Result<f64, AmountError> {
    amount(text, Unit::Ohm)
}

fn farads(text: &str) -> Result<f64, AmountError> {
    amount(text, Unit::Farad)
}

fn number(text: &str) -> Result<f64, AmountError> {
    amount(text, Unit::One)
}

#[cfg(test)]
mod tests {
    use clap::Parser;

    use crate::arguments::{Arguments, Command};

    fn plan(arguments: &[&str]) -> evenpair_core::planning::Plan {
        let arguments = ["evenpair", "budget"].iter().chain(arguments);
        match Arguments::try_parse_from(arguments).unwrap().command {
            Command::Budget { flags, .. } => flags.plan(),
            other => panic!("{other:?}"),
        }
    }

    #[test]
    fn flags_state_a_plan() {
        let plan = plan(&[
            "--swing",
            "650 V",
            "--low",
            "-325V",
            "--frequency",
            "50Hz",
            "--difference",
            "12",
            "--accuracy",
            "2%",
            "--noise",
            "1mV",
            "--spans",
            "1V,2V,5V",
            "--shifts",
            "false",
            "--gain-before",
            "0.02",
        ]);
        assert_eq!((plan.signal.swing_v, plan.signal.low_v), (Some(650.0), Some(-325.0)));
        assert_eq!((plan.signal.frequency_hz, plan.signal.difference_v), (Some(50.0), Some(12.0)));
        assert_eq!((plan.signal.accuracy_v, plan.signal.accuracy_ratio), (None, Some(0.02)));
        assert_eq!((plan.scope.noise_v, plan.scope.noise_ratio), (Some(0.001), None));
        assert_eq!((plan.scope.spans_v, plan.scope.shifts), (vec![1.0, 2.0, 5.0], Some(false)));
        assert_eq!(plan.before.gain, Some(0.02));
    }

    #[test]
    fn a_wrong_unit_is_refused() {
        assert!(Arguments::try_parse_from(["evenpair", "budget", "--edge", "25 V"]).is_err());
        assert!(Arguments::try_parse_from(["evenpair", "budget", "--edge", "25 ns", "--frequency", "1 MHz"]).is_err());
    }
}
