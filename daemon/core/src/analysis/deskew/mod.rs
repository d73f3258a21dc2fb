//! Several acquisitions of a reference become one correction.
//!
//! Each quantity is the mean of the repeats, weighted by their uncertainties; its standard uncertainty the larger of
//! what the single uncertainties promise and what the scatter shows (type A, JCGM 100, 4.2). Repeats are not averaged
//! down where the converter has too little dither: its error is then the same in all of them.

mod alike;

pub use alike::sampled_alike;

use super::budget::student;
use super::skew::{Limit, SkewEstimate, Warning, limit_of};
use super::{Correction, Estimate};

/// What a normal distribution holds within two standard deviations.
const TWO_SIGMA: f64 = 0.954_499_736;

/// The least noise, in converter steps, with which quantisation error behaves like noise.
pub const LEAST_DITHER: f64 = 0.5;

/// The mean of repeats.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Mean {
    /// The weighted mean and its standard uncertainty.
    pub estimate: Estimate,
    /// The factor k for 95 %: 2, or Student's for the few repeats whose scatter `u` is taken from (JCGM 100, G.3).
    pub coverage_factor: f64,
    /// Degrees of freedom of the standard uncertainty where the scatter of few repeats made it; `None` where the single
    /// estimates promise more than they scatter.
    pub freedom: Option<f64>,
    /// Standard uncertainty that the single estimates promise together.
    pub promised: f64,
    /// Standard uncertainty that their scatter shows; `None` for a single one.
    pub scatter: Option<f64>,
}

/// Skew, gain and offset from all repeats.
#[derive(Debug, Clone, PartialEq)]
pub struct Combined {
    /// τ in seconds.
    pub skew_s: Mean,
    /// g, N relative to P.
    pub gain: Mean,
    /// o in volts.
    pub offset_v: Mean,
    /// Correlation coefficient of gain and offset: the mean of the repeats', which differ by chance only.
    pub gain_offset: f64,
    /// How many repeats there were.
    pub repeats: usize,
    /// Each kind of warning once, with the last repeat's values.
    pub warnings: Vec<Warning>,
}

impl Mean {
    /// Degrees of freedom once a well-known standard uncertainty is added in quadrature (JCGM 100, equation G.2b).
    #[must_use]
    pub fn freedom_beside(&self, added: f64) -> Option<f64> {
        let u = self.estimate.u;
        let whole = if u > 0.0 { (u.hypot(added) / u).powi(4) } else { 1.0 };
        self.freedom.map(|freedom| freedom * whole)
    }
}

impl Combined {
    /// The estimates as a correction.
    #[must_use]
    pub fn correction(&self) -> Correction {
        Correction {
            skew_s: self.skew_s.estimate,
            gain: self.gain.estimate,
            offset_v: self.offset_v.estimate,
            gain_offset: self.gain_offset,
        }
    }

    /// What limits the skew most, when it is carried to another range with the standard uncertainty `carry_u_s`
    /// (zero: it is used where it was taken).
    #[must_use]
    pub fn limited_by(&self, carry_u_s: f64) -> Limit {
        match limit_of(&self.warnings) {
            Some(Limit::Ambiguity) => Limit::Ambiguity,
            _ if carry_u_s > self.skew_s.estimate.u => Limit::Carry,
            Some(limit) => limit,
            // Two standard deviations of a scatter's own uncertainty: with few repeats it is large by chance.
            None if self.skew_s.scatter.is_some_and(|scatter| {
                let chance = 1.0 + 2.0 / (2.0 * (self.repeats as f64 - 1.0)).sqrt();
                scatter > chance * self.skew_s.promised
            }) =>
            {
                Limit::Scatter
            }
            None => Limit::Noise,
        }
    }
}

/// Combines repeats; `None` without any.
#[must_use]
pub fn combine(repeats: &[SkewEstimate]) -> Option<Combined> {
    if repeats.is_empty() {
        return None;
    }
    let dithered = repeats.iter().all(|one| one.dither_steps.is_none_or(|steps| steps >= LEAST_DITHER));
    let all = |pick: fn(&SkewEstimate) -> Estimate| {
        let values: Vec<Estimate> = repeats.iter().map(pick).collect();
        weighted(&values, dithered)
    };
    let mut warnings: Vec<Warning> = Vec::new();
    for warning in repeats.iter().rev().flat_map(|one| &one.warnings) {
        let kind = std::mem::discriminant(warning);
        if warnings.iter().all(|known| std::mem::discriminant(known) != kind) {
            warnings.push(warning.clone());
        }
    }
    Some(Combined {
        skew_s: all(|one| one.skew_s),
        gain: all(|one| one.gain),
        offset_v: all(|one| one.offset_v),
        gain_offset: repeats.iter().map(SkewEstimate::gain_offset).sum::<f64>() / repeats.len() as f64,
        repeats: repeats.len(),
        warnings,
    })
}

/// Whether the skew is known to `target_u_skew_s` (standard uncertainty in seconds) by more than one repeat: a single
/// one shows no scatter.
#[must_use]
pub fn enough(combined: &Combined, target_u_skew_s: f64) -> bool {
    combined.repeats > 1 && combined.skew_s.estimate.u <= target_u_skew_s
}

/// The whole periods to add to a skew found on a reference that repeats every `period_s`, so that it is the one that
/// `coarse` saw on another reference; `None` where `coarse` cannot tell one period from the next.
#[must_use]
pub fn whole_periods(skew_s: f64, coarse: Estimate, period_s: f64) -> Option<f64> {
    let turns = ((coarse.value - skew_s) / period_s).round();
    // Beyond a quarter of a period the two references do not agree on anything.
    let left_s = coarse.value - skew_s - turns * period_s;
    let told = left_s.abs() + 3.0 * coarse.u < 0.25 * period_s;
    (told && turns.is_finite()).then_some(turns)
}

/// The weighted mean; `independent` repeats share nothing, others do not get better by their number.
pub(super) fn weighted(values: &[Estimate], independent: bool) -> Mean {
    let count = values.len() as f64;
    // Without any uncertainty to go by (data without noise) all count alike.
    let usable = values.iter().all(|one| one.u > 0.0 && one.u.is_finite());
    let weight = |one: &Estimate| if usable { 1.0 / (one.u * one.u) } else { 1.0 };
    let total: f64 = values.iter().map(weight).sum();
    // Differences from the first value keep the digits of small scatter about a large mean.
    let origin = values[0].value;
    let value = origin + values.iter().map(|one| weight(one) * (one.value - origin)).sum::<f64>() / total;
    let shared = if independent { 1.0 } else { count.sqrt() };
    let promised = if usable { (1.0 / total).sqrt() * shared } else { 0.0 };
    let scatter = (values.len() > 1).then(|| {
        let squares: f64 = values.iter().map(|one| weight(one) * (one.value - value).powi(2)).sum();
        (squares / total / (count - 1.0)).sqrt() * shared
    });
    let shows = scatter.filter(|scatter| *scatter > promised);
    let coverage_factor = shows.map_or(2.0, |_| student(TWO_SIGMA, count - 1.0));
    let freedom = shows.map(|_| count - 1.0);
    Mean { estimate: Estimate { value, u: shows.unwrap_or(promised) }, coverage_factor, freedom, promised, scatter }
}

#[cfg(test)]
mod tests;
