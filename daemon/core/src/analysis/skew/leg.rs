//! One leg's samples as they are stored: converted to volts only where they are looked at.

use super::super::record::{Record, Samples};
use super::super::wide::widest;
use std::borrow::Cow;
use std::ops::Range;

/// Samples per block mean.
pub(super) const BLOCK: usize = 64;

/// The samples of one leg; `scale` volts per code and `zero` volts at code 0.
pub(super) enum Leg<'a> {
    Codes { codes: &'a [i16], scale: f64, zero: f64 },
    Numbers { numbers: &'a [f32], scale: f64, zero: f64 },
    Volts(&'a [f64]),
}

impl<'a> Leg<'a> {
    pub(super) fn of(record: &'a Record) -> Self {
        let (scale, zero) = (record.volts_per_code, record.zero_v);
        match &record.samples {
            Samples::Codes(codes) => Self::Codes { codes, scale, zero },
            Samples::Numbers(numbers) => Self::Numbers { numbers, scale, zero },
        }
    }

    pub(super) fn len(&self) -> usize {
        match self {
            Self::Codes { codes, .. } => codes.len(),
            Self::Numbers { numbers, .. } => numbers.len(),
            Self::Volts(volts) => volts.len(),
        }
    }

    /// All samples in volts.
    pub(super) fn volts(&self) -> Cow<'a, [f64]> {
        match self {
            Self::Volts(volts) => Cow::Borrowed(volts),
            Self::Codes { .. } | Self::Numbers { .. } => Cow::Owned(self.window(0..self.len()).unwrap_or_default()),
        }
    }

    /// The samples of `range` in volts, if there are such.
    pub(super) fn window(&self, range: Range<usize>) -> Option<Vec<f64>> {
        let volt = |code: f64, scale: f64, zero: f64| code.mul_add(scale, zero);
        Some(match self {
            Self::Codes { codes, scale, zero } => {
                codes.get(range)?.iter().map(|&code| volt(f64::from(code), *scale, *zero)).collect()
            }
            Self::Numbers { numbers, scale, zero } => {
                numbers.get(range)?.iter().map(|&number| volt(f64::from(number), *scale, *zero)).collect()
            }
            Self::Volts(volts) => volts.get(range)?.to_vec(),
        })
    }

    /// Means in volts of the whole blocks from sample `from` on.
    pub(super) fn block_means(&self, from: usize) -> Vec<f64> {
        let from = from.min(self.len());
        let each = 1.0 / BLOCK as f64;
        match self {
            Self::Codes { codes, scale, zero } => {
                let mut sums = vec![0; (codes.len() - from) / BLOCK];
                sums_of_blocks(&codes[from..], &mut sums);
                sums.into_iter().map(|sum| f64::from(sum) * (each * scale) + zero).collect()
            }
            Self::Numbers { numbers, scale, zero } => numbers[from..]
                .chunks_exact(BLOCK)
                .map(|block| block.iter().map(|&x| f64::from(x)).sum::<f64>() * (each * scale) + zero)
                .collect(),
            Self::Volts(volts) => {
                let sum = |block: &[f64]| {
                    // Eight sums side by side: one alone would wait for itself.
                    let mut sums = [0.0; 8];
                    for part in block.chunks_exact(8) {
                        sums.iter_mut().zip(part).for_each(|(sum, x)| *sum += x);
                    }
                    sums.iter().sum::<f64>()
                };
                volts[from..].chunks_exact(BLOCK).map(|block| sum(block) * each).collect()
            }
        }
    }

    /// Whether a sample lies at or beyond one of the converter's `ends` (codes).
    pub(super) fn reaches(&self, ends: (f64, f64)) -> bool {
        match self {
            Self::Codes { codes, .. } => {
                let (low, high) = ends_of(codes);
                !codes.is_empty() && (f64::from(low) <= ends.0 || f64::from(high) >= ends.1)
            }
            Self::Numbers { numbers, .. } => numbers.iter().any(|&x| f64::from(x) <= ends.0 || f64::from(x) >= ends.1),
            Self::Volts(_) => false,
        }
    }
}

widest! {
    fn sums_of_blocks(codes: &[i16], sums: &mut [i32]) {
        for (sum, block) in sums.iter_mut().zip(codes.as_chunks::<BLOCK>().0) {
            *sum = block.iter().map(|code| i32::from(*code)).sum();
        }
    }
}

widest! {
    /// The lowest and the highest code.
    fn ends_of(codes: &[i16]) -> (i16, i16) {
        // One after the other: each alone is a single wide instruction.
        let low = codes.iter().copied().fold(i16::MAX, i16::min);
        (low, codes.iter().copied().fold(i16::MIN, i16::max))
    }
}
