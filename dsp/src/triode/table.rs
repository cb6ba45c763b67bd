//! Laws from tables: one-dimensional cubic splines in place of logarithms and powers.
//!
//! Every law is a power of a softplus, ln(1+e^z)^γ, of a linear combination of the two voltages, so a table in z alone
//! serves all of a tube's sections. The splines are twice continuously differentiable; past their ends they go on with
//! value and slope together.

use std::sync::Arc;

use super::law::softplus;
use super::{Currents, GridLaw, Law, Section};
use crate::lanes::{F64x4, LANES, Lanes};

/// z below which ln(1+e^z)^γ is 0 to a double beside its value in use: e^−36 is 2·10⁻¹⁶.
const Z_LOW: f64 = -36.0;
/// z above which the softplus equals z to a double, so that the table is a plain power and may be coarse.
const Z_BEND: f64 = 24.0;
/// The end of the table: for C of 5 V⁻¹ it stands at 128 V, well past 400 V over a µ of 5.
const Z_HIGH: f64 = 664.0;
const FINE_PER_UNIT: f64 = 32.0;
const COARSE_PER_UNIT: f64 = 2.0;
const FINE_CELLS: f64 = (Z_BEND - Z_LOW) * FINE_PER_UNIT;
const CELLS: usize = (FINE_CELLS + (Z_HIGH - Z_BEND) * COARSE_PER_UNIT) as usize;

/// √(plate volts) at the end of the table of the Koren law's second power, and its cells a unit.
const ROOT_HIGH: f64 = 64.0;
const ROOT_PER_UNIT: f64 = 32.0;
const ROOT_CELLS: usize = (ROOT_HIGH * ROOT_PER_UNIT) as usize;

/// Cubic pieces, each in its own coordinate 0…1: c0 + t·(c1 + t·(c2 + t·c3)).
#[derive(Clone, Debug)]
struct Pieces(Vec<F64x4>);

impl Pieces {
    /// The clamped cubic spline through `values` at `knots`, with the given end slopes (de Boor, *A Practical Guide to
    /// Splines*, chapter IV).
    fn spline(knots: &[f64], values: &[f64], end_slopes: (f64, f64)) -> Pieces {
        let slopes = spline_slopes(knots, values, end_slopes);
        let piece = |k: usize| {
            let h = knots[k + 1] - knots[k];
            let rise = values[k + 1] - values[k];
            let (d0, d1) = (slopes[k] * h, slopes[k + 1] * h);
            F64x4([values[k], d0, 3.0 * rise - 2.0 * d0 - d1, d0 + d1 - 2.0 * rise])
        };
        Pieces((0..knots.len() - 1).map(piece).collect())
    }
}

/// Slopes at the knots of the C² cubic with clamped ends: a tridiagonal system.
fn spline_slopes(knots: &[f64], values: &[f64], (first, last): (f64, f64)) -> Vec<f64> {
    let n = knots.len();
    let width = |k: usize| knots[k + 1] - knots[k];
    let (mut ratio, mut slopes) = (vec![0.0; n], vec![first; n]);
    for k in 1..n - 1 {
        let (left, right) = (width(k - 1), width(k));
        let chords =
            3.0 * (right / left * (values[k] - values[k - 1]) + left / right * (values[k + 1] - values[k]));
        let pivot = 2.0 * (left + right) - right * ratio[k - 1];
        ratio[k] = left / pivot;
        slopes[k] = (chords - right * slopes[k - 1]) / pivot;
    }
    slopes[n - 1] = last;
    for k in (1..n - 1).rev() {
        slopes[k] -= ratio[k] * slopes[k + 1];
    }
    slopes
}

/// ln(1+e^z)^power for z from −∞ to ∞.
#[derive(Clone, Debug)]
struct SoftPower(Pieces);

impl SoftPower {
    fn new(power: f64) -> SoftPower {
        let knots: Vec<f64> = (0..=CELLS)
            .map(|k| match k as f64 - FINE_CELLS {
                past if past <= 0.0 => Z_LOW + k as f64 / FINE_PER_UNIT,
                past => Z_BEND + past / COARSE_PER_UNIT,
            })
            .collect();
        let value = |z: f64| libm::pow(softplus(z).0, power);
        let mut values: Vec<f64> = knots.iter().map(|&z| value(z)).collect();
        values[0] = 0.0;
        let last = power * libm::pow(Z_HIGH, power - 1.0);
        SoftPower(Pieces::spline(&knots, &values, (0.0, last)))
    }
}

/// root^(2·power), which is x^power of x = root²: smooth enough at 0 for a spline, which x^power is not.
fn root_power(power: f64) -> Pieces {
    let knots: Vec<f64> = (0..=ROOT_CELLS).map(|k| k as f64 / ROOT_PER_UNIT).collect();
    let values: Vec<f64> = knots.iter().map(|&root| libm::pow(root, 2.0 * power)).collect();
    let last = 2.0 * power * libm::pow(ROOT_HIGH, 2.0 * power - 1.0);
    Pieces::spline(&knots, &values, (0.0, last))
}

/// The kind of a law: four lanes of a step must agree on it, not on its parameters.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub(crate) enum LawKind {
    TwoSection,
    DempwolfZoelzer,
    Koren,
}

/// Numbers of one tube as the tabulated laws use them; a table's scale factors are folded in.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct TubeNumbers<V> {
    /// z of the first section by vpk, by vgk (Koren: by vgk/√(Kvb+vpk²)), and its constant part.
    by_vpk: V,
    by_vgk: V,
    constant: V,
    /// z of the second section by vpk.
    second_by_vpk: V,
    weight: V,
    second_weight: V,
    /// knee³ (Koren: Kvb).
    knee_cubed: V,
    grid_by_vgk: V,
    grid_weight: V,
    grid_constant: V,
}

/// A section with its tables.
#[derive(Clone, Debug)]
pub(crate) struct TabulatedSection {
    pub kind: LawKind,
    pub numbers: TubeNumbers<f64>,
    pub tables: Arc<Tables>,
}

/// The tables of one section.
#[derive(Clone, Debug)]
pub(crate) struct Tables {
    plate: SoftPower,
    grid: SoftPower,
    /// Koren's second factor.
    root: Pieces,
}

impl TabulatedSection {
    pub fn new(section: &Section) -> TabulatedSection {
        let (kind, power, mut numbers) = match section.law {
            Law::TwoSection(l) => {
                let scale = l.g * libm::pow(l.c, -l.gamma);
                let numbers = TubeNumbers {
                    by_vpk: l.c / l.mu,
                    by_vgk: l.c,
                    constant: l.c * l.offset,
                    second_by_vpk: l.c / (l.mu * l.mu_ratio),
                    weight: scale * (1.0 - l.share),
                    second_weight: scale * l.share,
                    // Never 0, so that a plate at 0 V divides 0 by something.
                    knee_cubed: (l.knee * l.knee * l.knee).max(1e-60),
                    ..TubeNumbers::default()
                };
                (LawKind::TwoSection, l.gamma, numbers)
            }
            Law::DempwolfZoelzer(l) => {
                let numbers = TubeNumbers {
                    by_vpk: l.c / l.mu,
                    by_vgk: l.c,
                    weight: l.g * libm::pow(l.c, -l.gamma),
                    ..TubeNumbers::default()
                };
                (LawKind::DempwolfZoelzer, l.gamma, numbers)
            }
            Law::Koren(l) => {
                let numbers = TubeNumbers {
                    by_vgk: l.kp,
                    constant: l.kp / l.mu,
                    weight: 2.0 / l.kg1 * libm::pow(l.kp, -l.ex),
                    knee_cubed: l.kvb,
                    ..TubeNumbers::default()
                };
                (LawKind::Koren, l.ex, numbers)
            }
        };
        let GridLaw { gg, xi, cg, ig0 } = section.grid;
        numbers.grid_by_vgk = cg;
        numbers.grid_weight = gg * libm::pow(cg, -xi);
        numbers.grid_constant = ig0;
        let root = if kind == LawKind::Koren { root_power(power) } else { Pieces(Vec::new()) };
        let tables = Tables { plate: SoftPower::new(power), grid: SoftPower::new(xi), root };
        TabulatedSection { kind, numbers, tables: Arc::new(tables) }
    }

    /// Currents and slopes from the tables.
    pub fn currents(&self, vgk: f64, vpk: f64) -> Currents {
        let s = currents(self.kind, &self.numbers, &self.tables, vgk, vpk);
        Currents {
            grid: s.grid,
            plate: s.plate,
            grid_by_vgk: s.grid_by_vgk,
            plate_by_vgk: s.plate_by_vgk,
            plate_by_vpk: s.plate_by_vpk,
        }
    }
}

/// Four lanes' numbers beside each other.
pub(crate) fn gather(lanes: [&TubeNumbers<f64>; LANES]) -> TubeNumbers<F64x4> {
    let pick = |field: fn(&TubeNumbers<f64>) -> f64| F64x4(lanes.map(field));
    TubeNumbers {
        by_vpk: pick(|n| n.by_vpk),
        by_vgk: pick(|n| n.by_vgk),
        constant: pick(|n| n.constant),
        second_by_vpk: pick(|n| n.second_by_vpk),
        weight: pick(|n| n.weight),
        second_weight: pick(|n| n.second_weight),
        knee_cubed: pick(|n| n.knee_cubed),
        grid_by_vgk: pick(|n| n.grid_by_vgk),
        grid_weight: pick(|n| n.grid_weight),
        grid_constant: pick(|n| n.grid_constant),
    }
}

/// Currents and slopes of one tube in every lane.
#[derive(Clone, Copy)]
pub(crate) struct LaneCurrents<V> {
    pub grid: V,
    pub plate: V,
    pub grid_by_vgk: V,
    pub plate_by_vgk: V,
    pub plate_by_vpk: V,
}

/// Which of a section's tables.
#[derive(Clone, Copy)]
pub(crate) enum Which {
    Plate,
    Grid,
    Root,
}

impl Tables {
    #[inline(always)]
    fn cells(&self, which: Which) -> &[F64x4] {
        match which {
            Which::Plate => &self.plate.0.0,
            Which::Grid => &self.grid.0.0,
            Which::Root => &self.root.0,
        }
    }

    /// The cell that holds `place` and the way into it, 0…1.
    ///
    /// `place` must lie from 0 to below the number of cells, as [`clamped`] makes it.
    #[inline(always)]
    fn fetch(&self, which: Which, place: f64) -> (f64, F64x4) {
        let cells = self.cells(which);
        // SAFETY: `clamped` leaves 0 ≤ place < cells.len(), NaN included, so it fits an i32 and a cell.
        let index = unsafe { place.to_int_unchecked::<i32>() };
        debug_assert!((index as usize) < cells.len());
        let cell = unsafe { *cells.get_unchecked(index as usize) };
        (place - f64::from(index), cell)
    }
}

/// Lanes that can look a table up, each in its own.
pub(crate) trait Lookup: Lanes {
    /// One set of tables a lane.
    type Tables<'a>: Copy;

    /// The way into each lane's cell, 0…1, and the cell's coefficients.
    fn fetch(tables: Self::Tables<'_>, which: Which, place: Self) -> (Self, [Self; 4]);
    /// Square root.
    fn sqrt(self) -> Self;
    /// `yes` where the lane is at least `bound`, else `no`.
    fn at_least(self, bound: f64, yes: Self, no: Self) -> Self;
}

impl Lookup for f64 {
    type Tables<'a> = &'a Tables;

    #[inline(always)]
    fn fetch(tables: &Tables, which: Which, place: f64) -> (f64, [f64; 4]) {
        let (t, cell) = tables.fetch(which, place);
        (t, cell.0)
    }
    #[inline(always)]
    fn sqrt(self) -> f64 {
        f64::sqrt(self)
    }
    #[inline(always)]
    fn at_least(self, bound: f64, yes: f64, no: f64) -> f64 {
        if self >= bound { yes } else { no }
    }
}

impl Lookup for F64x4 {
    type Tables<'a> = [&'a Tables; LANES];

    #[inline(always)]
    fn fetch(tables: [&Tables; LANES], which: Which, place: F64x4) -> (F64x4, [F64x4; 4]) {
        let p = place.0;
        let (t0, r0) = tables[0].fetch(which, p[0]);
        let (t1, r1) = tables[1].fetch(which, p[1]);
        let (t2, r2) = tables[2].fetch(which, p[2]);
        let (t3, r3) = tables[3].fetch(which, p[3]);
        let (r0, r1, r2, r3) = (r0.0, r1.0, r2.0, r3.0);
        let row = |k: usize| F64x4([r0[k], r1[k], r2[k], r3[k]]);
        (F64x4([t0, t1, t2, t3]), [row(0), row(1), row(2), row(3)])
    }
    #[inline(always)]
    fn sqrt(self) -> F64x4 {
        let a = self.0;
        F64x4([a[0].sqrt(), a[1].sqrt(), a[2].sqrt(), a[3].sqrt()])
    }
    #[inline(always)]
    fn at_least(self, bound: f64, yes: F64x4, no: F64x4) -> F64x4 {
        let pick = |k: usize| if self.0[k] >= bound { yes.0[k] } else { no.0[k] };
        F64x4([pick(0), pick(1), pick(2), pick(3)])
    }
}

/// Keeps a place inside a table of `cells` cells; NaN becomes 0.
#[inline(always)]
fn clamped<V: Lookup>(place: V, cells: usize) -> V {
    place.max(V::splat(0.0)).min(V::splat(cells as f64 - 1e-9))
}

/// Value and slope by place of the cell at `inside`, carried on in a straight line to `place`.
#[inline(always)]
fn cubic<V: Lookup>(tables: V::Tables<'_>, which: Which, place: V, inside: V) -> (V, V) {
    let (t, [c0, c1, c2, c3]) = V::fetch(tables, which, inside);
    let inner = c2 + t * c3;
    let slope = c1 + t * (inner + inner + t * c3);
    (c0 + t * (c1 + t * inner) + slope * (place - inside), slope)
}

/// ln(1+e^z)^γ and its slope by z.
#[inline(always)]
fn soft_power<V: Lookup>(tables: V::Tables<'_>, which: Which, z: V) -> (V, V) {
    let bend = V::splat(Z_BEND);
    let fine = (z.min(bend) - V::splat(Z_LOW)) * V::splat(FINE_PER_UNIT);
    let place = fine + (z.max(bend) - bend) * V::splat(COARSE_PER_UNIT);
    let (value, slope) = cubic(tables, which, place, clamped(place, CELLS));
    let per_unit = place.at_least(FINE_CELLS, V::splat(COARSE_PER_UNIT), V::splat(FINE_PER_UNIT));
    (value, slope * per_unit)
}

/// Currents and slopes of one tube in every lane, all lanes of the same `kind`.
#[inline(always)]
pub(crate) fn currents<V: Lookup>(
    kind: LawKind,
    n: &TubeNumbers<V>,
    tables: V::Tables<'_>,
    vgk: V,
    vpk: V,
) -> LaneCurrents<V> {
    let (grid, grid_slope) = soft_power(tables, Which::Grid, n.grid_by_vgk * vgk);
    let grid = n.grid_weight * grid + n.grid_constant;
    let grid_by_vgk = n.grid_weight * n.grid_by_vgk * grid_slope;
    let (plate, plate_by_vgk, plate_by_vpk) = match kind {
        LawKind::TwoSection => two_section(n, tables, vgk, vpk),
        LawKind::Koren => koren(n, tables, vgk, vpk),
        LawKind::DempwolfZoelzer => {
            let (value, slope) = soft_power(tables, Which::Plate, n.by_vpk * vpk + n.by_vgk * vgk);
            let slope = n.weight * slope;
            (n.weight * value - grid, slope * n.by_vgk - grid_by_vgk, slope * n.by_vpk)
        }
    };
    LaneCurrents { grid, plate, grid_by_vgk, plate_by_vgk, plate_by_vpk }
}

#[inline(always)]
fn two_section<V: Lookup>(n: &TubeNumbers<V>, tables: V::Tables<'_>, vgk: V, vpk: V) -> (V, V, V) {
    let by_grid = n.by_vgk * vgk + n.constant;
    let (first, first_slope) = soft_power(tables, Which::Plate, n.by_vpk * vpk + by_grid);
    let (second, second_slope) = soft_power(tables, Which::Plate, n.second_by_vpk * vpk + by_grid);
    let (first_slope, second_slope) = (n.weight * first_slope, n.second_weight * second_slope);
    let current = n.weight * first + n.second_weight * second;
    let by_vgk = (first_slope + second_slope) * n.by_vgk;
    let by_vpk = first_slope * n.by_vpk + second_slope * n.second_by_vpk;

    let v = vpk.max(V::splat(0.0));
    let square = v * v;
    let cube = square * v;
    let inverse = V::splat(1.0) / (cube + n.knee_cubed);
    let fade = cube * inverse;
    let fade_slope = V::splat(3.0) * square * n.knee_cubed * inverse * inverse;
    (fade * current, fade * by_vgk, fade * by_vpk + fade_slope * current)
}

#[inline(always)]
fn koren<V: Lookup>(n: &TubeNumbers<V>, tables: V::Tables<'_>, vgk: V, vpk: V) -> (V, V, V) {
    let zero = V::splat(0.0);
    let v = vpk.max(zero);
    let inverse_root = V::splat(1.0) / (n.knee_cubed + v * v).sqrt();
    let (soft, soft_slope) = soft_power(tables, Which::Plate, n.constant + n.by_vgk * vgk * inverse_root);
    let root = v.sqrt();
    let place = root * V::splat(ROOT_PER_UNIT);
    let (power, power_slope) = cubic(tables, Which::Root, place, clamped(place, ROOT_CELLS));
    // d(root)/d(vpk) = 1/(2·root); where the plate is not positive the law and its slopes are 0.
    let halved = V::splat(0.5 * ROOT_PER_UNIT) / root.max(V::splat(1e-6));
    let power_by_vpk = power_slope * halved * v.at_least(f64::MIN_POSITIVE, V::splat(1.0), zero);
    let z_by_vgk = n.by_vgk * inverse_root;
    let by_z = n.weight * power * soft_slope;
    let by_vpk = n.weight * soft * power_by_vpk - by_z * z_by_vgk * vgk * v * inverse_root * inverse_root;
    (n.weight * soft * power, by_z * z_by_vgk, by_vpk)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::triode::{DempwolfZoelzer, Koren, TwoSection};

    fn sections() -> [Section; 3] {
        let grid = GridLaw { gg: 6.2e-4, xi: 1.35, cg: 9.3, ig0: 4e-8 };
        let two = TwoSection {
            g: 1.18e-3,
            mu: 111.8,
            gamma: 1.478,
            c: 5.44,
            share: 0.0256,
            mu_ratio: 0.369,
            offset: 0.59,
            knee: 7.0,
        };
        let one = DempwolfZoelzer { g: 2.173e-3, mu: 100.2, gamma: 1.28, c: 3.19 };
        let koren = Koren { mu: 28.0, ex: 1.3, kg1: 330.0, kp: 320.0, kvb: 300.0 };
        [Law::TwoSection(two), Law::DempwolfZoelzer(one), Law::Koren(koren)].map(|law| Section {
            law,
            grid,
            capacitance: Default::default(),
        })
    }

    /// The largest miss of a tabulated figure from the computed one, over the largest size of that figure nearby.
    fn misses(volts: impl Iterator<Item = (f64, f64)>, section: &Section) -> [f64; 5] {
        let table = TabulatedSection::new(section);
        let list = |c: Currents| [c.grid, c.plate, c.grid_by_vgk, c.plate_by_vgk, c.plate_by_vpk];
        let mut worst = [0.0f64; 5];
        for (vgk, vpk) in volts {
            let (got, want) = (list(table.currents(vgk, vpk)), list(section.currents(vgk, vpk)));
            for k in 0..5 {
                // A floor far below any current that is heard: a nanoampere, and a nanoampere a volt.
                worst[k] = worst[k].max((got[k] - want[k]).abs() / (want[k].abs() + 1e-9));
            }
        }
        worst
    }

    #[test]
    fn tables_follow_the_computed_laws() {
        let grid =
            || (0..=600).flat_map(|g| (0..=97).map(move |p| (-30.0 + 0.0617 * g as f64, 4.3 * p as f64 - 5.0)));
        for section in sections() {
            let worst = misses(grid(), &section);
            assert!(worst[0] < 1e-6 && worst[1] < 1e-6, "{:?} {worst:?}", section.law);
            assert!(worst[2..].iter().all(|&w| w < 2e-5), "{:?} {worst:?}", section.law);
        }
    }

    #[test]
    fn one_lane_equals_four() {
        for section in sections() {
            let t = TabulatedSection::new(&section);
            let four = gather([&t.numbers; LANES]);
            let vgk = F64x4([-3.1, 0.4, 2.0, -60.0]);
            let vpk = F64x4([120.0, 33.0, -4.0, 900.0]);
            let lanes = currents(t.kind, &four, [&t.tables; LANES].map(|t| &**t), vgk, vpk);
            for k in 0..LANES {
                let one = t.currents(vgk.0[k], vpk.0[k]);
                assert_eq!(one.plate.to_bits(), lanes.plate.0[k].to_bits());
                assert_eq!(one.plate_by_vpk.to_bits(), lanes.plate_by_vpk.0[k].to_bits());
                assert_eq!(one.grid.to_bits(), lanes.grid.0[k].to_bits());
            }
        }
    }

    #[test]
    fn beyond_its_ends_a_table_goes_on_with_value_and_slope() {
        for section in sections() {
            let t = TabulatedSection::new(&section);
            for (vgk, vpk) in [(80.0, 300.0), (1e6, 1e6), (-1e6, 1e6), (1e6, -1e6), (-1e6, -1e6)] {
                let c = t.currents(vgk, vpk);
                assert!(
                    c.plate.is_finite() && c.grid.is_finite() && c.plate_by_vpk.is_finite(),
                    "{vgk} {vpk} {c:?}"
                );
                assert!(c.grid_by_vgk >= 0.0);
            }
            let (near, far) = (t.currents(70.0, 0.5), t.currents(71.0, 0.5));
            assert!((far.grid - near.grid - near.grid_by_vgk).abs() < 1e-2 * near.grid);
        }
    }
}
