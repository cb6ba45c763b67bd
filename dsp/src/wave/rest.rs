//! The state of rest: the DC solution of a network, whatever its laws.

use super::root::{self, MAX_PORTS, RootCounts};
use crate::circuit::nodal::{conductances, incidence, source_currents, stamp, triode_ports};
use crate::circuit::{Network, Terminal};
use crate::linear::Matrix;
use crate::triode::Currents;

/// Volts to which the root is solved.
const TOLERANCE: f64 = 1e-11;

/// A network at rest, the signal at 0 V.
#[derive(Clone, Debug)]
pub(crate) struct Rest {
    /// Volts of every node.
    pub nodes: Vec<f64>,
    /// Volts of the triodes' ports.
    pub volts: [f64; MAX_PORTS],
    /// Currents of the triodes' ports, A.
    pub amps: [f64; MAX_PORTS],
    /// How the solution was found.
    pub counts: RootCounts,
}

/// Why a network has no state of rest.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum NoRest {
    /// A node has no way to any source or ground.
    Floating,
    /// The root was not solved.
    Unsolved,
}

impl Rest {
    /// `network` at rest under `law(tube, vgk, vpk)`, with `load` ohms from a terminal to ground where given.
    pub fn solve(
        network: &Network,
        load: Option<(Terminal, f64)>,
        law: &dyn Fn(usize, f64, f64) -> Currents,
    ) -> Result<Rest, NoRest> {
        let mut matrix = conductances(network);
        if let Some((node, ohms)) = load {
            stamp(&mut matrix, node, None, 1.0 / ohms);
        }
        let triodes = incidence(network.nodes, &triode_ports(network));
        let inverse = matrix.solve(Matrix::identity(network.nodes)).ok_or(NoRest::Floating)?;
        let constants: Vec<f64> = (0..network.sources.len()).map(|k| network.constant_volts(k)).collect();
        let open = inverse.times_vector(&source_currents(network).times_vector(&constants));
        let by_current = inverse.times(&triodes.transposed());
        let mut resistance = triodes.times(&by_current);
        for row in 0..resistance.rows() {
            for column in 0..resistance.columns() {
                resistance[(row, column)] = -resistance[(row, column)];
            }
        }
        let offer = triodes.times_vector(&open);
        let solved = root::solve(&resistance, &offer, &offer, TOLERANCE, law);
        if solved.counts.unresolved > 0 {
            return Err(NoRest::Unsolved);
        }
        let drop = by_current.times_vector(&solved.amps[..offer.len()]);
        let nodes = open.iter().zip(drop).map(|(v, d)| v - d).collect();
        Ok(Rest { nodes, volts: solved.volts, amps: solved.amps, counts: solved.counts })
    }

    /// Volts at a terminal.
    pub fn at(&self, terminal: Terminal) -> f64 {
        terminal.map_or(0.0, |node| self.nodes[node])
    }
}
