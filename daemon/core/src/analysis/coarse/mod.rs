//! Coarse skew: the whole number of samples at which two records are most alike.
//!
//! `r(L)` is the correlation coefficient of `p[i]` with `n[i + L]` over the samples that both have, their means over
//! those samples removed: a record's ends do not pull it towards zero as they pull a plain zero-padded correlation.
//! `L > 0`: the negative leg arrives late. Cost: O(n log n).

use super::line::mean;
use super::spectrum::{Fourier, SpectrumError, fast_length};

/// A place where the correlation has an extreme.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Peak {
    /// Samples by which the negative leg is late.
    pub lag: isize,
    /// The correlation coefficient there, −1 to 1.
    pub correlation: f64,
    /// The next lag, by distance from zero, at which the correlation is as good: a periodic signal repeats.
    pub alternative: Option<isize>,
}

/// What the correlation over all allowed lags shows.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Coarse {
    /// Where the records agree best; of equally good places the one nearest to zero.
    pub alike: Peak,
    /// Where one record agrees best with the other turned upside down.
    pub opposite: Peak,
    /// By how much correlations may differ by chance and by the grid of whole samples.
    pub tolerance: f64,
}

/// Finds the lag of `n` behind `p` among `−reach..=reach` samples. The records have one length; `reach` is cut to half
/// of it, so that at least half of the samples always count.
///
/// # Errors
/// Only a mistake of the program, see [`SpectrumError`].
pub fn find(p: &[f64], n: &[f64], reach: usize) -> Result<Coarse, SpectrumError> {
    let reach = reach.min(p.len() / 2);
    let curve = correlation(p, n, reach)?;
    let alike = strongest(&curve);
    let overlap = p.len() as f64 - reach as f64;
    // Noise moves a correlation near r by about √(2(1 − r)/n): five times that, and what up to half a sample off the
    // grid costs, taken from the drop to the neighbours.
    let chance = 5.0 * (2.0 * (1.0 - curve[alike]).max(0.0) / overlap).sqrt();
    let drop = [alike.checked_sub(1), Some(alike + 1)]
        .into_iter()
        .flatten()
        .filter_map(|i| curve.get(i))
        .fold(0.0f64, |worst, neighbour| worst.max(curve[alike] - neighbour));
    let tolerance = (chance + drop / 2.0 + 1e-12).min(0.25);
    let negated: Vec<f64> = curve.iter().map(|r| -r).collect();
    let mut opposite = nearest(&negated, reach, tolerance);
    opposite.correlation = -opposite.correlation;
    Ok(Coarse { alike: nearest(&curve, reach, tolerance), opposite, tolerance })
}

/// `r(L)` for `L = −reach..=reach`.
fn correlation(p: &[f64], n: &[f64], reach: usize) -> Result<Vec<f64>, SpectrumError> {
    let length = p.len();
    let fourier = Fourier::new(fast_length(length + reach + 1));
    let centred = |signal: &[f64]| {
        let level = mean(signal);
        let mut padded: Vec<f64> = signal.iter().map(|x| x - level).collect();
        padded.resize(fourier.length(), 0.0);
        padded
    };
    let (mut p, mut n) = (centred(p), centred(n));
    let (sums_p, sums_n) = (Sums::of(&p[..length]), Sums::of(&n[..length]));
    let spectrum_p = fourier.forward(&mut p)?;
    let mut product = fourier.forward(&mut n)?;
    product.iter_mut().zip(&spectrum_p).for_each(|(n, p)| *n *= p.conj());
    let raw = fourier.inverse(&mut product)?;
    let reach = reach as isize;
    Ok((-reach..=reach)
        .map(|lag| {
            let late = lag.max(0).unsigned_abs();
            let early = (-lag).max(0).unsigned_abs();
            let count = length - late - early;
            let (sum_p, square_p) = sums_p.over(early, early + count);
            let (sum_n, square_n) = sums_n.over(late, late + count);
            let size = count as f64;
            let spread = (square_p - sum_p * sum_p / size) * (square_n - sum_n * sum_n / size);
            let index = if lag >= 0 { late } else { fourier.length() - early };
            if spread > 0.0 { ((raw[index] - sum_p * sum_n / size) / spread.sqrt()).clamp(-1.0, 1.0) } else { 0.0 }
        })
        .collect())
}

/// Running sums of a signal and of its square.
struct Sums(Vec<(f64, f64)>);

impl Sums {
    fn of(signal: &[f64]) -> Self {
        let mut running = Vec::with_capacity(signal.len() + 1);
        let (mut sum, mut square) = (0.0, 0.0);
        running.push((0.0, 0.0));
        for x in signal {
            sum += x;
            square += x * x;
            running.push((sum, square));
        }
        Self(running)
    }

    fn over(&self, from: usize, to: usize) -> (f64, f64) {
        (self.0[to].0 - self.0[from].0, self.0[to].1 - self.0[from].1)
    }
}

fn strongest(curve: &[f64]) -> usize {
    curve.iter().enumerate().fold(0, |best, (i, r)| if *r > curve[best] { i } else { best })
}

/// Of the hills that reach the highest one within `tolerance`, the one nearest to lag zero, and the next one.
fn nearest(curve: &[f64], reach: usize, tolerance: f64) -> Peak {
    let top = curve[strongest(curve)];
    // A hill ends only well below its top, so that noise on a flat top does not make it two.
    let foot = top - (3.0 * tolerance).min(0.5);
    let mut hills: Vec<(isize, f64)> = Vec::new();
    let mut climbing: Option<(isize, f64)> = None;
    for (i, &r) in curve.iter().enumerate() {
        if r < foot {
            hills.extend(climbing.take());
        } else if climbing.is_none_or(|(_, best)| r > best) {
            climbing = Some((i as isize - reach as isize, r));
        }
    }
    hills.extend(climbing);
    hills.retain(|(_, r)| *r >= top - tolerance);
    hills.sort_by_key(|(lag, _)| lag.unsigned_abs());
    let (lag, correlation) = hills.first().copied().unwrap_or((0, top));
    Peak { lag, correlation, alternative: hills.get(1).map(|(lag, _)| *lag) }
}

#[cfg(test)]
mod tests;
