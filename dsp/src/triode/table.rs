//! Laws from tables: one-dimensional cubic splines in place of logarithms and powers.
//!
//! Every law is a power of a softplus, ln(1+e^z)^γ, of a linear combination of the two voltages, so a table in z alone
//! serves all of a tube's sections. The splines are twice continuously differentiable; past their ends they go on with
//! value and slope together.

use std::sync::Arc;

use super::law::softplus;
use super::lookup::{Lookup, Which, cubic};
use super::numbers::TubeNumbers;
use super::spline::Cells;
use super::{Currents, GridLaw, Law, Section, TwoSection};
use crate::lanes::F64x4;

/// z below which ln(1+e^z)^γ is 0 to a double beside its value in use: e^−36 is 2·10⁻¹⁶.
const Z_LOW: f64 = -36.0;
/// Fine enough for currents within 10⁻⁶ of the law wherever they are above a nanoampere.
const CELLS_PER_UNIT: f64 = 32.0;
/// Voltages that the tables cover before they go straight on: far beyond what a line stage's supply and driver reach.
const COVERED_VPK: f64 = 1000.0;
const COVERED_VGK: f64 = 40.0;
/// Place of z = 0: the cell of zeros ends, half a cell past its middle, at `Z_LOW`.
const PLACE_OF_ZERO: f64 = -Z_LOW * CELLS_PER_UNIT + 0.5;

/// √(plate volts) at the end of the table of the Koren law's second power, and its cells a unit.
const ROOT_HIGH: f64 = 64.0;
const ROOT_CELLS_PER_UNIT: f64 = 32.0;
const ROOT_LAST: usize = (ROOT_HIGH * ROOT_CELLS_PER_UNIT) as usize;

/// ln(1+e^z)^power for z from −∞ to ∞, by spline to some `z_high`.
fn soft_powers(power: f64, z_high: f64) -> Cells {
    // Past 40 the softplus is z to the last bit.
    let soft = |z: f64| if z > 40.0 { z } else { softplus(z).0 };
    let z_high = z_high.clamp(64.0, 4096.0).ceil();
    let count = ((z_high - Z_LOW) * CELLS_PER_UNIT) as usize + 1;
    let value = |k: usize| libm::pow(soft(Z_LOW + k as f64 / CELLS_PER_UNIT), power);
    let mut values: Vec<f64> = (0..count).map(value).collect();
    values[0] = 0.0;
    let (end, slope) = (values[count - 1], power * libm::pow(z_high, power - 1.0) / CELLS_PER_UNIT);
    Cells::spline(&values, (0.0, slope)).preceded_by_zeros().straight_on(end, slope)
}

/// root^(2·power), which is x^power of x = root²: smooth enough at 0 for a spline, which x^power is not.
fn root_powers(power: f64) -> Cells {
    let value = |k: usize| libm::pow(k as f64 / ROOT_CELLS_PER_UNIT, 2.0 * power);
    let values: Vec<f64> = (0..=ROOT_LAST).map(value).collect();
    let slope = 2.0 * power * libm::pow(ROOT_HIGH, 2.0 * power - 1.0) / ROOT_CELLS_PER_UNIT;
    Cells::spline(&values, (0.0, slope)).straight_on(values[ROOT_LAST], slope)
}

/// The kind of a law: four lanes of a step must agree on it, not on its parameters.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub(crate) enum LawKind {
    TwoSection,
    ThreeSection,
    DempwolfZoelzer,
    Koren,
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
    plate: Cells,
    grid: Cells,
    /// Koren's second factor.
    root: Cells,
}

impl Tables {
    #[inline(always)]
    pub fn cells(&self, which: Which) -> &[F64x4] {
        match which {
            Which::Plate => &self.plate.0,
            Which::Grid => &self.grid.0,
            Which::Root => &self.root.0,
        }
    }
}

impl TabulatedSection {
    pub fn new(section: &Section) -> TabulatedSection {
        let (kind, power, z_high, mut numbers) = match section.law {
            Law::TwoSection(l) => {
                let least_mu = l.mu * l.mu_ratio.min(1.0);
                (LawKind::TwoSection, l.gamma, end_of_sections(&l, least_mu), of_two_sections(&l))
            }
            Law::ThreeSection(l) => {
                let two = of_two_sections(&l.two);
                let scale = l.two.g * libm::pow(l.two.c, -l.two.gamma);
                let numbers = TubeNumbers {
                    weight: two.weight - scale * l.third_share,
                    third_weight: scale * l.third_share,
                    third_inverse_mu: 1.0 / (l.two.mu * l.third_mu_ratio),
                    ..two
                };
                let least_mu = l.two.mu * l.two.mu_ratio.min(l.third_mu_ratio).min(1.0);
                (LawKind::ThreeSection, l.two.gamma, end_of_sections(&l.two, least_mu), numbers)
            }
            Law::DempwolfZoelzer(l) => {
                let weight = l.g * libm::pow(l.c, -l.gamma);
                let numbers = TubeNumbers { inverse_mu: 1.0 / l.mu, weight, ..in_cells(l.c) };
                (LawKind::DempwolfZoelzer, l.gamma, l.c * (COVERED_VPK / l.mu + COVERED_VGK), numbers)
            }
            Law::Koren(l) => {
                let numbers = TubeNumbers {
                    constant: l.kp / l.mu,
                    weight: 2.0 / l.kg1 * libm::pow(l.kp, -l.ex),
                    knee_cubed: l.kvb,
                    ..in_cells(l.kp)
                };
                // Largest where the plate is at the cathode; a quarter of the grid's range is far past its use there.
                let z_high = l.kp * (1.0 / l.mu + 0.25 * COVERED_VGK / l.kvb.sqrt());
                (LawKind::Koren, l.ex, z_high, numbers)
            }
        };
        numbers.constant = numbers.constant * CELLS_PER_UNIT + PLACE_OF_ZERO;
        numbers.by_vpk = numbers.by_vgk * numbers.inverse_mu;
        numbers.second_by_vpk = numbers.by_vgk * numbers.second_inverse_mu;
        numbers.third_by_vpk = numbers.by_vgk * numbers.third_inverse_mu;
        numbers.slope_weight = numbers.by_vgk * numbers.weight;
        numbers.second_slope_weight = numbers.by_vgk * numbers.second_weight;
        numbers.third_slope_weight = numbers.by_vgk * numbers.third_weight;
        let GridLaw { gg, xi, cg, ig0 } = section.grid;
        numbers.grid_by_vgk = cg * CELLS_PER_UNIT;
        numbers.grid_weight = gg * libm::pow(cg, -xi);
        numbers.grid_slope_weight = numbers.grid_by_vgk * numbers.grid_weight;
        numbers.grid_constant = ig0;
        let root = if kind == LawKind::Koren { root_powers(power) } else { Cells(Vec::new()) };
        let tables = Tables { plate: soft_powers(power, z_high), grid: soft_powers(xi, cg * COVERED_VGK), root };
        numbers.plate_last = (tables.plate.0.len() - 1) as f64;
        numbers.grid_last = (tables.grid.0.len() - 1) as f64;
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

/// z at the end of the table of elementary triodes, the least µ of which is `least_mu`.
fn end_of_sections(l: &TwoSection, least_mu: f64) -> f64 {
    l.c * (COVERED_VPK / least_mu + COVERED_VGK + l.offset)
}

fn of_two_sections(l: &TwoSection) -> TubeNumbers<f64> {
    let scale = l.g * libm::pow(l.c, -l.gamma);
    // Never 0, so that a plate at 0 V divides 0 by something.
    let knee_cubed = (l.knee * l.knee * l.knee).max(1e-60);
    TubeNumbers {
        constant: l.c * l.offset,
        inverse_mu: 1.0 / l.mu,
        second_inverse_mu: 1.0 / (l.mu * l.mu_ratio),
        weight: scale * (1.0 - l.share),
        second_weight: scale * l.share,
        knee_cubed,
        thrice_knee_cubed: 3.0 * knee_cubed,
        ..in_cells(l.c)
    }
}

/// Numbers of a law whose softplus has `sharpness` by vgk.
fn in_cells(sharpness: f64) -> TubeNumbers<f64> {
    TubeNumbers { by_vgk: sharpness * CELLS_PER_UNIT, ..TubeNumbers::default() }
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

/// Currents and slopes of one tube in every lane, all lanes of the same `kind`.
#[inline(always)]
pub(crate) fn currents<V: Lookup>(
    kind: LawKind,
    n: &TubeNumbers<V>,
    tables: V::Tables<'_>,
    vgk: V,
    vpk: V,
) -> LaneCurrents<V> {
    let place = n.grid_by_vgk * vgk + V::splat(PLACE_OF_ZERO);
    let (grid, grid_slope) = cubic(tables, Which::Grid, place, n.grid_last);
    let grid = n.grid_weight * grid + n.grid_constant;
    let grid_by_vgk = n.grid_slope_weight * grid_slope;
    let (plate, plate_by_vgk, plate_by_vpk) = match kind {
        LawKind::TwoSection => two_section(n, tables, vgk, vpk),
        LawKind::ThreeSection => three_section(n, tables, vgk, vpk),
        LawKind::Koren => koren(n, tables, vgk, vpk),
        LawKind::DempwolfZoelzer => {
            let place = n.by_vpk * vpk + (n.by_vgk * vgk + n.constant);
            let (value, slope) = cubic(tables, Which::Plate, place, n.plate_last);
            let slope = n.slope_weight * slope;
            (n.weight * value - grid, slope - grid_by_vgk, slope * n.inverse_mu)
        }
    };
    LaneCurrents { grid, plate, grid_by_vgk, plate_by_vgk, plate_by_vpk }
}

#[inline(always)]
fn two_section<V: Lookup>(n: &TubeNumbers<V>, tables: V::Tables<'_>, vgk: V, vpk: V) -> (V, V, V) {
    let (current, by_vgk, by_vpk) = two_sections(n, tables, vgk, vpk);
    faded(n, vpk, current, by_vgk, by_vpk)
}

#[inline(always)]
fn three_section<V: Lookup>(n: &TubeNumbers<V>, tables: V::Tables<'_>, vgk: V, vpk: V) -> (V, V, V) {
    let (current, by_vgk, by_vpk) = two_sections(n, tables, vgk, vpk);
    let place = n.third_by_vpk * vpk + (n.by_vgk * vgk + n.constant);
    let (third, slope) = cubic(tables, Which::Plate, place, n.plate_last);
    let slope = n.third_slope_weight * slope;
    faded(n, vpk, current + n.third_weight * third, by_vgk + slope, by_vpk + slope * n.third_inverse_mu)
}

/// The first two sections before the knee: current and its slopes by vgk and vpk.
#[inline(always)]
fn two_sections<V: Lookup>(n: &TubeNumbers<V>, tables: V::Tables<'_>, vgk: V, vpk: V) -> (V, V, V) {
    let by_grid = n.by_vgk * vgk + n.constant;
    let (first, first_slope) = cubic(tables, Which::Plate, n.by_vpk * vpk + by_grid, n.plate_last);
    let (second, second_slope) = cubic(tables, Which::Plate, n.second_by_vpk * vpk + by_grid, n.plate_last);
    let (first_slope, second_slope) = (n.slope_weight * first_slope, n.second_slope_weight * second_slope);
    let current = n.weight * first + n.second_weight * second;
    let by_vpk = first_slope * n.inverse_mu + second_slope * n.second_inverse_mu;
    (current, first_slope + second_slope, by_vpk)
}

/// Current and slopes under the knee's D(vpk).
#[inline(always)]
fn faded<V: Lookup>(n: &TubeNumbers<V>, vpk: V, current: V, by_vgk: V, by_vpk: V) -> (V, V, V) {
    let v = vpk.max(V::splat(0.0));
    let square = v * v;
    let cube = square * v;
    let inverse = V::splat(1.0) / (cube + n.knee_cubed);
    let fade = cube * inverse;
    let fade_slope = (square * n.thrice_knee_cubed) * (inverse * inverse);
    (fade * current, fade * by_vgk, fade * by_vpk + fade_slope * current)
}

#[inline(always)]
fn koren<V: Lookup>(n: &TubeNumbers<V>, tables: V::Tables<'_>, vgk: V, vpk: V) -> (V, V, V) {
    let zero = V::splat(0.0);
    let v = vpk.max(zero);
    let inverse_root = V::splat(1.0) / (n.knee_cubed + v * v).sqrt();
    let by_vgk = n.by_vgk * inverse_root;
    let (soft, soft_slope) = cubic(tables, Which::Plate, n.constant + by_vgk * vgk, n.plate_last);
    let root = v.sqrt();
    let place = root * V::splat(ROOT_CELLS_PER_UNIT) - V::splat(0.5);
    let (power, power_slope) = cubic(tables, Which::Root, place, V::splat(ROOT_LAST as f64));
    // d(root)/d(vpk) = 1/(2·root); where the plate is not positive the law and its slopes are 0.
    let halved = V::splat(0.5 * ROOT_CELLS_PER_UNIT) / root.max(V::splat(1e-6));
    let power_by_vpk = power_slope * halved * v.at_least(f64::MIN_POSITIVE, V::splat(1.0), zero);
    let power = n.weight * power;
    let current_by_vgk = power * soft_slope * by_vgk;
    let by_vpk = n.weight * soft * power_by_vpk - current_by_vgk * vgk * v * inverse_root * inverse_root;
    (power * soft, current_by_vgk, by_vpk)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::lanes::LANES;
    use crate::triode::gather;
    use crate::triode::{DempwolfZoelzer, Koren, ThreeSection};

    fn sections() -> [Section; 4] {
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
        let three = ThreeSection { two, third_share: 0.11, third_mu_ratio: 0.25 };
        [Law::TwoSection(two), Law::ThreeSection(three), Law::DempwolfZoelzer(one), Law::Koren(koren)]
            .map(|law| Section { law, grid, capacitance: Default::default() })
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

    #[test]
    fn a_tube_of_the_librarys_own_law_never_gives_power() {
        let library =
            crate::triode::library::names().map(|name| crate::triode::library::find(name).unwrap().section);
        let own = library.chain([sections()[0]]).filter(|s| matches!(s.law, Law::TwoSection(_)));
        let mut seen = 0;
        for section in own {
            let table = TabulatedSection::new(&section);
            for g in 0..=900 {
                for p in 0..=160 {
                    let (vgk, vpk) = (-70.0 + 0.1117 * g as f64, -52.0 + 7.31 * p as f64);
                    for current in [table.currents(vgk, vpk).plate, section.currents(vgk, vpk).plate] {
                        assert!(current * vpk >= 0.0, "{current:e} A at {vgk} V, {vpk} V: {:?}", section.law);
                    }
                    seen += 1;
                }
            }
        }
        assert!(seen > 100_000);
    }
}
