//! Columns → the records of a pair.

use super::axis::{self, Axis};
use super::choose::{Leg, Place};
use super::header::{self, Scale};
use super::{Guess, ImportError, Imported, Options, Table, step};
use crate::analysis::{Record, Samples};
use crate::units::{Unit, show};

/// The fewest samples that are worth calling a record: less than the interpolation needs on both sides.
const LEAST_SAMPLES: usize = 128;

/// One leg before it is cut to what both have.
struct Series {
    values_v: Vec<f64>,
    axis: Axis,
}

/// Both legs from one table.
pub(super) fn one_table(
    table: Table,
    positive: Place,
    negative: Place,
    options: &Options,
) -> Result<Imported, ImportError> {
    let mut table = table;
    let mut guesses = std::mem::take(&mut table.guesses);
    let mut notes = std::mem::take(&mut table.notes);
    // Rows that one of the legs does not reach are no rows of the pair.
    let (p, n) = (&table.columns[positive.samples].values, &table.columns[negative.samples].values);
    let (from, to) = match positive.time == negative.time {
        true => overlap(&[inside(p), inside(n)])?,
        false => (0, p.len()),
    };
    let p = series(&table, Leg::Positive, positive, (from, to), options, &mut guesses, &mut notes)?;
    let n = series(&table, Leg::Negative, negative, (from, to), options, &mut guesses, &mut notes)?;
    pair(p, n, guesses, notes, options)
}

/// A leg from each of two tables.
pub(super) fn two_tables(
    mut first: Table,
    positive: Place,
    mut second: Table,
    negative: Place,
    options: &Options,
) -> Result<Imported, ImportError> {
    let mut guesses = std::mem::take(&mut first.guesses);
    guesses.append(&mut second.guesses);
    let mut notes = std::mem::take(&mut first.notes);
    notes.append(&mut second.notes);
    let rows = |table: &Table| (0, table.columns.first().map_or(0, |column| column.values.len()));
    let p = series(&first, Leg::Positive, positive, rows(&first), options, &mut guesses, &mut notes)?;
    let n = series(&second, Leg::Negative, negative, rows(&second), options, &mut guesses, &mut notes)?;
    pair(p, n, guesses, notes, options)
}

/// The rows from the first to the last with a number.
fn inside(values: &[f64]) -> (usize, usize) {
    let first = values.iter().position(|value| value.is_finite()).unwrap_or(values.len());
    let last = values.iter().rposition(|value| value.is_finite()).map_or(first, |last| last + 1);
    (first, last)
}

fn overlap(ranges: &[(usize, usize)]) -> Result<(usize, usize), ImportError> {
    let from = ranges.iter().map(|range| range.0).max().unwrap_or(0);
    let to = ranges.iter().map(|range| range.1).min().unwrap_or(0);
    if from < to { Ok((from, to)) } else { Err(ImportError::TooShort { found: 0, needed: LEAST_SAMPLES }) }
}

/// One leg of a table, rows `from..to` at most, in volts at the tip.
fn series(
    table: &Table,
    leg: Leg,
    place: Place,
    (from, to): (usize, usize),
    options: &Options,
    guesses: &mut Vec<Guess>,
    notes: &mut Vec<String>,
) -> Result<Series, ImportError> {
    let column = &table.columns[place.samples];
    let (first, last) = inside(&column.values[from..to]);
    let (from, to) = (from + first, from + last);
    let values = &column.values[from..to];
    if let Some(hole) = values.iter().position(|value| !value.is_finite()) {
        return Err(ImportError::Missing { leg: leg.name(), line: table.first_line + from + hole });
    }
    let scale = scale(Unit::Volt, "volt_unit", &options.volt_unit, column.unit, guesses)?;
    if scale.unit != Unit::Volt {
        return Err(ImportError::WrongUnit { column: column.name.clone(), leg: leg.name() });
    }
    let attenuation = options.attenuation.map_or(1.0, |both| both[usize::from(leg == Leg::Negative)]);
    if !(attenuation.is_finite() && attenuation > 0.0) {
        let why = format!("{attenuation} is no attenuation; tell 10 for a probe that divides by ten");
        return Err(ImportError::Option { option: "attenuation", why });
    }
    let factor = scale.factor * attenuation;
    let axis = axis_of(table, place, (from, to), options, guesses)?;
    for note in axis.note.iter().filter(|note| !notes.contains(note)).cloned().collect::<Vec<_>>() {
        notes.push(note);
    }
    Ok(Series { values_v: values.iter().map(|value| value * factor).collect(), axis })
}

fn axis_of(
    table: &Table,
    place: Place,
    (from, to): (usize, usize),
    options: &Options,
    guesses: &mut Vec<Guess>,
) -> Result<Axis, ImportError> {
    if let Some(interval_s) = options.interval_s.filter(|interval_s| !(interval_s.is_finite() && *interval_s > 0.0)) {
        return Err(ImportError::Option { option: "interval", why: format!("{interval_s} s is no sample interval") });
    }
    let hinted = table.interval.as_ref().map(|hint| hint.interval_s);
    let Some(time) = place.time else {
        let Some(interval_s) = options.interval_s.or(hinted) else { return Err(ImportError::NoTime) };
        if let Some(hint) = table.interval.as_ref().filter(|_| options.interval_s.is_none()) {
            let taken = format!("{} (`{}`)", show(hint.interval_s, Unit::Second, 4), hint.line);
            guess(guesses, "interval", taken);
        }
        return Ok(Axis { start_s: from as f64 * interval_s, interval_s, note: None });
    };
    let column = &table.columns[time];
    let scale = scale(Unit::Second, "time_unit", &options.time_unit, column.unit, guesses)?;
    let times: Vec<f64> = column.values[from..to].iter().map(|time| time * scale.factor).collect();
    match options.interval_s {
        Some(interval_s) => {
            let start_s = times.first().copied().filter(|start| start.is_finite()).unwrap_or(0.0);
            Ok(Axis { start_s, interval_s, note: None })
        }
        None => axis::fit(&column.name, &times, table.first_line + from),
    }
}

/// The unit that was told, that the header tells, or the plain one, which is a guess.
fn scale(
    wanted: Unit,
    option: &'static str,
    told: &Option<String>,
    found: Option<Scale>,
    guesses: &mut Vec<Guess>,
) -> Result<Scale, ImportError> {
    if let Some(text) = told {
        let scale = header::unit(text).filter(|scale| scale.unit == wanted);
        return scale.ok_or_else(|| ImportError::Option {
            option,
            why: format!("`{text}` is not understood; known are s, ms, us, ns, ps and V, mV, uV, kV"),
        });
    }
    if let Some(scale) = found {
        // Not told but read: worth showing, since a header can be wrong.
        let prefix = show(scale.factor, scale.unit, 1);
        guess(guesses, option, prefix.trim_start_matches("1 ").to_owned());
        return Ok(scale);
    }
    guess(guesses, option, format!("{wanted} (the header tells none)"));
    Ok(Scale { unit: wanted, factor: 1.0 })
}

/// Adds a guess, once.
fn guess(guesses: &mut Vec<Guess>, option: &'static str, taken: String) {
    let guess = Guess { option, taken };
    if !guesses.contains(&guess) {
        guesses.push(guess);
    }
}

/// Two series → two records of one length.
fn pair(
    mut p: Series,
    mut n: Series,
    mut guesses: Vec<Guess>,
    mut notes: Vec<String>,
    options: &Options,
) -> Result<Imported, ImportError> {
    let points = p.values_v.len().min(n.values_v.len());
    if points < LEAST_SAMPLES {
        return Err(ImportError::TooShort { found: points, needed: LEAST_SAMPLES });
    }
    let (positive_s, negative_s) = (p.axis.interval_s, n.axis.interval_s);
    // As the correction asks for it: within a thousandth of a sample over the whole record, or a few digits of text.
    let apart = (positive_s - negative_s).abs() * points as f64;
    if apart > 0.5 * positive_s {
        return Err(ImportError::Intervals { positive_s, negative_s });
    }
    if apart > 0.0 {
        // Both were meant to be the same; what is left is the rounding of two fits.
        let mean = 0.5 * (positive_s + negative_s);
        (p.axis.interval_s, n.axis.interval_s) = (mean, mean);
    }
    if p.values_v.len() != n.values_v.len() {
        notes.push(format!(
            "the legs have {} and {} samples; the first {points} of each are used",
            p.values_v.len(),
            n.values_v.len()
        ));
    }
    p.values_v.truncate(points);
    n.values_v.truncate(points);
    let positive = record(Leg::Positive, p, options, &mut guesses, &mut notes)?;
    let negative = record(Leg::Negative, n, options, &mut guesses, &mut notes)?;
    Ok(Imported { positive, negative, guesses, notes })
}

fn record(
    leg: Leg,
    series: Series,
    options: &Options,
    guesses: &mut Vec<Guess>,
    notes: &mut Vec<String>,
) -> Result<Record, ImportError> {
    let Series { values_v, axis } = series;
    let (low, high) =
        values_v.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), &v| (low.min(v), high.max(v)));
    // Single precision about the middle of the range: 2⁻²⁵ of it, 150 dB down.
    let zero_v = 0.5 * (low + high);
    let told = told_step(options)?;
    let step_v = match told {
        Some(step_v) => Some(step_v),
        None => {
            let found = step::of(&values_v);
            let taken = match found {
                Some(step_v) => {
                    format!("a converter step of {} in the {} leg", show(step_v, Unit::Volt, 3), leg.name())
                }
                None => format!("no converter step can be seen in the {} leg", leg.name()),
            };
            guess(guesses, "bits", taken);
            found
        }
    };
    let mut end_codes = (f64::NEG_INFINITY, f64::INFINITY);
    if let Some(step_v) = step_v {
        let codes = options.bits.map(|bits| 2f64.powi(i32::try_from(bits).unwrap_or(0)) - 1.0);
        if told.is_some() && codes.is_some_and(|codes| (high - low) / step_v > codes - 0.5) {
            // Every code of the converter occurs, so both of its ends do.
            end_codes = (f64::from((low - zero_v) as f32), f64::from((high - zero_v) as f32));
        } else if let Some(count) = step::crowded(&values_v, step_v) {
            notes.push(format!(
                "{count} samples of the {} leg stand at exactly its highest or lowest value: either it is clipped, \
                 or its noise stays below the converter's step",
                leg.name()
            ));
        }
    }
    let samples = values_v.iter().map(|v| (v - zero_v) as f32).collect();
    Ok(Record {
        samples: Samples::Numbers(samples),
        volts_per_code: 1.0,
        zero_v,
        interval_s: axis.interval_s,
        start_s: axis.start_s,
        end_codes,
        step_v: step_v.unwrap_or(0.0),
        averages: options.averages.unwrap_or(1).max(1),
    })
}

/// The step after what was told about the converter.
fn told_step(options: &Options) -> Result<Option<f64>, ImportError> {
    let wrong = |option, why: &str| Err(ImportError::Option { option, why: why.to_owned() });
    match (options.bits, options.span_v) {
        (None, None) => Ok(None),
        (None, Some(_)) => wrong("span", "a span tells the converter's step only together with bits"),
        (Some(_), None) => wrong("bits", "tell the full vertical span at the tip as well, as span"),
        (Some(bits), Some(_)) if !(4..=24).contains(&bits) => wrong("bits", "a scope's converter has 4 to 24 bits"),
        (Some(_), Some(span_v)) if !(span_v.is_finite() && span_v > 0.0) => wrong("span", "a span is above 0 V"),
        (Some(bits), Some(span_v)) => Ok(Some(span_v / 2f64.powi(i32::try_from(bits).unwrap_or(0)))),
    }
}
