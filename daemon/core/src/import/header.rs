//! What header lines tell: names, units, and sometimes the sample interval.

use crate::units::{Amount, Unit};

/// A unit with its prefix.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Scale {
    /// `Second` or `Volt`.
    pub unit: Unit,
    /// What a value has to be multiplied by to be in `unit`.
    pub factor: f64,
}

/// A sample interval that a header line tells.
#[derive(Debug, Clone, PartialEq)]
pub struct Hint {
    /// Seconds between two samples.
    pub interval_s: f64,
    /// The line that says so.
    pub line: String,
}

/// Spellings of units in headers, in lower case: a scope that writes `MV` means millivolts.
const SPELLINGS: [(Unit, i32, &[&str]); 9] = [
    (Unit::Second, 0, &["s", "sec", "secs", "second", "seconds"]),
    (Unit::Second, -3, &["ms", "msec", "millisecond", "milliseconds"]),
    (Unit::Second, -6, &["µs", "μs", "us", "usec", "microsecond", "microseconds"]),
    (Unit::Second, -9, &["ns", "nsec", "nanosecond", "nanoseconds"]),
    (Unit::Second, -12, &["ps", "psec", "picosecond", "picoseconds"]),
    (Unit::Volt, 0, &["v", "volt", "volts"]),
    (Unit::Volt, -3, &["mv", "millivolt", "millivolts"]),
    (Unit::Volt, -6, &["µv", "μv", "uv", "microvolt", "microvolts"]),
    (Unit::Volt, 3, &["kv", "kilovolt", "kilovolts"]),
];

/// The unit with this spelling, in brackets or without.
pub(super) fn unit(text: &str) -> Option<Scale> {
    let bare = text.trim().trim_start_matches(['(', '[']).trim_end_matches([')', ']']).trim().to_lowercase();
    let (unit, power, _) = SPELLINGS.iter().find(|(.., names)| names.contains(&bare.as_str()))?;
    let factor = if *power < 0 { 1.0 / 10f64.powi(-power) } else { 10f64.powi(*power) };
    Some(Scale { unit: *unit, factor })
}

/// The unit that stands in a column's name: `Time (ns)`, `CH1 [mV]`, `t/µs`, `t in ms`, `time_s`, `Volt`.
pub(super) fn unit_in(name: &str) -> Option<Scale> {
    split(name).1
}

/// A name without its unit.
pub(super) fn bare(name: &str) -> &str {
    split(name).0
}

fn split(name: &str) -> (&str, Option<Scale>) {
    let name = name.trim();
    for mark in ["(", "[", "/", " in ", "_", " "] {
        if let Some((head, tail)) = name.rsplit_once(mark)
            && let Some(scale) = unit(tail)
            && !head.trim().is_empty()
        {
            return (head.trim(), Some(scale));
        }
    }
    (name, unit(name))
}

/// The sample interval that one header line tells, as `sample interval, 2e-9` or `Sample rate: 500 MSa/s`. The words
/// are common practice, no source.
pub(super) fn interval(line: &str, number: impl Fn(&str) -> Option<f64>) -> Option<Hint> {
    let lower = line.to_lowercase();
    let is_interval = ["interval", "increment", "sample period", "sampling period"].iter().any(|w| lower.contains(w));
    let is_rate = ["sample rate", "sampling rate", "samplerate"].iter().any(|w| lower.contains(w));
    if !is_interval && !is_rate {
        return None;
    }
    let key_unit = line.split([':', '=', ',', ';', '\t']).next().and_then(unit_in);
    let mut fields = line.split([':', '=', ';', '\t', '"']).flat_map(|part| {
        // A comma may be a decimal mark: the whole part comes first, then what is between its commas.
        std::iter::once(part).chain(part.split(','))
    });
    let value = fields.find_map(|field| {
        let field = field.trim();
        if let Some(value) = number(field) {
            return Some(value * key_unit.filter(|scale| scale.unit == Unit::Second).map_or(1.0, |scale| scale.factor));
        }
        let wanted = if is_interval { [Unit::Second, Unit::Second] } else { [Unit::SamplePerSecond, Unit::Hertz] };
        Amount::parse(field).ok().filter(|amount| wanted.contains(&amount.unit)).map(|amount| amount.value)
    })?;
    let interval_s = if is_interval { value } else { 1.0 / value };
    (interval_s.is_finite() && interval_s > 0.0).then(|| Hint { interval_s, line: line.trim().to_owned() })
}
