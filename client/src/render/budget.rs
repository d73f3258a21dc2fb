//! An error budget before measuring: the verdict first, then what it stands on.

use evenpair_core::planning::{Budget, Loading, RangeChoice, Rejection, Term, Totals, Verdict, When};
use evenpair_core::units::{Unit, show};

use super::bench::wrap;
use super::table::{lines, table};

/// The verdict, the voltages, every term with its formula and that formula's source, and what was assumed.
pub(crate) fn budget(budget: &Budget) -> String {
    let mut parts = vec![format!("two single-ended probes: {}", verdict_word(budget.verdict))];
    parts.push(budget.words.iter().map(|words| wrap(words, 0)).collect::<Vec<_>>().join("\n"));
    parts.push(facts(budget).join("\n"));
    if let Some(totals) = &budget.totals {
        parts.push(terms(&budget.terms, totals));
        let formulas = budget.terms.iter().map(|term| format!("{}: {} ({})", term.name, term.formula, term.source));
        let total = "total: root sum of squares (JCGM 100, 5.1.2)".to_owned();
        parts.push(list("formulas (and their sources)", formulas.chain([total])));
    }
    parts.push(list("assumed, because the plan does not say it", budget.assumed.iter().cloned()));
    parts.push(list("notes", budget.notes.iter().cloned()));
    parts.retain(|part| !part.is_empty());
    parts.join("\n\n")
}

fn verdict_word(verdict: Verdict) -> &'static str {
    match verdict {
        Verdict::AfterDeskew => "will do after a deskew",
        Verdict::AsTheyAre => "will do as they are",
        Verdict::DifferentialProbe => "will NOT do; a differential probe may",
        Verdict::OutOfReach => "will NOT do, nor a differential probe on this scope",
        Verdict::Refused => "REFUSED: a rating would be exceeded",
    }
}

fn volts(value: f64) -> String {
    show(value, Unit::Volt, 3)
}

/// A head with its lines set in; nothing without lines.
fn list(head: &str, items: impl Iterator<Item = String>) -> String {
    let items: Vec<String> = items.map(|item| format!("  {}", wrap(&format!("- {item}"), 4))).collect();
    if items.is_empty() { String::new() } else { format!("{head}\n{}", items.join("\n")) }
}

fn facts(budget: &Budget) -> Vec<String> {
    let tip = &budget.tip;
    let at = show(budget.frequency_hz, Unit::Hertz, 3);
    let rated = tip.rating_v.map_or_else(|| "of no stated rating".to_owned(), |v| format!("rated for {}", volts(v)));
    let mut facts = vec![
        format!("wanted     ±{}, k = 2, of a difference of {}", volts(budget.wanted_v), volts(budget.difference_v)),
        format!("at a tip   {} to {} to earth, {rated} at {at}", volts(tip.low_v), volts(tip.high_v)),
    ];
    facts.extend(budget.range.as_ref().map(range));
    if budget.totals.is_some() {
        facts.push(rejection(&budget.rejection, &at));
        facts.extend(budget.loading.iter().filter(|part| part.at_frequency > 0.0).map(|part| loading(part, &at)));
    }
    facts
}

fn range(range: &RangeChoice) -> String {
    let mut text = format!(
        "range      {} at the tip around {} ({} at the input)\n             one step {}",
        volts(range.span_v),
        volts(range.middle_v),
        volts(range.input_span_v),
        volts(range.step_v)
    );
    if range.noise_v > 0.0 {
        text += &format!(", noise {} rms", volts(range.noise_v));
    }
    text
}

fn rejection(rejection: &Rejection, at: &str) -> String {
    let db = |value: Option<f64>| value.map_or_else(|| "no limit".to_owned(), |value| format!("{value:.1} dB"));
    format!(
        "rejection  before / after a deskew, at {at}: {} / {}\n             gain alone {} / {}; skew alone {} / {}",
        db(rejection.before_db),
        db(rejection.after_db),
        db(rejection.gain_before_db),
        db(rejection.gain_after_db),
        db(rejection.skew_before_db),
        db(rejection.skew_after_db)
    )
}

fn loading(part: &Loading, at: &str) -> String {
    let percent = |ratio: f64| show(100.0 * ratio, Unit::One, 2);
    format!(
        "loading    the {} node loses {} % at DC, {} % at {at}",
        part.tip,
        percent(part.at_dc),
        percent(part.at_frequency)
    )
}

fn terms(terms: &[Term], totals: &Totals) -> String {
    let mut list = table(&["error, ± at k = 2", "before", "after a deskew", ""], &[1, 2]);
    for term in terms {
        let when = if term.when == When::Moving { "while the common mode moves" } else { "" };
        list.add_row([term.name.clone(), volts(term.before_v), volts(term.after_v), when.to_owned()]);
    }
    let mut total = |name: &str, before_v, after_v| {
        list.add_row([name, &volts(before_v), &volts(after_v), ""]);
    };
    total("total", totals.before_v, totals.after_v);
    if let (Some(before_v), Some(after_v)) = (totals.settled_before_v, totals.settled_after_v) {
        total("total once settled", before_v, after_v);
    }
    lines(&list)
}

#[cfg(test)]
mod tests;
