//! The rejection that a correction really reaches, measured on acquisitions with both tips on one node.
//!
//! The records are corrected in the time domain; `D` and `C` are then windowed alike and the residual is the transfer
//! `T = ⟨D·C*⟩/⟨|C|²⟩` over the acquisitions, `CMRR = 1/|T|`. (A ratio of windowed P and N would be wrong by
//! the part of the window that the skew moves.) A band's residual power is `Σ|T_k|²·|C_k|²/Σ|C_k|²` over its bins that
//! carry signal, less what noise alone would put there. Noise is taken from bins without signal, in the band's
//! neighbourhood where there are any.

use super::super::apply::{self, ApplyError, Corrected};
use super::super::{Correction, Record};
use super::RejectionBand;
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
    let mut captures: Vec<Corrected> = Vec::new();
    for (p, n) in p.iter().zip(n) {
        captures.push(apply::correct(p, n, correction)?);
    }
    let (Some(first_p), Some(first_n)) = (p.first(), n.first()) else { return Ok(Vec::new()) };
    // Plain subtraction takes the nearest sample: whole intervals between the time axes are made up for.
    let apart = first_p.start_s - first_n.start_s;
    let delay_s = correction.skew_s.value + apart - (apart / first_p.interval_s).round() * first_p.interval_s;
    let after = spectra::of(&captures);
    let before: Vec<_> = after.iter().map(|s| s.uncorrected(correction.gain.value, delay_s)).collect();
    drop(captures);
    let mut sorted: Vec<f64> = bands.iter().copied().filter(|f| f.is_finite() && *f > 0.0).collect();
    sorted.sort_by(f64::total_cmp);
    sorted.dedup();
    let edges = edges(&sorted);
    let found = sorted.iter().zip(edges).filter_map(|(&frequency_hz, (from, to))| {
        let fits = |bin_hz: f64| frequency_hz >= LEAST_PLACE * bin_hz;
        let level = after.iter().position(|s| fits(s.bin_hz)).unwrap_or(after.len().saturating_sub(1));
        let raw = before.get(level)?.residual(from, to)?;
        let fine = after.get(level)?.residual(from, to)?;
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
