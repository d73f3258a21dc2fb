//! What two records of a capture show: corrected difference, leak bound, figures. The one way for captures of a bench
//! and for records that were saved elsewhere.

use super::apply::{self, ApplyError};
use super::budget::Basis;
use super::figures::{Allowance, Figure, FigureInput, FigureKind, compute};
use super::leak::{self, LeakBound};
use super::noise::{self, PairNoise};
use super::rejection::RejectionBand;
use super::{Correction, Record};

/// What the records of a capture show.
#[derive(Debug, Clone, PartialEq)]
pub struct Measured {
    /// The figures of the corrected difference.
    pub figures: Vec<Figure>,
    /// The most that the common mode can have added.
    pub leak: LeakBound,
    /// The corrected difference in volts.
    pub difference_v: Vec<f32>,
    /// Index, in the positive leg's record, of its first sample.
    pub first: usize,
    /// Time of its first sample in seconds.
    pub start_s: f64,
    /// Seconds between two samples.
    pub interval_s: f64,
    /// What a person should know.
    pub warnings: Vec<String>,
}

/// Corrects two records and computes the figures. `rejection` is what the correction was verified to reach (may be
/// empty), `scale_spec` the half-width of the scope's gain specification, relative.
///
/// # Errors
/// When the records do not belong together or the correction cannot be applied.
pub fn measure(
    p: &Record,
    n: &Record,
    correction: &Correction,
    rejection: &[RejectionBand],
    scale_spec: Option<f64>,
) -> Result<Measured, ApplyError> {
    let mut warnings = Vec::new();
    let clipped = (p.clipped(), n.clipped());
    for (leg, count) in [("positive", clipped.0), ("negative", clipped.1)] {
        if count > 0 {
            warnings.push(format!("the {leg} leg is clipped at {count} samples"));
        }
    }
    if scale_spec.is_none() {
        warnings.push(
            "no gain specification of the scope is known (`scale_spec`): its own gain error is in no uncertainty"
                .to_owned(),
        );
    }
    let corrected = apply::correct(p, n, correction)?;
    let plain_v = apply::plain(p, n)?;
    let noise = measured_noise(p, n, correction.gain.value, &mut warnings);
    let leak = leak::bound(&corrected.common(), corrected.interval_s, correction, rejection);
    let figures = compute(&FigureInput {
        corrected: &corrected,
        plain_v: Some(&plain_v),
        correction,
        leak: &leak,
        noise_p_v: noise.p_v,
        noise_n_v: noise.n_v,
        step_p_v: p.step_v,
        step_n_v: n.step_v,
        scale_spec: scale_spec.unwrap_or(0.0),
        clipped_p: clipped.0,
        clipped_n: clipped.1,
        averages: p.averages.min(n.averages),
        allowance: Allowance { noise_bins: noise.bins, ..Allowance::default() },
    });
    if figures.iter().any(|f| f.kind == FigureKind::Rms && f.coverage.is_some_and(|c| c.basis == Basis::CommonMode)) {
        warnings.push(
            "the rms is common-mode limited: what the correction may leave of the common mode is as large as the \
             difference shows; deskew more closely, or read the interval and not the value"
                .to_owned(),
        );
    }
    let (first, start_s, interval_s) = (corrected.first, corrected.start_s, corrected.interval_s);
    Ok(Measured { figures, leak, difference_v: corrected.difference_v.into_vec(), first, start_s, interval_s, warnings })
}

/// The noise of each leg in volts rms per sample, from the part of the spectrum that holds nothing else; where there is
/// none, what an ideal converter leaves: step/√12.
fn measured_noise(p: &Record, n: &Record, gain: f64, warnings: &mut Vec<String>) -> PairNoise {
    if let Ok(Some(noise)) = noise::out_of_band(&p.volts(), &n.volts(), gain) {
        return noise;
    }
    warnings.push(
        "noise could not be measured: the record's whole spectrum holds signal; the converter's own is taken"
            .to_owned(),
    );
    let own = |record: &Record| record.step_v / (12.0 * f64::from(record.averages.max(1))).sqrt();
    PairNoise { p_v: own(p), n_v: own(n), bins: 0 }
}
