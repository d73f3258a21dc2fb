//! The device's records: corrected difference, leak bound, figures.

use super::super::apply::{self, ApplyError};
use super::super::figures::{Figure, FigureInput, compute};
use super::super::leak::{self, LeakBound};
use super::super::rejection::RejectionBand;
use super::super::{Correction, Record, noise};
use super::Legs;

/// What the device's records show.
#[derive(Debug, Clone, PartialEq)]
pub struct Measured {
    /// The figures of the corrected difference.
    pub figures: Vec<Figure>,
    /// The most that the common mode can have added.
    pub leak: LeakBound,
    /// The corrected difference in volts.
    pub difference_v: Vec<f64>,
    /// Time of its first sample in seconds.
    pub start_s: f64,
    /// Seconds between two samples.
    pub interval_s: f64,
    /// What a person should know.
    pub warnings: Vec<String>,
}

/// Corrects the device's records and computes the figures.
pub(super) fn work(
    legs: &Legs,
    correction: &Correction,
    rejection: &[RejectionBand],
    scale_spec: Option<f64>,
) -> Result<Measured, ApplyError> {
    let (p, n) = (&legs.positive, &legs.negative);
    let mut warnings = Vec::new();
    let clipped = (p.clipped(), n.clipped());
    for (leg, count) in [("positive", clipped.0), ("negative", clipped.1)] {
        if count > 0 {
            warnings.push(format!("the {leg} leg is clipped at {count} samples"));
        }
    }
    if scale_spec.is_none() {
        warnings.push(
            "no gain specification of the scope was told (scale_spec): its own gain error is in no uncertainty"
                .to_owned(),
        );
    }
    let corrected = apply::correct(p, n, correction)?;
    let plain_v = apply::plain(p, n)?;
    let (noise_p_v, noise_n_v) = match noise::out_of_band(&p.volts(), &n.volts(), correction.gain.value) {
        Ok(Some(noise)) => (noise.p_v, noise.n_v),
        _ => {
            warnings.push(
                "noise could not be measured: the record's whole spectrum holds signal; the converter's own is taken"
                    .to_owned(),
            );
            (own_noise(p), own_noise(n))
        }
    };
    let leak = leak::bound(&corrected.common_v, corrected.interval_s, correction, rejection);
    let figures = compute(&FigureInput {
        corrected: &corrected,
        plain_v: &plain_v,
        correction,
        leak: &leak,
        noise_p_v,
        noise_n_v,
        step_p_v: p.step_v,
        step_n_v: n.step_v,
        scale_spec: scale_spec.unwrap_or(0.0),
        clipped_p: clipped.0,
        clipped_n: clipped.1,
        averages: p.averages.min(n.averages),
    });
    let (start_s, interval_s) = (corrected.start_s, corrected.interval_s);
    Ok(Measured { figures, leak, difference_v: corrected.difference_v, start_s, interval_s, warnings })
}

/// What an ideal converter leaves: step/√12.
fn own_noise(record: &Record) -> f64 {
    record.step_v / (12.0 * f64::from(record.averages.max(1))).sqrt()
}
