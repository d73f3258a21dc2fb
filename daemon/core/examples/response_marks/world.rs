//! Two legs of unequal bandwidth, one of them badly trimmed, on a square wave; everything in closed form.
//!
//! Each leg is `g·e^{−jωd}·(1 + jωT(1 + ε))/(1 + jωT)/(1 + jωc)`. An edge of the node is an error function of 1.5 ns
//! (10–90 %), so a leg's answer to it is a sum of one exponential per pole, smoothed by a Gaussian. Voltages are in
//! converter steps.

use statrs::function::erf::erfc;

/// One leg.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Leg {
    pub(crate) gain: f64,
    pub(crate) delay_s: f64,
    /// −3 dB frequency of its one pole.
    pub(crate) bandwidth_hz: f64,
    /// T and ε of its low-frequency error.
    pub(crate) trim: Option<(f64, f64)>,
}

/// The node that both tips are on: a symmetric square wave.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Square {
    pub(crate) amplitude: f64,
    pub(crate) period_s: f64,
    /// Time of a rising edge.
    pub(crate) edge_s: f64,
    /// Standard deviation of the edge's Gaussian.
    pub(crate) sigma_s: f64,
}

impl Leg {
    fn pole_s(&self) -> f64 {
        1.0 / (std::f64::consts::TAU * self.bandwidth_hz)
    }

    /// Weights and time constants of the exponentials in its step response, `1 − Σ w·e^{−t/c}`.
    fn exponentials(&self) -> Vec<(f64, f64)> {
        let fast = self.pole_s();
        match self.trim {
            None => vec![(1.0, fast)],
            Some((slow, relative)) => {
                let zero = slow * (1.0 + relative);
                vec![((1.0 - zero / fast) / (1.0 - slow / fast), fast), (-relative / (1.0 - fast / slow), slow)]
            }
        }
    }

    /// Real and imaginary part of its response at a frequency.
    pub(crate) fn response(&self, frequency_hz: f64) -> (f64, f64) {
        let w = std::f64::consts::TAU * frequency_hz;
        let (mut size, mut angle) = (self.gain, -w * self.delay_s);
        let mut pole = |c: f64, power: f64| {
            size *= (1.0 + (w * c).powi(2)).powf(0.5 * power);
            angle += power * (w * c).atan();
        };
        pole(self.pole_s(), -1.0);
        if let Some((slow, relative)) = self.trim {
            pole(slow, -1.0);
            pole(slow * (1.0 + relative), 1.0);
        }
        (size * angle.cos(), size * angle.sin())
    }

    /// Its record of `points` samples, without noise.
    pub(crate) fn record(&self, node: &Square, points: usize, interval_s: f64) -> Vec<f64> {
        let half = 0.5 * node.period_s;
        let poles = self.exponentials();
        // Sum over all earlier edges, alternating in sign, of an exponential: in closed form.
        let past: Vec<f64> = poles.iter().map(|(_, c)| 1.0 / (1.0 + (-half / c).exp())).collect();
        (0..points)
            .map(|i| {
                let t = i as f64 * interval_s - self.delay_s - node.edge_s;
                let nearest = (t / half).floor();
                let up = nearest.rem_euclid(2.0) < 0.5;
                let since = t - nearest * half;
                let sign = if up { 1.0 } else { -1.0 };
                // ±1 before, between and after; each edge is a step of ±2 that is smoothed near its middle.
                let mut value = sign;
                for ((weight, c), past) in poles.iter().zip(&past) {
                    value -= sign * 2.0 * weight * (-since / c).exp() * past;
                }
                value += sign * (edge(&poles, since, node.sigma_s) - sharp(&poles, since));
                value -= sign * (edge(&poles, since - half, node.sigma_s) - sharp(&poles, since - half));
                self.gain * node.amplitude * value
            })
            .collect()
    }
}

/// The answer to an infinitely fast step of 2 at time 0.
fn sharp(poles: &[(f64, f64)], t: f64) -> f64 {
    if t < 0.0 {
        return 0.0;
    }
    2.0 - poles.iter().map(|(weight, c)| 2.0 * weight * (-t / c).exp()).sum::<f64>()
}

/// The answer to a step of 2 with an error-function edge: the step and each exponential, convolved with a Gaussian.
fn edge(poles: &[(f64, f64)], t: f64, sigma_s: f64) -> f64 {
    if t < -12.0 * sigma_s {
        return 0.0;
    }
    let phi = |x: f64| 0.5 * erfc(-x / std::f64::consts::SQRT_2);
    let exponential = |c: f64| {
        let smooth = sigma_s / c;
        (0.5 * smooth * smooth - t / c).exp() * phi(t / sigma_s - smooth)
    };
    2.0 * phi(t / sigma_s) - poles.iter().map(|(weight, c)| 2.0 * weight * exponential(*c)).sum::<f64>()
}

/// A smooth non-linearity of `size` steps at most over a converter of 256.
pub(crate) fn bend(size: f64, value: f64, cycles: f64, phase: f64) -> f64 {
    size * (std::f64::consts::TAU * cycles * value / 256.0 + phase).sin()
}

/// What is done to the negative leg, in plain numbers.
#[derive(Debug, Clone, Default)]
pub(crate) struct Done {
    pub(crate) skew_s: f64,
    pub(crate) gain: f64,
    pub(crate) interval_s: f64,
    pub(crate) taps: Vec<f64>,
    /// T and ε.
    pub(crate) pole_zero: Option<(f64, f64)>,
}

/// Rejection of two true legs with a correction, in dB: `|(A + E·B)/2|/|A − E·B|`.
pub(crate) fn rejection_db(positive: &Leg, negative: &Leg, done: &Done, frequency_hz: f64) -> f64 {
    let turn = |(re, im): (f64, f64), angle: f64| {
        let (sin, cos) = angle.sin_cos();
        (re * cos - im * sin, re * sin + im * cos)
    };
    let (a, b) = (positive.response(frequency_hz), negative.response(frequency_hz));
    let w = std::f64::consts::TAU * frequency_hz;
    let y = turn(b, w * done.skew_s);
    let middle = 0.5 * (done.taps.len() as f64 - 1.0);
    let mut e = (0.0, 0.0);
    for (m, tap) in done.taps.iter().enumerate() {
        let (sin, cos) = (w * done.interval_s * (m as f64 - middle)).sin_cos();
        e = (e.0 + tap * cos, e.1 + tap * sin);
    }
    if let Some((slow, relative)) = done.pole_zero {
        let x = w * slow * (1.0 + relative);
        let size = relative * done.taps.iter().sum::<f64>() / (1.0 + x * x);
        e = (e.0 + size, e.1 - size * x);
    }
    let y = ((y.0 * e.0 - y.1 * e.1) / done.gain, (y.0 * e.1 + y.1 * e.0) / done.gain);
    let common = 0.5 * f64::hypot(a.0 + y.0, a.1 + y.1);
    20.0 * (common / f64::hypot(a.0 - y.0, a.1 - y.1)).log10()
}
