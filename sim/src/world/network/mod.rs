//! Networks of resistors, voltage sources and diodes of constant drop, by Kirchhoff's laws.
//!
//! Nodal analysis: the currents into every node but earth sum to nought. Every source has a resistance in series, so
//! that it is a current `V/R` beside a conductance `1/R` (Norton), and a conducting diode is such a source of its drop.
//! Which diodes conduct is found by trying: none at first, then all whose voltage or current contradicts their state
//! change it, one at a time, until none does.

#[cfg(test)]
mod tests;

/// Resistance of a conducting diode or of a clipped lead, in ohms: nothing beside any resistor of a bench.
pub(crate) const CONTACT_OHM: f64 = 1e-4;

/// What keeps a node that nothing holds from being undetermined, in siemens.
const LEAK_S: f64 = 1e-15;

/// A node; [`EARTH`] is given, the others come from [`Network::node`].
pub(crate) type Node = usize;

/// The node at nought volts.
pub(crate) const EARTH: Node = 0;

/// Parts between nodes.
#[derive(Debug, Clone, Default)]
pub(crate) struct Network {
    nodes: usize,
    resistors: Vec<(Node, Node, f64)>,
    sources: Vec<(Node, Node, f64, f64)>,
    diodes: Vec<(Node, Node, f64)>,
}

/// Voltages to earth, by node, and the diodes that conduct.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Solution {
    /// Indexed by node; the first is earth's.
    pub(crate) voltages: Vec<f64>,
    /// Indexed in the order in which the diodes were added.
    pub(crate) conducting: Vec<bool>,
}

impl Network {
    /// A new node.
    pub(crate) fn node(&mut self) -> Node {
        self.nodes += 1;
        self.nodes
    }

    /// A resistor.
    pub(crate) fn resistor(&mut self, a: Node, b: Node, ohm: f64) {
        self.resistors.push((a, b, 1.0 / ohm));
    }

    /// A source that holds `plus` at `volts` over `minus`, behind `ohm`.
    pub(crate) fn source(&mut self, plus: Node, minus: Node, volts: f64, ohm: f64) {
        self.sources.push((plus, minus, volts, 1.0 / ohm));
    }

    /// A diode that conducts from `anode` to `cathode` at `drop_v`.
    pub(crate) fn diode(&mut self, anode: Node, cathode: Node, drop_v: f64) {
        self.diodes.push((anode, cathode, drop_v));
    }

    /// The voltages with the diodes' states found.
    pub(crate) fn solve(&self) -> Solution {
        let mut conducting = vec![false; self.diodes.len()];
        // Every state at most once and then some: a network that swings between two states is left in the last.
        let most = 4 << self.diodes.len().min(8);
        let mut voltages = self.solve_in(&conducting);
        for _ in 0..most {
            let wrong = self.diodes.iter().zip(&conducting).map(|(&(anode, cathode, drop_v), &on)| {
                let over_v = voltages[anode] - voltages[cathode] - drop_v;
                // On, the sign of the current is that of the voltage across the contact.
                if on { -over_v / CONTACT_OHM } else { over_v }
            });
            let worst = wrong.enumerate().max_by(|a, b| a.1.total_cmp(&b.1));
            let Some((index, _)) = worst.filter(|&(_, by)| by > 1e-9) else { break };
            conducting[index] = !conducting[index];
            voltages = self.solve_in(&conducting);
        }
        Solution { voltages, conducting }
    }

    /// The voltages with the diodes in given states.
    pub(crate) fn solve_in(&self, conducting: &[bool]) -> Vec<f64> {
        let n = self.nodes;
        let mut matrix = vec![vec![0.0; n + 1]; n];
        let mut stamp = |plus: Node, minus: Node, volts: f64, siemens: f64| {
            for (node, other, sign) in [(plus, minus, 1.0), (minus, plus, -1.0)] {
                if node != EARTH {
                    matrix[node - 1][node - 1] += siemens;
                    matrix[node - 1][n] += sign * volts * siemens;
                    if other != EARTH {
                        matrix[node - 1][other - 1] -= siemens;
                    }
                }
            }
        };
        (1..=n).for_each(|node| stamp(node, EARTH, 0.0, LEAK_S));
        self.resistors.iter().for_each(|&(a, b, siemens)| stamp(a, b, 0.0, siemens));
        self.sources.iter().for_each(|&(plus, minus, volts, siemens)| stamp(plus, minus, volts, siemens));
        for (&(anode, cathode, drop_v), _) in self.diodes.iter().zip(conducting).filter(|&(_, &on)| on) {
            stamp(anode, cathode, drop_v, 1.0 / CONTACT_OHM);
        }
        let mut voltages = vec![0.0];
        voltages.extend(eliminate(matrix));
        voltages
    }
}

/// Solves `n` equations, each a row of `n` coefficients and the right side, by Gaussian elimination with row pivoting
/// (Golub & Van Loan, Matrix Computations, alg. 3.4.1; from memory).
fn eliminate(mut rows: Vec<Vec<f64>>) -> Vec<f64> {
    let n = rows.len();
    for column in 0..n {
        let pivot = (column..n).max_by(|&a, &b| rows[a][column].abs().total_cmp(&rows[b][column].abs()));
        rows.swap(column, pivot.unwrap_or(column));
        let (above, below) = rows.split_at_mut(column + 1);
        let lead = &above[column];
        for row in below {
            let factor = row[column] / lead[column];
            row.iter_mut().zip(lead).skip(column).for_each(|(a, b)| *a -= factor * b);
        }
    }
    let mut solution = vec![0.0; n];
    for row in (0..n).rev() {
        let known: f64 = (row + 1..n).map(|column| rows[row][column] * solution[column]).sum();
        solution[row] = (rows[row][n] - known) / rows[row][row];
    }
    solution
}
