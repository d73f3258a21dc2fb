//! The supply: output 1 feeds the bus, output 2 the brake. What it can do, without any header.

use std::sync::Arc;

use super::bench::{Bench, lock};
use super::tree::{Call, Model, Number, Place, number};
use crate::message::{Limits, Quantity};
use crate::scenario::Setting;
use crate::status::Fault;
use crate::world::Controls;

/// What each output can give.
const VOLTAGE: [Limits; 2] =
    [Limits { min: 0.0, max: 60.0, default: 0.0 }, Limits { min: 0.0, max: 30.0, default: 0.0 }];
/// The bus may draw all that its output can give; the brake is released.
const CURRENT: [Limits; 2] = [Limits { min: 0.0, max: 5.0, default: 5.0 }, Limits { min: 0.0, max: 2.0, default: 0.0 }];
/// Outputs of the supply.
pub(crate) const OUTPUTS: usize = VOLTAGE.len();

/// The supply on a bench; its settings are the bench's controls.
pub(crate) struct Supply {
    bench: Arc<Bench>,
}

impl Supply {
    /// A supply on `bench`.
    pub(crate) fn new(bench: Arc<Bench>) -> Self {
        Self { bench }
    }

    /// Voltage and current at an output, as its meters show them.
    pub(crate) fn reading(&self, call: &mut Call<'_>) -> Result<(f64, f64), Fault> {
        call.args.finish()?;
        if call.index >= OUTPUTS {
            return Err(Fault::HeaderSuffix);
        }
        let controls = lock(&self.bench.controls).clone();
        Ok(lock(&self.bench.world).supply_reading(&controls, call.index))
    }
}

impl Model for Supply {
    type Settings = Controls;

    fn with<R>(&self, act: impl FnOnce(&mut Controls) -> R) -> R {
        act(&mut lock(&self.bench.controls))
    }

    fn changed(&self) {
        self.bench.touch();
    }

    fn reset(&self) {
        self.with(|controls| {
            for ((output, voltage), current) in controls.supply.iter_mut().zip(&VOLTAGE).zip(&CURRENT) {
                (output.on, output.voltage_v, output.current_a) = (false, voltage.default, current.default);
            }
        });
        self.changed();
    }
}

/// The wanted voltage.
pub(crate) fn voltage() -> Number<Supply> {
    let place: fn(&mut Controls, usize) -> &mut f64 = |all, output| &mut all.supply[output].voltage_v;
    Number { clamp: Some(Setting::Voltage), ..number(Quantity::Volt, &VOLTAGE, OUTPUTS, place) }
}

/// The limit of the current.
pub(crate) fn current() -> Number<Supply> {
    let place: fn(&mut Controls, usize) -> &mut f64 = |all, output| &mut all.supply[output].current_a;
    Number { clamp: Some(Setting::Current), ..number(Quantity::Ampere, &CURRENT, OUTPUTS, place) }
}

/// Whether the output is connected.
pub(crate) fn state() -> Place<Supply, bool> {
    Place { count: OUTPUTS, of: |all: &mut Controls, output| &mut all.supply[output].on }
}

/// Answers with the voltage that the output's meter shows.
pub(crate) fn measure_voltage(supply: &Supply, call: &mut Call<'_>) -> Result<(), Fault> {
    let (voltage_v, _) = supply.reading(call)?;
    call.answer_number(voltage_v, Quantity::Volt);
    Ok(())
}

/// Answers with the current that the output's meter shows.
pub(crate) fn measure_current(supply: &Supply, call: &mut Call<'_>) -> Result<(), Fault> {
    let (_, current_a) = supply.reading(call)?;
    call.answer_number(current_a, Quantity::Ampere);
    Ok(())
}
