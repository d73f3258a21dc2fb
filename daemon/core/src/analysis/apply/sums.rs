//! Sums over a corrected capture, gathered while its samples pass by: all that means, rms values and their
//! sensitivities need.
//!
//! Stretches of [`STRETCH`] samples are added up in single precision in eight lanes and their totals in double
//! precision: the rounding of a stretch, below 4·2⁻²⁴ of the sum of its magnitudes, is random from stretch to stretch.

use std::ops::Range;

use super::super::wide::widest;

/// Samples that are summed in single precision.
const STRETCH: usize = 32;
const LANES: usize = 8;
/// Samples whose slopes are held at a time.
const CHUNK: usize = 1024;
/// Neighbours on each side that the slope at a sample needs.
pub(super) const REACH: usize = 2;
/// Neighbours before a stretch that make the slope at a record's last sample, which is that two samples further in.
pub(super) const LEAD: usize = 2 * REACH;

/// Means over all samples of `D` (difference), `N` (corrected negative leg), `S` (its slope per sample interval) and of
/// their products.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Sums {
    count: f64,
    d: f64,
    n: f64,
    s: f64,
    dd: f64,
    nn: f64,
    ss: f64,
    dn: f64,
    ds: f64,
    ns: f64,
}

impl Sums {
    /// Of a whole capture, from its difference and its corrected negative leg.
    #[must_use]
    pub(super) fn of(difference: &[f32], negative: &[f32]) -> Self {
        let mut sums = Self::default();
        let points = difference.len().min(negative.len());
        sums.extend(&difference[..points], &negative[..points], 0..points);
        sums
    }

    /// Takes in the samples `own` of a stretch of both. The slope at a sample needs [`REACH`] neighbours on each side; a
    /// stretch that has none there ends where the record does.
    pub(super) fn extend(&mut self, difference: &[f32], negative: &[f32], own: Range<usize>) {
        self.s += slope_sum(negative, own.start, own.end);
        self.count += own.len() as f64;
        let mut slope = [0.0f32; CHUNK];
        for from in own.clone().step_by(CHUNK) {
            let range = from..(from + CHUNK).min(own.end);
            let slope = &mut slope[..range.len()];
            slopes(negative, from, slope);
            let total = totals(&difference[range.clone()], &negative[range], slope);
            let fields = [
                &mut self.d,
                &mut self.n,
                &mut self.dd,
                &mut self.nn,
                &mut self.ss,
                &mut self.dn,
                &mut self.ds,
                &mut self.ns,
            ];
            fields.into_iter().zip(total).for_each(|(field, total)| *field += total);
        }
    }

    /// Takes in another's samples.
    pub(super) fn add(&mut self, other: &Self) {
        self.count += other.count;
        self.d += other.d;
        self.n += other.n;
        self.s += other.s;
        self.dd += other.dd;
        self.nn += other.nn;
        self.ss += other.ss;
        self.dn += other.dn;
        self.ds += other.ds;
        self.ns += other.ns;
    }

    /// The means, with the slope in units per second for samples `interval_s` apart.
    #[must_use]
    pub fn moments(&self, interval_s: f64) -> Moments {
        let n = self.count.max(1.0);
        let slope = 1.0 / (n * interval_s);
        Moments {
            d: self.d / n,
            n: self.n / n,
            s: self.s * slope,
            dd: self.dd / n,
            nn: self.nn / n,
            ss: self.ss * slope / interval_s,
            dn: self.dn / n,
            ds: self.ds * slope,
            ns: self.ns * slope,
        }
    }
}

/// Means of difference `d`, corrected negative leg `n`, its slope `s` (per second) and of their products.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Moments {
    /// Mean of the difference.
    pub d: f64,
    /// Mean of the corrected negative leg.
    pub n: f64,
    /// Mean slope.
    pub s: f64,
    /// Mean square of the difference.
    pub dd: f64,
    /// Mean square of the corrected negative leg.
    pub nn: f64,
    /// Mean square of the slope.
    pub ss: f64,
    /// Mean product of difference and negative leg.
    pub dn: f64,
    /// Mean product of difference and slope.
    pub ds: f64,
    /// Mean product of negative leg and slope.
    pub ns: f64,
}

impl Moments {
    /// Mean of the common mode `C = N + D/2`.
    #[must_use]
    pub fn common(&self) -> f64 {
        0.5f64.mul_add(self.d, self.n)
    }

    /// Mean square of the common mode.
    #[must_use]
    pub fn common_square(&self) -> f64 {
        self.nn + self.dn + 0.25 * self.dd
    }

    /// Mean product of common mode and negative leg.
    #[must_use]
    pub fn common_negative(&self) -> f64 {
        0.5f64.mul_add(self.dn, self.nn)
    }

    /// Mean product of common mode and slope.
    #[must_use]
    pub fn common_slope(&self) -> f64 {
        0.5f64.mul_add(self.ds, self.ns)
    }
}

widest! {
    /// Sums of d, n, d², n², s², d·n, d·s and n·s.
    fn totals(d: &[f32], n: &[f32], s: &[f32]) -> [f64; 8] {
        let mut all = [[0.0f64; LANES]; 8];
        for ((d, n), s) in d.chunks(STRETCH).zip(n.chunks(STRETCH)).zip(s.chunks(STRETCH)) {
            let mut lanes = [[0.0f32; LANES]; 8];
            let ((d, last_d), (n, last_n), (s, last_s)) =
                (d.as_chunks::<LANES>(), n.as_chunks::<LANES>(), s.as_chunks::<LANES>());
            for ((d, n), s) in d.iter().zip(n).zip(s) {
                for k in 0..LANES {
                    lanes[0][k] += d[k];
                    lanes[1][k] += n[k];
                    lanes[2][k] += d[k] * d[k];
                    lanes[3][k] += n[k] * n[k];
                    lanes[4][k] += s[k] * s[k];
                    lanes[5][k] += d[k] * n[k];
                    lanes[6][k] += d[k] * s[k];
                    lanes[7][k] += n[k] * s[k];
                }
            }
            for (all, lanes) in all.iter_mut().zip(&lanes) {
                all.iter_mut().zip(lanes).for_each(|(all, lane)| *all += f64::from(*lane));
            }
            for ((d, n), s) in last_d.iter().zip(last_n).zip(last_s) {
                let (d, n, s) = (f64::from(*d), f64::from(*n), f64::from(*s));
                for (all, term) in all.iter_mut().zip([d, n, d * d, n * n, s * s, d * n, d * s, n * s]) {
                    all[0] += term;
                }
            }
        }
        all.map(|lanes| lanes.iter().sum())
    }
}

/// The slopes per sample from a sample on, as many as `out` holds.
pub(super) fn slopes(x: &[f32], from: usize, out: &mut [f32]) {
    let count = out.len();
    // The two samples at each end of the record are done one by one.
    let (start, end) = (REACH.saturating_sub(from).min(count), x.len().saturating_sub(from + REACH).min(count));
    if x.len() < 5 || start >= end {
        out.iter_mut().enumerate().for_each(|(k, out)| *out = slope_at(x, from + k));
        return;
    }
    inner_slopes(&x[from + start - REACH..from + end + REACH], &mut out[start..end]);
    out[..start].iter_mut().enumerate().for_each(|(k, out)| *out = slope_at(x, from + k));
    out[end..].iter_mut().enumerate().for_each(|(k, out)| *out = slope_at(x, from + end + k));
}

widest! {
    fn inner_slopes(w: &[f32], out: &mut [f32]) {
        let count = out.len();
        let (a, b, c, d) = (&w[..count], &w[1..=count], &w[3..count + 3], &w[4..count + 4]);
        for k in 0..count {
            out[k] = (8.0 * (c[k] - b[k]) - (d[k] - a[k])) * (1.0 / 12.0);
        }
    }
}

/// The sum of the slopes from one sample up to before another. What neighbours share cancels on paper, so that no digits
/// are lost where a fast signal comes back to where it was.
fn slope_sum(x: &[f32], from: usize, to: usize) -> f64 {
    let (start, end) = (from.max(REACH), to.min(x.len().saturating_sub(REACH)));
    if x.len() < 5 || start >= end {
        return (from..to).map(|i| f64::from(slope_at(x, i))).sum();
    }
    let ends: f64 = (from..start).chain(end..to).map(|i| f64::from(slope_at(x, i))).sum();
    let near = |i: usize| f64::from(x[i]) + f64::from(x[i - 1]);
    let far = |i: usize| near(i + 1) + near(i - 1);
    ends + (8.0 * (near(end) - near(start)) - (far(end) - far(start))) / 12.0
}

/// The slope per sample by the five-point central difference (Abramowitz and Stegun, 25.3.6). The two samples at
/// each end repeat their neighbour.
pub(super) fn slope_at(x: &[f32], index: usize) -> f32 {
    if x.len() < 5 {
        return 0.0;
    }
    let i = index.clamp(2, x.len() - 3);
    (8.0 * (x[i + 1] - x[i - 1]) - (x[i + 2] - x[i - 2])) * (1.0 / 12.0)
}
