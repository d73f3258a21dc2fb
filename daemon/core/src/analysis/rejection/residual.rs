//! What averaged spectra say about a band: the residual, and what noise alone would leave of it.

use realfft::num_complex::Complex;

use super::super::band;

/// A bin carries signal when its power is this many times the noise (20 dB).
const SIGNAL_OVER_NOISE: f64 = 100.0;

/// Residuals below this power (−120 dB) are the interpolation's own error.
const LEAST_RESIDUAL: f64 = 1e-12;

/// The fewest bins without signal that give a band a noise of its own.
const LEAST_NOISE_BINS: usize = 16;

/// Spectra of difference and common mode, averaged over segments and acquisitions.
pub(super) struct Spectra {
    /// How many were averaged.
    pub(super) averages: f64,
    pub(super) bin_hz: f64,
    /// `⟨D·C*⟩`.
    pub(super) cross: Vec<Complex<f64>>,
    /// `⟨|C|²⟩`.
    pub(super) common: Vec<f64>,
    /// `⟨|D|²⟩`.
    pub(super) difference: Vec<f64>,
    pub(super) signal: Vec<bool>,
    pub(super) quiet: Vec<bool>,
    /// `⟨D·C*⟩` and `⟨|D|²⟩` of segments that hold nothing but noise, and their number.
    pub(super) measured: Option<(Vec<Complex<f64>>, Vec<f64>, f64)>,
    /// The noise to take where a band has no bins without signal of its own: at the lower rates, whose average has less
    /// of it in the bins further up.
    pub(super) elsewhere: Option<Noise>,
}

/// What a band shows.
pub(super) struct Residual {
    /// `|D/C|²` with the noise taken away; may be negative.
    pub(super) power: f64,
    /// The `|D/C|²` that noise could leave behind at a coverage factor of 2.
    pub(super) floor: f64,
    pub(super) bins: usize,
}

/// Noise per bin.
#[derive(Debug, Clone, Copy)]
pub(super) struct Noise {
    cross: Complex<f64>,
    difference: f64,
    /// How many independent looks it was averaged over: bins times averages.
    looks: f64,
}

impl Noise {
    /// The noise of bins that hold another part of it.
    pub(super) fn per_bin(self, part: f64) -> Self {
        Self { cross: self.cross * part, difference: self.difference * part, looks: self.looks }
    }
}

impl Spectra {
    /// What plain subtraction would show: the negative leg with `gain` and later by `delay_s`, undoing the correction.
    /// With `A = g·e^{−jωτ}`, `u = 1 − A` and `v = (1 + A)/2` it has `D = uC + vD`, `C = vC + uD/4` of the corrected ones.
    /// Exact but for the part of the window that the skew moves.
    pub(super) fn uncorrected(&self, gain: f64, delay_s: f64) -> Self {
        let undone = |k: usize, cross: Complex<f64>, common: f64, difference: f64| {
            let a = Complex::from_polar(gain, -std::f64::consts::TAU * self.bin_hz * k as f64 * delay_s);
            let (u, v) = (1.0 - a, (1.0 + a) * 0.5);
            let cross_after = u * v.conj() * common
                + cross.conj() * (0.25 * u.norm_sqr())
                + cross * v.norm_sqr()
                + v * u.conj() * (0.25 * difference);
            let common_after =
                v.norm_sqr() * common + u.norm_sqr() / 16.0 * difference + 0.5 * (v * u.conj() * cross.conj()).re;
            let difference_after =
                u.norm_sqr() * common + v.norm_sqr() * difference + 2.0 * (u * v.conj() * cross.conj()).re;
            (cross_after, common_after, difference_after)
        };
        let all: Vec<_> =
            (0..self.common.len()).map(|k| undone(k, self.cross[k], self.common[k], self.difference[k])).collect();
        // Noise alone has no common part to speak of: its spectra serve as they are.
        Self {
            averages: self.averages,
            bin_hz: self.bin_hz,
            cross: all.iter().map(|x| x.0).collect(),
            common: all.iter().map(|x| x.1).collect(),
            difference: all.iter().map(|x| x.2).collect(),
            signal: self.signal.clone(),
            quiet: self.quiet.clone(),
            measured: self.measured.clone(),
            elsewhere: self.elsewhere,
        }
    }

    pub(super) fn residual(&self, from_hz: f64, to_hz: f64) -> Option<Residual> {
        let bins: Vec<usize> = self.inside(from_hz, to_hz).filter(|&k| self.signal[k]).collect();
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
        // White noise in D leaves its power, divided by the number of averages, in every bin of the estimate.
        let count = bins.len() as f64;
        let each = noise.difference / self.averages;
        let scatter = each * (count * band::NOISE_BANDWIDTH).sqrt();
        let unsure = each * count * (band::NOISE_BANDWIDTH / noise.looks).sqrt();
        Some(Residual {
            power: (found - count * each) / common,
            floor: (2.0 * scatter.hypot(unsure) / common).max(LEAST_RESIDUAL),
            bins: bins.len(),
        })
    }

    /// The bins from one frequency up to another.
    fn inside(&self, from_hz: f64, to_hz: f64) -> std::ops::Range<usize> {
        let place = |f: f64| ((f / self.bin_hz).ceil().max(0.0) as usize).min(self.common.len());
        place(from_hz)..place(to_hz).max(place(from_hz))
    }

    /// The noise, from whichever bins show it.
    pub(super) fn noise_anywhere(&self) -> Option<Noise> {
        self.noise(0.0, f64::INFINITY)
    }

    /// The noise from segments without signal, or else from the bins without signal of the band, widened step by step
    /// until there are enough of them.
    fn noise(&self, from_hz: f64, to_hz: f64) -> Option<Noise> {
        let (mut low, mut high) = (from_hz, to_hz);
        let (cross, difference, averages) = match &self.measured {
            Some((cross, difference, averages)) => (cross, difference, *averages),
            None => (&self.cross, &self.difference, self.averages),
        };
        let last = (super::super::interpolate::BAND * 2.0 * (self.common.len() - 1) as f64) as usize;
        let usable = |k: usize| if self.measured.is_some() { k >= band::LOBE && k <= last } else { self.quiet[k] };
        let end = self.common.len() as f64 * self.bin_hz;
        loop {
            let bins: Vec<usize> = self.inside(low, high).filter(|&k| usable(k)).collect();
            let whole = low < self.bin_hz && high > end;
            if bins.len() >= LEAST_NOISE_BINS || (whole && !bins.is_empty()) {
                let count = bins.len() as f64;
                let cross = bins.iter().map(|&k| cross[k]).sum::<Complex<f64>>() / count;
                let difference = bins.iter().map(|&k| difference[k]).sum::<f64>() / count;
                return Some(Noise { cross, difference, looks: count * averages });
            }
            if whole || self.elsewhere.is_some() {
                return self.elsewhere;
            }
            low /= 2.0;
            high *= 2.0;
        }
    }
}

/// Which bins carry signal, and which carry none: neither they nor what their neighbours' main lobes reach.
///
/// Where the noise is not known, the first guess of it is the lower quartile of the common mode's power, put too high when signal fills more
/// than that: then fewer bins count as signal, never too many.
pub(super) fn sort_bins(common: &[f64], last: usize, known: Option<f64>) -> (Vec<bool>, Vec<bool>) {
    let usable = |k: usize| k >= band::LOBE && k <= last;
    let mut sorted: Vec<f64> = (0..common.len()).filter(|&k| usable(k)).map(|k| common[k]).collect();
    if sorted.is_empty() {
        return (vec![false; common.len()], vec![false; common.len()]);
    }
    let quarter = sorted.len() / 4;
    let (_, noise, _) = sorted.select_nth_unstable_by(quarter, f64::total_cmp);
    // The quartile of an exponential distribution is 0.288 of its mean; averaging only brings it closer to the mean.
    let noise = known.unwrap_or(*noise / 0.288);
    let signal: Vec<bool> = (0..common.len()).map(|k| usable(k) && common[k] > SIGNAL_OVER_NOISE * noise).collect();
    let mut quiet: Vec<bool> = (0..common.len()).map(usable).collect();
    for k in (0..common.len()).filter(|&k| signal[k]) {
        quiet[k.saturating_sub(band::LOBE)..=(k + band::LOBE).min(common.len() - 1)].fill(false);
    }
    (signal, quiet)
}
