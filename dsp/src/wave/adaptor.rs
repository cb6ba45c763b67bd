//! The R-type adaptor: what the resistive rest of a network does to the waves at its ports.
//!
//! Every capacitor and source is a one-port with its own port resistance; the junction that joins them has no closed
//! form, so its scattering is derived numerically by nodal analysis (Werner, Smith & Abel, "Wave digital filter
//! adaptors for arbitrary topologies and multiport linear elements", DAFx-15). The triodes' ports stay unadapted: they
//! see the junction as a voltage behind a resistance matrix, and meet it at the root.

use crate::circuit::Network;
use crate::circuit::nodal::{conductances, incidence, source_currents, stamp, triode_ports};
use crate::linear::Matrix;

/// What the junction makes of incident waves, source voltages and triode currents, all linear.
///
/// Incident capacitor waves are power-normalised: wave × √(port conductance), which makes their scattering symmetric.
pub(crate) struct Adaptor {
    /// √ of each capacitor's port conductance 2C·rate, √S.
    pub root_conductance: Vec<f64>,
    /// Reflected from incident waves, capacitors × capacitors, symmetric.
    pub scattering: Matrix<f64>,
    /// Reflected waves from source voltages, capacitors × sources.
    pub reflected_by_source: Matrix<f64>,
    /// Reflected waves from triode currents, capacitors × triode ports.
    pub reflected_by_current: Matrix<f64>,
    /// Node voltages from incident waves, nodes × capacitors.
    pub nodes_by_wave: Matrix<f64>,
    /// Node voltages from source voltages, nodes × sources.
    pub nodes_by_source: Matrix<f64>,
    /// Node voltages from triode currents, nodes × triode ports.
    pub nodes_by_current: Matrix<f64>,
}

impl Adaptor {
    /// The adaptor of `network` at `rate` steps a second (trapezoidal rule). `None` where a node floats.
    pub fn derive(network: &Network, rate: f64) -> Option<Adaptor> {
        let mut matrix = conductances(network);
        for part in &network.capacitors {
            stamp(&mut matrix, part.from, part.to, 2.0 * part.value * rate);
        }
        let count = network.capacitors.len();
        let ports: Vec<_> = network.capacitors.iter().map(|c| (c.from, c.to)).collect();
        let root: Vec<f64> = network.capacitors.iter().map(|c| (2.0 * c.value * rate).sqrt()).collect();
        let mut scaled_ports = incidence(network.nodes, &ports);
        for row in 0..count {
            for column in 0..network.nodes {
                scaled_ports[(row, column)] *= root[row];
            }
        }
        let triodes = incidence(network.nodes, &triode_ports(network));
        let inverse = matrix.solve(Matrix::identity(network.nodes))?;

        let nodes_by_wave = inverse.times(&scaled_ports.transposed());
        let nodes_by_source = inverse.times(&source_currents(network));
        let mut nodes_by_current = inverse.times(&triodes.transposed());
        negate(&mut nodes_by_current);
        let mut scattering = twice(scaled_ports.times(&nodes_by_wave));
        for k in 0..count {
            scattering[(k, k)] -= 1.0;
        }
        Some(Adaptor {
            root_conductance: root,
            scattering: symmetrised(scattering),
            reflected_by_source: twice(scaled_ports.times(&nodes_by_source)),
            reflected_by_current: twice(scaled_ports.times(&nodes_by_current)),
            nodes_by_wave,
            nodes_by_source,
            nodes_by_current,
        })
    }
}

fn negate(matrix: &mut Matrix<f64>) {
    scale(matrix, -1.0);
}

fn twice(mut matrix: Matrix<f64>) -> Matrix<f64> {
    scale(&mut matrix, 2.0);
    matrix
}

fn scale(matrix: &mut Matrix<f64>, factor: f64) {
    for row in 0..matrix.rows() {
        for column in 0..matrix.columns() {
            matrix[(row, column)] *= factor;
        }
    }
}

/// Reciprocity makes the normalised scattering symmetric; rounding does not.
fn symmetrised(matrix: Matrix<f64>) -> Matrix<f64> {
    let mut out = matrix.clone();
    for row in 0..matrix.rows() {
        for column in 0..matrix.columns() {
            out[(row, column)] = 0.5 * (matrix[(row, column)] + matrix[(column, row)]);
        }
    }
    out
}
