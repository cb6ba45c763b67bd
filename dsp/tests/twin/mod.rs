//! The slow, obvious twin of the engine: the same network by nodal analysis, every capacitor a companion model of the
//! trapezoidal rule, the laws computed, Newton's method to the end in every step.
//!
//! Nothing of it is shared with the engine but the network and the laws.

use platewright_dsp::analysis::OperatingPoint;
use platewright_dsp::circuit::{Drive, Network, Node, Terminal};

/// Volts below which a Newton step is the last: what is left is its square, far below the rounding of large conductances.
const CONVERGED: f64 = 1e-8;

pub struct Twin<'a> {
    network: &'a Network,
    /// Conductances of resistors, sources and companion models, rows of nodes.
    matrix: Vec<Vec<f64>>,
    /// Node volts.
    volts: Vec<f64>,
    /// Current of every capacitor, A.
    currents: Vec<f64>,
    /// Companion conductance of every capacitor, 2C·rate.
    companions: Vec<f64>,
    output: usize,
}

impl<'a> Twin<'a> {
    /// `network` at rest, to be stepped `rate` times a second.
    pub fn new(network: &'a Network, rate: f64) -> Twin<'a> {
        let companions: Vec<f64> = network.capacitors.iter().map(|c| 2.0 * c.value * rate).collect();
        let mut matrix = vec![vec![0.0; network.nodes]; network.nodes];
        for part in &network.resistors {
            stamp(&mut matrix, part.from, part.to, 1.0 / part.value);
        }
        for source in &network.sources {
            stamp(&mut matrix, source.node, None, 1.0 / source.resistance);
        }
        for (part, siemens) in network.capacitors.iter().zip(&companions) {
            stamp(&mut matrix, part.from, part.to, *siemens);
        }
        let point = OperatingPoint::solve(network, None).unwrap();
        let mut volts = vec![0.0; network.nodes];
        for node in Node::ALL {
            if let (Some(Some(place)), Some(at_rest)) = (network.place(node), point.volts(node)) {
                volts[place] = at_rest;
            }
        }
        let currents = vec![0.0; network.capacitors.len()];
        Twin { network, matrix, volts, currents, companions, output: network.place(Node::O).unwrap().unwrap() }
    }

    /// One step with `signal` volts at `in`; volts at `o`.
    pub fn step(&mut self, signal: f64) -> f64 {
        let mut sources = vec![0.0; self.network.nodes];
        for source in &self.network.sources {
            let volts = match source.drive {
                Drive::Signal => signal,
                Drive::Constant(volts) => volts,
            };
            add(&mut sources, source.node, volts / source.resistance);
        }
        let mut histories = Vec::new();
        for ((part, siemens), amps) in self.network.capacitors.iter().zip(&self.companions).zip(&self.currents) {
            let history = siemens * (at(&self.volts, part.from) - at(&self.volts, part.to)) + amps;
            add(&mut sources, part.from, history);
            add(&mut sources, part.to, -history);
            histories.push(history);
        }
        self.newton(&sources);
        for (k, part) in self.network.capacitors.iter().enumerate() {
            let volts = at(&self.volts, part.from) - at(&self.volts, part.to);
            self.currents[k] = self.companions[k] * volts - histories[k];
        }
        self.volts[self.output]
    }

    fn newton(&mut self, sources: &[f64]) {
        for _ in 0..200 {
            let mut matrix = self.matrix.clone();
            let mut residual: Vec<f64> = (0..self.volts.len())
                .map(|row| self.matrix[row].iter().zip(&self.volts).map(|(g, v)| g * v).sum::<f64>() - sources[row])
                .collect();
            for t in &self.network.triodes {
                let vgk = at(&self.volts, t.grid) - at(&self.volts, t.cathode);
                let vpk = at(&self.volts, t.plate) - at(&self.volts, t.cathode);
                let c = t.section.currents(vgk, vpk);
                add(&mut residual, t.grid, c.grid);
                add(&mut residual, t.plate, c.plate);
                add(&mut residual, t.cathode, -c.grid - c.plate);
                for (row, by_vgk, by_vpk) in [
                    (t.grid, c.grid_by_vgk, 0.0),
                    (t.plate, c.plate_by_vgk, c.plate_by_vpk),
                    (t.cathode, -c.grid_by_vgk - c.plate_by_vgk, -c.plate_by_vpk),
                ] {
                    for (column, siemens) in [(t.grid, by_vgk), (t.plate, by_vpk), (t.cathode, -by_vgk - by_vpk)] {
                        if let (Some(row), Some(column)) = (row, column) {
                            matrix[row][column] += siemens;
                        }
                    }
                }
            }
            let step = solve(matrix, residual);
            let size = step.iter().fold(0.0f64, |a, b| a.max(b.abs()));
            // A long step is shortened: exponentials are trusted for some volts only.
            let fraction = if size > 5.0 { 5.0 / size } else { 1.0 };
            for (volts, step) in self.volts.iter_mut().zip(&step) {
                *volts -= fraction * step;
            }
            if size < CONVERGED {
                return;
            }
        }
        panic!("the twin's Newton steps do not converge");
    }
}

fn at(volts: &[f64], terminal: Terminal) -> f64 {
    terminal.map_or(0.0, |node| volts[node])
}

fn add(values: &mut [f64], terminal: Terminal, value: f64) {
    if let Some(node) = terminal {
        values[node] += value;
    }
}

fn stamp(matrix: &mut [Vec<f64>], from: Terminal, to: Terminal, siemens: f64) {
    for (a, b) in [(from, to), (to, from)] {
        if let Some(a) = a {
            matrix[a][a] += siemens;
            if let Some(b) = b {
                matrix[a][b] -= siemens;
            }
        }
    }
}

/// Gaussian elimination with partial pivoting.
fn solve(mut matrix: Vec<Vec<f64>>, mut right: Vec<f64>) -> Vec<f64> {
    let n = right.len();
    for pivot in 0..n {
        let best = (pivot..n).max_by(|&a, &b| matrix[a][pivot].abs().total_cmp(&matrix[b][pivot].abs())).unwrap();
        matrix.swap(pivot, best);
        right.swap(pivot, best);
        for row in pivot + 1..n {
            let factor = matrix[row][pivot] / matrix[pivot][pivot];
            for column in pivot..n {
                matrix[row][column] -= factor * matrix[pivot][column];
            }
            right[row] -= factor * right[pivot];
        }
    }
    for row in (0..n).rev() {
        for column in row + 1..n {
            right[row] -= matrix[row][column] * right[column];
        }
        right[row] /= matrix[row][row];
    }
    right
}
