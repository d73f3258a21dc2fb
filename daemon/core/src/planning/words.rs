//! The verdict in sentences: what to do, what it must reach, and what stands in the way.

use super::check::Checked;
use super::differential::NoHelp;
use super::motion::Motion;
use super::outcome::{Budget, Differential, Needed, RangeChoice, Term, Totals, Verdict};
use super::range::wanted_span_v;
use super::terms::percent;
use crate::units::{Unit, show};

fn volts(value: f64) -> String {
    show(value, Unit::Volt, 3)
}

fn hertz(value: f64) -> String {
    show(value, Unit::Hertz, 3)
}

/// The verdict, the most important first.
pub(super) fn words(plan: &Checked, budget: &Budget, refusals: &[String], no_help: Option<&NoHelp>) -> Vec<String> {
    let mut words = refusals.to_vec();
    let wanted = volts(budget.wanted_v);
    match (budget.verdict, &budget.totals) {
        (Verdict::AsTheyAre, Some(totals)) => words.push(format!(
            "Two single-ended probes will do as they are: ±{} expected, ±{wanted} wanted.",
            volts(totals.before_v)
        )),
        (Verdict::AfterDeskew, Some(totals)) => {
            words.push(format!(
                "Two single-ended probes will do once they are deskewed: ±{} before, ±{} after, ±{wanted} wanted.",
                volts(totals.before_v),
                volts(totals.after_v)
            ));
            words.extend(budget.needed.as_ref().map(needed));
            words.extend(budget.range.as_ref().map(|range| {
                format!("Deskew on the range of the measurement, {} at the tip: ranges differ.", volts(range.span_v))
            }));
        }
        (Verdict::Refused, _) => words.push(format!(
            "Whatever is put on these nodes must be rated for {} to earth at {}.",
            volts(budget.tip.most_v),
            hertz(budget.frequency_hz)
        )),
        (_, Some(totals)) => not_enough(&mut words, budget, totals),
        (_, None) => words.push(format!(
            "Two single-ended probes will not do: behind an attenuation of {} no range of the scope shows {}.",
            plan.attenuation,
            volts(wanted_span_v(plan, &budget.tip))
        )),
    }
    if let Some(differential) = &budget.differential {
        words.push(offer(differential));
    }
    if !budget.verdict.two_probes_do() {
        words.extend(no_help.map(|why| hopeless(why, budget.wanted_v)));
    }
    words
}

fn not_enough(words: &mut Vec<String>, budget: &Budget, totals: &Totals) {
    let largest: Option<&Term> = budget.terms.iter().max_by(|a, b| a.after_v.total_cmp(&b.after_v));
    words.push(format!(
        "Two single-ended probes will not do: ±{} expected even after a deskew, ±{} wanted; most comes from {}.",
        volts(totals.after_v),
        volts(budget.wanted_v),
        largest.map_or("nothing", |term| term.name.as_str())
    ));
    match &budget.needed {
        Some(agreement) => words.push(format!("Only a better deskew than assumed would help. {}", needed(agreement))),
        None => words.push("No deskew is good enough: the terms that it leaves alone are too large.".to_owned()),
    }
    if let Some(settled_v) = totals.settled_after_v.filter(|settled_v| *settled_v <= budget.wanted_v) {
        words.push(format!(
            "Where only the levels between the edges count, two probes will do after a deskew: ±{}.",
            volts(settled_v)
        ));
    }
}

fn needed(agreement: &Needed) -> String {
    let gain = percent(agreement.gain);
    match agreement.skew_s {
        Some(skew_s) => {
            format!("They must agree within {} in skew and {gain} in gain.", show(skew_s, Unit::Second, 3))
        }
        None => format!("They must agree within {gain} in gain; the skew does not matter."),
    }
}

fn offer(needs: &Differential) -> String {
    let list: Vec<String> = needs.attenuations.iter().map(f64::to_string).collect();
    let attenuations = match list.split_last() {
        Some((last, rest)) if !rest.is_empty() => format!("{} or {last}", rest.join(", ")),
        _ => list.concat(),
    };
    let at = hertz(needs.frequency_hz);
    let mut text = format!(
        "A differential probe must offer: {} of bandwidth; an attenuation of {attenuations}; ±{} of differential range; \
         ±{} of common-mode range and rating to earth, at {at}; rejection of {:.0} dB at {at} and {:.0} dB at DC; gain \
         within {}",
        hertz(needs.bandwidth_hz),
        volts(needs.differential_v),
        volts(needs.common_v),
        needs.rejection_db.ceil(),
        needs.rejection_dc_db.ceil(),
        percent(needs.gain)
    );
    if let Some(ohm) = needs.resistance_ohm {
        text += &format!("; {} or more to earth at each input", show(ohm, Unit::Ohm, 3));
    }
    if let Some(farad) = needs.capacitance_f {
        text += &format!("; {} or less to earth at each input", show(farad, Unit::Farad, 3));
    }
    text + "."
}

fn hopeless(why: &NoHelp, wanted_v: f64) -> String {
    let share = volts(wanted_v / 2.0);
    match why {
        NoHelp::NoRange => "A differential probe does not help either: no range of this scope shows the difference \
                            within the scope's rating."
            .to_owned(),
        NoHelp::Scale(scale_v) => format!(
            "A differential probe does not help either: this scope's scale alone makes ±{} of the difference, and ±{share} \
             is its share. Take the scale from a reference of known levels (`scale` of `[after]`), or ask for less.",
            volts(*scale_v)
        ),
        NoHelp::Scope(best_v) => format!(
            "A differential probe does not help either: one channel of this scope makes ±{} at best, and ±{share} is its \
             share. Average more, take a finer scope, or ask for less.",
            volts(*best_v)
        ),
    }
}

/// What else to know.
pub(super) fn notes(plan: &Checked, range: Option<&RangeChoice>) -> Vec<String> {
    let mut notes = Vec::new();
    match (plan.bandwidth_hz(), plan.motion) {
        (None, _) => notes.push("No bandwidth is stated, so what it takes away is not counted.".to_owned()),
        (Some(bandwidth_hz), Motion::Edge(duration_s)) => notes.push(format!(
            "Behind {} of bandwidth an edge of {} reads {} (durations add by their squares, 0.35 over the bandwidth for \
             the system's: common practice, no source).",
            hertz(bandwidth_hz),
            show(duration_s, Unit::Second, 3),
            show(duration_s.hypot(0.35 / bandwidth_hz), Unit::Second, 3)
        )),
        (Some(_), Motion::Sine(_)) => {}
    }
    if let Some(range) = range {
        let reach_v = range.middle_v.abs() + range.span_v / 2.0;
        if reach_v > plan.rating_v {
            notes.push(format!(
                "The range shows more than the probes are rated for: {} to earth remains the limit.",
                volts(plan.rating_v)
            ));
        }
        if !plan.scope.is_effective() && plan.scope.averages > 1.0 && range.noise_v < 0.5 * range.step_v {
            notes.push(format!(
                "Noise is {:.2} steps: below 0.5 it does not let the steps average out.",
                range.noise_v / range.step_v
            ));
        }
    }
    let [positive_ohm, negative_ohm] = plan.sources_ohm;
    if (positive_ohm - negative_ohm).abs() > 0.0 {
        notes.push(
            "Loading stays after a deskew: with both tips on one node both are loaded alike, and it cannot be seen."
                .to_owned(),
        );
    }
    notes.push("Stay inside the probes' measurement category too, and never defeat the scope's earth.".to_owned());
    notes
}
