//! What the tips see: the routes of the switch unit, and the device or the reference behind them.

mod balanced;
mod divider;
mod half_bridge;
mod rectifier;
#[cfg(test)]
mod tests;

use super::controls::{Controls, SupplyOutput};
use super::source::{self, Load};
use super::wave::Wave;
use crate::scenario::{DeviceSpec, Scenario, Tip};

/// Switch channel that puts the reference on both tips.
const REFERENCE: u32 = 101;
/// Switch channel that puts the device's node on both tips.
const IN_SITU: u32 = 102;
/// Switch channel that puts each tip on its own node of the device.
const MEASURE: u32 = 103;

/// What a constant counts as its period.
const IDLE_PERIOD_S: f64 = 1e-3;

/// The voltages at the two tips, with what the probes load them.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Tips {
    /// At the positive leg's tip.
    pub(crate) p: Wave,
    /// At the negative leg's tip.
    pub(crate) n: Wave,
}

impl Tips {
    fn same(wave: Wave) -> Self {
        Self { p: wave.clone(), n: wave }
    }
}

/// What loads the nodes of a device; both probes load the node of an in-situ route.
#[derive(Debug, Clone, Copy)]
struct Probes {
    in_situ: bool,
    p: Load,
    n: Load,
}

/// The voltages at the tips as the switch unit's routes are now. Open tips are at nought.
pub(crate) fn tips(scenario: &Scenario, controls: &Controls) -> Tips {
    let load = |of: &dyn Fn(Tip) -> bool| {
        let legs = scenario.legs.iter().filter(|leg| of(leg.tip));
        legs.fold(Load::NONE, |load, leg| load.with(leg.resistance_ohm, leg.capacitance_f))
    };
    let both = load(&|_| true);
    let route = controls.closed.iter().find(|channel| (REFERENCE..=MEASURE).contains(*channel)).copied();
    match route {
        Some(REFERENCE) => {
            let wave = controls.generator.first().map_or(Wave::constant(0.0, IDLE_PERIOD_S), |output| {
                source::open_circuit(output, scenario.reference.multitone_tones)
            });
            Tips::same(both.on(wave, scenario.reference.source_ohm))
        }
        Some(IN_SITU) => device(&scenario.device, controls, Probes { in_situ: true, p: Load::NONE, n: both }),
        Some(MEASURE) => {
            let (p, n) = (load(&|tip| tip == Tip::P), load(&|tip| tip == Tip::N));
            device(&scenario.device, controls, Probes { in_situ: false, p, n })
        }
        _ => Tips::same(Wave::constant(0.0, IDLE_PERIOD_S)),
    }
}

/// Voltage and current that a supply output would read back. In current limit the voltage falls in proportion: to the
/// supply every device here is a resistance.
pub(crate) fn supply_reading(scenario: &Scenario, controls: &Controls, output: usize) -> (f64, f64) {
    let Some(supply) = controls.supply.get(output).filter(|supply| supply.on) else { return (0.0, 0.0) };
    let demand_a = match (&scenario.device, output) {
        (DeviceSpec::Divider(spec), 0) => divider::current_a(spec, supply.voltage_v),
        (DeviceSpec::HalfBridge(spec), 0) => half_bridge::bus_current_a(spec, controls, supply.voltage_v),
        (DeviceSpec::HalfBridge(spec), 1) => supply.voltage_v / spec.brake_ohm,
        _ => 0.0,
    };
    limited(supply, demand_a)
}

fn device(spec: &DeviceSpec, controls: &Controls, probes: Probes) -> Tips {
    match spec {
        DeviceSpec::Balanced(spec) => balanced::tips(spec, probes),
        DeviceSpec::Divider(spec) => divider::tips(spec, controls, probes),
        DeviceSpec::HalfBridge(spec) => half_bridge::tips(spec, controls, probes),
        DeviceSpec::Rectifier(spec) => rectifier::tips(spec, probes),
    }
}

fn limited(supply: &SupplyOutput, demand_a: f64) -> (f64, f64) {
    if demand_a > supply.current_a {
        (supply.voltage_v * supply.current_a / demand_a, supply.current_a)
    } else {
        (supply.voltage_v, demand_a)
    }
}
