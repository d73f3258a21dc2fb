//! Sums over a corrected capture, gathered while its samples pass by: all that means, rms values and their
//! sensitivities need.
//!
//! Stretches of [`STRETCH`] samples are added up in single precision in eight lanes and their totals in double
//! precision: the rounding of a stretch, below 4·2⁻²⁴ of the sum of its magnitudes, is random from stretch to stretch.

/// Samples that are summed in single precision.
const STRETCH: usize = 32;
const LANES: usize = 8;

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
        sums.extend(difference, negative, points);
        sums
    }

    /// Takes in the samples up to `end` that were not yet; the slope at a sample needs two neighbours on each side,
    /// so that `end` stays two samples behind what is known, but at the record's end.
    pub(super) fn extend(&mut self, difference: &[f32], negative: &[f32], end: usize) {
        let mut from = self.count as usize;
        let mut slope = [0.0f32; STRETCH];
        while from < end {
            let to = end.min(from + STRETCH);
            let slope = &mut slope[..to - from];
            slopes(negative, from, slope);
            self.s += slope_sum(negative, from, to);
            self.stretch(&difference[from..to], &negative[from..to], slope);
            from = to;
        }
    }

    fn stretch(&mut self, d: &[f32], n: &[f32], s: &[f32]) {
        let mut lanes = [[0.0f32; LANES]; 8];
        let whole = d.len() / LANES * LANES;
        for ((d, n), s) in d.chunks_exact(LANES).zip(n.chunks_exact(LANES)).zip(s.chunks_exact(LANES)) {
            for k in 0..LANES {
                lanes[0][k] += d[k];
                lanes[1][k] += n[k];
            }
            for k in 0..LANES {
                lanes[2][k] += d[k] * d[k];
                lanes[3][k] += n[k] * n[k];
                lanes[4][k] += s[k] * s[k];
            }
            for k in 0..LANES {
                lanes[5][k] += d[k] * n[k];
                lanes[6][k] += d[k] * s[k];
                lanes[7][k] += n[k] * s[k];
            }
        }
        let mut total = lanes.map(|lane| lane.into_iter().map(f64::from).sum::<f64>());
        for k in whole..d.len() {
            let (d, n, s) = (f64::from(d[k]), f64::from(n[k]), f64::from(s[k]));
            for (total, term) in total.iter_mut().zip([d, n, d * d, n * n, s * s, d * n, d * s, n * s]) {
                *total += term;
            }
        }
        self.count += d.len() as f64;
        let own = [
            &mut self.d,
            &mut self.n,
            &mut self.dd,
            &mut self.nn,
            &mut self.ss,
            &mut self.dn,
            &mut self.ds,
            &mut self.ns,
        ];
        own.into_iter().zip(total).for_each(|(own, total)| *own += total);
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

/// The slopes per sample from a sample on, as many as `out` holds.
pub(super) fn slopes(x: &[f32], from: usize, out: &mut [f32]) {
    let count = out.len();
    if from >= 2 && from + count + 2 <= x.len() {
        let w = &x[from - 2..from + count + 2];
        let (a, b, c, d) = (&w[..count], &w[1..=count], &w[3..count + 3], &w[4..count + 4]);
        for k in 0..count {
            out[k] = (8.0 * (c[k] - b[k]) - (d[k] - a[k])) * (1.0 / 12.0);
        }
    } else {
        out.iter_mut().enumerate().for_each(|(k, out)| *out = slope_at(x, from + k));
    }
}

/// The sum of the slopes from one sample up to before another. What neighbours share cancels on paper, so that no digits
/// are lost where a fast signal comes back to where it was.
fn slope_sum(x: &[f32], from: usize, to: usize) -> f64 {
    if from < 2 || to + 2 > x.len() {
        return (from..to).map(|i| f64::from(slope_at(x, i))).sum();
    }
    let near = |i: usize| f64::from(x[i]) + f64::from(x[i - 1]);
    let far = |i: usize| near(i + 1) + near(i - 1);
    (8.0 * (near(to) - near(from)) - (far(to) - far(from))) / 12.0
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
