//! The static laws of a triode: currents and their slopes from two voltages.
//!
//! Every logarithm, exponential and power goes through `libm`, so a law gives the same bits on every machine.

/// Currents into a triode's grid and plate, and their slopes, at one pair of voltages.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Currents {
    /// Current into the grid, amperes.
    pub grid: f64,
    /// Current into the plate, amperes.
    pub plate: f64,
    /// ∂(grid current)/∂(grid-to-cathode voltage), siemens.
    pub grid_by_vgk: f64,
    /// ∂(plate current)/∂(grid-to-cathode voltage), siemens: the mutual conductance.
    pub plate_by_vgk: f64,
    /// ∂(plate current)/∂(plate-to-cathode voltage), siemens: one over the plate resistance.
    pub plate_by_vpk: f64,
}

/// The plate-current law of one triode section.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Law {
    /// The library's own: two elementary triodes of unlike µ in parallel, with a knee.
    TwoSection(TwoSection),
    /// The same with a third elementary triode, for types whose measured curves two cannot follow.
    ThreeSection(ThreeSection),
    /// Dempwolf & Zölzer, "A physically-motivated triode model for circuit simulations", DAFx-11, 2011.
    DempwolfZoelzer(DempwolfZoelzer),
    /// Koren, "Improved vacuum tube models", 1996.
    Koren(Koren),
}

/// Parameters of the `two-section` law:
/// Ip = D(vpk)·G·\[(1−share)·S(vpk/µ+vgk+offset)^γ + share·S(vpk/(µ·mu_ratio)+vgk+offset)^γ\],
/// S(x) = ln(1+e^{C·x})/C, D(v) = v³/(v³+knee³) above 0 V and nothing below.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TwoSection {
    /// Perveance G, A/V^γ.
    pub g: f64,
    /// Amplification factor µ of the first section.
    pub mu: f64,
    /// Exponent γ.
    pub gamma: f64,
    /// Sharpness C of the cut-off, 1/V.
    pub c: f64,
    /// Part of the grid that the second section stands for, 0…1.
    pub share: f64,
    /// µ of the second section over that of the first.
    pub mu_ratio: f64,
    /// Contact-potential offset, V.
    pub offset: f64,
    /// Plate voltage below which the current falls off, V.
    pub knee: f64,
}

/// Parameters of the three-section law: the sum in the two-section law becomes
/// (1−share−third_share)·S(vpk/µ+vgk+offset)^γ + share·S(vpk/(µ·mu_ratio)+vgk+offset)^γ
/// + third_share·S(vpk/(µ·third_mu_ratio)+vgk+offset)^γ.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ThreeSection {
    /// What the first two sections, their shape and the knee are.
    pub two: TwoSection,
    /// Part of the grid that the third section stands for; with the second's at most 1.
    pub third_share: f64,
    /// µ of the third section over that of the first.
    pub third_mu_ratio: f64,
}

/// Parameters of the `dempwolf-zoelzer` law: Ik = G·S(vpk/µ+vgk)^γ, Ip = Ik − Ig.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DempwolfZoelzer {
    /// Perveance G, A/V^γ.
    pub g: f64,
    /// Amplification factor µ.
    pub mu: f64,
    /// Exponent γ.
    pub gamma: f64,
    /// Sharpness C of the cut-off, 1/V.
    pub c: f64,
}

/// Parameters of the `koren` law: E1 = (vpk/Kp)·ln(1+e^{Kp(1/µ+vgk/√(Kvb+vpk²))}), Ip = 2·E1^Ex/Kg1 above 0 V.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Koren {
    /// Amplification factor µ.
    pub mu: f64,
    /// Exponent.
    pub ex: f64,
    /// Inverse perveance.
    pub kg1: f64,
    /// Sharpness.
    pub kp: f64,
    /// Knee, V².
    pub kvb: f64,
}

/// The grid-current law that goes with every plate law: Ig = Gg·Sg(vgk)^ξ + Ig0, Sg(x) = ln(1+e^{Cg·x})/Cg
/// (Dempwolf & Zölzer 2011; Ig0 is 0 in the library's own law).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct GridLaw {
    /// Perveance Gg, A/V^ξ.
    pub gg: f64,
    /// Exponent ξ.
    pub xi: f64,
    /// Sharpness Cg, 1/V.
    pub cg: f64,
    /// Constant grid current Ig0, A.
    pub ig0: f64,
}

impl GridLaw {
    /// The first of Dempwolf & Zölzer's three measured 12AX7 (from memory), used, and said to be borrowed, where a
    /// type has no evidence of its own.
    pub const BORROWED: GridLaw = GridLaw { gg: 6.177e-4, xi: 1.314, cg: 9.901, ig0: 0.0 };

    /// Grid current and its slope at `vgk` volts, Ig0 included.
    pub fn current(&self, vgk: f64) -> (f64, f64) {
        let (value, slope) = soft_power(vgk, self.cg, self.xi);
        (self.gg * value + self.ig0, self.gg * slope)
    }
}

impl Law {
    /// Currents and slopes at `vgk` grid-to-cathode and `vpk` plate-to-cathode volts, with `grid` as the grid's law.
    pub fn currents(&self, grid: &GridLaw, vgk: f64, vpk: f64) -> Currents {
        let (grid_current, grid_by_vgk) = grid.current(vgk);
        let (plate, plate_by_vgk, plate_by_vpk) = match self {
            Law::TwoSection(law) => law.plate(vgk, vpk),
            Law::ThreeSection(law) => law.plate(vgk, vpk),
            Law::Koren(law) => law.plate(vgk, vpk),
            Law::DempwolfZoelzer(law) => {
                let (value, slope) = soft_power(vpk / law.mu + vgk, law.c, law.gamma);
                (law.g * value - grid_current, law.g * slope - grid_by_vgk, law.g * slope / law.mu)
            }
        };
        Currents { grid: grid_current, plate, grid_by_vgk, plate_by_vgk, plate_by_vpk }
    }
}

impl Law {
    /// The law of a tube with `emission` times the plate current and `mu_factor` times the µ.
    pub fn scaled(&self, emission: f64, mu_factor: f64) -> Law {
        match *self {
            Law::TwoSection(l) => Law::TwoSection(l.scaled(emission, mu_factor)),
            Law::ThreeSection(l) => Law::ThreeSection(ThreeSection { two: l.two.scaled(emission, mu_factor), ..l }),
            Law::DempwolfZoelzer(l) => {
                Law::DempwolfZoelzer(DempwolfZoelzer { g: l.g * emission, mu: l.mu * mu_factor, ..l })
            }
            Law::Koren(l) => Law::Koren(Koren { kg1: l.kg1 / emission, mu: l.mu * mu_factor, ..l }),
        }
    }
}

impl TwoSection {
    fn plate(&self, vgk: f64, vpk: f64) -> (f64, f64, f64) {
        self.sum([(1.0 - self.share, 1.0), (self.share, self.mu_ratio)], vgk, vpk)
    }

    /// The plate current of elementary triodes, each a part of the whole and its µ over the first's.
    fn sum<const N: usize>(&self, parts: [(f64, f64); N], vgk: f64, vpk: f64) -> (f64, f64, f64) {
        let (fade, fade_slope) = knee_fade(vpk, self.knee);
        let (mut current, mut by_vgk, mut by_vpk) = (0.0, 0.0, 0.0);
        for (part, ratio) in parts {
            let (weight, mu) = (self.g * part, self.mu * ratio);
            let (value, slope) = soft_power(vpk / mu + vgk + self.offset, self.c, self.gamma);
            current += weight * value;
            by_vgk += weight * slope;
            by_vpk += weight * slope / mu;
        }
        (fade * current, fade * by_vgk, fade * by_vpk + fade_slope * current)
    }

    fn scaled(&self, emission: f64, mu_factor: f64) -> TwoSection {
        TwoSection { g: self.g * emission, mu: self.mu * mu_factor, ..*self }
    }
}

impl ThreeSection {
    fn plate(&self, vgk: f64, vpk: f64) -> (f64, f64, f64) {
        let first = 1.0 - self.two.share - self.third_share;
        let parts = [(first, 1.0), (self.two.share, self.two.mu_ratio), (self.third_share, self.third_mu_ratio)];
        self.two.sum(parts, vgk, vpk)
    }
}

impl Koren {
    fn plate(&self, vgk: f64, vpk: f64) -> (f64, f64, f64) {
        if vpk <= 0.0 {
            return (0.0, 0.0, 0.0);
        }
        let root = (self.kvb + vpk * vpk).sqrt();
        let (soft, soft_slope) = softplus(self.kp * (1.0 / self.mu + vgk / root));
        let e1 = vpk / self.kp * soft;
        let power = libm::pow(e1, self.ex - 1.0);
        let slope = 2.0 * self.ex * power / self.kg1;
        let e1_by_vgk = vpk * soft_slope / root;
        let e1_by_vpk = soft / self.kp - vpk * soft_slope * vgk * vpk / (root * root * root);
        (2.0 * power * e1 / self.kg1, slope * e1_by_vgk, slope * e1_by_vpk)
    }
}

/// D(v) = v³/(v³+knee³) and its slope: what keeps a tube from giving power.
fn knee_fade(vpk: f64, knee: f64) -> (f64, f64) {
    if vpk <= 0.0 {
        return (0.0, 0.0);
    }
    // Written in knee/v so that a megavolt does not overflow.
    let ratio = knee / vpk;
    let cube = ratio * ratio * ratio;
    if !cube.is_finite() {
        return (0.0, 0.0);
    }
    let fade = 1.0 / (1.0 + cube);
    (fade, 3.0 * cube * fade * fade / vpk)
}

/// ln(1+e^z) and its slope.
pub(crate) fn softplus(z: f64) -> (f64, f64) {
    let e = libm::exp(-z.abs());
    (z.max(0.0) + libm::log1p(e), if z > 0.0 { 1.0 / (1.0 + e) } else { e / (1.0 + e) })
}

/// S(x)^power and its slope by x, S(x) = ln(1+e^{sharpness·x})/sharpness.
pub(crate) fn soft_power(x: f64, sharpness: f64, power: f64) -> (f64, f64) {
    let (soft, slope) = softplus(sharpness * x);
    let s = soft / sharpness;
    if s <= 0.0 {
        return (0.0, 0.0);
    }
    let lower = libm::pow(s, power - 1.0);
    (lower * s, power * lower * slope)
}
