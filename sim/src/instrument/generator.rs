//! The generator: two outputs behind 50 Ohm. What it can do, without any header.

use std::sync::Arc;

use super::bench::{Bench, lock};
use super::tree::{Model, Number, Place, Word, number};
use crate::message::{Limits, Quantity};
use crate::scenario::Setting;
use crate::world::{Controls, Shape};

/// Outputs of the generator.
pub(crate) const OUTPUTS: usize = 2;

/// Hertz.
pub(crate) const FREQUENCY: Limits = Limits { min: 1e-3, max: 50e6, default: 1e3 };
/// Peak to peak, open circuit.
pub(crate) const AMPLITUDE: Limits = Limits { min: 0.0, max: 20.0, default: 1.0 };
/// Volts.
pub(crate) const OFFSET: Limits = Limits { min: -10.0, max: 10.0, default: 0.0 };
/// Percent.
const DUTY: Limits = Limits { min: 0.1, max: 99.9, default: 50.0 };
/// 10-90 % edge time in seconds.
const EDGE: Limits = Limits { min: 1e-9, max: 1e-3, default: 10e-9 };

/// The shapes in the order in which their keywords are given.
const SHAPES: [Shape; 5] = [Shape::Dc, Shape::Multitone, Shape::Pulse, Shape::Sine, Shape::Square];

/// The generator on a bench; its settings are the bench's controls.
pub(crate) struct Generator {
    bench: Arc<Bench>,
}

impl Generator {
    /// A generator on `bench`.
    pub(crate) fn new(bench: Arc<Bench>) -> Self {
        Self { bench }
    }
}

impl Model for Generator {
    type Settings = Controls;

    fn with<R>(&self, act: impl FnOnce(&mut Controls) -> R) -> R {
        act(&mut lock(&self.bench.controls))
    }

    fn changed(&self) {
        self.bench.touch();
    }

    fn reset(&self) {
        self.with(|controls| {
            for output in &mut controls.generator {
                output.on = false;
                output.shape = Shape::Sine;
                output.frequency_hz = FREQUENCY.default;
                output.amplitude_vpp = AMPLITUDE.default;
                output.offset_v = OFFSET.default;
                output.duty = DUTY.default / 100.0;
                output.edge_s = EDGE.default;
            }
        });
        self.changed();
    }
}

/// The waveform; the keywords stand for constant, multitone, pulse, sine and square in this order.
pub(crate) fn shape(forms: &'static [&'static str; 5]) -> Word<Generator> {
    Word {
        forms,
        count: OUTPUTS,
        read: |controls: &Controls, output| {
            SHAPES.iter().position(|shape| *shape == controls.generator[output].shape).unwrap_or_default()
        },
        write: |controls: &mut Controls, output, place| controls.generator[output].shape = SHAPES[place],
    }
}

/// In hertz.
pub(crate) fn frequency() -> Number<Generator> {
    let place: fn(&mut Controls, usize) -> &mut f64 = |all, output| &mut all.generator[output].frequency_hz;
    Number { clamp: Some(Setting::Frequency), ..number(Quantity::Hertz, &[FREQUENCY], OUTPUTS, place) }
}

/// Peak to peak without a load.
pub(crate) fn amplitude() -> Number<Generator> {
    let place: fn(&mut Controls, usize) -> &mut f64 = |all, output| &mut all.generator[output].amplitude_vpp;
    Number { clamp: Some(Setting::Amplitude), ..number(Quantity::Volt, &[AMPLITUDE], OUTPUTS, place) }
}

/// The middle between the peaks.
pub(crate) fn offset() -> Number<Generator> {
    number(Quantity::Volt, &[OFFSET], OUTPUTS, |all: &mut Controls, output| &mut all.generator[output].offset_v)
}

/// High part of a pulse's period, told in percent.
pub(crate) fn duty() -> Number<Generator> {
    let place: fn(&mut Controls, usize) -> &mut f64 = |all, output| &mut all.generator[output].duty;
    Number {
        shown: |fraction| fraction * 100.0,
        meant: |percent| percent / 100.0,
        ..number(Quantity::Percent, &[DUTY], OUTPUTS, place)
    }
}

/// 10-90 % time of the edges.
pub(crate) fn edge() -> Number<Generator> {
    number(Quantity::Second, &[EDGE], OUTPUTS, |all: &mut Controls, output| &mut all.generator[output].edge_s)
}

/// Whether the output is connected.
pub(crate) fn state() -> Place<Generator, bool> {
    Place { count: OUTPUTS, of: |all: &mut Controls, output| &mut all.generator[output].on }
}
