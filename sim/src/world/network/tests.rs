//! Networks worked by hand with Ohm's and Kirchhoff's laws.

use super::*;

fn close(found: f64, expected: f64) {
    assert!((found - expected).abs() < 1e-4, "{found} instead of {expected}");
}

#[test]
fn an_unbalanced_bridge() {
    // 10 V across 1 kΩ + 2 kΩ and across 3 kΩ + 1 kΩ: 10·2/3 and 10·1/4.
    let mut network = Network::default();
    let (top, left, right) = (network.node(), network.node(), network.node());
    network.source(top, EARTH, 10.0, CONTACT_OHM);
    network.resistor(top, left, 1e3);
    network.resistor(left, EARTH, 2e3);
    network.resistor(top, right, 3e3);
    network.resistor(right, EARTH, 1e3);
    let voltages = network.solve().voltages;
    close(voltages[left], 20.0 / 3.0);
    close(voltages[right], 2.5);
    // With 5 kΩ across, the currents into the two nodes, in milliamperes:
    // (10−l)/1 − l/2 − (l−r)/5 = 0 and (10−r)/3 − r/1 + (l−r)/5 = 0  →  17·l − 2·r = 100, −3·l + 23·r = 50
    // → l = (2300 + 100)/(391 − 6) = 6.23377, r = (850 + 300)/385 = 2.98701.
    network.resistor(left, right, 5e3);
    let voltages = network.solve().voltages;
    close(voltages[left], 2400.0 / 385.0);
    close(voltages[right], 1150.0 / 385.0);
}

#[test]
fn two_sources_share_a_load() {
    // Millman: (6/1 + 3/2)/(1/1 + 1/2 + 1/3) = 7.5/(11/6) = 4.0909 V.
    let mut network = Network::default();
    let node = network.node();
    network.source(node, EARTH, 6.0, 1.0);
    network.source(node, EARTH, 3.0, 2.0);
    network.resistor(node, EARTH, 3.0);
    close(network.solve().voltages[node], 45.0 / 11.0);
}

#[test]
fn a_diode_conducts_one_way_above_its_drop() {
    for (volts, expected) in [(10.0, 9.3), (0.8, 0.1), (0.6, 0.0), (-10.0, 0.0)] {
        let mut network = Network::default();
        let (input, output) = (network.node(), network.node());
        network.source(input, EARTH, volts, CONTACT_OHM);
        network.diode(input, output, 0.7);
        network.resistor(output, EARTH, 1e3);
        let solution = network.solve();
        close(solution.voltages[output], expected);
        assert_eq!(solution.conducting, [volts > 0.7]);
    }
}
