//! The rejection that a correction really reaches, measured on acquisitions with both tips on one node.
//!
//! The records are corrected in the time domain; `D` and `C` are then windowed alike and the residual is the transfer
//! `T = ⟨D·C*⟩/⟨|C|²⟩` over the acquisitions, `CMRR = 1/|T|`. (A ratio of windowed P and N would be wrong by
//! the part of the window that the skew moves.) A band's residual power is `Σ|T_k|²·|C_k|²/Σ|C_k|²` over its bins that
//! carry signal, less what noise alone would put there. Noise is taken from bins without signal, in the band's
//! neighbourhood where there are any.

use super::super::apply::{self, ApplyError, Corrected};
use super::super::response::{self, Response};
use super::super::{Correction, Record};
use super::RejectionBand;
use super::residual::Spectra;
use super::spectra::{self, LEAST_PLACE};

/// Rejection per band, from one or more acquisitions of both tips on the same node; `bands` are frequencies in hertz.
///
/// A band reaches half an octave to each side, or half-way (on a logarithmic scale) to a nearer neighbour. Bands without
/// signal, or above 0.4 of the sample rate, are left out. The acquisitions must share sample interval and length; the
/// rest is counted by the shortest. Plain subtraction's rejection is worked out from the corrected spectra by undoing the
/// correction in them.
///
/// # Errors
/// When a pair of records cannot be corrected.
pub fn measure(
    p: &[Record],
    n: &[Record],
    correction: &Correction,
    bands: &[f64],
) -> Result<Vec<RejectionBand>, ApplyError> {
    measure_with(p, n, correction, None, bands)
}

/// As [`measure`], after a correction with a response.
///
/// # Errors
/// As [`measure`]; also when the response does not fit the records.
pub fn measure_with(
    p: &[Record],
    n: &[Record],
    correction: &Correction,
    response: Option<&Response>,
    bands: &[f64],
) -> Result<Vec<RejectionBand>, ApplyError> {
    // A response would have to be undone too: plain subtraction is then worked out from the capture without it.
    let linear = averaged(p, n, |p, n| apply::correct_without_sums(p, n, correction))?;
    let (Some(first_p), Some(first_n)) = (p.first(), n.first()) else { return Ok(Vec::new()) };
    // Plain subtraction takes the nearest sample: whole intervals between the time axes are made up for.
    let apart = first_p.start_s - first_n.start_s;
    let delay_s = correction.skew_s.value + apart - (apart / first_p.interval_s).round() * first_p.interval_s;
    let with_response = match response {
        None => None,
        Some(_) => Some(averaged(p, n, |p, n| response::correct(p, n, correction, response))?),
    };
    let after = with_response.as_ref().unwrap_or(&linear);
    let mut sorted: Vec<f64> = bands.iter().copied().filter(|f| f.is_finite() && *f > 0.0).collect();
    sorted.sort_by(f64::total_cmp);
    sorted.dedup();
    let edges = edges(&sorted);
    let found = sorted.iter().zip(edges).filter_map(|(&frequency_hz, (from, to))| {
        let raw = fitting(&linear, frequency_hz)?.uncorrected(correction.gain.value, delay_s).residual(from, to)?;
        let fine = fitting(after, frequency_hz)?.corrected().residual(from, to)?;
        let at_least = fine.power <= fine.floor;
        Some(RejectionBand {
            frequency_hz,
            before_db: db(raw.power.max(raw.floor)),
            after_db: db(if at_least { fine.floor } else { fine.power }),
            floor_db: db(fine.floor),
            at_least,
            bins: fine.bins,
        })
    });
    Ok(found.collect())
}

/// The averaged spectra of all acquisitions, in one or more resolutions.
fn averaged(
    p: &[Record],
    n: &[Record],
    one: impl Fn(&Record, &Record) -> Result<Corrected, ApplyError>,
) -> Result<Vec<Spectra>, ApplyError> {
    let captures = p.iter().zip(n).map(|(p, n)| one(p, n)).collect::<Result<Vec<_>, _>>()?;
    Ok(spectra::of(&captures))
}

/// The finest in time of the resolutions that can show a frequency, or else the last.
fn fitting(resolutions: &[Spectra], frequency_hz: f64) -> Option<&Spectra> {
    resolutions.iter().find(|s| frequency_hz >= LEAST_PLACE * s.bin_hz).or_else(|| resolutions.last())
}

/// Residual power to rejection.
fn db(power: f64) -> f64 {
    -10.0 * power.log10()
}

/// Lower and upper end of each band.
fn edges(centres: &[f64]) -> Vec<(f64, f64)> {
    let half_octave = std::f64::consts::SQRT_2;
    let between = |a: f64, b: f64| (a * b).sqrt();
    centres
        .iter()
        .enumerate()
        .map(|(i, &f)| {
            let low = i.checked_sub(1).map_or(0.0, |i| between(centres[i], f));
            let high = centres.get(i + 1).map_or(f64::INFINITY, |&next| between(f, next));
            (low.max(f / half_octave), high.min(f * half_octave))
        })
        .collect()
}
