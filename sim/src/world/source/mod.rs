//! The generator's waveforms without a load, and what a source resistance and a load make of any wave.

#[cfg(test)]
mod tests;

use std::f64::consts::{FRAC_PI_2, PI};

use super::complex::Complex;
use super::controls::{Shape, SourceOutput};
use super::wave::{Sampler, Tone, Wave};

/// A linear edge takes this many times its 10–90 % time.
pub(crate) const WHOLE_EDGE: f64 = 1.0 / 0.8;

/// The steepest duty and edge that a period can hold: each edge ends before the next begins.
const EDGE_ROOM: f64 = 0.99;

/// What hangs on a node: resistance and capacitance to earth.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Load {
    /// In siemens, so that no load at all is nought.
    pub(crate) conductance_s: f64,
    /// In farads.
    pub(crate) capacitance_f: f64,
}

impl Load {
    /// Nothing.
    pub(crate) const NONE: Self = Self { conductance_s: 0.0, capacitance_f: 0.0 };

    /// Both together.
    #[must_use]
    pub(crate) fn with(self, resistance_ohm: f64, capacitance_f: f64) -> Self {
        Self {
            conductance_s: self.conductance_s + 1.0 / resistance_ohm,
            capacitance_f: self.capacitance_f + capacitance_f,
        }
    }

    /// `wave` behind `source_ohm` with this load: a divider, and one pole by the parallel resistance and `C`.
    pub(crate) fn on(self, wave: Wave, source_ohm: f64) -> Wave {
        let share = 1.0 / (1.0 + source_ohm * self.conductance_s);
        wave.times(share).low_pass(source_ohm * share * self.capacitance_f)
    }
}

/// What an output gives without a load; nought when it is off. The sync edge is at the time 0 of its period: there a
/// square and a pulse begin to rise, and a sine rises through its middle.
pub(crate) fn open_circuit(output: &SourceOutput, tones: u32) -> Wave {
    let period_s = 1.0 / output.frequency_hz;
    if !output.on {
        return Wave::constant(0.0, period_s);
    }
    let half_v = output.amplitude_vpp / 2.0;
    match output.shape {
        Shape::Dc => Wave::constant(output.offset_v, period_s),
        Shape::Multitone => multitone(output, tones),
        Shape::Pulse | Shape::Square => {
            let high_s = high_s(output);
            let room_s = EDGE_ROOM * high_s.min(period_s - high_s);
            let edge_s = (output.edge_s * WHOLE_EDGE).clamp(1e-6 * room_s, room_s);
            let (low_v, high_v) = (output.offset_v - half_v, output.offset_v + half_v);
            let corners = [(0.0, low_v), (edge_s, high_v), (high_s, high_v), (high_s + edge_s, low_v)];
            Wave::polyline(period_s, &corners)
        }
        Shape::Sine => {
            let tone = Tone { frequency_hz: output.frequency_hz, amplitude: Complex::new(0.0, -half_v) };
            Wave::tones(period_s, output.offset_v, vec![tone])
        }
    }
}

/// From the sync edge to the falling edge, in seconds.
pub(crate) fn high_s(output: &SourceOutput) -> f64 {
    let duty = if output.shape == Shape::Pulse { output.duty.clamp(1e-3, 1.0 - 1e-3) } else { 0.5 };
    duty / output.frequency_hz
}

/// Equal tones whose phases grow with the square of their number, which keeps the peaks low (Schroeder, IEEE Trans.
/// Inf. Theory 16, 1970, eq. for equal amplitudes; from memory); the largest peak to peak is the amplitude.
fn multitone(output: &SourceOutput, count: u32) -> Wave {
    const GRID_PER_TONE: u32 = 32;
    let period_s = 1.0 / output.frequency_hz;
    let tone = |k: u32| {
        let phase = FRAC_PI_2 + PI * f64::from(k) * f64::from(k - 1) / f64::from(count);
        Tone { frequency_hz: f64::from(k) * output.frequency_hz, amplitude: Complex::new(0.0, -phase).exp() }
    };
    let wave = Wave::tones(period_s, 0.0, (1..=count).map(tone).collect());
    let mut grid = vec![0.0; (count * GRID_PER_TONE) as usize];
    Sampler::new(&wave).read(0.0, period_s / grid.len() as f64, &mut grid);
    let (low, high) = grid.iter().fold((f64::MAX, f64::MIN), |(low, high), &v| (low.min(v), high.max(v)));
    wave.times(output.amplitude_vpp / (high - low)).plus(&Wave::constant(output.offset_v, period_s))
}
