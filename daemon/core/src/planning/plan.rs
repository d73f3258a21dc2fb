//! What is known before the measurement: every field may be left out, [`super::budget`] says which it needs.

use serde::{Deserialize, Serialize};

/// Everything that a budget is made from; what is left out is assumed and told, or asked for. Volts are at the probes' tips, but the scope's, which are at its input.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetRequest))]
#[serde(default, deny_unknown_fields)]
pub struct Plan {
    /// What is to be measured, and how well.
    pub signal: Signal,
    /// What the tips are put on.
    pub source: Source,
    /// Each of the two probes.
    pub probe: Probe,
    /// The scope that both are on.
    pub scope: Scope,
    /// How far the two legs agree before a deskew.
    pub before: Agreement,
    /// How far they agree after one.
    pub after: Agreement,
}

/// The common mode, the difference, and the accuracy wanted of it.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetSignal))]
#[serde(default, deny_unknown_fields)]
pub struct Signal {
    /// Swing of the common mode in volts, peak to peak.
    pub swing_v: Option<f64>,
    /// The common mode's lowest voltage to earth; 0 V if absent.
    pub low_v: Option<f64>,
    /// 10–90 % transition duration of its edges in seconds; this or a frequency.
    pub edge_s: Option<f64>,
    /// Frequency of a sinusoidal common mode in hertz; this or an edge.
    pub frequency_hz: Option<f64>,
    /// The largest difference expected, in volts; it may have either sign.
    pub difference_v: Option<f64>,
    /// What the tips may see beyond swing and difference (ringing), in volts; none if absent.
    pub headroom_v: Option<f64>,
    /// Wanted accuracy (k = 2) in volts; this or a ratio.
    pub accuracy_v: Option<f64>,
    /// Wanted accuracy (k = 2) as a ratio of the difference; this or volts.
    pub accuracy_ratio: Option<f64>,
}

/// Source resistance of the two nodes in ohms.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetSource))]
#[serde(default, deny_unknown_fields)]
pub struct Source {
    /// Under the positive tip.
    pub positive_ohm: Option<f64>,
    /// Under the negative tip; 0 Ω if absent, which is the worst for a difference.
    pub negative_ohm: Option<f64>,
}

/// A single-ended probe: two of a kind are used.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetProbe))]
#[serde(default, deny_unknown_fields)]
pub struct Probe {
    /// Volts at the tip per volt at the scope.
    pub attenuation: Option<f64>,
    /// Input resistance at the tip in ohms.
    pub resistance_ohm: Option<f64>,
    /// Input capacitance at the tip in farads.
    pub capacitance_f: Option<f64>,
    /// −3 dB bandwidth in hertz.
    pub bandwidth_hz: Option<f64>,
    /// The highest voltage to earth at low frequency, in volts.
    pub rating_v: Option<f64>,
    /// The frequency from which the rating falls, in hertz.
    pub rating_corner_hz: Option<f64>,
    /// How it falls: as (corner/f)^slope; 1, which is 20 dB per decade, if absent.
    pub rating_slope: Option<f64>,
    /// The rating at some frequencies instead, in rising order.
    pub derating: Vec<Derating>,
}

/// A point of a rating that falls with frequency.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetDerating))]
#[serde(deny_unknown_fields)]
pub struct Derating {
    /// In hertz.
    pub frequency_hz: f64,
    /// The highest voltage to earth there, in volts.
    pub rating_v: f64,
}

/// The scope. Its volts are at its input, behind the probe.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetScope))]
#[serde(default, deny_unknown_fields)]
pub struct Scope {
    /// Bits of the converter; this or an effective number.
    pub bits: Option<f64>,
    /// Effective number of bits (IEEE Std 1057), which counts noise and non-linearity too.
    pub enob: Option<f64>,
    /// The full vertical spans it offers, in volts, in rising order.
    pub spans_v: Vec<f64>,
    /// Whether its range can be shifted, so that its middle need not be at earth; it can if absent.
    pub shifts: Option<bool>,
    /// Half-width of the vertical scale's specification, as a ratio.
    pub scale_spec: Option<f64>,
    /// Noise, rms, in volts; this or a ratio.
    pub noise_v: Option<f64>,
    /// Noise, rms, as a ratio of the span.
    pub noise_ratio: Option<f64>,
    /// Integral non-linearity of the converter, in steps.
    pub linearity_steps: Option<f64>,
    /// −3 dB bandwidth in hertz.
    pub bandwidth_hz: Option<f64>,
    /// The highest voltage that its input is rated for, in volts.
    pub rating_v: Option<f64>,
    /// Sweeps averaged; 1 if absent.
    pub averages: Option<f64>,
}

/// How far two legs agree; each is a limit, either way.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetAgreement))]
#[serde(default, deny_unknown_fields)]
pub struct Agreement {
    /// Skew in seconds.
    pub skew_s: Option<f64>,
    /// Gain of the one relative to the other, less 1.
    pub gain: Option<f64>,
    /// Offset between them, as a ratio of the span.
    pub offset: Option<f64>,
    /// Absolute scale of both as a ratio; only after a deskew on a reference of known levels.
    pub scale: Option<f64>,
}

impl Plan {
    /// This plan with everything that `other` states instead. Of two fields that exclude each other, the other plan's
    /// replaces both of this one's.
    #[must_use]
    pub fn overlaid(mut self, other: Self) -> Self {
        fn put<T>(place: &mut Option<T>, new: Option<T>) {
            if new.is_some() {
                *place = new;
            }
        }
        fn put_either(place: (&mut Option<f64>, &mut Option<f64>), new: (Option<f64>, Option<f64>)) {
            if new.0.is_some() || new.1.is_some() {
                (*place.0, *place.1) = new;
            }
        }
        let (signal, new) = (&mut self.signal, other.signal);
        put(&mut signal.swing_v, new.swing_v);
        put(&mut signal.low_v, new.low_v);
        put_either((&mut signal.edge_s, &mut signal.frequency_hz), (new.edge_s, new.frequency_hz));
        put(&mut signal.difference_v, new.difference_v);
        put(&mut signal.headroom_v, new.headroom_v);
        put_either((&mut signal.accuracy_v, &mut signal.accuracy_ratio), (new.accuracy_v, new.accuracy_ratio));
        put(&mut self.source.positive_ohm, other.source.positive_ohm);
        put(&mut self.source.negative_ohm, other.source.negative_ohm);
        let (probe, new) = (&mut self.probe, other.probe);
        put(&mut probe.attenuation, new.attenuation);
        put(&mut probe.resistance_ohm, new.resistance_ohm);
        put(&mut probe.capacitance_f, new.capacitance_f);
        put(&mut probe.bandwidth_hz, new.bandwidth_hz);
        put(&mut probe.rating_v, new.rating_v);
        if !new.derating.is_empty() {
            probe.derating = new.derating;
            (probe.rating_corner_hz, probe.rating_slope) = (None, None);
        }
        if new.rating_corner_hz.is_some() {
            probe.rating_corner_hz = new.rating_corner_hz;
            probe.derating.clear();
        }
        put(&mut probe.rating_slope, new.rating_slope);
        let (scope, new) = (&mut self.scope, other.scope);
        put_either((&mut scope.bits, &mut scope.enob), (new.bits, new.enob));
        if !new.spans_v.is_empty() {
            scope.spans_v = new.spans_v;
        }
        put(&mut scope.shifts, new.shifts);
        put(&mut scope.scale_spec, new.scale_spec);
        put_either((&mut scope.noise_v, &mut scope.noise_ratio), (new.noise_v, new.noise_ratio));
        put(&mut scope.linearity_steps, new.linearity_steps);
        put(&mut scope.bandwidth_hz, new.bandwidth_hz);
        put(&mut scope.rating_v, new.rating_v);
        put(&mut scope.averages, new.averages);
        for (agreement, new) in [(&mut self.before, other.before), (&mut self.after, other.after)] {
            put(&mut agreement.skew_s, new.skew_s);
            put(&mut agreement.gain, new.gain);
            put(&mut agreement.offset, new.offset);
            put(&mut agreement.scale, new.scale);
        }
        self
    }
}
