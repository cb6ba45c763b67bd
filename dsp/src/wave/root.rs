//! The grouped nonlinear root: the triodes' port voltages that satisfy junction and laws together.
//!
//! The triodes' ports stay unadapted and are solved as one problem (Werner, Nangia, Smith & Abel, "Resolving wave
//! digital filters with multiple/multiport nonlinearities", DAFx-15; Olsen, Werner & Smith, DAFx-16): find v with
//! v = p + K·i(v), where p is what the junction offers and K = −(its resistance matrix).

use crate::linear::Matrix;
use crate::triode::Currents;

/// How a root was found.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct RootCounts {
    /// Newton steps.
    pub newton: u64,
    /// Steps that had to be shortened.
    pub damped: u64,
    /// Roots that needed the homotopy fallback.
    pub fallback: u64,
    /// Roots that stayed above their tolerance.
    pub unresolved: u64,
}

impl RootCounts {
    /// Adds another count.
    pub fn add(&mut self, other: RootCounts) {
        self.newton += other.newton;
        self.damped += other.damped;
        self.fallback += other.fallback;
        self.unresolved += other.unresolved;
    }
}

/// Most ports a root has: two triodes with two each.
pub(crate) const MAX_PORTS: usize = 4;

/// A solved root.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Solved {
    /// Port voltages, V.
    pub volts: [f64; MAX_PORTS],
    /// Port currents that fit the last linearisation, so that Kirchhoff holds exactly, A.
    pub amps: [f64; MAX_PORTS],
    /// Slopes of the laws there.
    pub slopes: [Currents; MAX_PORTS / 2],
    pub counts: RootCounts,
}

/// Newton steps tried undamped, damped, and in each stage of the homotopy.
const NEWTON_LIMIT: usize = 60;
const HOMOTOPY_STAGES: usize = 40;

/// Solves v = offer + resistance·i(v) to `tolerance` volts, starting at `start`.
///
/// `resistance` is −(Thevenin resistance) in the triodes' port order. `law(tube, vgk, vpk)` gives the currents.
pub(crate) fn solve(
    resistance: &Matrix<f64>,
    offer: &[f64],
    start: &[f64],
    tolerance: f64,
    law: &dyn Fn(usize, f64, f64) -> Currents,
) -> Solved {
    let root = Root { resistance, offer, law, ports: offer.len() };
    let mut counts = RootCounts::default();
    let mut volts = [0.0; MAX_PORTS];
    volts[..root.ports].copy_from_slice(start);
    if let Some(solved) = root.newton(volts, 1.0, tolerance, &mut counts) {
        return Solved { counts, ..solved };
    }
    // The currents are let in little by little: without them the solution is the offer itself.
    counts.fallback += 1;
    let mut along = [0.0; MAX_PORTS];
    along[..root.ports].copy_from_slice(offer);
    let (mut reached, mut stride) = (0.0f64, 1.0 / 16.0);
    for _ in 0..HOMOTOPY_STAGES * 4 {
        let next = (reached + stride).min(1.0);
        match root.newton(along, next, tolerance, &mut counts) {
            Some(solved) if next >= 1.0 => return Solved { counts, ..solved },
            Some(solved) => {
                along = solved.volts;
                reached = next;
                stride *= 2.0;
            }
            None => stride *= 0.25,
        }
        if stride < 1e-9 {
            break;
        }
    }
    counts.unresolved += 1;
    let (_, amps, slopes) = root.linearise(&along, 1.0);
    Solved { volts: along, amps, slopes, counts }
}

struct Root<'a> {
    resistance: &'a Matrix<f64>,
    offer: &'a [f64],
    law: &'a dyn Fn(usize, f64, f64) -> Currents,
    ports: usize,
}

impl Root<'_> {
    /// Residual, currents and slopes at `volts`, the currents scaled by `scale`.
    fn linearise(
        &self,
        volts: &[f64; MAX_PORTS],
        scale: f64,
    ) -> ([f64; MAX_PORTS], [f64; MAX_PORTS], [Currents; MAX_PORTS / 2]) {
        let mut amps = [0.0; MAX_PORTS];
        let mut slopes = [Currents::default(); MAX_PORTS / 2];
        for tube in 0..self.ports / 2 {
            let c = (self.law)(tube, volts[2 * tube], volts[2 * tube + 1]);
            amps[2 * tube] = scale * c.grid;
            amps[2 * tube + 1] = scale * c.plate;
            slopes[tube] = Currents {
                grid: c.grid,
                plate: c.plate,
                grid_by_vgk: scale * c.grid_by_vgk,
                plate_by_vgk: scale * c.plate_by_vgk,
                plate_by_vpk: scale * c.plate_by_vpk,
            };
        }
        let mut residual = [0.0; MAX_PORTS];
        for row in 0..self.ports {
            residual[row] = volts[row] - self.offer[row];
            for (column, amp) in amps.iter().enumerate().take(self.ports) {
                residual[row] -= self.resistance[(row, column)] * amp;
            }
        }
        (residual, amps, slopes)
    }

    /// Newton with backtracking; `None` where it stalls.
    fn newton(
        &self,
        mut volts: [f64; MAX_PORTS],
        scale: f64,
        tolerance: f64,
        counts: &mut RootCounts,
    ) -> Option<Solved> {
        let (mut residual, mut amps, mut slopes) = self.linearise(&volts, scale);
        for _ in 0..NEWTON_LIMIT {
            counts.newton += 1;
            let step = self.step(&residual, &slopes)?;
            let size = largest(&step);
            if !size.is_finite() {
                return None;
            }
            if size < tolerance {
                for port in 0..self.ports {
                    volts[port] -= step[port];
                }
                for tube in 0..self.ports / 2 {
                    let (dg, dp) = (step[2 * tube], step[2 * tube + 1]);
                    let s = slopes[tube];
                    amps[2 * tube] -= s.grid_by_vgk * dg;
                    amps[2 * tube + 1] -= s.plate_by_vgk * dg + s.plate_by_vpk * dp;
                }
                return Some(Solved { volts, amps, slopes, counts: RootCounts::default() });
            }
            let before = largest(&residual);
            let mut fraction = 1.0;
            loop {
                let mut trial = volts;
                for port in 0..self.ports {
                    trial[port] -= fraction * step[port];
                }
                let at_trial = self.linearise(&trial, scale);
                // A step that only rounding can shorten is taken as it is.
                if largest(&at_trial.0) <= before * (1.0 - 1e-4 * fraction) || size < 1e-7 {
                    volts = trial;
                    (residual, amps, slopes) = at_trial;
                    break;
                }
                fraction *= 0.5;
                counts.damped += 1;
                if fraction < 1e-6 {
                    return None;
                }
            }
        }
        None
    }

    /// The Newton step: (I − K·J)⁻¹ · residual.
    fn step(&self, residual: &[f64; MAX_PORTS], slopes: &[Currents; 2]) -> Option<[f64; MAX_PORTS]> {
        let mut out = [0.0; MAX_PORTS];
        let solution = jacobian(self.resistance, slopes).solve_vector(&residual[..self.ports])?;
        out[..self.ports].copy_from_slice(&solution);
        Some(out)
    }
}

/// I − K·J at the laws' slopes.
pub(crate) fn jacobian(resistance: &Matrix<f64>, slopes: &[Currents; 2]) -> Matrix<f64> {
    let ports = resistance.rows();
    let mut matrix = Matrix::identity(ports);
    for row in 0..ports {
        for tube in 0..ports / 2 {
            let (by_grid, by_plate) = (resistance[(row, 2 * tube)], resistance[(row, 2 * tube + 1)]);
            let s = slopes[tube];
            matrix[(row, 2 * tube)] -= by_grid * s.grid_by_vgk + by_plate * s.plate_by_vgk;
            matrix[(row, 2 * tube + 1)] -= by_plate * s.plate_by_vpk;
        }
    }
    matrix
}

fn largest(values: &[f64; MAX_PORTS]) -> f64 {
    values.iter().fold(0.0, |a: f64, b| if a.is_nan() || b.is_nan() { f64::NAN } else { a.max(b.abs()) })
}
