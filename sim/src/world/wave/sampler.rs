//! A wave made ready for reading: cut into segments between its events, every segment one straight line plus modes.
//!
//! Reading a record at a steady interval costs one complex product per living mode and sample: `e^(−p·Δt)` is the same
//! for every step, a mode that has died away is left out, and every segment starts afresh from the exact value, so that
//! rounding does not pile up.

use std::f64::consts::TAU;

use super::{Mode, Tone, Wave};
use crate::world::complex::Complex;

/// A mode below this voltage is left out; the finest converter step of any scope is a billion times larger.
const DEAD_V: f64 = 1e-15;

/// Instants closer than this fraction of a period are one instant.
const SAME: f64 = 1e-12;

/// The samples after which a tone is computed afresh.
const TONE_RUN: usize = 1024;

/// A wave between two events.
#[derive(Debug, Clone)]
struct Segment {
    /// Seconds after the origin.
    start_s: f64,
    end_s: f64,
    level_v: f64,
    slope_v_per_s: f64,
    /// With the values they have at `start_s`.
    modes: Vec<Mode>,
}

/// Reads a wave at any instants.
#[derive(Debug, Clone)]
pub(crate) struct Sampler {
    period_s: f64,
    origin_s: f64,
    segments: Vec<Segment>,
    tones: Vec<Tone>,
}

impl Sampler {
    /// Cuts `wave` into segments.
    pub(crate) fn new(wave: &Wave) -> Self {
        let period_s = wave.period_s;
        let same_s = SAME * period_s;
        let origin_s = wave.events.iter().map(|event| event.at_s).reduce(f64::min).unwrap_or(0.0);
        let phase = |at_s: f64| {
            let phase = (at_s - origin_s).rem_euclid(period_s);
            if period_s - phase < same_s { 0.0 } else { phase }
        };
        let mut starts: Vec<f64> = wave.events.iter().map(|event| phase(event.at_s)).collect();
        starts.push(0.0);
        starts.sort_by(f64::total_cmp);
        starts.dedup_by(|later, earlier| *later - *earlier < same_s);

        let segment = |(i, &start_s): (usize, &f64)| {
            let end_s = starts.get(i + 1).copied().unwrap_or(period_s);
            let mut segment = Segment { start_s, end_s, level_v: wave.base_v, slope_v_per_s: 0.0, modes: Vec::new() };
            for event in &wave.events {
                // The group of this period and, where it has not ended yet, of the one before.
                for since_s in [start_s - (event.at_s - origin_s), start_s - (event.at_s - origin_s) + period_s] {
                    if since_s > -same_s {
                        segment.slope_v_per_s += event.slope_v_per_s;
                        segment.level_v += event.jump_v + event.slope_v_per_s * since_s;
                        let lasting = |mode: &&Mode| mode.pole.re == 0.0;
                        event.modes.iter().filter(lasting).for_each(|mode| segment.add(*mode, since_s));
                    }
                }
                // Of a damped mode all the periods before, as a geometric series.
                let mut since_s = (start_s - phase(event.at_s)).rem_euclid(period_s);
                if period_s - since_s < same_s {
                    since_s = 0.0;
                }
                for mode in event.modes.iter().filter(|mode| mode.pole.re > 0.0) {
                    let all = Complex::real(1.0) - (-mode.pole * period_s).exp();
                    segment.add(Mode { pole: mode.pole, coefficient: mode.coefficient / all }, since_s);
                }
            }
            segment
        };
        let segments = starts.iter().enumerate().map(segment).collect();
        Self { period_s, origin_s, segments, tones: wave.tones.clone() }
    }

    /// Seconds after which the wave repeats.
    pub(crate) const fn period_s(&self) -> f64 {
        self.period_s
    }

    /// The voltage at one instant.
    pub(crate) fn at(&self, time_s: f64) -> f64 {
        let (segment, into_s) = self.place(time_s);
        let tones: f64 = self.tones.iter().map(|tone| tone.at(time_s).re).sum();
        segment.at(into_s) + tones
    }

    /// Fills `record` with the voltages at `start_s + i·interval_s`.
    pub(crate) fn read(&self, start_s: f64, interval_s: f64, record: &mut [f64]) {
        let mut done = 0;
        while let Some(rest) = record.get_mut(done..)
            && !rest.is_empty()
        {
            let (segment, into_s) = self.place(start_s + done as f64 * interval_s);
            let left = (segment.end_s - segment.start_s - into_s) / interval_s;
            // At least one, also where rounding puts the instant on the segment's very end.
            let count = (left.ceil().max(1.0) as usize).min(rest.len());
            if let Some(run) = rest.get_mut(..count) {
                segment.read(into_s, interval_s, run);
            }
            done += count;
        }
        for tone in &self.tones {
            let step = Complex::new(0.0, TAU * tone.frequency_hz * interval_s).exp();
            for (block, run) in record.chunks_mut(TONE_RUN).enumerate() {
                let mut value = tone.at(start_s + (block * TONE_RUN) as f64 * interval_s);
                for sample in run {
                    *sample += value.re;
                    value = value * step;
                }
            }
        }
    }

    /// Instants of one period, in order, that miss no feature of the wave: between two of them it is nearly straight.
    pub(crate) fn grid(&self) -> Vec<f64> {
        const STEPS: f64 = 64.0;
        let highest_hz = self.tones.iter().map(|tone| tone.frequency_hz).fold(0.0, f64::max);
        let mut grid = Vec::new();
        for segment in &self.segments {
            let length_s = segment.end_s - segment.start_s;
            let ring_hz = segment.modes.iter().map(|mode| mode.pole.im.abs() / TAU).fold(highest_hz, f64::max);
            let steps = (STEPS + STEPS * ring_hz * length_s).min(1e5) as usize;
            let instant = |i: usize| self.origin_s + segment.start_s + length_s * i as f64 / steps as f64;
            grid.extend((0..steps).map(instant));
        }
        grid
    }

    /// The mean over a period.
    pub(crate) fn mean(&self) -> f64 {
        let area = |segment: &Segment| {
            let length_s = segment.end_s - segment.start_s;
            let line = segment.level_v * length_s + 0.5 * segment.slope_v_per_s * length_s * length_s;
            let left = |mode: &Mode| Complex::real(1.0) - (-mode.pole * length_s).exp();
            line + segment.modes.iter().map(|mode| (mode.coefficient * left(mode) / mode.pole).re).sum::<f64>()
        };
        self.segments.iter().map(area).sum::<f64>() / self.period_s
    }

    /// The segment that holds an instant, and the seconds since it began.
    fn place(&self, time_s: f64) -> (&Segment, f64) {
        let phase_s = (time_s - self.origin_s).rem_euclid(self.period_s);
        let index = self.segments.partition_point(|segment| segment.start_s <= phase_s).saturating_sub(1);
        // There is always a segment that begins at nought (see `new`).
        let segment = &self.segments[index];
        (segment, phase_s - segment.start_s)
    }
}

impl Segment {
    /// Adds a mode that began `since_s` before this segment.
    fn add(&mut self, mode: Mode, since_s: f64) {
        let now = mode.coefficient * (-mode.pole * since_s).exp();
        match self.modes.iter_mut().find(|known| known.pole == mode.pole) {
            Some(known) => known.coefficient = known.coefficient + now,
            None => self.modes.push(Mode { pole: mode.pole, coefficient: now }),
        }
    }

    fn at(&self, into_s: f64) -> f64 {
        let mode = |mode: &Mode| (mode.coefficient * (-mode.pole * into_s).exp()).re;
        self.level_v + self.slope_v_per_s * into_s + self.modes.iter().map(mode).sum::<f64>()
    }

    fn read(&self, into_s: f64, interval_s: f64, run: &mut [f64]) {
        for (i, sample) in run.iter_mut().enumerate() {
            *sample = self.level_v + self.slope_v_per_s * (into_s + i as f64 * interval_s);
        }
        for mode in &self.modes {
            let mut value = mode.coefficient * (-mode.pole * into_s).exp();
            let size = value.abs();
            if size < DEAD_V {
                continue;
            }
            let step = (-mode.pole * interval_s).exp();
            let life = ((size / DEAD_V).ln() / (mode.pole.re * interval_s)).min(1e12);
            for sample in run.iter_mut().take(life as usize + 1) {
                *sample += value.re;
                value = value * step;
            }
        }
    }
}

impl Tone {
    /// The tone's phasor at an instant.
    fn at(&self, time_s: f64) -> Complex {
        self.amplitude * Complex::new(0.0, TAU * self.frequency_hz * time_s).exp()
    }
}
