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
    /// The spectra as they are.
    pub(super) fn corrected(&self) -> View<'_> {
        View { spectra: self, undo: None }
    }

    /// What plain subtraction would show: the negative leg with `gain` and later by `delay_s`, undoing the correction.
    /// Exact but for the part of the window that the skew moves.
    pub(super) fn uncorrected(&self, gain: f64, delay_s: f64) -> View<'_> {
        View { spectra: self, undo: Some((gain, delay_s)) }
    }

    /// The noise, from whichever bins show it.
    pub(super) fn noise_anywhere(&self) -> Option<Noise> {
        self.corrected().noise(0.0, f64::INFINITY)
    }
}

/// Averaged spectra, with the correction or with the correction undone.
#[derive(Clone, Copy)]
pub(super) struct View<'a> {
    spectra: &'a Spectra,
    /// Gain and delay in seconds that the correction took away.
    undo: Option<(f64, f64)>,
}

impl View<'_> {
    /// `⟨D·C*⟩`, `⟨|C|²⟩` and `⟨|D|²⟩` of a bin. With `A = g·e^{−jωτ}`, `u = 1 − A` and `v = (1 + A)/2` plain subtraction
    /// has `D = uC + vD`, `C = vC + uD/4` of the corrected ones.
    fn at(&self, k: usize) -> (Complex<f64>, f64, f64) {
        let (cross, common, difference) = (self.spectra.cross[k], self.spectra.common[k], self.spectra.difference[k]);
        let Some((gain, delay_s)) = self.undo else { return (cross, common, difference) };
        let a = Complex::from_polar(gain, -std::f64::consts::TAU * self.spectra.bin_hz * k as f64 * delay_s);
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
    }

    pub(super) fn residual(&self, from_hz: f64, to_hz: f64) -> Option<Residual> {
        let bins: Vec<usize> = self.inside(from_hz, to_hz).filter(|&k| self.spectra.signal[k]).collect();
        if bins.is_empty() {
            return None;
        }
        let noise = self.noise(from_hz, to_hz)?;
        let (mut common, mut found) = (0.0, 0.0);
        for &k in &bins {
            let (cross, power, _) = self.at(k);
            common += power;
            // Legs of unequal noise show a common part of noise in D and C; it is no residual.
            found += (cross - noise.cross).norm_sqr() / power;
        }
        // White noise in D leaves its power, divided by the number of averages, in every bin of the estimate.
        let count = bins.len() as f64;
        let each = noise.difference / self.spectra.averages;
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
        let place = |f: f64| ((f / self.spectra.bin_hz).ceil().max(0.0) as usize).min(self.spectra.common.len());
        place(from_hz)..place(to_hz).max(place(from_hz))
    }

    /// The noise from segments without signal, or else from the bins without signal of the band, widened step by step
    /// until there are enough of them.
    fn noise(&self, from_hz: f64, to_hz: f64) -> Option<Noise> {
        let (mut low, mut high) = (from_hz, to_hz);
        let spectra = self.spectra;
        let points = spectra.common.len();
        let last = (super::super::interpolate::BAND * 2.0 * (points - 1) as f64) as usize;
        let end = points as f64 * spectra.bin_hz;
        loop {
            let (mut cross, mut difference, mut count) = (Complex::default(), 0.0, 0usize);
            for k in self.inside(low, high) {
                match &spectra.measured {
                    // Noise alone has no common part to speak of: its spectra serve as they are.
                    Some((crosses, differences, _)) if k >= band::LOBE && k <= last => {
                        cross += crosses[k];
                        difference += differences[k];
                    }
                    None if spectra.quiet[k] => {
                        let (own, _, power) = self.at(k);
                        cross += own;
                        difference += power;
                    }
                    _ => continue,
                }
                count += 1;
            }
            let whole = low < spectra.bin_hz && high > end;
            if count >= LEAST_NOISE_BINS || (whole && count > 0) {
                let averages = spectra.measured.as_ref().map_or(spectra.averages, |(.., averages)| *averages);
                let count = count as f64;
                return Some(Noise { cross: cross / count, difference: difference / count, looks: count * averages });
            }
            if whole || spectra.elsewhere.is_some() {
                return spectra.elsewhere;
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
