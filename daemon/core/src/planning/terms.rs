//! The terms of a budget for two single-ended probes, each with its formula and that formula's source.

use super::check::Checked;
use super::motion::Motion;
use super::outcome::{RangeChoice, Term, Totals, When};
use super::{OF_LIMIT, loading};
use crate::units::{Unit, show};

/// The name of the skew's term.
pub(super) const SKEW: &str = "skew";

/// The name of the gain's term.
pub(super) const GAIN: &str = "gain";

const RECTANGULAR: &str = "a limit counts as rectangular, JCGM 100, 4.3.7";

/// A percentage as a person would write it.
pub(super) fn percent(ratio: f64) -> String {
    let text = show(100.0 * ratio, Unit::One, 3);
    let text = if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.') } else { &text };
    format!("{text} %")
}

/// Every term that this plan has on this range.
pub(super) fn terms(plan: &Checked, range: &RangeChoice) -> Vec<Term> {
    let volts = |value| show(value, Unit::Volt, 3);
    let both = std::f64::consts::SQRT_2;
    let mut terms = Vec::new();
    let mut add = |name: &str, when, [before_v, after_v]: [f64; 2], formula: String, source: &str| {
        // A term that is nothing, such as the noise that effective bits contain, would only be read in vain.
        if before_v > 0.0 || after_v > 0.0 {
            let (name, source) = (name.to_owned(), source.to_owned());
            terms.push(Term { name, before_v, after_v, when, formula, source });
        }
    };
    let agreements = [&plan.before, &plan.after];

    let skew = agreements.map(|legs| OF_LIMIT * plan.motion.skew_error_v(plan.swing_v, legs.skew_s));
    match plan.motion {
        Motion::Edge(duration_s) => add(
            SKEW,
            When::Moving,
            skew,
            format!(
                "2/√3 × swing × erf(τ/(2√2 σ)), σ = edge/2.563: {} in {}",
                volts(plan.swing_v),
                show(duration_s, Unit::Second, 3)
            ),
            &format!("closed form for a Gaussian edge; {RECTANGULAR}"),
        ),
        Motion::Sine(frequency_hz) => add(
            SKEW,
            When::Moving,
            skew,
            format!("2/√3 × swing × sin(π f τ): {} at {}", volts(plan.swing_v), show(frequency_hz, Unit::Hertz, 3)),
            &format!("closed form, difference of two phasors; {RECTANGULAR}"),
        ),
    }
    add(
        GAIN,
        When::Always,
        agreements.map(|legs| OF_LIMIT * legs.gain * plan.common_most_v()),
        format!("2/√3 × mismatch × largest common mode: {}", volts(plan.common_most_v())),
        &format!("definition of gain; {RECTANGULAR}"),
    );
    add(
        "offset",
        When::Always,
        agreements.map(|legs| OF_LIMIT * legs.offset * range.span_v),
        format!("2/√3 × offset × span: {}", volts(range.span_v)),
        &format!("definition of offset; {RECTANGULAR}"),
    );
    add(
        "scale",
        When::Always,
        agreements.map(|legs| OF_LIMIT * legs.scale * plan.difference_v),
        format!("2/√3 × scale × difference: {}", volts(plan.difference_v)),
        &format!("definition of scale; {RECTANGULAR}"),
    );
    let channel = plan.scope.channel_error(range);
    let averages = plan.scope.averages;
    let effective = plan.scope.is_effective();
    add(
        "quantisation",
        When::Always,
        [both * channel.quantisation_v; 2],
        if effective {
            format!("2 √2 × span/(2^ENOB √12): step equivalent to {}", volts(range.step_v))
        } else {
            format!("2 √2 × step/√12, what averages over {averages}: step {}", volts(range.step_v))
        },
        if effective {
            "definition of effective bits, IEEE Std 1057 (from memory)"
        } else {
            "JCGM 100, 4.3.7; what noise leaves: Fourier series of the quantiser's mean error"
        },
    );
    add(
        "linearity",
        When::Always,
        [both * channel.linearity_v; 2],
        format!("2 √2/√3 × steps of non-linearity × step: {} steps", plan.scope.linearity_steps),
        RECTANGULAR,
    );
    add(
        "noise",
        When::Always,
        [both * channel.noise_v; 2],
        format!("2 √2 × rms/√averages: {} rms, {averages} averages", volts(range.noise_v)),
        "standard deviation of a mean, JCGM 100, 4.2.3",
    );
    add(
        "loading, settled",
        When::Always,
        [OF_LIMIT * loading::settled_error_v(plan); 2],
        "2/√3 × (common mode × |a_P − a_N| + difference × a_P), a = r/(r + R)".to_owned(),
        &format!("Ohm's and Kirchhoff's laws; {RECTANGULAR}"),
    );
    let moving = [OF_LIMIT * loading::moving_error_v(plan); 2];
    match plan.motion {
        Motion::Edge(_) => add(
            "loading, edges",
            When::Moving,
            moving,
            "as skew, with the difference of the lags (r ∥ R) C of the two nodes".to_owned(),
            "Ohm's and Kirchhoff's laws; an edge through a pole is late by r C at most",
        ),
        Motion::Sine(_) => add(
            "loading, moving",
            When::Moving,
            moving,
            "2/√3 × (swing/2 × |H_P − H_N| + difference × |1 − H_P|), H = 1/(1 + r/R + jωrC)".to_owned(),
            &format!("Ohm's and Kirchhoff's laws; {RECTANGULAR}"),
        ),
    }
    if let (Motion::Sine(frequency_hz), Some(bandwidth_hz)) = (plan.motion, plan.bandwidth_hz()) {
        let ratio = frequency_hz / bandwidth_hz;
        let lost = 1.0 - 1.0 / ratio.hypot(1.0);
        add(
            "bandwidth",
            When::Moving,
            [OF_LIMIT * lost * plan.difference_v; 2],
            format!("2/√3 × difference × (1 − 1/√(1 + (f/B)²)): B = {}", show(bandwidth_hz, Unit::Hertz, 3)),
            &format!("magnitude of one pole; {RECTANGULAR}"),
        );
    }
    terms
}

/// Their sums.
pub(super) fn totals(terms: &[Term], motion: Motion) -> Totals {
    let sum = |value: fn(&Term) -> f64, settled: bool| {
        let counted = terms.iter().filter(|term| !settled || term.when == When::Always);
        counted.map(|term| value(term).powi(2)).sum::<f64>().sqrt()
    };
    let settles = matches!(motion, Motion::Edge(_));
    let before: fn(&Term) -> f64 = |term| term.before_v;
    let after: fn(&Term) -> f64 = |term| term.after_v;
    Totals {
        before_v: sum(before, false),
        after_v: sum(after, false),
        settled_before_v: settles.then(|| sum(before, true)),
        settled_after_v: settles.then(|| sum(after, true)),
    }
}
