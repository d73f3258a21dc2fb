//! How far the legs' slow gain may differ from the gain of their edges, and what that means for an offset.
//!
//! A probe divides slow signals by its resistors and fast ones by its capacitors; trimming makes the two alike. Where the
//! trimming of the legs differs by `ε` (as [`super::response::PoleZero`]), the gain g that edges tell is not the gain of the
//! mean, and with `L` the low-passed signal the corrected difference holds `ε·(L(t) − L₀)`: an offset is right only at the
//! mean `L₀` of the reference that it was taken on.
//!
//! The levels of the reference show it: while the signal stands still the difference goes by `ε·L(t)`, which is what is
//! fitted here, beside offset, gain and skew errors, on the mean of all acquisitions, the surroundings of edges left out. For
//! a period that is short beside the time constant T only the slope `ε/T` shows, so T has to be known: a divider of
//! `R₁C₁ = R₂C₂ = T` has the input resistance `R₁ + R₂` and the input capacitance `C₁C₂/(C₁ + C₂)`, whose product is T
//! (Kirchhoff). Shorter time constants are tried too and taken where the levels show one.

use nalgebra::{Matrix5, Vector5};
use serde::{Deserialize, Serialize};

use super::apply::{self, ApplyError};
use super::response::{LowPass, PoleZero, Response};
use super::signal::Signal;
use super::{Correction, Estimate, Record, line};

/// Half-width of T as a probe's data give it, relative (common practice, no source): an error of T is one of ε.
const KNOWN_TO: f64 = 0.2;

/// The shortest time constant that is tried, in samples.
const SHORTEST: f64 = 50.0;

/// By how much `χ²` must fall for a shorter time constant to be believed: 3.5 standard deviations.
const SHOWN: f64 = 12.0;

/// From this standard uncertainty on nothing is known: a probe that was trimmed by eye is nearer than that (common
/// practice, no source).
const MOST_U: f64 = 0.01;

/// Samples are near an edge where the signal moves by this part of its swing within [`REACH`] samples to either side.
const MOVES: f64 = 0.1;
const REACH: usize = 16;

/// The least part of the record that must be left.
const LEAST_LEFT: f64 = 0.3;

/// Samples per block by which noise is looked at that is not white.
const BLOCK: usize = 64;

/// How the slow gains of the legs differ from the fast ones.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Compensation {
    /// ε: by how much the negative leg's fast gain is larger than its slow one, relative to the positive leg's.
    pub relative: Estimate,
    /// T in seconds.
    pub time_constant_s: f64,
    /// L₀: the mean in volts of the reference that the offset was taken on, where ε does no harm.
    pub level_v: f64,
}

/// What a compensation that is not known exactly leaves in a capture, as standard uncertainties in volts.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Left {
    /// In the mean of the difference.
    pub mean_v: f64,
    /// In its value at any one place, at the worst of them.
    pub level_v: f64,
    /// Between two places.
    pub swing_v: f64,
}

impl Compensation {
    /// The standard uncertainty of ε that is left: the estimate itself is part of it where nothing was done about it.
    #[must_use]
    pub fn u(&self, corrected: bool) -> f64 {
        if corrected { self.relative.u } else { self.relative.value.hypot(self.relative.u) }
    }

    /// The same with what a response found and does; none where it does nothing at low frequencies.
    #[must_use]
    pub fn with(&self, response: Option<&Response>) -> (Self, bool) {
        match response.and_then(|response| response.pole_zero) {
            Some(PoleZero { time_constant_s, relative }) => {
                (Self { relative, time_constant_s: time_constant_s.value, level_v: self.level_v }, true)
            }
            None => (*self, false),
        }
    }

    /// What it leaves in a capture whose corrected negative leg this is.
    ///
    /// The past of a record is not known; it is taken to be as the record. Where T is not short beside it, the difference
    /// of its halves' means counts as an uncertainty of that.
    #[must_use]
    pub fn left<S: Signal + ?Sized>(&self, negative_v: &S, interval_s: f64, corrected: bool) -> Left {
        let samples = (self.time_constant_s / interval_s).max(1.0);
        let block = ((samples / 64.0) as usize).clamp(1, 256);
        let means = block_means(negative_v, block);
        if means.is_empty() {
            return Left::default();
        }
        let u = self.u(corrected);
        let slow = LowPass::new(samples / block as f64).settled(&means, means.len());
        let (low, high) = slow.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), v| (l.min(*v), h.max(*v)));
        let mean = line::mean(&means);
        let past = if samples * 4.0 > negative_v.points() as f64 {
            let (first, second) = means.split_at(means.len() / 2);
            if first.is_empty() { 0.0 } else { line::mean(first) - line::mean(second) }
        } else {
            0.0
        };
        let unknown = past * self.relative.value.hypot(self.relative.u);
        let furthest = (low - self.level_v).abs().max((high - self.level_v).abs());
        Left {
            mean_v: (u * (mean - self.level_v)).hypot(unknown),
            level_v: (u * furthest).hypot(unknown),
            swing_v: (u * (high - low)).hypot(unknown),
        }
    }

    /// The largest `|D/C|` that it allows at a frequency in hertz above zero, at a coverage factor of 2.
    #[must_use]
    pub fn residual(&self, frequency_hz: f64, corrected: bool) -> f64 {
        2.0 * self.u(corrected) / 1.0f64.hypot(std::f64::consts::TAU * frequency_hz * self.time_constant_s)
    }
}

/// Means of blocks; the last one may be shorter.
fn block_means<S: Signal + ?Sized>(signal: &S, block: usize) -> Vec<f64> {
    let points = signal.points();
    let mut values = vec![0.0f32; block];
    (0..points)
        .step_by(block)
        .map(|from| {
            let out = &mut values[..block.min(points - from)];
            signal.load(from, out);
            out.iter().map(|v| f64::from(*v)).sum::<f64>() / out.len() as f64
        })
        .collect()
}

/// Estimates ε from the acquisitions of the reference that `correction`'s gain and offset were taken on; its period, if it
/// has one, and the probes' time constant in seconds are known. `None` when the reference cannot show it: a sine does
/// not tell it from a skew, and a record that is all edges has no levels.
///
/// # Errors
/// When the records cannot be corrected.
pub fn estimate(
    p: &[Record],
    n: &[Record],
    correction: &Correction,
    period_s: Option<f64>,
    time_constant_s: f64,
) -> Result<Option<Compensation>, ApplyError> {
    let Some(mean) = Mean::of(p, n, correction, period_s)? else { return Ok(None) };
    let known = time_constant_s / mean.interval_s;
    let Some(mut best) = mean.fit(known) else { return Ok(None) };
    let given = best.cost;
    let mut samples = known.min(mean.x.len() as f64) / 3.0;
    while samples > SHORTEST {
        if let Some(found) = mean.fit(samples).filter(|found| found.cost < best.cost && found.cost < given - SHOWN) {
            best = found;
        }
        samples /= 1.5;
    }
    let relative = best.relative;
    let u = relative.u.hypot(relative.value * KNOWN_TO / 3.0f64.sqrt());
    let found = Compensation {
        relative: Estimate { value: relative.value, u },
        time_constant_s: best.samples * mean.interval_s,
        level_v: line::mean(&mean.x[..mean.whole]),
    };
    Ok((relative.u <= MOST_U).then_some(found))
}

/// The mean of all acquisitions.
struct Mean {
    d: Vec<f64>,
    x: Vec<f64>,
    /// Which samples are far from edges.
    still: Vec<bool>,
    /// How many samples are whole periods.
    whole: usize,
    interval_s: f64,
}

/// A fit at one time constant.
struct Fit {
    samples: f64,
    relative: Estimate,
    /// Squares of the residual over its variance.
    cost: f64,
}

impl Mean {
    fn of(
        p: &[Record],
        n: &[Record],
        correction: &Correction,
        period_s: Option<f64>,
    ) -> Result<Option<Self>, ApplyError> {
        let mut sums: Option<(Vec<f64>, Vec<f64>)> = None;
        let mut interval_s = 0.0;
        let mut count = 0.0;
        for (p, n) in p.iter().zip(n) {
            let one = apply::correct(p, n, correction)?;
            interval_s = one.interval_s;
            count += 1.0;
            let (d, x) =
                sums.get_or_insert_with(|| (vec![0.0; one.difference_v.len()], vec![0.0; one.negative_v.len()]));
            d.truncate(one.difference_v.len());
            x.truncate(one.negative_v.len());
            d.iter_mut().zip(&one.difference_v).for_each(|(sum, v)| *sum += f64::from(*v));
            x.iter_mut().zip(&one.negative_v).for_each(|(sum, v)| *sum += f64::from(*v));
        }
        let Some((mut d, mut x)) = sums else { return Ok(None) };
        d.iter_mut().chain(&mut x).for_each(|v| *v /= count);
        let period = period_s.map(|period| period / interval_s).filter(|period| *period >= 16.0);
        let whole = period.map_or(d.len(), |period| ((d.len() as f64 / period).floor() * period).round() as usize);
        // Less than a period shows no mean.
        if whole == 0 || d.len() < 16 * REACH {
            return Ok(None);
        }
        let (low, high) = x.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), v| (l.min(*v), h.max(*v)));
        let last = x.len() - 1;
        let moves = |i: usize| (x[(i + REACH).min(last)] - x[i.saturating_sub(REACH)]).abs() > MOVES * (high - low);
        let mut still = vec![true; x.len()];
        for i in (0..x.len()).filter(|&i| moves(i)) {
            still[i.saturating_sub(REACH)..=(i + REACH).min(last)].fill(false);
        }
        let left = still.iter().filter(|still| **still).count() as f64;
        Ok((left >= LEAST_LEFT * x.len() as f64).then_some(Self { d, x, still, whole, interval_s }))
    }

    /// `D = a + b·N + c·N' + ε·L` by least squares; `None` where these cannot be told apart.
    fn fit(&self, samples: f64) -> Option<Fit> {
        let slow = LowPass::new(samples).settled(&self.x, self.whole);
        let (centre, level) = (line::mean(&self.x), line::mean(&slow));
        let swing = self.x.iter().fold(0.0f64, |top, v| top.max((v - centre).abs()));
        let last = self.x.len() - 1;
        let row = |i: usize| {
            let steep = self.x[(i + 1).min(last)] - self.x[i.saturating_sub(1)];
            [1.0, (self.x[i] - centre) / swing, steep / swing, (slow[i] - level) / swing, self.d[i]]
        };
        let kept: Vec<usize> = (0..=last).filter(|&i| self.still[i]).collect();
        let mut matrix = Matrix5::<f64>::zeros();
        for &i in &kept {
            let row = Vector5::from(row(i));
            matrix += row * row.transpose();
        }
        let normal = matrix.fixed_view::<4, 4>(0, 0).into_owned();
        let right = matrix.fixed_view::<4, 1>(0, 4).into_owned();
        // Scaled to a diagonal of one; what is left of a column beside the others shows in its factor.
        let scale = normal.diagonal().map(|v| 1.0 / v.max(f64::MIN_POSITIVE).sqrt());
        let scaled = normal.component_mul(&(scale * scale.transpose()));
        let inverse = scaled.cholesky()?.inverse();
        let solution = (inverse * right.component_mul(&scale)).component_mul(&scale);
        // A tenth of L at least must be its own.
        if inverse[(3, 3)].is_nan() || inverse[(3, 3)] > 100.0 {
            return None;
        }
        let residual = |i: &usize| {
            let row = row(*i);
            row[4] - (0..4).map(|k| solution[k] * row[k]).sum::<f64>()
        };
        let residuals: Vec<f64> = kept.iter().map(residual).collect();
        let power = |values: &[f64]| values.iter().map(|v| v * v).sum::<f64>() / values.len().max(1) as f64;
        let blocks: Vec<f64> = residuals.chunks_exact(BLOCK).map(line::mean).collect();
        let variance = power(&residuals).max(BLOCK as f64 * power(&blocks));
        let u = (variance * inverse[(3, 3)]).sqrt() * scale[3] / swing;
        let cost = power(&residuals) * residuals.len() as f64 / self.variance(&kept);
        let value = solution[3] / swing;
        (value.is_finite() && u.is_finite()).then_some(Fit { samples, relative: Estimate { value, u }, cost })
    }

    /// The noise of a sample of D, from second differences: it does not hang on any fit.
    fn variance(&self, kept: &[usize]) -> f64 {
        let all =
            kept.windows(3).filter(|w| w[2] == w[0] + 2).map(|w| self.d[w[0]] - 2.0 * self.d[w[1]] + self.d[w[2]]);
        let (count, sum) = all.fold((0.0, 0.0), |(count, sum), v| (count + 1.0, sum + v * v / 6.0));
        if sum > 0.0 { sum / count } else { f64::MIN_POSITIVE }
    }
}

#[cfg(test)]
mod tests;
