//! The numbers of one tube, or of four tubes beside each other, that the tabulated laws are made of.

use crate::lanes::{F64x4, LANES};

/// Numbers of one tube as the tabulated laws use them, folded so that a step multiplies as little as it can.
///
/// A *place* is a table's coordinate, counted in cells.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct TubeNumbers<V> {
    /// Place of the first section by vpk, by vgk (Koren: by vgk/√(Kvb+vpk²)), and its constant part.
    pub(super) by_vpk: V,
    pub(super) by_vgk: V,
    pub(super) constant: V,
    /// Place of the second and third section by vpk.
    pub(super) second_by_vpk: V,
    pub(super) third_by_vpk: V,
    /// Amperes of a section by its table's value.
    pub(super) weight: V,
    pub(super) second_weight: V,
    pub(super) third_weight: V,
    /// Siemens by vgk of a section by its table's slope.
    pub(super) slope_weight: V,
    pub(super) second_slope_weight: V,
    pub(super) third_slope_weight: V,
    /// 1/µ of each section: its slope by vpk over that by vgk.
    pub(super) inverse_mu: V,
    pub(super) second_inverse_mu: V,
    pub(super) third_inverse_mu: V,
    /// knee³ (Koren: Kvb), and three times that.
    pub(super) knee_cubed: V,
    pub(super) thrice_knee_cubed: V,
    pub(super) grid_by_vgk: V,
    pub(super) grid_weight: V,
    pub(super) grid_slope_weight: V,
    pub(super) grid_constant: V,
    /// The last cell of each table.
    pub(super) plate_last: V,
    pub(super) grid_last: V,
}

impl<V> TubeNumbers<V> {
    /// The same numbers in another form.
    #[inline(always)]
    pub fn map<W>(&self, f: impl Fn(&V) -> W) -> TubeNumbers<W> {
        TubeNumbers {
            by_vpk: f(&self.by_vpk),
            by_vgk: f(&self.by_vgk),
            constant: f(&self.constant),
            second_by_vpk: f(&self.second_by_vpk),
            third_by_vpk: f(&self.third_by_vpk),
            weight: f(&self.weight),
            second_weight: f(&self.second_weight),
            third_weight: f(&self.third_weight),
            slope_weight: f(&self.slope_weight),
            second_slope_weight: f(&self.second_slope_weight),
            third_slope_weight: f(&self.third_slope_weight),
            inverse_mu: f(&self.inverse_mu),
            second_inverse_mu: f(&self.second_inverse_mu),
            third_inverse_mu: f(&self.third_inverse_mu),
            knee_cubed: f(&self.knee_cubed),
            thrice_knee_cubed: f(&self.thrice_knee_cubed),
            grid_by_vgk: f(&self.grid_by_vgk),
            grid_weight: f(&self.grid_weight),
            grid_slope_weight: f(&self.grid_slope_weight),
            grid_constant: f(&self.grid_constant),
            plate_last: f(&self.plate_last),
            grid_last: f(&self.grid_last),
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
        third_by_vpk: pick(|n| n.third_by_vpk),
        weight: pick(|n| n.weight),
        second_weight: pick(|n| n.second_weight),
        third_weight: pick(|n| n.third_weight),
        slope_weight: pick(|n| n.slope_weight),
        second_slope_weight: pick(|n| n.second_slope_weight),
        third_slope_weight: pick(|n| n.third_slope_weight),
        inverse_mu: pick(|n| n.inverse_mu),
        second_inverse_mu: pick(|n| n.second_inverse_mu),
        third_inverse_mu: pick(|n| n.third_inverse_mu),
        knee_cubed: pick(|n| n.knee_cubed),
        thrice_knee_cubed: pick(|n| n.thrice_knee_cubed),
        grid_by_vgk: pick(|n| n.grid_by_vgk),
        grid_weight: pick(|n| n.grid_weight),
        grid_slope_weight: pick(|n| n.grid_slope_weight),
        grid_constant: pick(|n| n.grid_constant),
        plate_last: pick(|n| n.plate_last),
        grid_last: pick(|n| n.grid_last),
    }
}
