//! The rejection that a correction really reaches, measured on acquisitions with both tips on one node.
//!
//! The records are corrected in the time domain; `D` and `C` are then windowed alike and the residual is the transfer
//! `T = ⟨D·C*⟩/⟨|C|²⟩` over the acquisitions, `CMRR = 1/|T|`. (A ratio of windowed P and N would be wrong by
//! the part of the window that the skew moves.) A band's residual power is `Σ|T_k|²·|C_k|²/Σ|C_k|²` over its bins that
//! carry signal, less what noise alone would put there. Noise is taken from bins without signal, in the band's
//! neighbourhood where there are any.

use realfft::num_complex::Complex;

use super::super::apply::{self, ApplyError};
use super::super::band;
use super::super::interpolate::BAND;
use super::super::response::{self, Response};
use super::super::{Correction, Record};
use super::RejectionBand;

/// A bin carries signal when its power is this many times the noise (20 dB).
const SIGNAL_OVER_NOISE: f64 = 100.0;

/// Residuals below this power (−120 dB) are the interpolation's own error.
const LEAST_RESIDUAL: f64 = 1e-12;

/// The fewest bins without signal that give a band a noise of its own.
const LEAST_NOISE_BINS: usize = 16;

/// Rejection per band, from one or more acquisitions of both tips on the same node; `bands` are frequencies in hertz.
///
/// A band reaches half an octave to each side, or half-way (on a logarithmic scale) to a nearer neighbour. Bands without signal, or above 0.4 of the sample rate, are left out. The
/// acquisitions must share sample interval and length; the rest is counted by the shortest.
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
    let mut after = Vec::new();
    let mut before = Vec::new();
    let mut interval_s = 0.0;
    for (p, n) in p.iter().zip(n) {
        let corrected = response::correct(p, n, correction, response)?;
        interval_s = corrected.interval_s;
        after.push((corrected.difference_v, corrected.common_v));
        let pairs = apply::nearest(p, n)?;
        let difference = pairs.iter().map(|(p, n)| p - n).collect();
        before.push((difference, pairs.iter().map(|(p, n)| 0.5 * (p + n)).collect::<Vec<f64>>()));
    }
    let (Some(after), Some(before)) = (Spectra::of(&after, interval_s), Spectra::of(&before, interval_s)) else {
        return Ok(Vec::new());
    };
    let mut sorted: Vec<f64> = bands.iter().copied().filter(|f| f.is_finite() && *f > 0.0).collect();
    sorted.sort_by(f64::total_cmp);
    sorted.dedup();
    let edges = edges(&sorted);
    let found = sorted.iter().zip(edges).filter_map(|(&frequency_hz, (from, to))| {
        let raw = before.residual(from, to)?;
        let fine = after.residual(from, to)?;
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

/// Spectra of difference and common mode, summed over the acquisitions.
struct Spectra {
    acquisitions: f64,
    bin_hz: f64,
    /// `⟨D·C*⟩`.
    cross: Vec<Complex<f64>>,
    /// `⟨|C|²⟩`.
    common: Vec<f64>,
    /// `⟨|D|²⟩`.
    difference: Vec<f64>,
    signal: Vec<bool>,
    quiet: Vec<bool>,
}

/// What a band shows.
struct Residual {
    /// `|D/C|²` with the noise taken away; may be negative.
    power: f64,
    /// The `|D/C|²` that noise could leave behind at a coverage factor of 2.
    floor: f64,
    bins: usize,
}

impl Spectra {
    fn of(waveforms: &[(Vec<f64>, Vec<f64>)], interval_s: f64) -> Option<Self> {
        // What is cut off is where the window ends anyway.
        let points = band::fast_up_to(waveforms.iter().map(|(d, _)| d.len()).min()?);
        let window = band::window(points);
        let bins = points / 2 + 1;
        let mut cross = vec![Complex::default(); bins];
        let mut common = vec![0.0; bins];
        let mut difference = vec![0.0; bins];
        let share = 1.0 / waveforms.len() as f64;
        for (d, c) in waveforms {
            let d = band::windowed(&d[..points], &window);
            let c = band::windowed(&c[..points], &window);
            for (k, (d, c)) in d.iter().zip(&c).enumerate() {
                cross[k] += d * c.conj() * share;
                common[k] += c.norm_sqr() * share;
                difference[k] += d.norm_sqr() * share;
            }
        }
        let bin_hz = 1.0 / (points as f64 * interval_s);
        let last = ((BAND * points as f64) as usize).min(bins.saturating_sub(1));
        let (signal, quiet) = sort_bins(&common, last);
        Some(Self { acquisitions: waveforms.len() as f64, bin_hz, cross, common, difference, signal, quiet })
    }

    fn residual(&self, from_hz: f64, to_hz: f64) -> Option<Residual> {
        let inside = |k: usize| {
            let f = k as f64 * self.bin_hz;
            f >= from_hz && f < to_hz
        };
        let bins: Vec<usize> = (0..self.common.len()).filter(|&k| self.signal[k] && inside(k)).collect();
        if bins.is_empty() {
            return None;
        }
        let noise = self.noise(from_hz, to_hz)?;
        let common: f64 = bins.iter().map(|&k| self.common[k]).sum();
        let found: f64 = bins
            .iter()
            .map(|&k| {
                // Legs of unequal noise show a common part of noise in D and C; it is no residual.
                let cross = self.cross[k] - noise.cross;
                cross.norm_sqr() / self.common[k]
            })
            .sum();
        // White noise in D leaves its power, divided by the number of acquisitions, in every bin of the estimate.
        let count = bins.len() as f64;
        let each = noise.difference / self.acquisitions;
        let scatter = each * (count * band::NOISE_BANDWIDTH).sqrt();
        let unsure = each * count * (band::NOISE_BANDWIDTH / (noise.bins * self.acquisitions)).sqrt();
        Some(Residual {
            power: (found - count * each) / common,
            floor: (2.0 * scatter.hypot(unsure) / common).max(LEAST_RESIDUAL),
            bins: bins.len(),
        })
    }

    /// The noise from the bins without signal of the band, widened step by step until there are enough of them.
    fn noise(&self, from_hz: f64, to_hz: f64) -> Option<Noise> {
        let (mut low, mut high) = (from_hz, to_hz);
        let end = self.common.len() as f64 * self.bin_hz;
        loop {
            let first = (low / self.bin_hz) as usize;
            let last = ((high / self.bin_hz) as usize + 1).min(self.common.len());
            let bins: Vec<usize> = (first.min(last)..last).filter(|&k| self.quiet[k]).collect();
            let whole = low < self.bin_hz && high > end;
            if bins.len() >= LEAST_NOISE_BINS || (whole && !bins.is_empty()) {
                let count = bins.len() as f64;
                let cross = bins.iter().map(|&k| self.cross[k]).sum::<Complex<f64>>() / count;
                let difference = bins.iter().map(|&k| self.difference[k]).sum::<f64>() / count;
                return Some(Noise { cross, difference, bins: count });
            }
            if whole {
                return None;
            }
            low /= 2.0;
            high *= 2.0;
        }
    }
}

struct Noise {
    cross: Complex<f64>,
    difference: f64,
    bins: f64,
}

/// Which bins carry signal, and which carry none: neither they nor what their neighbours' main lobes reach.
///
/// The first guess of the noise is the lower quartile of the common mode's power, put too high when signal fills more
/// than that: then fewer bins count as signal, never too many.
fn sort_bins(common: &[f64], last: usize) -> (Vec<bool>, Vec<bool>) {
    let usable = |k: usize| k >= band::LOBE && k <= last;
    let mut sorted: Vec<f64> = (0..common.len()).filter(|&k| usable(k)).map(|k| common[k]).collect();
    if sorted.is_empty() {
        return (vec![false; common.len()], vec![false; common.len()]);
    }
    let quarter = sorted.len() / 4;
    let (_, noise, _) = sorted.select_nth_unstable_by(quarter, f64::total_cmp);
    // The quartile of an exponential distribution is 0.288 of its mean; averaging only brings it closer to the mean.
    let noise = *noise / 0.288;
    let signal: Vec<bool> = (0..common.len()).map(|k| usable(k) && common[k] > SIGNAL_OVER_NOISE * noise).collect();
    let mut quiet: Vec<bool> = (0..common.len()).map(usable).collect();
    for k in (0..common.len()).filter(|&k| signal[k]) {
        quiet[k.saturating_sub(band::LOBE)..=(k + band::LOBE).min(common.len() - 1)].fill(false);
    }
    (signal, quiet)
}
