//! Three resistors in series on the supply: a steady voltage of which neither end is earth.

use super::{IDLE_PERIOD_S, Probes, Tips, limited};
use crate::scenario::DividerSpec;
use crate::world::controls::Controls;
use crate::world::network::{CONTACT_OHM, EARTH, Network};
use crate::world::wave::Wave;

/// The current that the resistors take, without probes.
pub(super) fn current_a(spec: &DividerSpec, volts: f64) -> f64 {
    let [upper, middle, lower] = spec.resistors_ohm;
    volts / (upper + middle + if spec.earth_lead { 0.0 } else { lower })
}

/// The middle resistor's ends, with the probes as resistances to earth.
pub(super) fn tips(spec: &DividerSpec, controls: &Controls, probes: Probes) -> Tips {
    let supply = controls.supply.first().filter(|supply| supply.on);
    let volts = supply.map_or(0.0, |supply| limited(supply, current_a(spec, supply.voltage_v)).0);
    let [upper_ohm, middle_ohm, lower_ohm] = spec.resistors_ohm;
    let mut network = Network::default();
    let (top, upper, lower) = (network.node(), network.node(), network.node());
    network.source(top, EARTH, volts, CONTACT_OHM);
    network.resistor(top, upper, upper_ohm);
    network.resistor(upper, lower, middle_ohm);
    network.resistor(lower, EARTH, lower_ohm);
    network.resistor(upper, EARTH, 1.0 / probes.p.conductance_s);
    network.resistor(lower, EARTH, 1.0 / probes.n.conductance_s);
    if spec.earth_lead {
        network.resistor(lower, EARTH, CONTACT_OHM);
    }
    let voltages = network.solve().voltages;
    let wave = |node: usize| Wave::constant(voltages[node], IDLE_PERIOD_S);
    if probes.in_situ { Tips::same(wave(lower)) } else { Tips { p: wave(upper), n: wave(lower) } }
}
