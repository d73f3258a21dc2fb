//! What two records of a capture show: corrected difference, leak bound, figures. The one way for captures of a bench
//! and for records that were saved elsewhere.

use super::apply::{self, ApplyError};
use super::budget::Basis;
use super::figures::{Allowance, Asked, Figure, FigureInput, FigureKind, compute};
use super::leak::{self, LeakBound};
use super::noise::{self, PairNoise};
use super::rejection::RejectionBand;
use super::{Beyond, Correction, Drift, Freedom, Record, response};

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

/// What is known beside the records, and what is asked of their figures.
#[derive(Debug, Clone, Copy, Default)]
pub struct Known<'a> {
    /// What is known beyond gain, skew and offset, if anything.
    pub beyond: Option<&'a Beyond>,
    /// What the correction was verified to reach; may be empty.
    pub rejection: &'a [RejectionBand],
    /// Half-width of the scope's gain specification, relative.
    pub scale_spec: Option<f64>,
    /// How far the correction may have drifted since it was made.
    pub drift: Drift,
    /// How well its standard uncertainties are known.
    pub freedom: Freedom,
    /// Thresholds and bands of figures.
    pub asked: Asked,
}

/// Corrects two records and computes the figures. `rejection` is what the correction was verified to reach (may be
/// empty), `scale_spec` the half-width of the scope's gain specification, relative.
///
/// # Errors
/// As [`measure_with`].
pub fn measure(
    p: &Record,
    n: &Record,
    correction: &Correction,
    rejection: &[RejectionBand],
    scale_spec: Option<f64>,
) -> Result<Measured, ApplyError> {
    measure_with(p, n, correction, &Known { rejection, scale_spec, ..Known::default() })
}

/// As [`measure`], with all that is known of the correction and asked of the figures. A response that does not hold for
/// the records is left out, with a warning.
///
/// # Errors
/// When the records do not belong together or the correction cannot be applied.
pub fn measure_with(
    p: &Record,
    n: &Record,
    correction: &Correction,
    known: &Known<'_>,
) -> Result<Measured, ApplyError> {
    let Known { rejection, scale_spec, drift, freedom, asked, .. } = *known;
    let nothing = Beyond::default();
    let beyond = known.beyond.unwrap_or(&nothing);
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
    let mut rejection = rejection.to_vec();
    let (corrected, beyond) = match response::correct(p, n, correction, beyond.response.as_ref()) {
        Ok(corrected) => (corrected, beyond.clone()),
        Err(ApplyError::Response(error)) => {
            warnings.push(format!("the response is not applied: {error}"));
            if let Some(response) = &beyond.response {
                // What was verified was verified with it.
                for band in &mut rejection {
                    let without = response.residual_without(band.frequency_hz);
                    band.after_db = band.after_db.min(-20.0 * without.log10());
                }
            }
            (apply::correct(p, n, correction)?, beyond.without_response())
        }
        Err(error) => return Err(error),
    };
    // The response's factor on the gain is known no better than it was fitted.
    let mut correction = *correction;
    if let Some(response) = &beyond.response {
        correction.gain.u = correction.gain.u.hypot(correction.gain.value * response.gain_u);
    }
    let plain_v = apply::plain(p, n)?;
    let noise = measured_noise(p, n, correction.gain.value, &mut warnings);
    let leak = leak::bound_with(&corrected.common(), corrected.interval_s, &correction, &rejection, &beyond, &drift);
    let figures = compute(&FigureInput {
        corrected: &corrected,
        plain_v: Some(&plain_v),
        correction: &correction,
        leak: &leak,
        noise_p_v: noise.p_v,
        noise_n_v: noise.n_v,
        step_p_v: p.step_v,
        step_n_v: n.step_v,
        scale_spec: scale_spec.unwrap_or(0.0),
        clipped_p: clipped.0,
        clipped_n: clipped.1,
        averages: p.averages_on_finer_codes().min(n.averages_on_finer_codes()),
        allowance: Allowance {
            noise_bins: noise.bins,
            drift,
            freedom,
            compensation: beyond.left(&corrected.negative_v, corrected.interval_s),
            response: beyond.remains(&corrected),
            ..Allowance::default()
        },
        asked,
    });
    if figures.iter().any(|f| f.kind == FigureKind::Rms && f.coverage.is_some_and(|c| c.basis == Basis::CommonMode)) {
        warnings.push(
            "the rms is common-mode limited: what the correction may leave of the common mode is as large as the \
             difference shows; deskew more closely, or read the interval and not the value"
                .to_owned(),
        );
    }
    let (first, start_s, interval_s) = (corrected.first, corrected.start_s, corrected.interval_s);
    Ok(Measured {
        figures,
        leak,
        difference_v: corrected.difference_v.into_vec(),
        first,
        start_s,
        interval_s,
        warnings,
    })
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
    let own = |record: &Record| record.step_v / (12.0 * f64::from(record.averages_on_finer_codes())).sqrt();
    PairNoise { p_v: own(p), n_v: own(n), bins: 0 }
}

#[cfg(test)]
mod tests;
