//! Acquisitions of a reference, corrected, averaged and cut to whole periods.

use super::super::band;
use super::super::skew::Reference;
use super::super::{Correction, Record};
use super::{Response, ResponseError, carry};

/// Half of the longest filter: so many samples of the negative leg are kept beyond each end.
pub(super) const HALF: usize = 8;

/// The fewest samples that are worth a fit.
const LEAST_POINTS: usize = 256;

/// The mean of some acquisitions: the positive leg and the corrected negative one.
#[derive(Debug, Clone)]
pub(super) struct Mean {
    /// P in volts.
    pub(super) p: Vec<f64>,
    /// The corrected negative leg in volts, with [`HALF`] samples more at each end.
    pub(super) x: Vec<f64>,
    /// How many acquisitions it is the mean of.
    pub(super) acquisitions: f64,
}

/// The two halves of the acquisitions, on one length.
#[derive(Debug)]
pub(super) struct Halves {
    pub(super) fitted: Mean,
    pub(super) judging: Mean,
    /// Whole periods of the reference in a record, if it is cut to whole ones.
    pub(super) periods: Option<usize>,
    pub(super) interval_s: f64,
}

/// Corrects the acquisitions, with a `filter` if there is one, and makes two halves of them, every other one in each.
pub(super) fn halves(
    p: &[Record],
    n: &[Record],
    correction: &Correction,
    reference: &Reference,
    filter: Option<&Response>,
) -> Result<Halves, ResponseError> {
    let acquisitions = p.len().min(n.len());
    if acquisitions < 2 {
        return Err(ResponseError::Acquisitions { acquisitions });
    }
    let interval_s = p[0].interval_s;
    let mut sums: [Option<Sum>; 2] = [None, None];
    for (index, (p, n)) in p.iter().zip(n).enumerate() {
        let corrected = carry::correct(p, n, correction, filter)
            .map_err(|error| ResponseError::Correct { index, reason: error.to_string() })?;
        if (corrected.interval_s / interval_s - 1.0).abs() > 1e-9 {
            return Err(ResponseError::Interval { fitted_s: interval_s, interval_s: corrected.interval_s });
        }
        let x: Vec<f64> = corrected.negative_v.iter().map(|n| f64::from(*n)).collect();
        let positive = x.iter().zip(&corrected.difference_v).map(|(n, d)| n + f64::from(*d)).collect();
        let one = Sum { first: corrected.first, p: positive, x, count: 1.0 };
        let sum = &mut sums[index % 2];
        match sum {
            Some(sum) => sum.add(&one),
            None => *sum = Some(one),
        }
    }
    let [Some(fitted), Some(judging)] = sums else {
        return Err(ResponseError::Acquisitions { acquisitions });
    };
    let first = fitted.first.max(judging.first);
    let points = fitted.end().min(judging.end()).saturating_sub(first + 2 * HALF);
    if points < LEAST_POINTS {
        return Err(ResponseError::TooShort { points });
    }
    let (length, periods) = cut(points, reference.period_s.map(|period| period / interval_s));
    Ok(Halves { fitted: fitted.mean(first, length), judging: judging.mean(first, length), periods, interval_s })
}

/// The length to use of `points` samples, and how many whole periods it holds.
fn cut(points: usize, period: Option<f64>) -> (usize, Option<usize>) {
    if let Some(period) = period.filter(|period| *period >= 16.0) {
        let whole = (points as f64 / period).floor();
        let length = (whole * period).round() as usize;
        if whole >= 1.0 && (LEAST_POINTS..=points).contains(&length) {
            return (length, Some(whole as usize));
        }
    }
    (band::fast_up_to(points), None)
}

/// The sum of acquisitions where all of them are valid.
#[derive(Debug)]
struct Sum {
    first: usize,
    p: Vec<f64>,
    x: Vec<f64>,
    count: f64,
}

impl Sum {
    fn end(&self) -> usize {
        self.first + self.p.len()
    }

    fn add(&mut self, other: &Self) {
        let first = self.first.max(other.first);
        let end = self.end().min(other.end()).max(first);
        let (mine, others) = (first - self.first, first - other.first);
        for (sum, more) in [(&mut self.p, &other.p), (&mut self.x, &other.x)] {
            sum.drain(..mine.min(sum.len()));
            sum.truncate(end - first);
            sum.iter_mut().zip(&more[others.min(more.len())..]).for_each(|(sum, more)| *sum += more);
        }
        self.first = first;
        self.count += other.count;
    }

    fn mean(&self, first: usize, length: usize) -> Mean {
        let from = first - self.first;
        let share = |values: &[f64]| values.iter().map(|value| value / self.count).collect();
        Mean {
            p: share(&self.p[from + HALF..from + HALF + length]),
            x: share(&self.x[from..from + 2 * HALF + length]),
            acquisitions: self.count,
        }
    }
}
