//! The error budget of a measurement not yet made: will two single-ended probes do, how well must they be deskewed, or
//! what must a differential probe offer instead?
//!
//! [`budget`] takes a [`Plan`] (from a file by [`read()`], from flags or from the API), and gives a [`Budget`]: every
//! term in volts before and after a deskew, with its formula and that formula's source, and a verdict in words and
//! numbers. Ratings come first: where the voltage at a tip exceeds what is stated for its frequency, the answer is no,
//! whatever the accuracy.
//!
//! Every error in volts is an expanded uncertainty, k = 2 (JCGM 100, 6.2.1), so that the terms add by their squares to
//! the total (JCGM 100, 5.1.2). A limit `a` of which nothing else is known counts as a rectangular distribution,
//! `u = a/√3` (JCGM 100, 4.3.7), so `2·a/√3` at k = 2. Voltages are at the probes' tips unless a name says otherwise.
//!
//! Plan and budget are documents too: the API takes and gives them as they are. With the feature `schema` they describe
//! themselves for its OpenAPI document, under the names that it knows them by.

mod agreement;
mod check;
pub mod defaults;
mod differential;
mod loading;
mod motion;
mod outcome;
mod plan;
mod range;
mod rating;
mod read;
mod scope_error;
mod terms;
mod words;

pub use check::Flaw;
pub use outcome::{
    Budget, Differential, Loading, Needed, RangeChoice, Rejection, Term, TipVoltage, Totals, Verdict, When,
};
pub use plan::{Agreement, Derating, Plan, Probe, Scope, Signal, Source};
pub use read::{Written, parse_ratio, parse_volts_or_ratio, read};

/// Half of the width of a rectangular distribution to its expanded uncertainty, k = 2: `2/√3` (JCGM 100, 4.3.7).
const OF_LIMIT: f64 = 1.154_700_538_379_251_5;

/// The predicted errors of `plan`, and the verdict.
///
/// # Errors
/// Everything that is missing, out of range or contradicts itself in the plan.
pub fn budget(plan: &Plan) -> Result<Budget, Vec<Flaw>> {
    let checked = check::check(plan)?;
    let frequency_hz = checked.motion.frequency_hz();
    let tip = checked.tip_voltage();
    let refusals = rating::refusals(&checked, &tip);
    let range = range::choose(&checked, &tip);
    let usable = range.as_ref().filter(|_| refusals.is_empty());
    let terms = usable.map(|range| terms::terms(&checked, range)).unwrap_or_default();
    let totals = (!terms.is_empty()).then(|| terms::totals(&terms, checked.motion));
    let within = |total: f64| total <= checked.wanted_v;
    let needed = totals.as_ref().and_then(|totals| agreement::needed(&checked, &terms, totals));
    let differential = differential::require(&checked, &tip);
    let verdict = match (&totals, &differential) {
        _ if !refusals.is_empty() => Verdict::Refused,
        (Some(totals), _) if within(totals.before_v) => Verdict::AsTheyAre,
        (Some(totals), _) if within(totals.after_v) => Verdict::AfterDeskew,
        (_, Ok(_)) => Verdict::DifferentialProbe,
        _ => Verdict::OutOfReach,
    };
    let mut budget = Budget {
        verdict,
        words: Vec::new(),
        wanted_v: checked.wanted_v,
        difference_v: checked.difference_v,
        frequency_hz,
        tip,
        range: usable.copied(),
        terms,
        totals,
        rejection: agreement::rejection(&checked, frequency_hz),
        needed,
        loading: loading::parts(&checked),
        // Where two probes will do, what another probe would have to offer is no news.
        differential: differential.as_ref().ok().filter(|_| !verdict.two_probes_do()).cloned(),
        assumed: checked.assumed.clone(),
        notes: words::notes(&checked, usable),
    };
    budget.words = words::words(&checked, &budget, &refusals, differential.err().as_ref());
    Ok(budget)
}

#[cfg(test)]
mod tests;
