//! From a plan to one with nothing left open: ranges, what excludes what, and defaults that are told.

use std::ops::RangeInclusive;

use super::defaults;
use super::motion::Motion;
use super::outcome::TipVoltage;
use super::plan::{Agreement, Derating, Plan};
use super::rating::{Fall, rating_at};
use super::scope_error::{CheckedScope, Fineness, Noise};
use super::terms::percent;
use crate::units::{Unit, show};

/// Something wrong in a plan.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("`{key}` {what}; {help}")]
pub struct Flaw {
    /// The key of the plan's file, such as `signal.swing`.
    pub key: String,
    /// What is wrong with it.
    pub what: String,
    /// What to try.
    pub help: String,
}

/// A plan with nothing left open; all voltages at the tips, but the scope's own.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Checked {
    pub(super) swing_v: f64,
    pub(super) low_v: f64,
    pub(super) motion: Motion,
    pub(super) difference_v: f64,
    pub(super) headroom_v: f64,
    pub(super) wanted_v: f64,
    /// Under the positive and the negative tip.
    pub(super) sources_ohm: [f64; 2],
    pub(super) attenuation: f64,
    pub(super) resistance_ohm: f64,
    pub(super) capacitance_f: f64,
    pub(super) probe_bandwidth_hz: Option<f64>,
    pub(super) rating_v: f64,
    pub(super) fall: Fall,
    pub(super) scope: CheckedScope,
    pub(super) before: CheckedAgreement,
    pub(super) after: CheckedAgreement,
    pub(super) assumed: Vec<String>,
}

/// An agreement with nothing left open.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct CheckedAgreement {
    pub(super) skew_s: f64,
    pub(super) gain: f64,
    pub(super) offset: f64,
    pub(super) scale: f64,
}

impl Checked {
    /// The largest magnitude of the common mode, ringing included.
    pub(super) fn common_most_v(&self) -> f64 {
        (self.low_v - self.headroom_v).abs().max((self.low_v + self.swing_v + self.headroom_v).abs())
    }

    /// What a tip sees: the common mode, the difference either way, and the headroom.
    pub(super) fn tip_voltage(&self) -> TipVoltage {
        let beyond_v = self.difference_v + self.headroom_v;
        let (low_v, high_v) = (self.low_v - beyond_v, self.low_v + self.swing_v + beyond_v);
        TipVoltage {
            low_v,
            high_v,
            most_v: low_v.abs().max(high_v.abs()),
            rating_v: rating_at(self.rating_v, &self.fall, self.motion.frequency_hz()),
        }
    }

    /// −3 dB bandwidth of probe and scope in a row, as far as they are stated (common practice, no source).
    pub(super) fn bandwidth_hz(&self) -> Option<f64> {
        match (self.probe_bandwidth_hz, self.scope.bandwidth_hz) {
            (Some(probe_hz), Some(scope_hz)) => Some(1.0 / (1.0 / probe_hz).hypot(1.0 / scope_hz)),
            (stated, None) | (None, stated) => stated,
        }
    }
}

/// Collects what is wrong and what was assumed.
#[derive(Default)]
struct Desk {
    flaws: Vec<Flaw>,
    assumed: Vec<String>,
}

impl Desk {
    fn flaw(&mut self, key: &str, what: impl Into<String>, help: impl Into<String>) {
        self.flaws.push(Flaw { key: key.to_owned(), what: what.into(), help: help.into() });
    }

    /// A value within `range`, if it is stated.
    fn stated(&mut self, key: &str, value: Option<f64>, unit: Unit, range: &RangeInclusive<f64>) -> Option<f64> {
        let value = value?;
        if !range.contains(&value) {
            let text = |value| show(value, unit, 4);
            self.flaw(
                key,
                format!("is {}", text(value)),
                format!("allowed here: {} to {}", text(*range.start()), text(*range.end())),
            );
        }
        Some(value)
    }

    /// A value that must be stated; 1 stands in for one that is not, and the flaw keeps it from being used.
    fn needed(&mut self, key: &str, value: Option<f64>, unit: Unit, range: &RangeInclusive<f64>, help: &str) -> f64 {
        self.stated(key, value, unit, range).unwrap_or_else(|| {
            self.flaw(key, "is missing", help);
            1.0
        })
    }

    /// Which of two is stated: exactly one may be.
    fn either(&mut self, keys: [&str; 2], values: [Option<f64>; 2], help: &str) {
        match values {
            [None, None] => self.flaw(keys[0], format!("and `{}` are both missing", keys[1]), help),
            [Some(_), Some(_)] => self.flaw(keys[1], format!("and `{}` exclude each other", keys[0]), help),
            _ => {}
        }
    }

    fn assume(&mut self, what: &str, value: String, why: &str) {
        self.assumed.push(format!("{what}: {value} ({why})"));
    }
}

const PRACTICE: &str = "common practice, no source";
const VOLTS: RangeInclusive<f64> = 1e-6..=1e6;
const HERTZ: RangeInclusive<f64> = 1e-3..=1e12;
const SECONDS: RangeInclusive<f64> = 1e-13..=1e3;
const RATIO: RangeInclusive<f64> = 0.0..=0.5;

/// Checks a plan.
pub(super) fn check(plan: &Plan) -> Result<Checked, Vec<Flaw>> {
    let mut desk = Desk::default();
    let signal = &plan.signal;
    let swing_v = desk.needed("signal.swing", signal.swing_v, Unit::Volt, &VOLTS, "how far the common mode moves");
    let low_v = desk.stated("signal.low", signal.low_v, Unit::Volt, &(-1e6..=1e6)).unwrap_or(0.0);
    desk.either(
        ["signal.edge", "signal.frequency"],
        [signal.edge_s, signal.frequency_hz],
        "state the edges' 10-90 % duration, or the frequency of a sine",
    );
    let edge_s = desk.stated("signal.edge", signal.edge_s, Unit::Second, &SECONDS);
    let frequency_hz = desk.stated("signal.frequency", signal.frequency_hz, Unit::Hertz, &HERTZ);
    let motion = edge_s.map(Motion::Edge).or_else(|| frequency_hz.map(Motion::Sine)).unwrap_or(Motion::Sine(1.0));
    let help = "the largest difference that you expect";
    let difference_v = desk.needed("signal.difference", signal.difference_v, Unit::Volt, &VOLTS, help);
    let headroom_v = desk.stated("signal.headroom", signal.headroom_v, Unit::Volt, &(0.0..=1e6)).unwrap_or(0.0);
    let help = "state it in volts (`100 mV`) or as a part of the difference (`2 %`)";
    match (signal.accuracy_v, signal.accuracy_ratio) {
        (None, None) => desk.flaw("signal.accuracy", "is missing", help),
        (Some(_), Some(_)) => desk.flaw("signal.accuracy", "is stated twice", help),
        _ => {}
    }
    let accuracy_v = desk.stated("signal.accuracy", signal.accuracy_v, Unit::Volt, &(1e-12..=1e6));
    let accuracy = desk.stated("signal.accuracy", signal.accuracy_ratio, Unit::One, &(1e-9..=10.0));
    let wanted_v = accuracy_v.or_else(|| accuracy.map(|ratio| ratio * difference_v)).unwrap_or(1.0);

    let sources_ohm = sources(&mut desk, plan);
    let probe = &plan.probe;
    let attenuation = desk.needed(
        "probe.attenuation",
        probe.attenuation,
        Unit::One,
        &(1.0..=1e5),
        "volts at the tip per volt at the scope: 10 for a x10 probe",
    );
    let (resistance_ohm, capacitance_f) = load(&mut desk, plan, sources_ohm);
    let probe_bandwidth_hz = desk.stated("probe.bandwidth", probe.bandwidth_hz, Unit::Hertz, &HERTZ);
    let help = "the highest voltage to earth that its data sheet allows";
    let rating_v = desk.needed("probe.rating", probe.rating_v, Unit::Volt, &(1e-3..=1e6), help);
    let fall = fall(&mut desk, plan);
    let scope = scope(&mut desk, plan);
    let before = agreement(&mut desk, "before", &plan.before, scope.scale_spec, None);
    let after = agreement(&mut desk, "after", &plan.after, scope.scale_spec, Some(before));
    if !desk.flaws.is_empty() {
        return Err(desk.flaws);
    }
    Ok(Checked {
        swing_v,
        low_v,
        motion,
        difference_v,
        headroom_v,
        wanted_v,
        sources_ohm,
        attenuation,
        resistance_ohm,
        capacitance_f,
        probe_bandwidth_hz,
        rating_v,
        fall,
        scope,
        before,
        after,
        assumed: desk.assumed,
    })
}

fn sources(desk: &mut Desk, plan: &Plan) -> [f64; 2] {
    let range = 0.0..=1e9;
    let positive = desk.stated("source.positive", plan.source.positive_ohm, Unit::Ohm, &range);
    let negative = desk.stated("source.negative", plan.source.negative_ohm, Unit::Ohm, &range);
    match (positive, negative) {
        (None, None) => desk.assumed.push("source resistance: none, so loading is not counted".to_owned()),
        (Some(_), None) => desk.assume("source resistance of the negative node", "0 Ω".into(), "the worst for loading"),
        (None, Some(_)) => desk.assume("source resistance of the positive node", "0 Ω".into(), "the worst for loading"),
        (Some(_), Some(_)) => {}
    }
    [positive.unwrap_or(0.0), negative.unwrap_or(0.0)]
}

/// The probe's R and C; they must be known where a source has a resistance.
fn load(desk: &mut Desk, plan: &Plan, sources_ohm: [f64; 2]) -> (f64, f64) {
    let probe = &plan.probe;
    let resistance = desk.stated("probe.resistance", probe.resistance_ohm, Unit::Ohm, &(10.0..=1e15));
    let capacitance = desk.stated("probe.capacitance", probe.capacitance_f, Unit::Farad, &(0.0..=1e-3));
    if sources_ohm.iter().any(|ohm| *ohm > 0.0) {
        let help = "it loads a source that has a resistance; see the probe's data sheet";
        for (key, known) in [("probe.resistance", resistance), ("probe.capacitance", capacitance)] {
            if known.is_none() {
                desk.flaw(key, "is missing", help);
            }
        }
    }
    (resistance.unwrap_or(1e15), capacitance.unwrap_or(0.0))
}

fn fall(desk: &mut Desk, plan: &Plan) -> Fall {
    let probe = &plan.probe;
    let corner = desk.stated("probe.rating_corner", probe.rating_corner_hz, Unit::Hertz, &HERTZ);
    let slope = desk.stated("probe.rating_slope", probe.rating_slope, Unit::One, &(0.0..=10.0));
    if !probe.derating.is_empty() {
        if corner.is_some() {
            let help = "state the corner and slope, or points";
            desk.flaw("probe.derating", "and `probe.rating_corner` exclude each other", help);
        }
        check_points(desk, &probe.derating);
        return Fall::Points(probe.derating.clone());
    }
    match (corner, slope) {
        (Some(corner_hz), Some(slope)) => Fall::Corner { corner_hz, slope },
        (Some(corner_hz), None) => {
            desk.assume("fall of the rating above its corner", "20 dB per decade".into(), PRACTICE);
            Fall::Corner { corner_hz, slope: defaults::RATING_SLOPE }
        }
        (None, Some(_)) => {
            desk.flaw("probe.rating_corner", "is missing", "a slope needs the frequency that it begins at");
            Fall::Flat
        }
        (None, None) => {
            desk.assumed.push("fall of the rating with frequency: none, because none is stated".to_owned());
            Fall::Flat
        }
    }
}

fn check_points(desk: &mut Desk, points: &[Derating]) {
    const KEY: &str = "probe.derating";
    if points.len() > 1000 {
        desk.flaw(KEY, format!("has {} points", points.len()), "1000 are more than any data sheet prints");
    }
    for point in points {
        desk.stated(KEY, Some(point.frequency_hz), Unit::Hertz, &HERTZ);
        desk.stated(KEY, Some(point.rating_v), Unit::Volt, &(1e-3..=1e6));
    }
    let rises = |pair: &[Derating]| pair[1].frequency_hz > pair[0].frequency_hz && pair[1].rating_v <= pair[0].rating_v;
    if !points.windows(2).all(rises) {
        desk.flaw(KEY, "is not in order", "frequencies rise from point to point, and ratings do not");
    }
}

fn scope(desk: &mut Desk, plan: &Plan) -> CheckedScope {
    let scope = &plan.scope;
    let help = "state the converter's bits, or its effective number of bits";
    desk.either(["scope.bits", "scope.enob"], [scope.bits, scope.enob], help);
    let bits = desk.stated("scope.bits", scope.bits, Unit::One, &(1.0..=24.0));
    let enob = desk.stated("scope.enob", scope.enob, Unit::One, &(1.0..=24.0));
    let fineness = enob.map_or_else(|| Fineness::Bits(bits.unwrap_or(8.0)), Fineness::Effective);
    let noise_v = desk.stated("scope.noise", scope.noise_v, Unit::Volt, &(0.0..=1e3));
    let noise_ratio = desk.stated("scope.noise", scope.noise_ratio, Unit::One, &RATIO);
    let linearity = desk.stated("scope.linearity", scope.linearity_steps, Unit::One, &(0.0..=1000.0));
    if enob.is_some() {
        for (key, told) in [("scope.noise", noise_v.or(noise_ratio)), ("scope.linearity", linearity)] {
            if told.is_some() {
                desk.flaw(key, "and `scope.enob` exclude each other", "effective bits count it already; leave it out");
            }
        }
    } else {
        if noise_v.is_some() && noise_ratio.is_some() {
            desk.flaw("scope.noise", "is stated twice", "state it in volts, or as a part of the span");
        }
        if noise_v.or(noise_ratio).is_none() {
            desk.assume("noise", format!("{} of the span, rms", percent(defaults::NOISE_RATIO)), PRACTICE);
        }
        if linearity.is_none() {
            desk.assume("non-linearity", format!("{} steps", defaults::LINEARITY_STEPS), PRACTICE);
        }
    }
    let mut spans_v = scope.spans_v.clone();
    if spans_v.is_empty() {
        desk.assume("spans", "8 divisions of 2 mV to 10 V in steps of 1, 2, 5".into(), PRACTICE);
        spans_v = defaults::SPANS_V.to_vec();
    }
    for &span_v in &spans_v {
        desk.stated("scope.spans", Some(span_v), Unit::Volt, &(1e-6..=1e5));
    }
    if spans_v.len() > 1000 {
        desk.flaw("scope.spans", format!("has {} entries", spans_v.len()), "1000 are more than any scope has");
    }
    if !spans_v.windows(2).all(|pair| pair[0] < pair[1]) {
        desk.flaw("scope.spans", "is not in order", "write the spans from the smallest to the largest");
    }
    let scale_spec = desk.stated("scope.scale_spec", scope.scale_spec, Unit::One, &RATIO).unwrap_or_else(|| {
        desk.assume("scale specification", format!("±{}", percent(defaults::SCALE_SPEC)), PRACTICE);
        defaults::SCALE_SPEC
    });
    CheckedScope {
        fineness,
        spans_v,
        shifts: scope.shifts.unwrap_or(true),
        scale_spec,
        noise: noise_v.map_or_else(|| Noise::OfSpan(noise_ratio.unwrap_or(defaults::NOISE_RATIO)), Noise::Volts),
        linearity_steps: linearity.unwrap_or(defaults::LINEARITY_STEPS),
        bandwidth_hz: desk.stated("scope.bandwidth", scope.bandwidth_hz, Unit::Hertz, &HERTZ),
        rating_v: desk.stated("scope.rating", scope.rating_v, Unit::Volt, &(1e-3..=1e6)),
        averages: desk.stated("scope.averages", scope.averages, Unit::One, &(1.0..=1e9)).unwrap_or(1.0),
    }
}

/// One agreement; `before` is the one that a deskew begins with and cannot make worse.
fn agreement(
    desk: &mut Desk,
    when: &str,
    told: &Agreement,
    scale_spec: f64,
    before: Option<CheckedAgreement>,
) -> CheckedAgreement {
    let mut one = |what: &str, told: Option<f64>, unit: Unit, default: f64, begins: Option<f64>, why: &str| {
        let key = format!("{when}.{what}");
        let most = if unit == Unit::Second { 1e3 } else { 0.5 };
        let Some(value) = desk.stated(&key, told, unit, &(0.0..=most)) else {
            let value = begins.map_or(default, |begins| begins.min(default));
            let text = if unit == Unit::Second { show(value, unit, 2) } else { percent(value) };
            desk.assume(&format!("{what} {when} a deskew"), text, why);
            return value;
        };
        if begins.is_some_and(|begins| value > begins) {
            let begins = begins.unwrap_or_default();
            let (value, begins) = (show(value, unit, 3), show(begins, unit, 3));
            let help = "a deskew does not make the legs worse; exchange the two, or leave one out";
            desk.flaw(&key, format!("is {value}, worse than the {begins} before the deskew"), help);
        }
        value
    };
    let (skew_s, gain, offset, why) = match before {
        None => (defaults::SKEW_BEFORE_S, defaults::GAIN_BEFORE, defaults::OFFSET_BEFORE, PRACTICE),
        Some(_) => (defaults::SKEW_AFTER_S, defaults::GAIN_AFTER, defaults::OFFSET_AFTER, "until a verification says"),
    };
    let skew_s = one("skew", told.skew_s, Unit::Second, skew_s, before.map(|legs| legs.skew_s), why);
    let gain = one("gain", told.gain, Unit::One, gain, before.map(|legs| legs.gain), why);
    let offset = one("offset", told.offset, Unit::One, offset, before.map(|legs| legs.offset), why);
    let scale = match (told.scale, before) {
        (Some(told), Some(begins)) => one("scale", Some(told), Unit::One, told, Some(begins.scale), why),
        (Some(_), None) => {
            desk.flaw("before.scale", "has no meaning", "the scope's own is `scale_spec` of `[scope]`");
            scale_spec
        }
        (None, _) => scale_spec,
    };
    CheckedAgreement { skew_s, gain, offset, scale }
}
