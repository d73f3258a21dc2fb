//! Ratings: what a probe's tip and the scope's input may see, and the plain no where the plan goes beyond.

use super::check::Checked;
use super::outcome::TipVoltage;
use super::plan::Derating;
use crate::units::{Unit, show};

/// How a probe's rating depends on frequency.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Fall {
    /// Nothing is stated: the same at all frequencies.
    Flat,
    /// `(corner/f)^slope` above the corner.
    Corner { corner_hz: f64, slope: f64 },
    /// Points, straight between them on logarithmic axes; nothing is known above the last.
    Points(Vec<Derating>),
}

/// The rating at a frequency in volts; nothing where none is stated.
pub(super) fn rating_at(rating_v: f64, fall: &Fall, frequency_hz: f64) -> Option<f64> {
    match fall {
        Fall::Flat => Some(rating_v),
        Fall::Corner { corner_hz, slope } => Some(rating_v * (corner_hz / frequency_hz).min(1.0).powf(*slope)),
        Fall::Points(points) => {
            let above = points.iter().position(|point| point.frequency_hz >= frequency_hz)?;
            let right = points[above];
            let Some(left) = above.checked_sub(1).map(|index| points[index]) else {
                return Some(right.rating_v.min(rating_v));
            };
            let part = (frequency_hz / left.frequency_hz).ln() / (right.frequency_hz / left.frequency_hz).ln();
            let between_v = left.rating_v * (right.rating_v / left.rating_v).powf(part);
            // A rounding must not lift it above what is stated.
            Some(between_v.min(left.rating_v.max(right.rating_v)).min(rating_v))
        }
    }
}

/// Why the probes must not be connected; nothing where every stated rating holds.
pub(super) fn refusals(plan: &Checked, tip: &TipVoltage) -> Vec<String> {
    let mut refusals = Vec::new();
    let volts = |value| show(value, Unit::Volt, 3);
    let at = show(plan.motion.frequency_hz(), Unit::Hertz, 3);
    match tip.rating_v {
        None => refusals.push(format!(
            "Do not connect these probes: their rating is not stated up to {at}, where the signal reaches with {} at a \
             tip.",
            volts(tip.most_v)
        )),
        Some(rating_v) if tip.most_v > rating_v => refusals.push(format!(
            "Do not connect these probes: a tip would see {}, but is rated for {} at {at}.",
            volts(tip.most_v),
            volts(rating_v)
        )),
        Some(_) => {}
    }
    if let Some(rating_v) = plan.scope.rating_v {
        let input_v = tip.most_v / plan.attenuation;
        if input_v > rating_v {
            refusals.push(format!(
                "Do not connect these probes: the scope's input would see {}, but is rated for {}.",
                volts(input_v),
                volts(rating_v)
            ));
        }
    }
    refusals
}
