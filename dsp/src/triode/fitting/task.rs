//! All that is known of one type, and the search for the law that meets it best.

use super::evidence::{Figure, Quantity};
use super::least_squares::{Bounds, Minimum, minimise};
use super::random::Random;
use super::space::{Family, Prior};
use crate::triode::{GridLaw, Law, Section};

/// Figures taken alike.
#[derive(Clone, Debug, PartialEq)]
pub struct Set {
    /// The figures.
    pub figures: Vec<Figure>,
    /// True where they were taken on specimens that may stand off the type's nominal: then a plate-current factor and
    /// a µ factor between the law and these specimens are found with the rest.
    pub specimen: bool,
}

/// What is to be met.
#[derive(Clone, Debug, PartialEq)]
pub struct Task {
    /// The law to fit.
    pub family: Family,
    /// Beliefs about its parameters, in the family's order.
    pub priors: Vec<Prior>,
    /// Grid current, found beforehand; the Dempwolf & Zölzer law takes it from the plate's.
    pub grid: GridLaw,
    /// The figures.
    pub sets: Vec<Set>,
}

/// What was found.
#[derive(Clone, Debug, PartialEq)]
pub struct Solution {
    /// The nominal law.
    pub law: Law,
    /// For each set, the plate-current and µ factors of its specimens; ones where it has none of its own.
    pub specimens: Vec<(f64, f64)>,
    /// Half the sum of squared residuals, priors included, each in units of its error.
    pub cost: f64,
}

/// Residuals beyond this many errors count ever less (pseudo-Huber loss): a misprint must not bend the law.
const ROBUST_FROM: f64 = 2.0;

/// Standard deviations of the logarithms of a measured specimen's plate-current and µ factors. Sixty ECC88 sections
/// scatter by 13 % and 10 % (derived from published curve-tracer data), and single specimens stand up to 40 % off.
const SPECIMEN_SPREAD: (f64, f64) = (0.25, 0.08);

/// Specimens' factors stay between e^−1 and e.
const SPECIMEN_BOUNDS: Bounds = Bounds { low: -1.0, high: 1.0 };

/// Iterations of one descent.
const ITERATIONS: usize = 120;

/// Random starts of a member of an ensemble.
const MEMBER_STARTS: usize = 3;

impl Task {
    /// The task with nothing believed of the parameters but their ranges.
    pub fn without_priors(&self) -> Task {
        let priors = self.priors.iter().map(|prior| Prior { spread: f64::INFINITY, ..*prior }).collect();
        Task { priors, ..self.clone() }
    }

    /// debug
    pub fn debug(&self, law: &Law) {
        let mut at = super::space::coordinates(law);
        at.resize(self.bounds().len(), 0.0);
        let mut out = Vec::new();
        self.residuals(&at, &mut out);
        let sum: f64 = out.iter().map(|r| 0.5 * r * r).sum();
        eprint!("{law:?}\n start cost {sum}; ");
        let m = self.descend(&at, &self.bounds());
        self.residuals(&m.at, &mut out);
        let mut k = 0;
        for set in &self.sets {
            let c: f64 = out[k..k + set.figures.len()].iter().map(|r| 0.5 * r * r).sum();
            eprint!("[{} {c:.2}] ", set.figures.len());
            k += set.figures.len();
        }
        eprintln!("priors {:?}", &out[k..]);
        eprintln!(" cost {} {:?}", m.cost, self.read(&m.at));
    }

    /// The best law over many starts: local minima abound.
    pub fn solve(&self) -> Solution {
        let base = self.one_section();
        let starts = self.starts(&base.at);
        let found = starts.iter().map(|start| self.descend(start, &self.bounds()));
        self.solution(&best(found.chain([base.clone()])))
    }

    /// One equally good law: figures and beliefs are drawn anew within their errors, and the search starts anew.
    pub fn member(&self, seed: u64) -> Solution {
        let mut random = Random::new(seed);
        let drawn = self.drawn(&mut random);
        let base = drawn.one_section();
        let starts: Vec<_> = (0..MEMBER_STARTS).map(|_| drawn.random_start(&base.at, &mut random)).collect();
        let found = starts.iter().map(|start| drawn.descend(start, &drawn.bounds()));
        drawn.solution(&best(found))
    }

    /// The task with every figure and every prior's centre moved by its own error.
    fn drawn(&self, random: &mut Random) -> Task {
        let mut task = self.clone();
        for prior in task.priors.iter_mut().filter(|prior| prior.spread.is_finite()) {
            prior.centre = (prior.centre + prior.spread * random.normal()).clamp(prior.low, prior.high);
        }
        for figure in task.sets.iter_mut().flat_map(|set| &mut set.figures) {
            figure.published += figure.error * random.normal();
        }
        task
    }

    fn specimen_sets(&self) -> usize {
        self.sets.iter().filter(|set| set.specimen).count()
    }

    fn bounds(&self) -> Vec<Bounds> {
        let specimens = std::iter::repeat_n(SPECIMEN_BOUNDS, 2 * self.specimen_sets());
        self.priors.iter().map(Prior::bounds).chain(specimens).collect()
    }

    fn descend(&self, start: &[f64], bounds: &[Bounds]) -> Minimum {
        minimise(|at, out| self.residuals(at, out), start, bounds, ITERATIONS)
    }

    fn residuals(&self, at: &[f64], out: &mut Vec<f64>) {
        out.clear();
        let (law, specimens) = self.read(at);
        for (set, &(emission, mu_factor)) in self.sets.iter().zip(&specimens) {
            let tube = self.section(law.scaled(emission, mu_factor));
            out.extend(set.figures.iter().map(|f| robust((f.of(&tube) - f.published) / f.error)));
        }
        let held = self.priors.iter().zip(at).filter(|(prior, _)| prior.spread.is_finite());
        out.extend(held.map(|(prior, x)| (x - prior.centre) / prior.spread));
        for pair in at[self.priors.len()..].chunks_exact(2) {
            out.extend([pair[0] / SPECIMEN_SPREAD.0, pair[1] / SPECIMEN_SPREAD.1]);
        }
    }

    fn section(&self, law: Law) -> Section {
        Section { law, grid: self.grid, capacitance: Default::default() }
    }

    /// The law and every set's specimen factors at a point of the space.
    fn read(&self, at: &[f64]) -> (Law, Vec<(f64, f64)>) {
        let (parameters, mut factors) = at.split_at(self.priors.len());
        let specimens = self.sets.iter().map(|set| {
            if !set.specimen {
                return (1.0, 1.0);
            }
            let (own, rest) = factors.split_at(2);
            factors = rest;
            (libm::exp(own[0]), libm::exp(own[1]))
        });
        let specimens = specimens.collect();
        (self.family.law(parameters), specimens)
    }

    fn solution(&self, found: &Minimum) -> Solution {
        let (law, specimens) = self.read(&found.at);
        Solution { law, specimens, cost: found.cost }
    }

    /// The best fit of the family with its second section left out, where it has one.
    fn one_section(&self) -> Minimum {
        let mut bounds = self.bounds();
        if self.family == Family::TwoSection {
            bounds[SHARE] = Bounds { low: 0.0, high: 0.0 };
        }
        let starts = [6.0, 12.0, 25.0, 50.0, 100.0].map(|mu| {
            let mut at: Vec<f64> = self.priors.iter().map(|prior| prior.centre).collect();
            at.resize(bounds.len(), 0.0);
            at[self.family.mu()] = libm::log(mu);
            self.to_scale(at)
        });
        best(starts.iter().map(|start| self.descend(start, &bounds)))
    }

    /// Starts with a second section of several sizes beside the one-section fit.
    fn starts(&self, base: &[f64]) -> Vec<Vec<f64>> {
        if self.family != Family::TwoSection {
            return Vec::new();
        }
        let pairs = [0.02, 0.15, 0.4].into_iter().flat_map(|share| [0.3, 0.5, 0.75].map(|ratio| (share, ratio)));
        pairs.map(|(share, ratio)| self.split(base, share, ratio)).collect()
    }

    /// The one-section fit `base` split in two, µ raised so that the whole keeps its own.
    fn split(&self, base: &[f64], share: f64, ratio: f64) -> Vec<f64> {
        let mut at = base.to_vec();
        (at[SHARE], at[MU_RATIO]) = (share, ratio);
        at[self.family.mu()] += libm::log(1.0 - share + share / ratio);
        self.to_scale(at)
    }

    /// A start drawn from the priors, or from the ranges where nothing is believed.
    fn random_start(&self, base: &[f64], random: &mut Random) -> Vec<f64> {
        let mut at = base.to_vec();
        let scale = self.family.scale().0;
        for (j, prior) in self.priors.iter().enumerate().filter(|&(j, _)| j != scale && j != self.family.mu()) {
            let drawn = if prior.spread.is_finite() {
                prior.centre + prior.spread * random.normal()
            } else {
                prior.low + (prior.high - prior.low) * random.uniform()
            };
            at[j] = drawn.clamp(prior.low, prior.high);
        }
        if self.family == Family::TwoSection {
            let (share, ratio) = (at[SHARE], at[MU_RATIO]);
            return self.split(&at, share, ratio);
        }
        self.to_scale(at)
    }

    /// Moves the coordinate that scales all currents so that half of them lie above the published ones.
    fn to_scale(&self, mut at: Vec<f64>) -> Vec<f64> {
        let (law, _) = self.read(&at);
        let tube = self.section(law);
        let currents = self
            .sets
            .iter()
            .flat_map(|set| &set.figures)
            .filter(|f| f.quantity == Quantity::PlateCurrent && f.published > 3.0 * f.error);
        let mut ratios: Vec<f64> = currents
            .map(|f| libm::log(f.published / f.of(&tube).max(1e-12)))
            .filter(|ratio| ratio.is_finite())
            .collect();
        ratios.sort_by(f64::total_cmp);
        if let Some(median) = ratios.get(ratios.len() / 2) {
            let (coordinate, sign) = self.family.scale();
            at[coordinate] += sign * median;
        }
        at
    }
}

/// Coordinates of the two-section law that the search treats apart.
const SHARE: usize = 4;
const MU_RATIO: usize = 5;

fn best(found: impl Iterator<Item = Minimum>) -> Minimum {
    let none = Minimum { at: Vec::new(), cost: f64::INFINITY };
    found.fold(none, |best, next| if best.at.is_empty() || next.cost < best.cost { next } else { best })
}

/// A residual whose square is the pseudo-Huber loss (Charbonnier et al. 1994; Hartley & Zisserman, A6.8).
fn robust(residual: f64) -> f64 {
    let ratio = residual / ROBUST_FROM;
    residual * (2.0 / (1.0 + (1.0 + ratio * ratio).sqrt())).sqrt()
}
