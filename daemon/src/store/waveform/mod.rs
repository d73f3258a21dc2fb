//! What one capture's waveform file holds, as a value.

pub(crate) mod csv;
pub(super) mod parquet;

use std::collections::BTreeMap;

use evenpair_api::Capture;
use evenpair_core::analysis::Record;

use super::error::StoreError;

/// Two records and their corrected difference.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Waveform {
    /// The positive leg as it was acquired.
    pub(crate) positive: Record,
    /// The negative leg as it was acquired, not corrected.
    pub(crate) negative: Record,
    /// The corrected difference in volts at the tips, from sample `first_valid` of the records on.
    pub(crate) difference_v: Vec<f32>,
    /// The sample of the records that `difference_v` begins at; what lies before and after it has no support.
    pub(crate) first_valid: usize,
    /// More about it, kept in the file beside what the store writes by itself. Keys that the store uses are its own:
    /// what a caller puts there is replaced.
    pub(crate) metadata: BTreeMap<String, String>,
}

impl Waveform {
    /// How many samples each record has.
    pub(crate) fn points(&self) -> usize {
        self.positive.samples.len()
    }

    /// The corrected difference at a sample of the records, in volts at the tips; none where it has no support.
    pub(crate) fn difference_at(&self, sample: usize) -> Option<f32> {
        self.difference_v.get(sample.checked_sub(self.first_valid)?).copied()
    }

    /// Seconds from the trigger to a sample of the records.
    pub(crate) fn time_s(&self, sample: usize) -> f64 {
        (sample as f64).mul_add(self.positive.interval_s, self.positive.start_s)
    }

    /// Sees that the records come from one acquisition and belong to `capture`.
    ///
    /// # Errors
    /// [`StoreError::Inconsistent`] with the first contradiction.
    pub(super) fn check_against(&self, capture: &Capture) -> Result<(), StoreError> {
        let points = self.points();
        let (positive, negative) = (&self.positive, &self.negative);
        let differ = |a: f64, b: f64| a.to_bits() != b.to_bits();
        let why = if negative.samples.len() != points {
            format!("the legs have {points} and {} samples", negative.samples.len())
        } else if capture.points != points as u64 {
            format!("the capture says {} points and the records have {points}", capture.points)
        } else if differ(positive.interval_s, negative.interval_s) || differ(positive.start_s, negative.start_s) {
            "the legs' records do not share one time axis".to_owned()
        } else if self.first_valid.checked_add(self.difference_v.len()).is_none_or(|end| end > points) {
            format!("the difference reaches beyond the {points} samples of the records")
        } else {
            return Ok(());
        };
        Err(StoreError::Inconsistent { doing: "store a capture", why })
    }
}

#[cfg(test)]
mod tests;
