//! A plan from a TOML file.

use std::ops::Range;

use super::check::Flaw;
use super::plan::{Agreement, Derating, Plan, Probe, Scope, Signal, Source};
use crate::document::{self, Mistake, Table};
use crate::units::{Amount, AmountError, Unit};

/// A plan as a file says it, with the place of every key.
#[derive(Debug, Clone, PartialEq)]
pub struct Written {
    /// The plan.
    pub plan: Plan,
    places: Vec<(String, Range<usize>)>,
}

impl Written {
    /// The flaws of the plan as mistakes of the file: at the key, or else at its table, or else at the beginning.
    #[must_use]
    pub fn mistakes(&self, flaws: &[Flaw]) -> Vec<Mistake> {
        let place = |key: &str| self.places.iter().find(|(name, _)| name == key).map(|(_, span)| span.clone());
        let mistake = |flaw: &Flaw| {
            let table = flaw.key.split('.').next().unwrap_or_default();
            let span = place(&flaw.key).or_else(|| place(table)).unwrap_or(0..0);
            Mistake { span, what: format!("`{}` {}", flaw.key, flaw.what), help: flaw.help.clone() }
        };
        let mut mistakes: Vec<Mistake> = flaws.iter().map(mistake).collect();
        mistakes.sort_by_key(|mistake| mistake.span.start);
        mistakes
    }
}

/// A ratio: `2 %`, or a number such as `0.02`.
///
/// # Errors
/// When it is neither.
pub fn parse_ratio(text: &str) -> Result<f64, AmountError> {
    match text.trim().strip_suffix('%') {
        Some(number) => Amount::parse_in(number, Unit::One).map(|percent| percent / 100.0),
        None => Amount::parse_in(text, Unit::One),
    }
}

/// Volts (`100 mV`), or a ratio of something else (`2 %`, `0.02`); the second of the two if it is a ratio.
///
/// # Errors
/// When it is neither.
pub fn parse_volts_or_ratio(text: &str) -> Result<(Option<f64>, Option<f64>), AmountError> {
    if text.contains('%') {
        return parse_ratio(text).map(|ratio| (None, Some(ratio)));
    }
    let amount = Amount::parse(text)?;
    match amount.unit {
        Unit::Volt => Ok((Some(amount.value), None)),
        Unit::One => Ok((None, Some(amount.value))),
        found => Err(AmountError::WrongUnit { found, wanted: Unit::Volt }),
    }
}

/// Reads a plan; whether it is complete, [`super::budget`] says.
///
/// # Errors
/// Every mistake in the text, sorted by place.
pub fn read(text: &str) -> Result<Written, Vec<Mistake>> {
    document::read(text, |top| {
        let mut places = Vec::new();
        let mut plan = Plan::default();
        part(top, "signal", &mut places, |table| plan.signal = signal(table));
        part(top, "source", &mut places, |table| {
            plan.source = Source {
                positive_ohm: table.amount("positive", Unit::Ohm).map(|item| item.value),
                negative_ohm: table.amount("negative", Unit::Ohm).map(|item| item.value),
            };
        });
        part(top, "probe", &mut places, |table| plan.probe = probe(table));
        part(top, "scope", &mut places, |table| plan.scope = scope(table));
        part(top, "before", &mut places, |table| plan.before = agreement(table));
        part(top, "after", &mut places, |table| plan.after = agreement(table));
        Some(Written { plan, places })
    })
}

/// One table of the file, with the places of its keys.
fn part<'t>(
    top: &mut Table<'t>,
    name: &str,
    places: &mut Vec<(String, Range<usize>)>,
    read: impl FnOnce(&mut Table<'t>),
) {
    let Some(mut table) = top.table(name) else { return };
    places.extend(table.keys().into_iter().map(|key| (format!("{name}.{}", key.value), key.span)));
    places.push((name.to_owned(), table.span()));
    read(&mut table);
    table.refuse_others();
}

fn signal(table: &mut Table<'_>) -> Signal {
    let mut amount = |key: &str, unit| table.amount(key, unit).map(|item| item.value);
    let (swing_v, low_v) = (amount("swing", Unit::Volt), amount("low", Unit::Volt));
    let (edge_s, frequency_hz) = (amount("edge", Unit::Second), amount("frequency", Unit::Hertz));
    let (difference_v, headroom_v) = (amount("difference", Unit::Volt), amount("headroom", Unit::Volt));
    let (accuracy_v, accuracy_ratio) = volts_or_ratio(table, "accuracy", "100 mV");
    Signal { swing_v, low_v, edge_s, frequency_hz, difference_v, headroom_v, accuracy_v, accuracy_ratio }
}

fn probe(table: &mut Table<'_>) -> Probe {
    let points = table.tables("derating").unwrap_or_default();
    let derating = points.into_iter().filter_map(|mut point| {
        let help = "a point of the rating has both a `frequency` and a `rating`";
        let frequency = point.amount("frequency", Unit::Hertz).or_else(|| point.missing("frequency", help));
        let rating = point.amount("rating", Unit::Volt).or_else(|| point.missing("rating", help));
        point.refuse_others();
        Some(Derating { frequency_hz: frequency?.value, rating_v: rating?.value })
    });
    let derating = derating.collect();
    let mut amount = |key: &str, unit| table.amount(key, unit).map(|item| item.value);
    Probe {
        attenuation: amount("attenuation", Unit::One),
        resistance_ohm: amount("resistance", Unit::Ohm),
        capacitance_f: amount("capacitance", Unit::Farad),
        bandwidth_hz: amount("bandwidth", Unit::Hertz),
        rating_v: amount("rating", Unit::Volt),
        rating_corner_hz: amount("rating_corner", Unit::Hertz),
        rating_slope: amount("rating_slope", Unit::One),
        derating,
    }
}

fn scope(table: &mut Table<'_>) -> Scope {
    let spans = table.amounts("spans", Unit::Volt).unwrap_or_default();
    let (noise_v, noise_ratio) = volts_or_ratio(table, "noise", "1 mV");
    let shifts = table.flag("shifts").map(|item| item.value);
    let scale_spec = ratio(table, "scale_spec");
    let mut amount = |key: &str, unit| table.amount(key, unit).map(|item| item.value);
    Scope {
        bits: amount("bits", Unit::One),
        enob: amount("enob", Unit::One),
        spans_v: spans.into_iter().map(|item| item.value).collect(),
        shifts,
        scale_spec,
        noise_v,
        noise_ratio,
        linearity_steps: amount("linearity", Unit::One),
        bandwidth_hz: amount("bandwidth", Unit::Hertz),
        rating_v: amount("rating", Unit::Volt),
        averages: amount("averages", Unit::One),
    }
}

fn agreement(table: &mut Table<'_>) -> Agreement {
    Agreement {
        skew_s: table.amount("skew", Unit::Second).map(|item| item.value),
        gain: ratio(table, "gain"),
        offset: ratio(table, "offset"),
        scale: ratio(table, "scale"),
    }
}

/// A number, or a text such as `"2 %"`.
fn ratio(table: &mut Table<'_>, key: &str) -> Option<f64> {
    if !table.is_text(key) {
        return table.number(key).map(|item| item.value);
    }
    let item = table.text(key)?;
    match parse_ratio(&item.value) {
        Ok(ratio) => Some(ratio),
        Err(error) => {
            table.mistakes().add(item.span, format!("`{key}`: {error}"), format!("such as `{key} = \"2 %\"`"));
            None
        }
    }
}

/// A text in volts or percent. A bare number could be meant either way, so it is refused.
fn volts_or_ratio(table: &mut Table<'_>, key: &str, example: &str) -> (Option<f64>, Option<f64>) {
    let Some(item) = table.text(key) else { return (None, None) };
    parse_volts_or_ratio(&item.value).unwrap_or_else(|error| {
        let help = format!("such as `{key} = \"{example}\"` or `{key} = \"2 %\"`");
        table.mistakes().add(item.span, format!("`{key}`: {error}"), help);
        (None, None)
    })
}
