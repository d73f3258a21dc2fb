//! What a differential probe must offer where two single-ended ones will not do.
//!
//! The accuracy wanted is shared by four errors, each of which gets half of it, since errors add by their squares: what
//! the common mode leaks through the probe's rejection, its gain, the load on the sources, and the one channel of the
//! scope behind it (its scale, noise, steps and non-linearity).

use super::OF_LIMIT;
use super::check::Checked;
use super::motion::Motion;
use super::outcome::{Differential, TipVoltage};

/// How many times 0.35/t_r (or the sine's frequency) the bandwidth must be: at 3 an edge reads 5 % long (common
/// practice, no source).
const BANDWIDTH_MARGIN: f64 = 3.0;

/// Attenuations that are looked at: 1, 2, 5 … 5000.
const ATTENUATIONS: [f64; 12] = [1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0, 200.0, 500.0, 1000.0, 2000.0, 5000.0];

/// Why no differential probe helps on this scope.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum NoHelp {
    /// No attenuation brings the difference into the scope's ranges and rating.
    NoRange,
    /// The scope's own scale is too uncertain, in volts at k = 2.
    Scale(f64),
    /// The best that the scope's channel reaches behind any attenuation, in volts at k = 2.
    Scope(f64),
}

/// The requirements.
pub(super) fn require(plan: &Checked, tip: &TipVoltage) -> Result<Differential, NoHelp> {
    let share_v = plan.wanted_v / 2.0;
    let limit_v = share_v / OF_LIMIT;
    let frequency_hz = plan.motion.frequency_hz();
    let attenuations = attenuations(plan, share_v)?;
    let moving_v = match plan.motion {
        // Of an edge the probe may leak all at once.
        Motion::Edge(_) => plan.swing_v,
        Motion::Sine(_) => plan.swing_v / 2.0,
    };
    let (resistance_ohm, capacitance_f) = load(plan, limit_v);
    Ok(Differential {
        bandwidth_hz: bandwidth(plan, limit_v),
        attenuations,
        differential_v: plan.difference_v + plan.headroom_v,
        common_v: tip.most_v,
        frequency_hz,
        rejection_db: decibels(moving_v / limit_v),
        rejection_dc_db: decibels(plan.common_most_v() / limit_v),
        gain: limit_v / plan.difference_v,
        capacitance_f,
        resistance_ohm,
    })
}

fn decibels(ratio: f64) -> f64 {
    (20.0 * ratio.log10()).max(0.0)
}

/// The attenuations with which one channel keeps within its share. Not every one between two of them does: the span at
/// the tip goes in steps.
fn attenuations(plan: &Checked, share_v: f64) -> Result<Vec<f64>, NoHelp> {
    let most_v = plan.difference_v + plan.headroom_v;
    let scale_v = OF_LIMIT * plan.after.scale * plan.difference_v;
    if scale_v > share_v {
        return Err(NoHelp::Scale(scale_v));
    }
    let within_rating = |attenuation: f64| plan.scope.rating_v.is_none_or(|rating_v| most_v / attenuation <= rating_v);
    let own_errors: Vec<(f64, f64)> = ATTENUATIONS
        .into_iter()
        .filter(|attenuation| within_rating(*attenuation))
        .filter_map(|attenuation| {
            let range = plan.scope.range_for(2.0 * most_v, attenuation)?;
            let channel = plan.scope.channel_error(&range);
            let offset_v = OF_LIMIT * plan.after.offset * range.span_v;
            let parts = [scale_v, offset_v, channel.quantisation_v, channel.linearity_v, channel.noise_v];
            Some((attenuation, parts.iter().map(|part| part * part).sum::<f64>().sqrt()))
        })
        .collect();
    let good: Vec<f64> = own_errors.iter().filter(|(_, own_v)| *own_v <= share_v).map(|(a, _)| *a).collect();
    if !good.is_empty() {
        return Ok(good);
    }
    let best_v = own_errors.iter().map(|(_, own_v)| *own_v).reduce(f64::min);
    Err(best_v.map_or(NoHelp::NoRange, NoHelp::Scope))
}

fn bandwidth(plan: &Checked, limit_v: f64) -> f64 {
    let usual_hz = BANDWIDTH_MARGIN * plan.motion.frequency_hz();
    match plan.motion {
        Motion::Edge(_) => usual_hz,
        Motion::Sine(frequency_hz) => {
            // One pole may take no more off the difference than the gain's share: 1/√(1 + (f/B)²) ≥ 1 − e.
            let kept = 1.0 - (limit_v / plan.difference_v).min(0.9);
            usual_hz.max(frequency_hz / (1.0 / (kept * kept) - 1.0).sqrt())
        }
    }
}

/// The least R and the most C that keep the load within its share, half of its square each.
fn load(plan: &Checked, limit_v: f64) -> (Option<f64>, Option<f64>) {
    let source_ohm = plan.sources_ohm[0].max(plan.sources_ohm[1]);
    if source_ohm <= 0.0 {
        return (None, None);
    }
    let part_v = limit_v * std::f64::consts::FRAC_1_SQRT_2;
    let seen_v = plan.common_most_v() + plan.difference_v;
    // r/(r + R) of all that a tip sees is at most the part.
    let resistance_ohm = (source_ohm * (seen_v / part_v - 1.0)).max(0.0);
    let moving_v = plan.swing_v + plan.difference_v;
    let lag_s = match plan.motion {
        Motion::Edge(_) => plan.motion.skew_for(moving_v, part_v),
        // |1 − H| is at most ωrC.
        Motion::Sine(frequency_hz) => {
            Some(part_v / (plan.swing_v / 2.0 + plan.difference_v) / (std::f64::consts::TAU * frequency_hz))
        }
    };
    (Some(resistance_ohm), lag_s.map(|lag_s| lag_s / source_ohm))
}
