//! Nodal analysis of a network: the matrices that every solver begins with.

use super::{Network, Terminal, TriodePlace};
use crate::linear::{Matrix, Scalar};
use crate::triode::Currents;

/// A matrix that picks port voltages out of node voltages, one row a port (from, to).
pub(crate) fn incidence(nodes: usize, ports: &[(Terminal, Terminal)]) -> Matrix<f64> {
    let mut out = Matrix::zeros(ports.len(), nodes);
    for (row, &(from, to)) in ports.iter().enumerate() {
        if let Some(node) = from {
            out[(row, node)] += 1.0;
        }
        if let Some(node) = to {
            out[(row, node)] -= 1.0;
        }
    }
    out
}

/// The triodes' ports in the order of the root: grid–cathode, plate–cathode, tube after tube.
pub(crate) fn triode_ports(network: &Network) -> Vec<(Terminal, Terminal)> {
    network.triodes.iter().flat_map(|t| [(t.grid, t.cathode), (t.plate, t.cathode)]).collect()
}

/// Adds a conductance between two terminals to a nodal matrix.
pub(crate) fn stamp<T: Scalar>(matrix: &mut Matrix<T>, from: Terminal, to: Terminal, siemens: T) {
    for (a, b) in [(from, to), (to, from)] {
        if let Some(a) = a {
            matrix[(a, a)] += siemens;
            if let Some(b) = b {
                matrix[(a, b)] -= siemens;
            }
        }
    }
}

/// The nodal conductance matrix of resistors and source resistances.
pub(crate) fn conductances(network: &Network) -> Matrix<f64> {
    let mut matrix = Matrix::zeros(network.nodes, network.nodes);
    for part in &network.resistors {
        stamp(&mut matrix, part.from, part.to, 1.0 / part.value);
    }
    for source in &network.sources {
        stamp(&mut matrix, source.node, None, 1.0 / source.resistance);
    }
    matrix
}

/// Node currents from source voltages, nodes × sources.
pub(crate) fn source_currents(network: &Network) -> Matrix<f64> {
    let mut matrix = Matrix::zeros(network.nodes, network.sources.len());
    for (column, source) in network.sources.iter().enumerate() {
        if let Some(node) = source.node {
            matrix[(node, column)] = 1.0 / source.resistance;
        }
    }
    matrix
}

/// Adds a triode's slopes to a nodal matrix.
pub(crate) fn stamp_slopes<T: Scalar + From<f64>>(matrix: &mut Matrix<T>, place: &TriodePlace, slopes: &Currents) {
    let (grid, plate) = ((place.grid, place.cathode), (place.plate, place.cathode));
    controlled(matrix, grid, grid, slopes.grid_by_vgk);
    controlled(matrix, plate, grid, slopes.plate_by_vgk);
    controlled(matrix, plate, plate, slopes.plate_by_vpk);
}

/// A current into `out.0` and out of `out.1`, `siemens` times the voltage from `by.0` to `by.1`.
fn controlled<T: Scalar + From<f64>>(
    matrix: &mut Matrix<T>,
    out: (Terminal, Terminal),
    by: (Terminal, Terminal),
    siemens: f64,
) {
    for (row, row_sign) in [(out.0, 1.0), (out.1, -1.0)] {
        for (column, column_sign) in [(by.0, 1.0), (by.1, -1.0)] {
            if let (Some(row), Some(column)) = (row, column) {
                matrix[(row, column)] += T::from(row_sign * column_sign * siemens);
            }
        }
    }
}
