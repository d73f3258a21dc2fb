//! A periodic voltage in closed form, and what linear networks make of it.
//!
//! A wave is a constant, plus tones, plus a group of *events* that repeats every period. An event at the time `t₀`
//! adds, from then on, `jump + slope·(t − t₀) + Re Σ c·e^(−p·(t − t₀))`. The events of one group together bring the
//! jumps and slopes back to nought, and so they do with the undamped modes (`Re p = 0`); damped modes ring on, and
//! the periodic steady state sums them over all earlier periods as a geometric series.
//!
//! A one-pole low-pass turns an event into an event (partial fractions of its Laplace transform, worked out in
//! [`Wave::low_pass`]), so that the wave behind any chain of one-pole networks is known at every instant exactly: there
//! is no grid on which it would have been computed and from which it would have to be interpolated.

mod sampler;
#[cfg(test)]
mod tests;

pub(crate) use sampler::Sampler;

use std::f64::consts::TAU;

use super::complex::Complex;

/// A one-pole network whose pole lies nearer to a mode's than this (relative) is moved away by twice as much: partial
/// fractions of a double pole would need another kind of term, and a millionth of a time constant cannot be seen.
const POLE_GAP: f64 = 1e-6;

/// `Re(coefficient · e^(−pole·t))`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Mode {
    /// In 1/s; the real part is the rate of decay and not negative.
    pub(crate) pole: Complex,
    /// In volts.
    pub(crate) coefficient: Complex,
}

/// What one instant adds to all later ones.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Event {
    /// When, in seconds of the period.
    pub(crate) at_s: f64,
    /// Volts added at once.
    pub(crate) jump_v: f64,
    /// Change of slope in V/s.
    pub(crate) slope_v_per_s: f64,
    /// What rings or decays.
    pub(crate) modes: Vec<Mode>,
}

/// `Re(amplitude · e^(j·2π·frequency·t))`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Tone {
    /// In hertz; a whole multiple of 1/period.
    pub(crate) frequency_hz: f64,
    /// In volts, peak.
    pub(crate) amplitude: Complex,
}

/// A periodic voltage.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Wave {
    period_s: f64,
    base_v: f64,
    events: Vec<Event>,
    tones: Vec<Tone>,
}

impl Wave {
    /// A constant voltage; the period only says how soon it counts as repeated.
    pub(crate) const fn constant(level_v: f64, period_s: f64) -> Self {
        Self { period_s, base_v: level_v, events: Vec::new(), tones: Vec::new() }
    }

    /// The sum of a constant and tones.
    pub(crate) const fn tones(period_s: f64, level_v: f64, tones: Vec<Tone>) -> Self {
        Self { period_s, base_v: level_v, events: Vec::new(), tones }
    }

    /// Straight lines through `corners` (time in seconds rising strictly, volts), and on to the first of them one
    /// period later.
    pub(crate) fn polyline(period_s: f64, corners: &[(f64, f64)]) -> Self {
        let Some(&(start_s, base_v)) = corners.first() else { return Self::constant(0.0, period_s) };
        let mut wave = Self::constant(base_v, period_s);
        let mut slope = 0.0;
        for (i, &(at_s, level_v)) in corners.iter().enumerate() {
            let (next_s, next_v) = corners.get(i + 1).copied().unwrap_or((start_s + period_s, base_v));
            let next_slope = (next_v - level_v) / (next_s - at_s);
            wave.events.push(Event { at_s, jump_v: 0.0, slope_v_per_s: next_slope - slope, modes: Vec::new() });
            slope = next_slope;
        }
        wave.events.push(Event { at_s: start_s + period_s, jump_v: 0.0, slope_v_per_s: -slope, modes: Vec::new() });
        wave
    }

    /// Adds an event. All events of a group lie within two periods of the first.
    pub(crate) fn push(&mut self, event: Event) {
        self.events.push(event);
    }

    /// True when nothing ever changes.
    pub(crate) const fn is_constant(&self) -> bool {
        self.events.is_empty() && self.tones.is_empty()
    }

    /// The sum with a wave of the same period.
    #[must_use]
    pub(crate) fn plus(mut self, other: &Self) -> Self {
        if self.is_constant() {
            self.period_s = other.period_s;
        }
        self.base_v += other.base_v;
        self.events.extend_from_slice(&other.events);
        self.tones.extend_from_slice(&other.tones);
        self
    }

    /// Every voltage times `factor`.
    #[must_use]
    pub(crate) fn times(mut self, factor: f64) -> Self {
        self.base_v *= factor;
        for event in &mut self.events {
            event.jump_v *= factor;
            event.slope_v_per_s *= factor;
            event.modes.iter_mut().for_each(|mode| mode.coefficient = mode.coefficient * factor);
        }
        self.tones.iter_mut().for_each(|tone| tone.amplitude = tone.amplitude * factor);
        self
    }

    /// Behind the one-pole low-pass `1/(1 + s·T)`, `T` in seconds; nought leaves the wave as it is.
    ///
    /// With `q = 1/T`: `1/s → 1/s − 1/(s+q)`, `1/s² → 1/s² − (1/q)/s + (1/q)/(s+q)` and
    /// `1/(s+p) → q/(q−p)·(1/(s+p) − 1/(s+q))`.
    #[must_use]
    pub(crate) fn low_pass(mut self, time_constant_s: f64) -> Self {
        if time_constant_s <= 0.0 {
            return self;
        }
        let mut q = 1.0 / time_constant_s;
        let near = |q: f64| {
            let near = |mode: &Mode| (mode.pole - Complex::real(q)).abs() < POLE_GAP * q;
            self.events.iter().any(|event| event.modes.iter().any(near))
        };
        while near(q) {
            q *= 1.0 + 2.0 * POLE_GAP;
        }
        for event in &mut self.events {
            let mut own = event.slope_v_per_s / q - event.jump_v;
            event.jump_v -= event.slope_v_per_s / q;
            for mode in &mut event.modes {
                mode.coefficient = mode.coefficient * q / (Complex::real(q) - mode.pole);
                own -= mode.coefficient.re;
            }
            event.modes.push(Mode { pole: Complex::real(q), coefficient: Complex::real(own) });
        }
        for tone in &mut self.tones {
            tone.amplitude = tone.amplitude / Complex::new(1.0, TAU * tone.frequency_hz / q);
        }
        self
    }

    /// Behind `(1 + s·T·(1+e))/(1 + s·T)`: a divider whose two halves are not of quite the same time constant. Slow
    /// signals pass as they are, fast ones are larger by the fraction `e`.
    #[must_use]
    pub(crate) fn pole_zero(self, time_constant_s: f64, error: f64) -> Self {
        if error == 0.0 {
            return self;
        }
        // (1 + sT(1+e))/(1 + sT) = (1 + e) − e/(1 + sT)
        let slow = self.clone().low_pass(time_constant_s).times(-error);
        let mut sum = self.times(1.0 + error);
        sum.base_v += slow.base_v;
        sum.tones.iter_mut().zip(&slow.tones).for_each(|(a, b)| a.amplitude = a.amplitude + b.amplitude);
        for (event, add) in sum.events.iter_mut().zip(slow.events) {
            event.jump_v += add.jump_v;
            event.slope_v_per_s += add.slope_v_per_s;
            event.modes.extend(add.modes);
        }
        sum
    }

    /// The mean voltage, which low-passes of unit gain leave alone.
    pub(crate) fn mean(&self) -> f64 {
        Sampler::new(self).mean()
    }
}
