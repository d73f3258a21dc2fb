//! The generator: two outputs behind 50 Ohm. Headers after SCPI-99's signal source class.

use std::sync::Arc;

use super::bench::Bench;
use super::outputs::{self, Outputs};
use super::tree::{Action, Call, Model, Number, Word, number};
use crate::message::{Limits, Quantity};
use crate::status::Fault;
use crate::world::{Controls, Shape};

/// Outputs of the generator; their level is the amplitude.
const OUTPUTS: usize = 2;
const OUTPUT: Outputs = Outputs {
    count: OUTPUTS,
    level: &[AMPLITUDE],
    level_v: |all, output| &mut all.generator[output].amplitude_vpp,
    on: |all, output| &mut all.generator[output].on,
};

const FREQUENCY: Limits = Limits { min: 1e-3, max: 50e6, default: 1e3 };
/// Peak to peak, open circuit.
const AMPLITUDE: Limits = Limits { min: 0.0, max: 20.0, default: 1.0 };
const OFFSET: Limits = Limits { min: -10.0, max: 10.0, default: 0.0 };
/// Percent.
const DUTY: Limits = Limits { min: 0.1, max: 99.9, default: 50.0 };
/// 10-90 % edge time in seconds.
const EDGE: Limits = Limits { min: 1e-9, max: 1e-3, default: 10e-9 };

/// `SOURce:FUNCtion` keywords with the shapes they stand for.
const FORMS: [&str; 5] = ["DC", "MTONe", "PULSe", "SINusoid", "SQUare"];
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
        outputs::with(&self.bench, act)
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

    fn commands() -> Vec<(&'static str, Action<Self>)> {
        let shape = Word {
            forms: &FORMS,
            count: OUTPUTS,
            read: |controls: &Controls, output| {
                SHAPES.iter().position(|shape| *shape == controls.generator[output].shape).unwrap_or_default()
            },
            write: |controls: &mut Controls, output, place| controls.generator[output].shape = SHAPES[place],
        };
        let frequency = number(Quantity::Hertz, &[FREQUENCY], OUTPUTS, |all: &mut Controls, output| {
            &mut all.generator[output].frequency_hz
        });
        let offset = number(Quantity::Volt, &[OFFSET], OUTPUTS, |all: &mut Controls, output| {
            &mut all.generator[output].offset_v
        });
        let duty = Number {
            scale: 100.0,
            ..number(Quantity::Percent, &[DUTY], OUTPUTS, |all: &mut Controls, output| &mut all.generator[output].duty)
        };
        let edge =
            number(Quantity::Second, &[EDGE], OUTPUTS, |all: &mut Controls, output| &mut all.generator[output].edge_s);
        OUTPUT.headers(vec![
            ("[:SOURce#]:FUNCtion[:SHAPe]", Action::Word(shape)),
            ("[:SOURce#]:FREQuency[:CW]", Action::Number(frequency)),
            ("[:SOURce#]:VOLTage[:LEVel][:IMMediate]:OFFSet", Action::Number(offset)),
            ("[:SOURce#]:PULSe:DCYCle", Action::Number(duty)),
            ("[:SOURce#]:PULSe:TRANsition", Action::Number(edge)),
            (":OUTPut#:IMPedance", Action::Query(impedance)),
        ])
    }
}

fn impedance(_: &Generator, call: &mut Call<'_>) -> Result<(), Fault> {
    OUTPUT.asked(call)?;
    call.answer("50");
    Ok(())
}
