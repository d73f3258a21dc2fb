//! How far two legs agree: the rejection that follows, and the agreement that the wanted accuracy asks for.

use super::OF_LIMIT;
use super::check::{Checked, CheckedAgreement};
use super::outcome::{Needed, Rejection, Term, Totals};
use super::terms::{GAIN, SKEW};
use crate::analysis::rejection::cmrr_db;

/// Rejection by [`cmrr_db`]; a gain mismatch is taken as a leg that shows too little.
pub(super) fn rejection(plan: &Checked, frequency_hz: f64) -> Rejection {
    let told = |gain: f64, skew_s: f64| Some(cmrr_db(1.0 - gain, skew_s, frequency_hz)).filter(|db| db.is_finite());
    let parts = |legs: &CheckedAgreement| {
        // Towards half a period the closed form falls without end, and then turns round; the −6 dB of a quarter say enough.
        let skew_s = legs.skew_s.min(0.25 / frequency_hz);
        [told(legs.gain, 0.0), told(0.0, skew_s), told(legs.gain, skew_s)]
    };
    let [gain_before_db, skew_before_db, before_db] = parts(&plan.before);
    let [gain_after_db, skew_after_db, after_db] = parts(&plan.after);
    Rejection { gain_before_db, gain_after_db, skew_before_db, skew_after_db, before_db, after_db }
}

/// The skew and the gain mismatch with which the total is just the accuracy wanted. Both get the same share in volts,
/// unless one of them cannot be brought that far, but the other leaves room.
pub(super) fn needed(plan: &Checked, terms: &[Term], totals: &Totals) -> Option<Needed> {
    let after = |name: &str| terms.iter().find(|term| term.name == name).map_or(0.0, |term| term.after_v);
    let fixed: f64 =
        terms.iter().filter(|term| ![SKEW, GAIN].contains(&term.name.as_str())).map(|t| t.after_v.powi(2)).sum();
    let rest = plan.wanted_v * plan.wanted_v - fixed;
    if rest <= 0.0 {
        return None;
    }
    let (skew_v, gain_v) = (after(SKEW), after(GAIN));
    let equal_v = (rest / 2.0).sqrt();
    let beside = |taken_v: f64| (rest - taken_v * taken_v).max(0.0).sqrt();
    let (skew_share_v, gain_share_v) = if totals.after_v > plan.wanted_v {
        (equal_v, equal_v)
    } else if skew_v > equal_v {
        (skew_v, beside(skew_v))
    } else if gain_v > equal_v {
        (beside(gain_v), gain_v)
    } else {
        (equal_v, equal_v)
    };
    Some(Needed {
        skew_s: plan.motion.skew_for(plan.swing_v, skew_share_v / OF_LIMIT),
        gain: gain_share_v / OF_LIMIT / plan.common_most_v(),
    })
}
