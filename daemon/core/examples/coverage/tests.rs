//! A few hundred of the cases, so that a change that breaks coverage is seen before somebody runs the whole.

use super::regimes::{Mark, REGIMES, slack};
use super::*;

/// Cases in each regime.
const CASES: usize = 30;

/// Shares over 30 cases in each regime: coarse for one of them, but over all regimes of one mark together there are
/// 120 and 180.
#[test]
fn intervals_hold_what_they_promise() {
    let (mut sharp, mut limited, mut sharp_cases, mut limited_cases) = (0, 0, 0, 0);
    for regime in &REGIMES {
        let tally = Tally::of(regime, CASES);
        assert_eq!(tally.outcomes.len(), CASES, "{} refuses records", regime.name);
        let held = tally.outcomes.iter().filter(|o| o.rms).count();
        if regime.mark == Mark::Sharp {
            sharp += held;
            sharp_cases += CASES;
        } else {
            limited += held;
            limited_cases += CASES;
            assert!(tally.share(|o| o.flagged) >= 0.95, "{} does not say what limits it", regime.name);
        }
    }
    let share = |held: usize, cases: usize| held as f64 / cases as f64;
    let (sharp_share, limited_share) = (share(sharp, sharp_cases), share(limited, limited_cases));
    assert!((sharp_share - 0.95).abs() <= slack(sharp_cases), "{sharp_share}");
    assert!(limited_share >= 0.95 - slack(limited_cases), "{limited_share}");
}

/// The interval that is left out is what made the difference: value ± 2u holds the truth always under a dominant
/// rectangular term, which is no 95 %.
#[test]
fn two_standard_uncertainties_are_too_wide_under_a_rectangular_term() {
    let tally = Tally::of(&REGIMES[0], CASES);
    assert!(tally.share(|o| o.plain) > 0.99);
    assert!(tally.share(|o| o.rms) < 0.99);
}
