//! What plain subtraction would have given: the same figures, values only.

use super::super::levels::Levels;
use super::super::signal::{Signal, mean_and_square};
use super::shape::{Layout, Reading, Shape};
use super::sums::without_noise;
use super::{FigureInput, FigureKind};

/// The figures of plain subtraction, values only.
pub(super) struct Plain {
    points: usize,
    mean: f64,
    rms: f64,
    interval_s: f64,
    layout: Layout,
    shape: Shape,
}

impl Plain {
    pub(super) fn of(input: &FigureInput<'_>) -> Option<Self> {
        let signal = input.plain_v?;
        let noise_v = input.noise_p_v.hypot(input.noise_n_v);
        let layout = Layout::of(signal, noise_v);
        let shape = layout.read(signal, noise_v, layout.between());
        let (mean, square) = mean_and_square(signal);
        let points = signal.points();
        let rms = without_noise(square, points, noise_v).0;
        Some(Self { points, mean, rms, interval_s: input.corrected.interval_s, layout, shape })
    }

    pub(super) fn figure(&self, kind: FigureKind) -> Option<f64> {
        let value = |reading: &Reading| reading.as_ref().ok().map(|r| r.value);
        let time = |reading: &Reading| value(reading).map(|v| v * self.interval_s);
        let levels = self.layout.levels.as_ref().ok();
        match kind {
            FigureKind::Mean => Some(self.mean),
            FigureKind::Area => Some(self.mean * self.points as f64 * self.interval_s),
            FigureKind::Rms => Some(self.rms),
            FigureKind::HighLevel => levels.map(|l| l.high.value),
            FigureKind::LowLevel => levels.map(|l| l.low.value),
            FigureKind::Amplitude => levels.map(Levels::amplitude),
            FigureKind::Maximum => Some(self.shape.maximum.value),
            FigureKind::Minimum => Some(self.shape.minimum.value),
            FigureKind::PeakToPeak => Some(self.shape.maximum.value - self.shape.minimum.value),
            FigureKind::Overshoot => value(&self.shape.overshoot),
            FigureKind::Undershoot => value(&self.shape.undershoot),
            FigureKind::RiseTime => time(&self.shape.rise),
            FigureKind::FallTime => time(&self.shape.fall),
            FigureKind::Period => time(&self.shape.period),
            FigureKind::Frequency => time(&self.shape.period).map(|p| 1.0 / p),
            FigureKind::Duty => value(&self.shape.duty),
            FigureKind::RiseSlew => time(&self.shape.rise).map(|t| 0.8 * self.shape.amplitude / t),
            FigureKind::FallSlew => time(&self.shape.fall).map(|t| 0.8 * self.shape.amplitude / t),
            FigureKind::CommonRms
            | FigureKind::CommonSlew
            | FigureKind::CommonSwing
            | FigureKind::Jitter
            | FigureKind::PreAberration
            | FigureKind::SettlingTime
            | FigureKind::Thd
            | FigureKind::TimeAbove
            | FigureKind::TimeBelow => None,
        }
    }
}
