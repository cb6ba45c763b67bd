//! The wave state turned into the adaptor's real modes.
//!
//! A network of resistors and capacitors scatters power-normalised waves by a symmetric matrix, so it has real modes:
//! in their coordinates a step of the linear part is one multiplication a mode instead of a whole matrix.

use super::adaptor::Adaptor;
use super::rest::Rest;
use crate::circuit::nodal::{incidence, triode_ports};
use crate::circuit::{Network, Node, Terminal};
use crate::linear::Matrix;

/// Modes whose eigenvalue is nearer to −1 than this carry no voltage: the loops that a triode's three capacitances make.
/// They are left out.
const NULL_MODE: f64 = 1e-12;

/// One step of a network with `modes` states and `ports` root ports, every state counted from the state of rest:
///
/// - root voltages: v = `root_by_mode`·m + `root_by_signal`·u + `root_constant` + `root_by_current`·i
/// - next state: m′ = `eigenvalue`·m + `mode_by_signal`·u + `mode_constant` + `mode_by_current`·i
/// - output: `output_by_mode`·m + `output_by_signal`·u + `output_constant` + `output_by_current`·i
///
/// with u the voltage at `in` and i the triodes' grid and plate currents.
///
/// The slow modes' losses are small differences of large numbers, so rest is not left to them: it comes from the network's
/// own DC solution, and the constants are what makes it a fixed point.
#[derive(Clone, Debug)]
pub struct Modes {
    /// Steps a second.
    pub(crate) rate: f64,
    pub(crate) eigenvalue: Vec<f64>,
    pub(crate) mode_by_signal: Vec<f64>,
    pub(crate) mode_constant: Vec<f64>,
    pub(crate) mode_by_current: Matrix<f64>,
    pub(crate) root_by_mode: Matrix<f64>,
    pub(crate) root_by_signal: Vec<f64>,
    pub(crate) root_constant: Vec<f64>,
    pub(crate) root_by_current: Matrix<f64>,
    pub(crate) output_by_mode: Vec<f64>,
    pub(crate) output_by_signal: f64,
    pub(crate) output_constant: f64,
    pub(crate) output_by_current: Vec<f64>,
    /// Capacitor waves (volts) from modes, capacitors × modes.
    pub(crate) wave_by_mode: Matrix<f64>,
    /// Modes from capacitor waves (volts), modes × capacitors.
    pub(crate) mode_by_wave: Matrix<f64>,
    /// Capacitor waves at rest, V.
    pub(crate) resting_wave: Vec<f64>,
    /// Key of each capacitor, in the order of the waves.
    pub(crate) capacitors: Vec<&'static str>,
}

impl Modes {
    /// The modes of `network` at `rate` steps a second, around `rest`; `None` where a node floats.
    pub(crate) fn derive(network: &Network, rate: f64, rest: &Rest) -> Option<Modes> {
        let output = network.place(Node::O)??;
        let adaptor = Adaptor::derive(network, rate)?;
        let (eigenvalue, vectors) = adaptor.scattering.clone().symmetric_eigen();
        let kept: Vec<usize> = (0..eigenvalue.len()).filter(|&k| 1.0 + eigenvalue[k] > NULL_MODE).collect();
        let vectors = columns(&vectors, &kept);
        let to_modes = vectors.transposed();
        let triodes = incidence(network.nodes, &triode_ports(network));
        let nodes_by_mode = adaptor.nodes_by_wave.times(&vectors);
        let eigenvalue: Vec<f64> = (kept.iter().enumerate())
            .map(|(mode, &k)| slow_by_loss(network, eigenvalue[k], &column(&nodes_by_mode, mode)))
            .collect();
        let root_by_source = triodes.times(&adaptor.nodes_by_source);
        let mode_by_source = to_modes.times(&adaptor.reflected_by_source);
        let mut wave_by_mode = vectors;
        let mut mode_by_wave = to_modes.clone();
        for capacitor in 0..adaptor.root_conductance.len() {
            for mode in 0..kept.len() {
                wave_by_mode[(capacitor, mode)] /= adaptor.root_conductance[capacitor];
                mode_by_wave[(mode, capacitor)] *= adaptor.root_conductance[capacitor];
            }
        }
        let mode_by_current = to_modes.times(&adaptor.reflected_by_current);
        let root_by_current = triodes.times(&adaptor.nodes_by_current);
        let output_by_current = adaptor.nodes_by_current.row(output).to_vec();
        let amps = &rest.amps[..triodes.rows()];
        let volts = &rest.volts[..triodes.rows()];
        let less = |at_rest: f64, by_current: &[f64]| at_rest - dot(by_current, amps);
        Some(Modes {
            rate,
            eigenvalue,
            mode_by_signal: column(&mode_by_source, 0),
            mode_constant: (0..kept.len()).map(|k| less(0.0, mode_by_current.row(k))).collect(),
            mode_by_current,
            root_by_mode: triodes.times(&nodes_by_mode),
            root_by_signal: column(&root_by_source, 0),
            root_constant: (0..volts.len()).map(|p| less(volts[p], root_by_current.row(p))).collect(),
            root_by_current,
            output_by_mode: nodes_by_mode.row(output).to_vec(),
            output_by_signal: adaptor.nodes_by_source[(output, 0)],
            output_constant: less(rest.nodes[output], &output_by_current),
            output_by_current,
            wave_by_mode,
            mode_by_wave,
            resting_wave: network.capacitors.iter().map(|c| rest.at(c.from) - rest.at(c.to)).collect(),
            capacitors: network.capacitors.iter().map(|c| c.key).collect(),
        })
    }

    /// Number of modes, the null ones left out.
    pub fn count(&self) -> usize {
        self.eigenvalue.len()
    }

    /// Number of root ports: two a triode.
    pub fn ports(&self) -> usize {
        self.root_constant.len()
    }

    /// Steps a second.
    pub fn rate(&self) -> f64 {
        self.rate
    }
}

/// The eigenvalue of a mode from the power that its unit wave loses in the resistors, 1 − λ² = 4·P, where it is slow.
///
/// A sum of squares knows a slow mode's loss better than the scattering does, and is never negative: no rounding makes a
/// passive network grow.
fn slow_by_loss(network: &Network, eigenvalue: f64, nodes: &[f64]) -> f64 {
    if eigenvalue < 0.9 {
        return eigenvalue;
    }
    let at = |terminal: Terminal| terminal.map_or(0.0, |node| nodes[node]);
    let square = |volts: f64| volts * volts;
    let parts: f64 = network.resistors.iter().map(|r| square(at(r.from) - at(r.to)) / r.value).sum();
    let sources: f64 = network.sources.iter().map(|s| square(at(s.node)) / s.resistance).sum();
    (1.0 - 4.0 * (parts + sources)).max(0.0).sqrt()
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

fn column(matrix: &Matrix<f64>, column: usize) -> Vec<f64> {
    (0..matrix.rows()).map(|row| matrix[(row, column)]).collect()
}

fn columns(matrix: &Matrix<f64>, kept: &[usize]) -> Matrix<f64> {
    let mut out = Matrix::zeros(matrix.rows(), kept.len());
    for row in 0..matrix.rows() {
        for (to, &from) in kept.iter().enumerate() {
            out[(row, to)] = matrix[(row, from)];
        }
    }
    out
}
