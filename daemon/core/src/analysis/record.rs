//! The samples of one leg from one acquisition.

use super::wide::widest;

/// Samples as the instrument sent them.
#[derive(Debug, Clone, PartialEq)]
pub enum Samples {
    /// Converter codes, or averaged codes on a finer grid.
    Codes(Vec<i16>),
    /// Numbers, from instruments that send floating point or text.
    Numbers(Vec<f32>),
}

impl Samples {
    /// How many samples there are.
    #[must_use]
    pub fn len(&self) -> usize {
        match self {
            Self::Codes(codes) => codes.len(),
            Self::Numbers(numbers) => numbers.len(),
        }
    }

    /// Whether there are none.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }
}

/// The samples of one leg from one acquisition, with what turns them into volts at the probe tip and seconds.
#[derive(Debug, Clone, PartialEq)]
pub struct Record {
    /// Raw samples.
    pub samples: Samples,
    /// Volts at the tip per code.
    pub volts_per_code: f64,
    /// Volts at the tip at code 0.
    pub zero_v: f64,
    /// Seconds between two samples.
    pub interval_s: f64,
    /// Time of sample 0 relative to the trigger, in seconds.
    pub start_s: f64,
    /// The converter's lowest and highest code; a sample at or beyond one of them is clipped.
    pub end_codes: (f64, f64),
    /// Size of one converter step at the tip in volts. Equal to `volts_per_code` for a single acquisition; an averaged
    /// record has finer codes than its converter.
    pub step_v: f64,
    /// How many acquisitions were averaged into it, at least 1.
    pub averages: u32,
}

impl Record {
    /// The samples in volts at the tip.
    #[must_use]
    pub fn volts(&self) -> Vec<f64> {
        let volt = |code: f64| code.mul_add(self.volts_per_code, self.zero_v);
        match &self.samples {
            Samples::Codes(codes) => codes.iter().map(|&code| volt(f64::from(code))).collect(),
            Samples::Numbers(numbers) => numbers.iter().map(|&number| volt(f64::from(number))).collect(),
        }
    }

    /// How many acquisitions were averaged after the converter rounded them. Some instruments send an average on the
    /// converter's own grid, rounded once more: what dithers that last rounding is the noise of the average, as if there
    /// were one acquisition only.
    #[must_use]
    pub fn averages_on_finer_codes(&self) -> u32 {
        let coarse = matches!(self.samples, Samples::Codes(_)) && self.volts_per_code.abs() > 0.75 * self.step_v;
        if coarse { 1 } else { self.averages.max(1) }
    }

    /// How many samples lie at or beyond the converter's ends.
    #[must_use]
    pub fn clipped(&self) -> usize {
        let (low, high) = self.end_codes;
        let beyond = |code: f64| code <= low || code >= high;
        match &self.samples {
            Samples::Codes(codes) => {
                // As whole codes; ends that are no numbers are never reached.
                let low = if low.is_nan() { i32::MIN } else { low.floor() as i32 };
                let high = if high.is_nan() { i32::MAX } else { high.ceil() as i32 };
                beyond_codes(codes, low, high)
            }
            Samples::Numbers(numbers) => numbers.iter().filter(|&&number| beyond(f64::from(number))).count(),
        }
    }
}

widest! {
    /// How many codes are not between two others.
    fn beyond_codes(codes: &[i16], low: i32, high: i32) -> usize {
        let count = |part: &[i16]| {
            let beyond = |code: &i16| u32::from(i32::from(*code) <= low) | u32::from(i32::from(*code) >= high);
            part.iter().map(beyond).sum::<u32>() as usize
        };
        codes.chunks(4096).map(count).sum()
    }
}
