//! The coefficients of four machines beside each other.

use super::machine::Machine;
use crate::lanes::{F64x4, LANES};
use crate::triode::{TubeNumbers, gather};

/// Coefficients of four lanes; see `Modes` for what each one means.
#[derive(Clone)]
pub(super) struct Coefficients<const PORTS: usize, const MODES: usize> {
    pub eigenvalue: [F64x4; MODES],
    pub mode_by_signal: [F64x4; MODES],
    pub mode_constant: [F64x4; MODES],
    pub mode_by_current: [[F64x4; PORTS]; MODES],
    pub root_by_mode: [[F64x4; MODES]; PORTS],
    pub root_by_signal: [F64x4; PORTS],
    pub root_constant: [F64x4; PORTS],
    /// What a current takes from the root's voltages: −(`root_by_current`), Ω.
    pub resistance: [[F64x4; PORTS]; PORTS],
    pub output_by_mode: [F64x4; MODES],
    pub output_by_signal: F64x4,
    pub output_constant: F64x4,
    pub output_by_current: [F64x4; PORTS],
    pub tubes: [TubeNumbers<F64x4>; 2],
}

pub(super) fn coefficients<const PORTS: usize, const MODES: usize>(
    machines: &[Machine; LANES],
) -> Coefficients<PORTS, MODES> {
    let each = |f: &dyn Fn(&Machine) -> f64| F64x4([0, 1, 2, 3].map(|lane| f(&machines[lane])));
    // Absent modes have no amplitude, no drive and no effect.
    let mode =
        |k: usize, f: &dyn Fn(&Machine) -> f64| each(&|m: &Machine| if k < m.modes.count() { f(m) } else { 0.0 });
    let tube =
        |tube: usize| gather([0, 1, 2, 3].map(|lane| &machines[lane].tubes[tube.min(PORTS / 2 - 1)].numbers));
    use std::array::from_fn;
    Coefficients {
        eigenvalue: from_fn(|k| mode(k, &|m| m.modes.eigenvalue[k])),
        mode_by_signal: from_fn(|k| mode(k, &|m| m.modes.mode_by_signal[k])),
        mode_constant: from_fn(|k| mode(k, &|m| m.modes.mode_constant[k])),
        mode_by_current: from_fn(|k| from_fn(|p| mode(k, &|m| m.modes.mode_by_current[(k, p)]))),
        root_by_mode: from_fn(|p| from_fn(|k| mode(k, &|m| m.modes.root_by_mode[(p, k)]))),
        root_by_signal: from_fn(|p| each(&|m| m.modes.root_by_signal[p])),
        root_constant: from_fn(|p| each(&|m| m.modes.root_constant[p])),
        resistance: from_fn(|p| from_fn(|q| each(&|m| -m.modes.root_by_current[(p, q)]))),
        output_by_mode: from_fn(|k| mode(k, &|m| m.modes.output_by_mode[k])),
        output_by_signal: each(&|m| m.modes.output_by_signal),
        output_constant: each(&|m| m.modes.output_constant),
        output_by_current: from_fn(|p| each(&|m| m.modes.output_by_current[p])),
        tubes: from_fn(tube),
    }
}
