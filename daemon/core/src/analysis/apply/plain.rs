//! Plain subtraction of two records, to be shown beside what the correction makes of them.

use super::super::signal::{BLOCK, Outline, Signal, range_of, sum_and_square};
use super::super::wide::widest;
use super::super::{Record, Samples};
use super::{ApplyError, LEAST_POINTS, belong, fused};

/// Plain subtraction in volts: each sample of P less the sample of N that is nearest in time, nothing else done. Where
/// the time axes agree that is sample by sample; samples without a partner are left out.
///
/// # Errors
/// When the records do not belong together, hold something that is not a number, or do not overlap in time.
pub fn plain<'a>(p: &'a Record, n: &'a Record) -> Result<Plain<'a>, ApplyError> {
    let points = belong(p, n)?;
    let shift = (p.start_s - n.start_s) / p.interval_s;
    if !(shift.is_finite() && shift.abs() < points as f64) {
        return Err(ApplyError::TooShort { points, valid: 0, shift_samples: shift });
    }
    let whole = shift.round() as isize;
    let skip_p = usize::try_from(-whole).unwrap_or(0);
    let skip_n = usize::try_from(whole).unwrap_or(0);
    let valid = points.saturating_sub(skip_p.max(skip_n));
    if valid < LEAST_POINTS {
        return Err(ApplyError::TooShort { points, valid, shift_samples: shift });
    }
    let mut found =
        Plain { p, n, skip_p, skip_n, points: valid, mean: 0.0, square: 0.0, outline: Outline::with_capacity(valid) };
    let mut buffer = [0.0; BLOCK];
    for from in (0..valid).step_by(BLOCK) {
        let part = &mut buffer[..BLOCK.min(valid - from)];
        found.load(from, part);
        let (sum, square) = sum_and_square(part);
        found.mean += sum;
        found.square += square;
        found.outline.push(range_of(part));
    }
    found.mean /= valid as f64;
    found.square /= valid as f64;
    Ok(found)
}

/// The difference by plain subtraction, computed as it is read. See [`plain()`].
#[derive(Debug, Clone)]
pub struct Plain<'a> {
    p: &'a Record,
    n: &'a Record,
    skip_p: usize,
    skip_n: usize,
    points: usize,
    mean: f64,
    square: f64,
    outline: Outline,
}

impl Signal for Plain<'_> {
    fn points(&self) -> usize {
        self.points
    }

    fn at(&self, index: usize) -> f64 {
        let volts = |record: &Record, index: usize| {
            let code = match &record.samples {
                Samples::Codes(codes) => f64::from(codes[index]),
                Samples::Numbers(numbers) => f64::from(numbers[index]),
            };
            code.mul_add(record.volts_per_code, record.zero_v)
        };
        volts(self.p, self.skip_p + index) - volts(self.n, self.skip_n + index)
    }

    fn load(&self, from: usize, out: &mut [f32]) {
        let (from_p, from_n) = (self.skip_p + from, self.skip_n + from);
        if let (Samples::Codes(p), Samples::Codes(n)) = (&self.p.samples, &self.n.samples) {
            let (p, n) = (&p[from_p..from_p + out.len()], &n[from_n..from_n + out.len()]);
            let line = |record: &Record| (record.volts_per_code as f32, record.zero_v as f32);
            subtract_codes(p, n, line(self.p), line(self.n), out);
            return;
        }
        fused::load_volts(self.p, from_p, out);
        let mut negative = [0.0; BLOCK];
        for (i, out) in out.chunks_mut(BLOCK).enumerate() {
            let negative = &mut negative[..out.len()];
            fused::load_volts(self.n, from_n + i * BLOCK, negative);
            out.iter_mut().zip(negative).for_each(|(p, n)| *p -= *n);
        }
    }

    fn means(&self) -> Option<(f64, f64)> {
        Some((self.mean, self.square))
    }

    fn outline(&self) -> Option<&Outline> {
        Some(&self.outline)
    }
}

widest! {
    /// Both legs' codes in volts, subtracted.
    fn subtract_codes(p: &[i16], n: &[i16], of_p: (f32, f32), of_n: (f32, f32), out: &mut [f32]) {
        for ((out, p), n) in out.iter_mut().zip(p).zip(n) {
            *out = (f32::from(*p) * of_p.0 + of_p.1) - (f32::from(*n) * of_n.0 + of_n.1);
        }
    }
}
