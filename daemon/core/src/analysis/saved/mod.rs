//! Records that were saved: one acquisition of a reference on both legs and, if there is one, one of the device.
//!
//! On a bench a correction comes from many acquisitions and is verified on fresh ones. Here there may be a single
//! acquisition of the reference. Then the record is cut in two: a correction from its first half is verified on its
//! second half, which it was not fitted to. That is less than a fresh acquisition (whatever drifts between two of them
//! is not seen), and [`Findings::verified`] says which it was. What is applied is fitted to the whole record; the two
//! halves, fitted by themselves, must agree with each other, or its uncertainty is widened to what they differ by.

mod bands;
mod beyond;

use super::apply::ApplyError;
use super::measured::{self, Known, Measured};
use super::rejection::{RejectionBand, measure_with};
use super::response;
use super::skew::{Reference, SkewError, SkewEstimate, estimate_records};
use super::{Beyond, Correction, Estimate, Record, Samples};

/// The two records of one acquisition.
#[derive(Debug, Clone, PartialEq)]
pub struct Legs {
    /// The positive leg.
    pub positive: Record,
    /// The negative leg.
    pub negative: Record,
}

/// What there is to work on.
#[derive(Debug, Clone, PartialEq)]
pub struct Given {
    /// Both tips on one signal.
    pub reference: Legs,
    /// Another acquisition of such, to verify on.
    pub verification: Option<Legs>,
    /// The tips on the device.
    pub device: Option<Legs>,
    /// What is known of the reference.
    pub known: Reference,
    /// Half-width of the scope's gain specification, relative.
    pub scale_spec: Option<f64>,
    /// Whether the response that is left is to be fitted and applied.
    pub response: bool,
}

/// What the rejection was measured on.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Verified {
    /// An acquisition of its own: independent.
    Fresh,
    /// The half of the reference's record that the correction verified was not fitted to: not an independent acquisition.
    OtherHalf,
    /// The record that the correction was fitted to, since its halves are too short to be fitted: not independent.
    Itself,
}

impl Verified {
    /// Whether it was an acquisition of its own.
    #[must_use]
    pub fn independent(self) -> bool {
        self == Self::Fresh
    }
}

/// What was found.
#[derive(Debug, Clone, PartialEq)]
pub struct Findings {
    /// Skew, gain and offset.
    pub correction: Correction,
    /// The estimate from the whole record, as the estimator gave it.
    pub estimate: SkewEstimate,
    /// What was found beyond them.
    pub beyond: Beyond,
    /// Rejection before and after, by frequency.
    pub rejection: Vec<RejectionBand>,
    /// What `rejection` was measured on.
    pub verified: Verified,
    /// The device's figures.
    pub device: Option<Measured>,
    /// What a person should know about the correction.
    pub warnings: Vec<String>,
}

/// Why saved records could not be analysed.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum SavedError {
    /// The device's records could not be corrected.
    #[error("correcting the device's records: {0}")]
    Device(ApplyError),
    /// The reference gives no correction.
    #[error("estimating skew and gain from the reference: {0}")]
    Reference(SkewError),
    /// The rejection could not be measured.
    #[error("verifying the correction: {0}")]
    Verify(ApplyError),
}

/// Correction, rejection and figures from saved records.
///
/// # Errors
/// When the reference gives no correction, or records do not belong together.
pub fn analyse(given: &Given) -> Result<Findings, SavedError> {
    let Given { reference, verification, device, known, scale_spec, response } = given;
    let estimate = estimate_records(&reference.positive, &reference.negative, known).map_err(SavedError::Reference)?;
    let mut correction = estimate.correction();
    let mut warnings: Vec<String> = estimate.warnings.iter().map(ToString::to_string).collect();
    let halves = reference.halves();
    let fitted = halves.each_ref().map(|half| estimate_records(&half.positive, &half.negative, known).ok());
    if let [Some(first), Some(second)] = &fitted {
        warnings.extend(widen(&mut correction, first, second));
    }
    let beyond = match beyond::find(reference, &correction, &estimate, known) {
        _ if !response => Beyond::default(),
        Ok(found) => found,
        Err(why) => {
            warnings.push(format!("no response was fitted: {why}"));
            Beyond::default()
        }
    };
    let [first, _] = &fitted;
    let (on, with, verified) = match (verification, first) {
        (Some(fresh), _) => (fresh, correction, Verified::Fresh),
        // A response is fitted to both halves.
        (None, Some(first)) if beyond.response.is_none() => (&halves[1], first.correction(), Verified::OtherHalf),
        (None, _) => (reference, correction, Verified::Itself),
    };
    let rejection = verify(on, &with, &beyond).map_err(SavedError::Verify)?;
    let device = device
        .as_ref()
        .map(|legs| {
            let known =
                Known { beyond: Some(&beyond), rejection: &rejection, scale_spec: *scale_spec, ..Known::default() };
            measured::measure_with(&legs.positive, &legs.negative, &correction, &known)
        })
        .transpose()
        .map_err(SavedError::Device)?;
    Ok(Findings { correction, estimate, beyond, rejection, verified, device, warnings })
}

/// Rejection at multiples of the reference's fundamental, or on a finer grid where these hold nothing.
fn verify(legs: &Legs, correction: &Correction, beyond: &Beyond) -> Result<Vec<RejectionBand>, ApplyError> {
    let (p, n) = (std::slice::from_ref(&legs.positive), std::slice::from_ref(&legs.negative));
    let [multiples, grid] = bands::of(&legs.positive);
    // A response that does not hold for these records is left out, as it is for the device.
    let response = beyond.response.as_ref();
    let response = response.filter(|response| response::correct(&p[0], &n[0], correction, Some(response)).is_ok());
    let found = measure_with(p, n, correction, response, &multiples)?;
    if found.len() > 1 { Ok(found) } else { measure_with(p, n, correction, response, &grid) }
}

/// Two halves of one record must give the same; where they do not, each uncertainty is at least half of what they differ
/// by, and a warning says so.
fn widen(correction: &mut Correction, first: &SkewEstimate, second: &SkewEstimate) -> Vec<String> {
    let mut warnings = Vec::new();
    let mut check = |what: &str, unit: &str, a: Estimate, b: Estimate, whole: &mut Estimate| {
        let apart = (a.value - b.value).abs();
        if apart > 3.0 * a.u.hypot(b.u) {
            whole.u = whole.u.max(apart / 2.0);
            warnings.push(format!(
                "the reference's two halves differ in {what} by {apart:.2e}{unit}, more than their noise explains; \
                 the uncertainty was widened to {:.2e}{unit}",
                whole.u
            ));
        }
    };
    check("skew", " s", first.skew_s, second.skew_s, &mut correction.skew_s);
    check("gain", "", first.gain, second.gain, &mut correction.gain);
    // At the reference's own mean, where the offset does not hang on the gain.
    let level = first.level_v;
    check("offset", " V", first.offset_at(level), second.offset_at(level), &mut correction.offset_v);
    warnings
}

impl Legs {
    /// The first and the second half of the acquisition.
    fn halves(&self) -> [Self; 2] {
        let middle = self.positive.samples.len().min(self.negative.samples.len()) / 2;
        self.parts(middle, middle)
    }

    /// Two parts of `length` samples, the second one from `second` on.
    fn parts(&self, length: usize, second: usize) -> [Self; 2] {
        let cut = |from_second: bool| {
            let part = |record: &Record| {
                let points = record.samples.len();
                let from = if from_second { second.min(points) } else { 0 };
                let to = (from + length).min(points);
                let samples = match &record.samples {
                    Samples::Codes(codes) => Samples::Codes(codes[from..to].to_vec()),
                    Samples::Numbers(numbers) => Samples::Numbers(numbers[from..to].to_vec()),
                };
                let start_s = (from as f64).mul_add(record.interval_s, record.start_s);
                Record { samples, start_s, ..*record }
            };
            Self { positive: part(&self.positive), negative: part(&self.negative) }
        };
        [cut(false), cut(true)]
    }
}

#[cfg(test)]
mod tests;
