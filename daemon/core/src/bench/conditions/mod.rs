//! What a correction was made under, and whether it still holds.
//!
//! A correction belongs to a scope, two channels, their vertical ranges, couplings and probes. Where one of these
//! differs it is `void`: nothing is known about the pair as it is now. Where only time has passed it is `stale`.

use serde::{Deserialize, Serialize};

use crate::bench::field::plain;
use crate::units::Unit;

/// What was in force when a correction was made, or what is in force now.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Conditions {
    /// What the scope answered to `*IDN?`.
    pub scope_identity: String,
    /// The positive leg.
    pub positive: LegConditions,
    /// The negative leg.
    pub negative: LegConditions,
    /// The reference that skew was taken from.
    pub skew_reference: String,
    /// The reference that gain and offset were taken from.
    pub gain_reference: String,
    /// Set when skew was taken on another vertical range than the one it is used on.
    pub carried: Option<Carried>,
}

/// The settings of a leg that a correction depends on.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct LegConditions {
    /// The scope's channel, from 1.
    pub channel: u32,
    /// Full vertical span at the tip, in volts.
    pub span_v: f64,
    /// Voltage at the tip in the middle of the span, in volts.
    pub offset_v: f64,
    /// `DC` or `AC`.
    pub coupling: String,
    /// Attenuation of the probe.
    pub attenuation: f64,
    /// The probe's name in the bench file.
    pub probe: String,
    /// The scope's own skew setting of the channel, in seconds; `None` where it has none or it is not known.
    pub scope_skew_s: Option<f64>,
}

/// That skew was carried from one vertical range to another.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Carried {
    /// The full span at the tip that skew was taken on, in volts.
    pub from_span_v: f64,
    /// The standard uncertainty that this added, in seconds.
    pub u_s: f64,
}

/// Two voltages on a leg count as the same when they differ by less than this part of the span: far less than any
/// scope's step, far more than the rounding of a decimal number in a reply.
const SAME_VOLTAGE: f64 = 1e-6;

/// Two skew settings count as the same when they differ by less than this, in seconds: a hundredth of the finest step
/// of a scope, and below what any estimate tells.
const SAME_SKEW_S: f64 = 1e-13;

/// Why a correction made under `made` does not hold under `now`, each reason in words; empty if it holds.
///
/// The references are not compared: they say where the correction came from, not where it applies.
#[must_use]
pub fn differences(made: &Conditions, now: &Conditions) -> Vec<String> {
    let mut reasons = Vec::new();
    if made.scope_identity != now.scope_identity {
        reasons
            .push(format!("it was made with the scope `{}`, now it is `{}`", made.scope_identity, now.scope_identity));
    }
    for (leg, made, now) in [("positive", &made.positive, &now.positive), ("negative", &made.negative, &now.negative)] {
        leg_differences(leg, made, now, &mut reasons);
    }
    reasons
}

fn leg_differences(leg: &str, made: &LegConditions, now: &LegConditions, reasons: &mut Vec<String>) {
    let volts = |value: f64| plain(value, Unit::Volt);
    let seconds = |value: f64| plain(value, Unit::Second);
    let step_v = SAME_VOLTAGE * made.span_v.abs();
    let mut differs = |what: &str, made: String, now: String| {
        reasons.push(format!("the {leg} leg's {what} was {made}, now it is {now}"));
    };
    if made.channel != now.channel {
        differs("channel", made.channel.to_string(), now.channel.to_string());
    }
    if made.probe != now.probe {
        differs("probe", format!("`{}`", made.probe), format!("`{}`", now.probe));
    }
    if (made.attenuation - now.attenuation).abs() > 1e-9 * made.attenuation.abs() {
        differs("attenuation", made.attenuation.to_string(), now.attenuation.to_string());
    }
    if made.coupling != now.coupling {
        differs("coupling", made.coupling.clone(), now.coupling.clone());
    }
    if (made.span_v - now.span_v).abs() > step_v {
        differs("vertical span at the tip", volts(made.span_v), volts(now.span_v));
    }
    if (made.offset_v - now.offset_v).abs() > step_v {
        differs("vertical offset at the tip", volts(made.offset_v), volts(now.offset_v));
    }
    if let (Some(before), Some(after)) = (made.scope_skew_s, now.scope_skew_s)
        && (before - after).abs() > SAME_SKEW_S
    {
        differs("skew setting in the scope", seconds(before), seconds(after));
    }
}

/// Why a correction of this age is `stale`, in words; `None` while it is young enough.
///
/// An age below zero, from a clock that was set back, is as good as unknown and counts as stale.
#[must_use]
pub fn too_old(age_s: f64, max_age_s: f64) -> Option<String> {
    if age_s < 0.0 {
        return Some("it seems to have been made in the future: the clock was set back".to_owned());
    }
    (age_s > max_age_s)
        .then(|| format!("it is {} old, the pair allows {}", span_of_time(age_s), span_of_time(max_age_s)))
}

/// `12.5 h`, `3 min`, `40 s`.
fn span_of_time(time_s: f64) -> String {
    let tenths = |value: f64| format!("{}", (value * 10.0).round() / 10.0);
    match time_s {
        t if t >= 3600.0 => format!("{} h", tenths(t / 3600.0)),
        t if t >= 60.0 => format!("{} min", tenths(t / 60.0)),
        t => format!("{} s", tenths(t)),
    }
}

#[cfg(test)]
mod tests;
