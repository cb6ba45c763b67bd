//! All that is known of one type, and the search for the law that meets it best.

use super::evidence::{Figure, Quantity, Specimen};
use super::least_squares::{Bounds, Minimum, minimise};
use super::random::Random;
use super::space::{Family, Prior};
use crate::triode::{GridLaw, Law, Section};

/// Figures taken alike.
#[derive(Clone, Debug, PartialEq)]
pub struct Set {
    /// The figures.
    pub figures: Vec<Figure>,
    /// True where they were taken on specimens that may stand off the type's nominal: then their differences are found
    /// with the rest.
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
    /// How each set's specimens differ from the nominal.
    pub specimens: Vec<Specimen>,
    /// Half the sum of squared residuals, priors included, each in units of its error.
    pub cost: f64,
}

/// Residuals beyond this many errors count ever less (pseudo-Huber loss): a misprint must not bend the law.
const ROBUST_FROM: f64 = 2.0;

/// Standard deviations of the logarithms of a measured specimen's plate-current and µ factors, and of its grid offset, V.
/// Sixty ECC88 sections scatter by 13 % and 10 % (derived from published curve-tracer data), single specimens stand up to
/// 40 % off; the offset is common practice, no source.
const SPECIMEN_SPREAD: [f64; 3] = [0.25, 0.04, 0.1];

/// Specimens' factors stay between e^−1 and e, their offsets within a volt.
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
        let mut starts: Vec<_> = (0..MEMBER_STARTS).map(|_| drawn.random_start(&base.at, &mut random)).collect();
        starts.extend(drawn.starts(&base.at).into_iter().step_by(4));
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
        let specimens = std::iter::repeat_n(SPECIMEN_BOUNDS, SPECIMEN_SPREAD.len() * self.specimen_sets());
        self.priors.iter().map(Prior::bounds).chain(specimens).collect()
    }

    fn descend(&self, start: &[f64], bounds: &[Bounds]) -> Minimum {
        minimise(|at, out| self.residuals(at, out), start, bounds, ITERATIONS)
    }

    fn residuals(&self, at: &[f64], out: &mut Vec<f64>) {
        out.clear();
        let (law, specimens) = self.read(at);
        let tube = self.section(law);
        for (set, specimen) in self.sets.iter().zip(&specimens) {
            let miss = |f: &Figure| (f.of_specimen(&tube, specimen) - f.published) / f.error;
            out.extend(set.figures.iter().map(|figure| robust(miss(figure))));
        }
        let held = self.priors.iter().zip(at).filter(|(prior, _)| prior.spread.is_finite());
        out.extend(held.map(|(prior, x)| (x - prior.centre) / prior.spread));
        for own in at[self.priors.len()..].chunks_exact(SPECIMEN_SPREAD.len()) {
            out.extend(own.iter().zip(SPECIMEN_SPREAD).map(|(x, spread)| x / spread));
        }
    }

    fn section(&self, law: Law) -> Section {
        Section { law, grid: self.grid, capacitance: Default::default() }
    }

    /// The law and every set's specimens at a point of the space.
    fn read(&self, at: &[f64]) -> (Law, Vec<Specimen>) {
        let (parameters, own) = at.split_at(self.priors.len());
        let mut own = own.chunks_exact(SPECIMEN_SPREAD.len());
        let mut next = |set: &Set| if set.specimen { own.next() } else { None };
        let specimen = |set: &Set| match next(set) {
            Some(own) => {
                Specimen { emission: libm::exp(own[0]), mu_factor: libm::exp(own[1]), grid_offset: own[2] }
            }
            None => Specimen::NOMINAL,
        };
        (self.family.law(parameters), self.sets.iter().map(specimen).collect())
    }

    fn solution(&self, found: &Minimum) -> Solution {
        let (law, specimens) = self.read(&found.at);
        Solution { law, specimens, cost: found.cost }
    }

    /// The best fit of the family with its second section left out, where it has one.
    fn one_section(&self) -> Minimum {
        let mut bounds = self.bounds();
        for &(part, _) in self.parts() {
            bounds[part] = Bounds { low: 0.0, high: 0.0 };
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
        if !self.family.sections() {
            return Vec::new();
        }
        let pairs = [0.02, 0.15, 0.4].into_iter().flat_map(|share| [0.3, 0.5, 0.75].map(|ratio| (share, ratio)));
        let start = |(share, ratio)| {
            let mut at = base.to_vec();
            (at[SECOND.0], at[SECOND.1]) = (share, ratio);
            if self.family == Family::ThreeSection {
                (at[THIRD.0], at[THIRD.1]) = (0.2 * share, 0.5 * ratio);
            }
            self.raised(at)
        };
        pairs.map(start).collect()
    }

    /// The coordinates of each further section's part and µ ratio.
    fn parts(&self) -> &'static [(usize, usize)] {
        match self.family {
            Family::TwoSection => &[SECOND],
            Family::ThreeSection => &[SECOND, THIRD],
            Family::DempwolfZoelzer | Family::Koren => &[],
        }
    }

    /// Raises the first section's µ so that the whole keeps the one-section fit's.
    fn raised(&self, mut at: Vec<f64>) -> Vec<f64> {
        let more: f64 = self.parts().iter().map(|&(part, ratio)| at[part] * (1.0 / at[ratio] - 1.0)).sum();
        at[self.family.mu()] += libm::log(1.0 + more);
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
        self.raised(at)
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

/// Coordinates of the further sections' part and µ ratio.
const SECOND: (usize, usize) = (4, 5);
const THIRD: (usize, usize) = (8, 9);

fn best(found: impl Iterator<Item = Minimum>) -> Minimum {
    let none = Minimum { at: Vec::new(), cost: f64::INFINITY };
    found.fold(none, |best, next| if best.at.is_empty() || next.cost < best.cost { next } else { best })
}

/// A residual whose square is the pseudo-Huber loss (Charbonnier et al. 1994; Hartley & Zisserman, A6.8).
fn robust(residual: f64) -> f64 {
    let ratio = residual / ROBUST_FROM;
    residual * (2.0 / (1.0 + (1.0 + ratio * ratio).sqrt())).sqrt()
}
