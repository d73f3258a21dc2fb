//! The supply: output 1 feeds the bus, output 2 the brake. Headers after SCPI-99's power supply class.

use std::sync::Arc;

use super::bench::{Bench, lock};
use super::outputs::{self, Outputs};
use super::tree::{Action, Call, Model, number};
use crate::message::{Limits, Quantity, nr3};
use crate::status::Fault;
use crate::world::Controls;

/// What each output can give.
const VOLTAGE: [Limits; 2] =
    [Limits { min: 0.0, max: 60.0, default: 0.0 }, Limits { min: 0.0, max: 30.0, default: 0.0 }];
/// The bus may draw all that its output can give; the brake is released.
const CURRENT: [Limits; 2] = [Limits { min: 0.0, max: 5.0, default: 5.0 }, Limits { min: 0.0, max: 2.0, default: 0.0 }];
const OUTPUT: Outputs = Outputs {
    count: VOLTAGE.len(),
    level: &VOLTAGE,
    level_v: |all, output| &mut all.supply[output].voltage_v,
    on: |all, output| &mut all.supply[output].on,
};

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
    fn reading(&self, call: &mut Call<'_>) -> Result<(f64, f64), Fault> {
        let output = OUTPUT.asked(call)?;
        let controls = lock(&self.bench.controls).clone();
        Ok(lock(&self.bench.world).supply_reading(&controls, output))
    }
}

impl Model for Supply {
    type Settings = Controls;

    fn with<R>(&self, act: impl FnOnce(&mut Controls) -> R) -> R {
        outputs::with(&self.bench, act)
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

    fn commands() -> Vec<(&'static str, Action<Self>)> {
        let current = number(Quantity::Ampere, &CURRENT, OUTPUT.count, |all: &mut Controls, output| {
            &mut all.supply[output].current_a
        });
        OUTPUT.headers(vec![
            ("[:SOURce#]:CURRent[:LEVel][:IMMediate][:AMPLitude]", Action::Number(current)),
            (":MEASure#[:SCALar]:VOLTage[:DC]", Action::Query(measure_voltage)),
            (":MEASure#[:SCALar]:CURRent[:DC]", Action::Query(measure_current)),
        ])
    }
}

fn measure_voltage(supply: &Supply, call: &mut Call<'_>) -> Result<(), Fault> {
    let (voltage_v, _) = supply.reading(call)?;
    call.answer(nr3(voltage_v));
    Ok(())
}

fn measure_current(supply: &Supply, call: &mut Call<'_>) -> Result<(), Fault> {
    let (_, current_a) = supply.reading(call)?;
    call.answer(nr3(current_a));
    Ok(())
}
