//! Small-signal figures by complex nodal analysis around the operating point.

use num_complex::Complex64;

use super::OperatingPoint;
use crate::circuit::nodal::{stamp, stamp_slopes};
use crate::circuit::{LOAD_KEYS, Network, Node, Part, Terminal};
use crate::linear::Matrix;

/// What the stage does to a vanishing sine at one frequency.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Response {
    /// Frequency, Hz.
    pub frequency: f64,
    /// Voltage at `o` over voltage at `in`.
    pub gain: Complex64,
    /// What the source sees beyond its own resistance, Ω.
    pub input_impedance: Complex64,
    /// At `o` with the load removed, Ω.
    pub output_impedance: Complex64,
}

/// A network linearised at its operating point.
pub struct SmallSignal<'a> {
    network: &'a Network,
    point: &'a OperatingPoint,
}

/// Which parts are left out.
#[derive(Clone, Copy, PartialEq)]
enum Without {
    Nothing,
    Source,
    Load,
}

impl<'a> SmallSignal<'a> {
    /// `network` around `point`, which must be its own.
    pub fn new(network: &'a Network, point: &'a OperatingPoint) -> Self {
        SmallSignal { network, point }
    }

    /// The figures at `frequency` Hz; `None` where the matrix is singular.
    pub fn at(&self, frequency: f64) -> Option<Response> {
        let output = self.network.place(Node::O)??;
        let source = self.network.sources.first()?;
        let through = self.matrix(frequency, Without::Nothing);
        let driven = self.solve(through, source.node, 1.0 / source.resistance)?;
        let seen = self.solve(self.matrix(frequency, Without::Source), source.node, 1.0)?;
        let unloaded = self.solve(self.matrix(frequency, Without::Load), Some(output), 1.0)?;
        Some(Response {
            frequency,
            gain: driven[output],
            input_impedance: source.node.map_or(Complex64::ZERO, |node| seen[node]),
            output_impedance: unloaded[output],
        })
    }

    /// The voltage at `o` for each ampere injected into each node at `frequency` Hz, one entry a node: one solution of the
    /// transposed equations serves every source of noise and hum. `None` where the matrix is singular.
    pub(crate) fn transfer_from_nodes(&self, frequency: f64) -> Option<Vec<Complex64>> {
        let output = self.network.place(Node::O)??;
        let mut right = vec![Complex64::ZERO; self.network.nodes];
        right[output] = Complex64::new(1.0, 0.0);
        self.matrix(frequency, Without::Nothing).transposed().solve_vector(&right)
    }

    pub(crate) fn network(&self) -> &Network {
        self.network
    }

    pub(crate) fn point(&self) -> &OperatingPoint {
        self.point
    }

    fn solve(&self, matrix: Matrix<Complex64>, node: Terminal, amps: f64) -> Option<Vec<Complex64>> {
        let mut right = vec![Complex64::ZERO; self.network.nodes];
        if let Some(node) = node {
            right[node] = Complex64::new(amps, 0.0);
        }
        matrix.solve_vector(&right)
    }

    fn matrix(&self, frequency: f64, without: Without) -> Matrix<Complex64> {
        let omega = std::f64::consts::TAU * frequency;
        let mut matrix = Matrix::zeros(self.network.nodes, self.network.nodes);
        let kept = |part: &&Part| without != Without::Load || !LOAD_KEYS.contains(&part.key);
        for part in self.network.resistors.iter().filter(kept) {
            stamp(&mut matrix, part.from, part.to, Complex64::new(1.0 / part.value, 0.0));
        }
        for part in self.network.capacitors.iter().filter(kept) {
            stamp(&mut matrix, part.from, part.to, Complex64::new(0.0, omega * part.value));
        }
        for (index, source) in self.network.sources.iter().enumerate() {
            if index > 0 || without != Without::Source {
                stamp(&mut matrix, source.node, None, Complex64::new(1.0 / source.resistance, 0.0));
            }
        }
        for (place, tube) in self.network.triodes.iter().zip(&self.point.tubes) {
            stamp_slopes(&mut matrix, place, &tube.currents);
        }
        matrix
    }
}
