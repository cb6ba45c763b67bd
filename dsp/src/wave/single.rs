//! One lane with computed laws and a fully converged root: the machine that is measured.
//!
//! It steps the same modes as the four-lane engine and can carry along how its state depends on the state at the start,
//! which is what shooting needs.

use super::modes::Modes;
use super::root::{self, MAX_PORTS, RootCounts, Solved};
use crate::triode::{Currents, Section};

/// A correction below this many volts ends the Newton steps; what is left is its square.
const CONVERGED: f64 = 1e-7;
/// Newton steps tried before the damped solver takes over.
const PLAIN_STEPS: usize = 10;

/// How the present state depends on the state at the start, modes × modes.
pub(crate) type Sensitivity<const MODES: usize> = [[f64; MODES]; MODES];

/// Amplitudes of the modes, counted from rest: all that a step leaves to the next.
pub(crate) type Amplitudes<const MODES: usize> = [f64; MODES];

/// One machine with computed laws.
pub(crate) struct Single<'a, const PORTS: usize, const MODES: usize> {
    source: &'a Modes,
    sections: &'a [Section],
    eigenvalue: [f64; MODES],
    mode_by_signal: [f64; MODES],
    mode_constant: [f64; MODES],
    mode_by_current: [[f64; PORTS]; MODES],
    root_by_mode: [[f64; MODES]; PORTS],
    root_by_signal: [f64; PORTS],
    root_constant: [f64; PORTS],
    root_by_current: [[f64; PORTS]; PORTS],
    output_by_mode: [f64; MODES],
    output_by_current: [f64; PORTS],
    pub counts: RootCounts,
}

/// A root with what the sensitivities need: the inverse of I − K·J, and J.
struct Rooted<const PORTS: usize> {
    volts: [f64; PORTS],
    amps: [f64; PORTS],
    slopes: [Currents; 2],
}

impl<'a, const PORTS: usize, const MODES: usize> Single<'a, PORTS, MODES> {
    /// # Panics
    /// If `modes.count() > MODES` or `modes.ports() != PORTS`.
    pub fn new(modes: &'a Modes, sections: &'a [Section]) -> Self {
        assert!(modes.count() <= MODES && modes.ports() == PORTS, "the shape that was chosen");
        use std::array::from_fn;
        let padded = |values: &[f64]| from_fn(|k| values.get(k).copied().unwrap_or(0.0));
        Single {
            source: modes,
            sections,
            eigenvalue: padded(&modes.eigenvalue),
            mode_by_signal: padded(&modes.mode_by_signal),
            mode_constant: padded(&modes.mode_constant),
            mode_by_current: from_fn(|k| {
                from_fn(|p| if k < modes.count() { modes.mode_by_current[(k, p)] } else { 0.0 })
            }),
            root_by_mode: from_fn(|p| padded(modes.root_by_mode.row(p))),
            root_by_signal: from_fn(|p| modes.root_by_signal[p]),
            root_constant: from_fn(|p| modes.root_constant[p]),
            root_by_current: from_fn(|p| from_fn(|q| modes.root_by_current[(p, q)])),
            output_by_mode: padded(&modes.output_by_mode),
            output_by_current: from_fn(|p| modes.output_by_current[p]),
            counts: RootCounts::default(),
        }
    }

    /// One step with `signal` volts at `in`; the root's voltages begin at `guess`. Returns the volts at `o` and at the
    /// root.
    #[inline]
    pub fn step(
        &mut self,
        state: &mut Amplitudes<MODES>,
        signal: f64,
        guess: &[f64; PORTS],
        sensitivity: Option<&mut Sensitivity<MODES>>,
    ) -> (f64, [f64; PORTS]) {
        let root = self.root(state, signal, guess);
        let mut output = self.source.output_constant + self.source.output_by_signal * signal;
        for k in 0..MODES {
            output += self.output_by_mode[k] * state[k];
        }
        for p in 0..PORTS {
            output += self.output_by_current[p] * root.amps[p];
        }
        if let Some(sensitivity) = sensitivity {
            self.carry(&root.slopes, sensitivity);
        }
        for k in 0..MODES {
            let mut next = self.mode_by_signal[k] * signal + self.mode_constant[k];
            next += self.eigenvalue[k] * state[k];
            for p in 0..PORTS {
                next += self.mode_by_current[k][p] * root.amps[p];
            }
            state[k] = next;
        }
        (output, root.volts)
    }

    #[inline]
    fn root(&mut self, state: &Amplitudes<MODES>, signal: f64, guess: &[f64; PORTS]) -> Rooted<PORTS> {
        let mut offer = [0.0; PORTS];
        let mut volts = *guess;
        for p in 0..PORTS {
            offer[p] = self.root_constant[p] + self.root_by_signal[p] * signal;
            for k in 0..MODES {
                offer[p] += self.root_by_mode[p][k] * state[k];
            }
        }
        for _ in 0..PLAIN_STEPS {
            self.counts.newton += 1;
            let (rooted, size) = self.correct(&offer, &volts);
            if size < CONVERGED {
                return rooted;
            }
            volts = rooted.volts;
        }
        self.damped(&offer)
    }

    /// One Newton step from `volts`, and its size.
    #[inline]
    fn correct(&self, offer: &[f64; PORTS], volts: &[f64; PORTS]) -> (Rooted<PORTS>, f64) {
        let mut amps = [0.0; PORTS];
        let mut slopes = [Currents::default(); 2];
        for tube in 0..PORTS / 2 {
            slopes[tube] = self.sections[tube].currents(volts[2 * tube], volts[2 * tube + 1]);
            amps[2 * tube] = slopes[tube].grid;
            amps[2 * tube + 1] = slopes[tube].plate;
        }
        let mut move_by = [0.0; PORTS];
        for p in 0..PORTS {
            move_by[p] = volts[p] - offer[p];
            for q in 0..PORTS {
                move_by[p] -= self.root_by_current[p][q] * amps[q];
            }
        }
        let mut matrix = self.jacobian(&slopes);
        eliminate(&mut matrix, |row, pivot, factor| move_by[row] -= factor * move_by[pivot]);
        substitute(&matrix, &mut move_by);
        let mut size: f64 = 0.0;
        let mut moved = *volts;
        for p in 0..PORTS {
            moved[p] -= move_by[p];
            size = if move_by[p].is_nan() { f64::INFINITY } else { size.max(move_by[p].abs()) };
        }
        for tube in 0..PORTS / 2 {
            let (s, dg, dp) = (slopes[tube], move_by[2 * tube], move_by[2 * tube + 1]);
            amps[2 * tube] -= s.grid_by_vgk * dg;
            amps[2 * tube + 1] -= s.plate_by_vgk * dg + s.plate_by_vpk * dp;
        }
        (Rooted { volts: moved, amps, slopes }, size)
    }

    /// I − K·J.
    #[inline]
    fn jacobian(&self, slopes: &[Currents; 2]) -> [[f64; PORTS]; PORTS] {
        let mut matrix = [[0.0; PORTS]; PORTS];
        for p in 0..PORTS {
            let k = &self.root_by_current[p];
            for tube in 0..PORTS / 2 {
                let s = &slopes[tube];
                matrix[p][2 * tube] = -(k[2 * tube] * s.grid_by_vgk + k[2 * tube + 1] * s.plate_by_vgk);
                matrix[p][2 * tube + 1] = -(k[2 * tube + 1] * s.plate_by_vpk);
            }
            matrix[p][p] += 1.0;
        }
        matrix
    }

    #[cold]
    fn damped(&mut self, offer: &[f64; PORTS]) -> Rooted<PORTS> {
        let law = |tube: usize, vgk: f64, vpk: f64| self.sections[tube].currents(vgk, vpk);
        let solved: Solved = root::solve(&self.source.root_by_current, offer, offer, CONVERGED, &law);
        self.counts.add(solved.counts);
        debug_assert!(PORTS <= MAX_PORTS);
        Rooted {
            volts: std::array::from_fn(|p| solved.volts[p]),
            amps: std::array::from_fn(|p| solved.amps[p]),
            slopes: solved.slopes,
        }
    }

    /// Carries the sensitivity through a step: M′ = Λ·M + B·J·(I − K·J)⁻¹·Q·M.
    #[inline]
    fn carry(&self, slopes: &[Currents; 2], m: &mut Sensitivity<MODES>) {
        let mut y = [[0.0; MODES]; PORTS];
        for p in 0..PORTS {
            for (row, factor) in m.iter().zip(self.root_by_mode[p]) {
                for k in 0..MODES {
                    y[p][k] += factor * row[k];
                }
            }
        }
        let mut matrix = self.jacobian(slopes);
        eliminate(&mut matrix, |row, pivot, factor| {
            for k in 0..MODES {
                y[row][k] -= factor * y[pivot][k];
            }
        });
        for p in (0..PORTS).rev() {
            for q in p + 1..PORTS {
                for k in 0..MODES {
                    y[p][k] -= matrix[p][q] * y[q][k];
                }
            }
            let inverse = 1.0 / matrix[p][p];
            for k in 0..MODES {
                y[p][k] *= inverse;
            }
        }
        for tube in 0..PORTS / 2 {
            let s = slopes[tube];
            for k in 0..MODES {
                let (g, p) = (y[2 * tube][k], y[2 * tube + 1][k]);
                y[2 * tube][k] = s.grid_by_vgk * g;
                y[2 * tube + 1][k] = s.plate_by_vgk * g + s.plate_by_vpk * p;
            }
        }
        for k in 0..MODES {
            for column in 0..MODES {
                m[k][column] *= self.eigenvalue[k];
            }
            for p in 0..PORTS {
                for column in 0..MODES {
                    m[k][column] += self.mode_by_current[k][p] * y[p][column];
                }
            }
        }
    }
}

/// Gaussian elimination without pivoting: I − K·J of a passive junction keeps its diagonal away from 0.
#[inline(always)]
fn eliminate<const N: usize>(matrix: &mut [[f64; N]; N], mut apply: impl FnMut(usize, usize, f64)) {
    for pivot in 0..N {
        let inverse = 1.0 / matrix[pivot][pivot];
        for row in pivot + 1..N {
            let factor = matrix[row][pivot] * inverse;
            for column in pivot + 1..N {
                matrix[row][column] -= factor * matrix[pivot][column];
            }
            apply(row, pivot, factor);
        }
    }
}

#[inline(always)]
fn substitute<const N: usize>(matrix: &[[f64; N]; N], right: &mut [f64; N]) {
    for row in (0..N).rev() {
        for column in row + 1..N {
            right[row] -= matrix[row][column] * right[column];
        }
        right[row] /= matrix[row][row];
    }
}
