//! The denoised estimate of the common signal and of its derivative: the regressors.

use super::super::interpolate::BAND;
use super::super::line::mean;
use super::super::spectrum::{Fourier, SpectrumError, cosines, fast_length};
use super::Shape;
use realfft::num_complex::Complex;

/// The regressors and what noise is in them. Slopes are per sample.
pub(super) struct Template {
    /// Derivative, denoised in frequency and, for edges, set to zero where it does not stand out of its noise.
    pub(super) gated: Vec<f64>,
    /// Derivative, denoised in frequency only.
    pub(super) slope: Vec<f64>,
    /// The signal about its mean, denoised.
    pub(super) signal: Vec<f64>,
    /// The signal's mean.
    pub(super) level: f64,
    /// Noise power per sample in `slope` and `gated` where that is not zero.
    pub(super) slope_noise: f64,
    /// Noise power per sample in `signal`.
    pub(super) signal_noise: f64,
    /// Σ s′² over the samples, noise taken off: what the bound needs.
    pub(super) slope_energy: f64,
}

/// Standard deviations by which an edge's slope must stand out.
const GATE: f64 = 4.5;
/// Standard deviations down to which the flanks of such a slope are followed.
const FLANK: f64 = 1.0;
/// A bin of a line spectrum is kept above this multiple of its noise (one bin of pure noise in 160 000 is).
const LINE: f64 = 12.0;
/// Samples on either side of a join that its step may reach.
const JOIN: usize = 24;
/// Fewer samples than this are no gate.
const LEAST_GATE: usize = 8;

/// Denoises `estimate`, which holds white noise of variance `noise` per sample.
pub(super) fn build(estimate: &[f64], noise: f64, shape: Shape) -> Result<Template, SpectrumError> {
    let n = estimate.len();
    let level = mean(estimate);
    // A transform takes the record for periodic: a smooth bridge from its end to its start leaves no jump.
    let fourier = Fourier::new(fast_length(n + (n / 64).max(32)));
    let mut bridged: Vec<f64> = estimate.iter().map(|x| x - level).collect();
    let (from, to) = (bridged[n - 1], bridged[0]);
    let span = (fourier.length() - n + 1) as f64;
    bridged.extend((1..=fourier.length() - n).map(|i| {
        let share = (1.0 - (std::f64::consts::PI * i as f64 / span).cos()) / 2.0;
        from + (to - from) * share
    }));
    let spectrum = fourier.forward(&mut bridged)?;
    let per_bin = noise * n as f64;
    let filtered = |weights: Vec<f64>| Filtered::new(&fourier, &spectrum, &weights, noise);
    let edges = || {
        let first = filtered(smooth(&spectrum, per_bin))?.template(n, level, true);
        let Some((weights, slope_energy)) = sharpen(&fourier, estimate, &first.gated, noise)? else {
            return Ok(first);
        };
        Ok(Template { slope_energy, ..filtered(weights)?.template(n, level, true) })
    };
    let tones = || Ok(filtered(lines(&spectrum, per_bin))?.template(n, level, false));
    match shape {
        Shape::Edges => edges(),
        Shape::Sine | Shape::Multitone => tones(),
        Shape::Unknown => {
            let (edges, tones) = (edges()?, tones()?);
            Ok(if edges.information() >= tones.information() { edges } else { tones })
        }
    }
}

/// Wiener weights from the power spectrum smoothed over neighbouring bins: for signals whose spectrum has no gaps.
fn smooth(spectrum: &[Complex<f64>], per_bin: f64) -> Vec<f64> {
    let half = (spectrum.len() / 128).clamp(8, 64);
    let running = running_sums(spectrum.iter().map(|bin| bin.norm_sqr()));
    // Below this a smoothed value may be noise alone.
    let least = 1.0 + 3.0 / ((2 * half + 1) as f64).sqrt();
    let line = lines(spectrum, per_bin);
    let weigh = |k: usize| {
        let (from, to) = (k.saturating_sub(half), (k + half + 1).min(spectrum.len()));
        let power = (running[to] - running[from]) / (to - from) as f64;
        if power > least * per_bin { 1.0 - per_bin / power } else { 0.0 }
    };
    (0..spectrum.len()).map(|k| weigh(k).max(line[k])).collect()
}

/// Wiener weights from the neighbourhood of the edges alone, and Σ s′² from there. In a long record with few edges the
/// noise between them hides the upper part of the edges' spectrum; the plateaus have nothing to tell of it.
///
/// `gated` is a first template, not zero where the edges are. `None` if they fill most of the record.
fn sharpen(
    fourier: &Fourier,
    estimate: &[f64],
    gated: &[f64],
    noise: f64,
) -> Result<Option<(Vec<f64>, f64)>, SpectrumError> {
    let edge = |i: usize| gated[i] != 0.0;
    let starts = (0..gated.len()).filter(|&i| edge(i) && (i == 0 || !edge(i - 1))).count();
    let inside = (0..gated.len()).filter(|&i| edge(i)).count();
    if starts == 0 || inside < LEAST_GATE {
        return Ok(None);
    }
    // As wide again to either side as an edge is, and never so narrow that the cut itself has a spectrum.
    let run = inside.div_ceil(starts);
    let reach = (2 * run).max(24);
    let mut window = vec![false; gated.len() - 1];
    let mut filled = 0;
    for i in (0..gated.len()).filter(|&i| edge(i)) {
        // Each sample is filled once, however many edges' samples reach it.
        let to = (i + reach).min(window.len());
        if let Some(part) = window.get_mut(i.saturating_sub(reach).max(filled)..to) {
            part.fill(true);
        }
        filled = to;
    }
    let mut differences = vec![0.0; fourier.length()];
    for (i, out) in differences.iter_mut().enumerate().take(window.len()).filter(|(i, _)| window[*i]) {
        *out = estimate[i + 1] - estimate[i];
    }
    let open = window.iter().filter(|open| **open).count();
    if 2 * open > gated.len() {
        return Ok(None);
    }
    let length = fourier.length();
    let power: Vec<f64> = fourier.forward(&mut differences)?.iter().map(|bin| bin.norm_sqr()).collect();
    let half = (length / (8 * run)).clamp(8, (power.len() / 128).max(8));
    let running = running_sums(power.iter().copied());
    let least = 1.0 + 3.0 / ((2 * half + 1) as f64).sqrt();
    let mut energy = 0.0;
    let mut weights = vec![1.0; power.len()];
    let turn = std::f64::consts::TAU / length as f64;
    for (k, (weight, cosine)) in weights.iter_mut().zip(cosines(0.0, turn)).enumerate().skip(1) {
        let omega = turn * k as f64;
        let difference = 2.0 * (1.0 - cosine);
        let (from, to) = (k.saturating_sub(half), (k + half + 1).min(power.len()));
        let seen = (running[to] - running[from]) / (to - from) as f64;
        let expected = noise * open as f64 * difference;
        *weight = if seen > least * expected { 1.0 - expected / seen } else { 0.0 };
        if *weight > 0.0 && k as f64 <= BAND * length as f64 {
            // With its weight, or bins that stand out by chance alone would add up.
            energy += *weight * (power[k] - expected) * omega * omega / difference;
        }
    }
    Ok(Some((weights, 2.0 * energy / length as f64)))
}

/// Sums of the first 0, 1, 2, … values.
fn running_sums(values: impl Iterator<Item = f64>) -> Vec<f64> {
    let mut total = 0.0;
    std::iter::once(0.0)
        .chain(values.map(|value| {
            total += value;
            total
        }))
        .collect()
}

/// Weights that keep the bins which stand out of the noise: for lines.
fn lines(spectrum: &[Complex<f64>], per_bin: f64) -> Vec<f64> {
    spectrum
        .iter()
        .map(|bin| if bin.norm_sqr() > LINE * per_bin { 1.0 - per_bin / bin.norm_sqr() } else { 0.0 })
        .collect()
}

/// The record and its derivative after weighting in frequency.
struct Filtered {
    slope: Vec<f64>,
    signal: Vec<f64>,
    slope_noise: f64,
    signal_noise: f64,
    slope_energy: f64,
}

impl Filtered {
    fn new(fourier: &Fourier, spectrum: &[Complex<f64>], weights: &[f64], noise: f64) -> Result<Self, SpectrumError> {
        let length = fourier.length() as f64;
        let mut slope = Vec::with_capacity(spectrum.len());
        let mut signal = Vec::with_capacity(spectrum.len());
        let (mut slope_noise, mut signal_noise, mut slope_energy) = (0.0, 0.0, 0.0);
        for (k, (bin, weight)) in spectrum.iter().zip(weights).enumerate() {
            // Beyond its band the interpolator errs, and what it does to the noise would tie template and residual.
            let weight = if (k as f64) <= BAND * length { *weight } else { 0.0 };
            let omega = std::f64::consts::TAU * k as f64 / length;
            signal.push(bin * weight);
            slope.push(bin * Complex::new(0.0, omega * weight));
            signal_noise += weight * weight;
            slope_noise += (weight * omega).powi(2);
            if weight > 0.0 {
                slope_energy += omega * omega * (bin.norm_sqr() - noise * length);
            }
        }
        let slope = fourier.inverse(&mut slope)?;
        let signal = fourier.inverse(&mut signal)?;
        let share = 2.0 * noise / length;
        Ok(Self {
            slope,
            signal,
            slope_noise: share * slope_noise,
            signal_noise: share * signal_noise,
            slope_energy: 2.0 * slope_energy / length,
        })
    }

    fn template(mut self, n: usize, level: f64, gate: bool) -> Template {
        self.slope.truncate(n);
        self.signal.truncate(n);
        let gated = if gate { opened(&self.slope, self.slope_noise.sqrt()) } else { self.slope.clone() };
        Template {
            gated,
            slope: self.slope,
            signal: self.signal,
            level,
            slope_noise: self.slope_noise,
            signal_noise: self.signal_noise,
            slope_energy: self.slope_energy,
        }
    }
}

/// The slope where it stands out of its noise (standard deviation `noise`), with its flanks: an edge of a few samples
/// has a sixth of what it tells below the threshold, next to where it crosses it.
fn opened(slope: &[f64], noise: f64) -> Vec<f64> {
    let core = |d: f64| d.abs() > GATE * noise;
    if slope.iter().filter(|d| core(**d)).count() < LEAST_GATE {
        return slope.to_vec();
    }
    let mut gated: Vec<f64> = slope.iter().map(|&d| if core(d) { d } else { 0.0 }).collect();
    let flank = |from: f64, d: f64| from * d > 0.0 && d.abs() > FLANK * noise;
    for i in 1..slope.len() {
        if gated[i] == 0.0 && flank(gated[i - 1], slope[i]) {
            gated[i] = slope[i];
        }
    }
    for i in (0..slope.len() - 1).rev() {
        if gated[i] == 0.0 && flank(gated[i + 1], slope[i]) {
            gated[i] = slope[i];
        }
    }
    gated
}

impl Template {
    /// Takes out the slopes next to `joins`, of which the record's first sample is number `from`.
    pub(super) fn close(&mut self, joins: &[usize], from: usize) {
        for join in joins {
            let (start, end) = (join.saturating_sub(from + JOIN), (join + JOIN).saturating_sub(from));
            let end = end.min(self.gated.len());
            let start = start.min(end);
            self.gated[start..end].fill(0.0);
            self.slope[start..end].fill(0.0);
        }
    }

    /// Σ gated·s′: Σ gated² with the noise that the template shares with itself taken off.
    pub(super) fn useful(&self) -> f64 {
        let open = self.gated.iter().filter(|d| **d != 0.0).count() as f64;
        let own = self.own();
        (own - open * self.slope_noise).max(own * 1e-3)
    }

    fn own(&self) -> f64 {
        self.gated.iter().map(|d| d * d).sum()
    }

    /// What the template tells about the skew, up to a factor: (Zᵀs′)²/ZᵀZ.
    fn information(&self) -> f64 {
        let own = self.own();
        if own > 0.0 { self.useful().powi(2) / own } else { 0.0 }
    }
}
