//! The state of rest: the DC solution of a network, whatever its laws.

use super::root::{self, MAX_PORTS, RootCounts};
use crate::circuit::nodal::{conductances, incidence, source_currents, stamp, stamp_slopes, triode_ports};
use crate::circuit::{Network, Terminal};
use crate::linear::Matrix;
use crate::triode::Currents;

/// Volts to which the root is solved.
const TOLERANCE: f64 = 1e-11;
/// Newton steps of all the nodes after that: one for what the inverse lost, one for what rounding leaves of the first.
const POLISHINGS: usize = 2;

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
        let inverse = matrix.clone().solve(Matrix::identity(network.nodes)).ok_or(NoRest::Floating)?;
        let constants: Vec<f64> = (0..network.sources.len()).map(|k| network.constant_volts(k)).collect();
        let from_sources = source_currents(network).times_vector(&constants);
        let open = inverse.times_vector(&from_sources);
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
        let into_tubes = by_current.times_vector(&solved.amps[..offer.len()]);
        let nodes = open.iter().zip(into_tubes).map(|(v, d)| v - d).collect();
        let mut rest = Rest { nodes, volts: solved.volts, amps: solved.amps, counts: solved.counts };
        for _ in 0..POLISHINGS {
            rest.polish(network, &matrix, &from_sources, law).ok_or(NoRest::Unsolved)?;
        }
        Ok(rest)
    }

    /// One Newton step of all the nodes. Between 1 Ω and 10 MΩ an inverse loses digits that elimination keeps: this
    /// brings Kirchhoff's law to the last bits of every node.
    fn polish(
        &mut self,
        network: &Network,
        matrix: &Matrix<f64>,
        from_sources: &[f64],
        law: &dyn Fn(usize, f64, f64) -> Currents,
    ) -> Option<()> {
        let mut jacobian = matrix.clone();
        let mut residual = matrix.times_vector(&self.nodes);
        for (row, source) in residual.iter_mut().zip(from_sources) {
            *row -= source;
        }
        for (tube, place) in network.triodes.iter().enumerate() {
            let cathode = self.at(place.cathode);
            let (vgk, vpk) = (self.at(place.grid) - cathode, self.at(place.plate) - cathode);
            let c = law(tube, vgk, vpk);
            for (end, amps) in [(place.grid, c.grid), (place.plate, c.plate), (place.cathode, -c.grid - c.plate)] {
                if let Some(node) = end {
                    residual[node] += amps;
                }
            }
            stamp_slopes(&mut jacobian, place, &c);
        }
        let step = jacobian.solve_vector(&residual)?;
        for (node, step) in self.nodes.iter_mut().zip(step) {
            *node -= step;
        }
        for (tube, place) in network.triodes.iter().enumerate() {
            let cathode = self.at(place.cathode);
            let (vgk, vpk) = (self.at(place.grid) - cathode, self.at(place.plate) - cathode);
            let c = law(tube, vgk, vpk);
            self.volts[2 * tube..2 * tube + 2].copy_from_slice(&[vgk, vpk]);
            self.amps[2 * tube..2 * tube + 2].copy_from_slice(&[c.grid, c.plate]);
        }
        Some(())
    }

    /// Volts at a terminal.
    pub fn at(&self, terminal: Terminal) -> f64 {
        terminal.map_or(0.0, |node| self.nodes[node])
    }
}
