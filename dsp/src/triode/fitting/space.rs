//! A law's parameters as a fit moves them: of order one, within stated ranges, drawn towards what is known of triodes.

use crate::triode::{DempwolfZoelzer, Koren, Law, ThreeSection, TwoSection};

use super::least_squares::Bounds;

/// Which of the laws.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Family {
    /// The library's own.
    TwoSection,
    /// The library's own with a third section, for types with measured curves.
    ThreeSection,
    /// Dempwolf & Zölzer 2011.
    DempwolfZoelzer,
    /// Koren 1996.
    Koren,
}

/// What is believed of a parameter before any figure is seen: a normal distribution within a range.
///
/// Parameters with a unit are moved as logarithms, and the sharpness as its ratio to µ, which is what tubes of one
/// kind have in common.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Prior {
    /// The parameter as the stage file names it.
    pub name: &'static str,
    /// The range, never left.
    pub low: f64,
    /// The range, never left.
    pub high: f64,
    /// Where it is drawn to.
    pub centre: f64,
    /// How firmly, one standard deviation; infinite where only the range holds.
    pub spread: f64,
}

impl Prior {
    pub(super) fn bounds(&self) -> Bounds {
        Bounds { low: self.low, high: self.high }
    }
}

/// Natural logarithms of the bounds of a positive parameter, with no pull towards anything.
fn positive(name: &'static str, low: f64, high: f64) -> Prior {
    let (low, high) = (libm::log(low), libm::log(high));
    Prior { name, low, high, centre: 0.5 * (low + high), spread: f64::INFINITY }
}

fn two_section_priors() -> Vec<Prior> {
    let ln = libm::log;
    vec![
        positive("G", 1e-5, 0.5),
        positive("mu", 3.0, 250.0),
        Prior { name: "gamma", low: 1.0, high: 1.7, centre: 1.35, spread: 0.2 },
        Prior { name: "C", low: ln(1.0 / 200.0), high: ln(0.5), centre: ln(1.0 / 18.0), spread: 0.5 },
        Prior { name: "share", low: 0.0, high: 0.6, centre: 0.2, spread: 0.2 },
        Prior { name: "mu_ratio", low: 0.1, high: 0.95, centre: 0.5, spread: 0.2 },
        Prior { name: "offset", low: -1.5, high: 1.5, centre: 0.0, spread: 0.5 },
        Prior { name: "knee", low: ln(0.5), high: ln(40.0), centre: ln(6.0), spread: 0.4 },
    ]
}

impl Family {
    /// Which law `law` is.
    pub fn of(law: &Law) -> Self {
        match law {
            Law::TwoSection(_) => Family::TwoSection,
            Law::ThreeSection(_) => Family::ThreeSection,
            Law::DempwolfZoelzer(_) => Family::DempwolfZoelzer,
            Law::Koren(_) => Family::Koren,
        }
    }

    /// What is believed of any triode.
    ///
    /// The exponent is 3/2 for ideal electrodes (Child 1911, Langmuir 1913), and the effective one of real tubes lies
    /// a little below; the ratio of sharpness to µ, knee, offset and the second section's part come from the types
    /// that have measured curves.
    pub fn priors(self) -> Vec<Prior> {
        let ln = libm::log;
        match self {
            Family::TwoSection => two_section_priors(),
            Family::ThreeSection => {
                let mut priors = two_section_priors();
                priors.push(Prior { name: "third_share", low: 0.0, high: 0.35, centre: 0.05, spread: 0.15 });
                priors.push(Prior { name: "third_mu_ratio", low: 0.05, high: 0.8, centre: 0.4, spread: 0.15 });
                priors
            }
            Family::DempwolfZoelzer => vec![
                positive("G", 1e-5, 0.5),
                positive("mu", 3.0, 250.0),
                Prior { name: "gamma", low: 1.0, high: 2.0, centre: 1.4, spread: 0.3 },
                Prior { name: "C", low: ln(1.0 / 200.0), high: ln(1.0), centre: ln(1.0 / 22.0), spread: 1.0 },
            ],
            Family::Koren => vec![
                positive("mu", 3.0, 250.0),
                Prior { name: "Ex", low: 1.0, high: 2.2, centre: 1.4, spread: 0.3 },
                positive("Kg1", 1.0, 1e6),
                Prior { name: "Kp", low: ln(0.3), high: ln(100.0), centre: ln(6.0), spread: 1.0 },
                Prior { name: "Kvb", low: ln(0.1), high: ln(1e5), centre: ln(300.0), spread: 2.0 },
            ],
        }
    }

    /// How many parameters the law has.
    pub fn dimension(self) -> usize {
        match self {
            Family::TwoSection => 8,
            Family::ThreeSection => 10,
            Family::DempwolfZoelzer => 4,
            Family::Koren => 5,
        }
    }

    /// The law at a point of the space, `dimension` coordinates in the order of `priors`.
    pub fn law(self, at: &[f64]) -> Law {
        let e = libm::exp;
        match self {
            Family::TwoSection => Law::TwoSection(two_section(at)),
            Family::ThreeSection => {
                Law::ThreeSection(ThreeSection { two: two_section(at), third_share: at[8], third_mu_ratio: at[9] })
            }
            Family::DempwolfZoelzer => Law::DempwolfZoelzer(DempwolfZoelzer {
                g: e(at[0]),
                mu: e(at[1]),
                gamma: at[2],
                c: e(at[3] + at[1]),
            }),
            Family::Koren => {
                Law::Koren(Koren { mu: e(at[0]), ex: at[1], kg1: e(at[2]), kp: e(at[3] + at[0]), kvb: e(at[4]) })
            }
        }
    }

    /// Whether the law has sections beside the first.
    pub(super) fn sections(self) -> bool {
        matches!(self, Family::TwoSection | Family::ThreeSection)
    }

    /// The coordinate that scales every current alike, and its sign.
    pub(super) fn scale(self) -> (usize, f64) {
        match self {
            Family::TwoSection | Family::ThreeSection | Family::DempwolfZoelzer => (0, 1.0),
            Family::Koren => (2, -1.0),
        }
    }

    /// The coordinate of µ.
    pub(super) fn mu(self) -> usize {
        match self {
            Family::TwoSection | Family::ThreeSection | Family::DempwolfZoelzer => 1,
            Family::Koren => 0,
        }
    }
}

/// The point of its family's space at which a law lies.
pub fn coordinates(law: &Law) -> Vec<f64> {
    let ln = libm::log;
    match law {
        Law::TwoSection(l) => two_section_coordinates(l),
        Law::ThreeSection(l) => {
            let mut at = two_section_coordinates(&l.two);
            at.extend([l.third_share, l.third_mu_ratio]);
            at
        }
        Law::DempwolfZoelzer(l) => vec![ln(l.g), ln(l.mu), l.gamma, ln(l.c / l.mu)],
        Law::Koren(l) => vec![ln(l.mu), l.ex, ln(l.kg1), ln(l.kp / l.mu), ln(l.kvb)],
    }
}

fn two_section(at: &[f64]) -> TwoSection {
    let e = libm::exp;
    TwoSection {
        g: e(at[0]),
        mu: e(at[1]),
        gamma: at[2],
        c: e(at[3] + at[1]),
        share: at[4],
        mu_ratio: at[5],
        offset: at[6],
        knee: e(at[7]),
    }
}

fn two_section_coordinates(l: &TwoSection) -> Vec<f64> {
    let ln = libm::log;
    vec![ln(l.g), ln(l.mu), l.gamma, ln(l.c / l.mu), l.share, l.mu_ratio, l.offset, ln(l.knee)]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn coordinates_lead_back_to_the_law() {
        let two = TwoSection {
            g: 1.2e-3,
            mu: 110.0,
            gamma: 1.45,
            c: 5.4,
            share: 0.03,
            mu_ratio: 0.37,
            offset: 0.5,
            knee: 7.0,
        };
        let laws = [
            Law::TwoSection(two),
            Law::ThreeSection(ThreeSection { two, third_share: 0.1, third_mu_ratio: 0.2 }),
            Law::DempwolfZoelzer(DempwolfZoelzer { g: 2.2e-3, mu: 100.0, gamma: 1.3, c: 3.4 }),
            Law::Koren(Koren { mu: 100.0, ex: 1.4, kg1: 1060.0, kp: 600.0, kvb: 300.0 }),
        ];
        for law in laws {
            let family = Family::of(&law);
            let at = coordinates(&law);
            assert!(at.len() == family.dimension() && at.len() == family.priors().len());
            let again = coordinates(&family.law(&at));
            assert!(at.iter().zip(&again).all(|(a, b)| (a - b).abs() < 1e-12), "{law:?}");
        }
    }
}
