//! One sine on both legs: seven parameters, one frequency for both.
//!
//! Least squares of `A·cos ωt + B·sin ωt + C` for each leg with a shared ω, the time counted from the record's middle:
//! the four-parameter fit of IEEE Std 1057 (clause on four-parameter least-squares fits to sine-wave data; clause
//! number not at hand) carried to two channels. Fitted apart, with the phase taken at the first sample, each leg's own
//! error of frequency would add to the phase and double the spread of the skew. Maximum likelihood for a pure sine in
//! white noise; a record need not hold whole periods. Cost: O(n) a step, about five steps.

use super::super::Estimate;
use super::super::line::mean;
use super::super::spectrum::hann;
use super::fine::LEAST_SAMPLES;
use super::{SkewError, SkewEstimate};
use nalgebra::{SMatrix, SVector};

type Gram = SMatrix<f64, 5, 5>;
type Basis = SVector<f64, 5>;
type Normal = SMatrix<f64, 7, 7>;

/// Steps of the frequency after which the search is given up.
const STEPS: usize = 30;
/// Periods in a record below which frequency, offset and amplitude cannot be told apart.
const LEAST_PERIODS: f64 = 1.5;
/// Samples after which the running angle is computed anew.
const RESTART: usize = 64;

/// One leg's sine.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Sine {
    /// Amplitude in volts.
    pub amplitude_v: f64,
    /// Phase in radians at the record's middle, of a cosine.
    pub phase: f64,
    /// Mean level in volts.
    pub level_v: f64,
    /// Rms of what the sine does not explain, in volts.
    pub residual_v: f64,
}

/// The fit of both legs.
#[derive(Debug, Clone, PartialEq)]
pub struct SineFit {
    /// Cycles per sample, with its standard uncertainty.
    pub frequency: Estimate,
    /// The positive leg.
    pub p: Sine,
    /// The negative leg.
    pub n: Sine,
    /// τ in samples within half a period, positive when the negative leg arrives late.
    pub skew_samples: Estimate,
    /// Ratio of the amplitudes, N over P.
    pub gain: Estimate,
    /// o in volts: N's level less gain times P's.
    pub offset_v: Estimate,
    /// Covariance of skew (samples), gain and offset.
    pub covariance: [[f64; 3]; 3],
}

/// Fits one sine to both legs. The records are in volts and of one length.
///
/// # Errors
/// Unequal, short or not finite records; no line in the spectrum, fewer than one and a half periods.
pub fn fit_two_sines(p: &[f64], n: &[f64]) -> Result<SineFit, SkewError> {
    if p.len() != n.len() {
        return Err(SkewError::Lengths { p: p.len(), n: n.len() });
    }
    if p.len() < LEAST_SAMPLES {
        return Err(SkewError::TooShort { samples: p.len(), needed: LEAST_SAMPLES });
    }
    if p.iter().chain(n).any(|x| !x.is_finite()) {
        return Err(SkewError::NotFinite { what: "a sample" });
    }
    let half = p.len() as f64 / 2.0;
    let (legs, mut omega) = ([Leg::of(p), Leg::of(n)], std::f64::consts::TAU * line(p, n)?);
    for _ in 0..STEPS {
        let state = State::at(&legs, omega)?;
        let step = state.step()?;
        // Half a bin at most: farther the sine and the data lose each other's count.
        let step = step.clamp(-std::f64::consts::PI / half / 2.0, std::f64::consts::PI / half / 2.0);
        omega += step;
        let periods = omega * half / std::f64::consts::PI;
        if !(LEAST_PERIODS..=half).contains(&periods) {
            return Err(SkewError::NoSine { periods });
        }
        if (step * half).abs() < 1e-9 {
            return State::at(&legs, omega)?.fit(&legs);
        }
    }
    Err(SkewError::NoSine { periods: omega * half / std::f64::consts::PI })
}

/// `found`, or the sine fit in its place where the legs show a pure sine and its uncertainty is less.
pub(super) fn better(p: &[f64], n: &[f64], interval_s: f64, mut found: SkewEstimate) -> SkewEstimate {
    let Ok(fit) = fit_two_sines(p, n) else { return found };
    // A distorted sine leaves more than the noise; what it has beside the fundamental only the other estimate uses.
    let most = 1.1 + 8.0 / (p.len() as f64).sqrt();
    let pure = |residual: f64, noise: f64| residual * residual <= most * noise * noise;
    let period = 1.0 / fit.frequency.value;
    let whole = ((found.skew_s.value / interval_s - fit.skew_samples.value) / period).round();
    let skew = (fit.skew_samples.value + whole * period) * interval_s;
    let u = fit.skew_samples.u * interval_s;
    let agree = (skew - found.skew_s.value).abs() <= 6.0 * u.hypot(found.skew_s.u);
    let surer = u <= 1.02 * found.skew_s.u && fit.gain.u <= 1.02 * found.gain.u;
    if !(pure(fit.p.residual_v, found.noise_p_v) && pure(fit.n.residual_v, found.noise_n_v) && agree && surer) {
        return found;
    }
    found.skew_s = Estimate { value: skew, u };
    (found.gain, found.offset_v) = (fit.gain, fit.offset_v);
    let units = [interval_s, 1.0, 1.0];
    found.covariance = [0, 1, 2].map(|i| [0, 1, 2].map(|j| fit.covariance[i][j] * units[i] * units[j]));
    found.bound = [u, fit.gain.u, fit.offset_v.u];
    (found.noise_p_v, found.noise_n_v) = (fit.p.residual_v, fit.n.residual_v);
    found.residual_v = fit.n.residual_v.hypot(fit.gain.value * fit.p.residual_v);
    found.samples = p.len();
    found
}

/// The strongest line of both legs' spectra, in cycles per sample.
fn line(p: &[f64], n: &[f64]) -> Result<f64, SkewError> {
    let ((of_p, length), (of_n, _)) = (hann(p)?, hann(n)?);
    let power: Vec<f64> = of_p.iter().zip(&of_n).map(|(p, n)| p.norm_sqr() + n.norm_sqr()).collect();
    let inner = 1..power.len() - 1;
    let top = inner.fold(1, |best, k| if power[k] > power[best] { k } else { best });
    // The vertex of the parabola through the logarithms: right to a few hundredths of a bin under Hann's window.
    let [left, middle, right] = [top - 1, top, top + 1].map(|k| power[k].max(f64::MIN_POSITIVE).ln());
    let bend = left - 2.0 * middle + right;
    let vertex = if bend < 0.0 { 0.5 * (left - right) / bend } else { 0.0 };
    Ok((top as f64 + vertex) / length as f64)
}

/// One leg about its mean.
struct Leg {
    level: f64,
    about: Vec<f64>,
    power: f64,
}

impl Leg {
    fn of(signal: &[f64]) -> Self {
        let level = mean(signal);
        let about: Vec<f64> = signal.iter().map(|x| x - level).collect();
        let power = about.iter().map(|x| x * x).sum();
        Self { level, about, power }
    }
}

/// The linear fits at one frequency.
struct State {
    omega: f64,
    half: f64,
    gram: Gram,
    moments: [Basis; 2],
    /// `A`, `B` and `C` of each leg.
    sines: [[f64; 3]; 2],
    variances: [f64; 2],
}

impl State {
    fn at(legs: &[Leg; 2], omega: f64) -> Result<Self, SkewError> {
        let (gram, moments) = sums(legs, omega);
        let count = legs[0].about.len() as f64;
        let half = count / 2.0;
        let corner: SMatrix<f64, 3, 3> = gram.fixed_view::<3, 3>(0, 0).into_owned();
        let inverse = corner.try_inverse().ok_or(SkewError::NoSine { periods: omega * half / std::f64::consts::PI })?;
        let mut sines = [[0.0; 3]; 2];
        let mut variances = [0.0; 2];
        for i in 0..2 {
            let moment = moments[i].fixed_view::<3, 1>(0, 0).into_owned();
            let solved = inverse * moment;
            sines[i] = [solved[0], solved[1], solved[2]];
            let left = (legs[i].power - solved.dot(&moment)).max(1e-15 * legs[i].power);
            variances[i] = left / (count - 3.5);
        }
        Ok(Self { omega, half, gram, moments, sines, variances })
    }

    /// The normal equations of all seven parameters (A, B, C of each leg, then ω times half the length).
    fn normal(&self) -> (Normal, SVector<f64, 7>) {
        let mut matrix = Normal::zeros();
        let mut right = SVector::<f64, 7>::zeros();
        for i in 0..2 {
            let [a, b, c] = self.sines[i];
            let weight = 1.0 / self.variances[i].max(f64::MIN_POSITIVE);
            let mut turn = SMatrix::<f64, 5, 7>::zeros();
            for k in 0..3 {
                turn[(k, 3 * i + k)] = 1.0;
            }
            // d/dω of A·cos ωt + B·sin ωt = B·t·cos ωt − A·t·sin ωt, t in halves of the record.
            (turn[(3, 6)], turn[(4, 6)]) = (b, -a);
            let left = self.moments[i] - self.gram * Basis::new(a, b, c, 0.0, 0.0);
            matrix += turn.transpose() * self.gram * turn * weight;
            right += turn.transpose() * left * weight;
        }
        (matrix, right)
    }

    fn inverse(&self) -> Result<(Normal, SVector<f64, 7>), SkewError> {
        let (matrix, right) = self.normal();
        let scale = Normal::from_diagonal(&SVector::from_fn(|i, _| 1.0 / matrix[(i, i)].sqrt()));
        let inverse = (scale * matrix * scale).try_inverse().filter(|inverse| inverse.iter().all(|x| x.is_finite()));
        let periods = self.omega * self.half / std::f64::consts::PI;
        Ok((scale * inverse.ok_or(SkewError::NoSine { periods })? * scale, right))
    }

    fn step(&self) -> Result<f64, SkewError> {
        let (inverse, right) = self.inverse()?;
        Ok((inverse * right)[6] / self.half)
    }

    fn fit(&self, legs: &[Leg; 2]) -> Result<SineFit, SkewError> {
        let (covariance, _) = self.inverse()?;
        let [p, n] = [0, 1].map(|i| {
            let [a, b, c] = self.sines[i];
            let residual_v = self.variances[i].sqrt();
            Sine { amplitude_v: a.hypot(b), phase: (-b).atan2(a), level_v: legs[i].level + c, residual_v }
        });
        let turn = std::f64::consts::TAU;
        // cos(ωt + φ): a late leg has the smaller phase.
        let behind = (p.phase - n.phase + turn / 2.0).rem_euclid(turn) - turn / 2.0;
        let skew = behind / self.omega;
        let gain = n.amplitude_v / p.amplitude_v;
        let mut rows = SMatrix::<f64, 3, 7>::zeros();
        for (i, sine, sign) in [(0, p, -1.0), (1, n, 1.0)] {
            let [a, b, _] = self.sines[i];
            let r2 = sine.amplitude_v.powi(2);
            // −φ = atan2(B, A): its derivatives are −B/R² and A/R²; those of R are A/R and B/R.
            (rows[(0, 3 * i)], rows[(0, 3 * i + 1)]) = (sign * -b / r2 / self.omega, sign * a / r2 / self.omega);
            (rows[(1, 3 * i)], rows[(1, 3 * i + 1)]) = (sign * gain * a / r2, sign * gain * b / r2);
        }
        rows[(0, 6)] = -skew / self.omega / self.half;
        for k in 0..7 {
            rows[(2, k)] = -p.level_v * rows[(1, k)];
        }
        (rows[(2, 2)], rows[(2, 5)]) = (rows[(2, 2)] - gain, rows[(2, 5)] + 1.0);
        let found = rows * covariance * rows.transpose();
        let u = [0, 1, 2].map(|i| found[(i, i)].max(0.0).sqrt());
        Ok(SineFit {
            frequency: Estimate { value: self.omega / turn, u: covariance[(6, 6)].max(0.0).sqrt() / self.half / turn },
            p,
            n,
            skew_samples: Estimate { value: skew, u: u[0] },
            gain: Estimate { value: gain, u: u[1] },
            offset_v: Estimate { value: n.level_v - gain * p.level_v, u: u[2] },
            covariance: [0, 1, 2].map(|i| [0, 1, 2].map(|j| found[(i, j)])),
        })
    }
}

/// Sums over the record of the products of (cos ωt, sin ωt, 1, t·cos ωt, t·sin ωt), and of these with each leg; ω in
/// radians per sample, t from the record's middle, in halves of its length where it stands as a factor.
fn sums(legs: &[Leg; 2], omega: f64) -> (Gram, [Basis; 2]) {
    let count = legs[0].about.len();
    let half = count as f64 / 2.0;
    let middle = (count as f64 - 1.0) / 2.0;
    let (mut gram, mut moments) = (Gram::zeros(), [Basis::zeros(); 2]);
    let (turn_sin, turn_cos) = omega.sin_cos();
    let parts = legs[0].about.chunks(RESTART).zip(legs[1].about.chunks(RESTART));
    for (part, (of_p, of_n)) in parts.enumerate() {
        let first = (part * RESTART) as f64 - middle;
        let (mut sin, mut cos) = (omega * first).sin_cos();
        // Within a part: the products of cos, sin and 1 with powers of the local time.
        let (mut own, mut of) = (Gram::zeros(), [Basis::zeros(); 2]);
        for (i, (p, n)) in of_p.iter().zip(of_n).enumerate() {
            let t = (first + i as f64) / half;
            let basis = Basis::new(cos, sin, 1.0, t * cos, t * sin);
            own += basis * basis.transpose();
            of[0] += basis * *p;
            of[1] += basis * *n;
            (cos, sin) = (cos * turn_cos - sin * turn_sin, sin * turn_cos + cos * turn_sin);
        }
        gram += own;
        moments[0] += of[0];
        moments[1] += of[1];
    }
    (gram, moments)
}

#[cfg(test)]
mod tests;
