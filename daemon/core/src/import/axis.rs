//! A column of times → start and interval.
//!
//! Samples are evenly spaced; what makes the written times uneven is that they have few digits. A straight line
//! through them takes that out: the interval of n times rounded to q is known to about `q·√(1/n³)`.

use super::ImportError;

/// Times of evenly spaced samples.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Axis {
    /// Time of the first sample in seconds.
    pub(super) start_s: f64,
    /// Seconds between two samples.
    pub(super) interval_s: f64,
    /// What a person should know about it.
    pub(super) note: Option<String>,
}

/// A time this far off its place, in samples, may be rounding; more is a hole or another axis.
const MOST_OFF: f64 = 1.0;

/// From here on, in samples, the rounding is told.
const WORTH_TELLING: f64 = 0.05;

/// Fits the axis of `times` (seconds) that stand in the lines from `first_line` on.
pub(super) fn fit(column: &str, times: &[f64], first_line: usize) -> Result<Axis, ImportError> {
    if let Some(missing) = times.iter().position(|time| !time.is_finite()) {
        return Err(ImportError::Missing { leg: "time of the", line: first_line + missing });
    }
    let falls = || ImportError::AxisFalls { column: column.to_owned() };
    let (Some(&first), Some(&last)) = (times.first(), times.last()) else { return Err(falls()) };
    let steps = times.len() as f64 - 1.0;
    let by_ends = (last - first) / steps;
    if !(by_ends.is_finite() && by_ends > 0.0) {
        return Err(falls());
    }
    let (off, at) = worst(times, first, by_ends);
    if off < 1e-3 {
        return Ok(Axis { start_s: first, interval_s: by_ends, note: None });
    }
    let (start_s, interval_s) = line(times, first);
    let (off, at) = if interval_s > 0.0 { worst(times, start_s, interval_s) } else { (off, at) };
    if off > MOST_OFF {
        return Err(ImportError::Axis { column: column.to_owned(), line: first_line + at, off_samples: off });
    }
    let note = (off > WORTH_TELLING).then(|| {
        format!(
            "the times in `{column}` are rounded (up to {off:.2} samples off); an even interval of {interval_s:e} s was \
             fitted to them"
        )
    });
    Ok(Axis { start_s, interval_s, note })
}

/// Whether numbers without a name could be times: they rise evenly.
pub(super) fn rises_evenly(values: &[f64]) -> bool {
    values.len() > 2 && values.iter().all(|v| v.is_finite()) && fit("", values, 1).is_ok()
}

/// The largest distance of a time from its place, in samples, and where.
fn worst(times: &[f64], start: f64, interval: f64) -> (f64, usize) {
    times.iter().enumerate().fold((0.0, 0), |(most, at), (i, time)| {
        let off = ((time - start) / interval - i as f64).abs();
        if off > most { (off, i) } else { (most, at) }
    })
}

/// Least squares of times over their index; times relative to the first keep their digits.
fn line(times: &[f64], first: f64) -> (f64, f64) {
    let n = times.len() as f64;
    let middle = (n - 1.0) / 2.0;
    let mean = times.iter().map(|time| time - first).sum::<f64>() / n;
    let products: f64 = times.iter().enumerate().map(|(i, time)| (i as f64 - middle) * (time - first - mean)).sum();
    let interval = products / (n * (n * n - 1.0) / 12.0);
    (first + mean - middle * interval, interval)
}
