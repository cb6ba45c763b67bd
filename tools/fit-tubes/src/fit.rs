//! The fits of one type: nominal, ensemble, and the ensemble that priors do not narrow.

use platewright_dsp::triode::fitting::{Family, Prior, Solution, Task, coordinates};
use platewright_dsp::triode::{GridLaw, Law};
use rayon::prelude::*;

use crate::evidence::{Gathered, seed_of};

/// Separate fits in an ensemble.
const MEMBERS: u64 = 24;

/// What was found for one type.
pub struct Fitted {
    pub nominal: Solution,
    pub ensemble: Vec<Law>,
    pub without_priors: Vec<Law>,
}

/// Fits a type to what was gathered, with the priors of its neighbours where it has any.
pub fn fit(name: &str, family: Family, gathered: &[Gathered], neighbours: &[Law]) -> Fitted {
    let task = Task {
        family,
        priors: priors(family, neighbours),
        grid: GridLaw::BORROWED,
        sets: gathered.iter().map(Gathered::set).collect(),
    };
    let wide = task.without_priors();
    let seed = seed_of(name);
    let members = |task: &Task, from: u64| -> Vec<Law> {
        (0..MEMBERS).into_par_iter().map(|k| task.member(seed.wrapping_add(from + k)).law).collect()
    };
    Fitted { nominal: task.solve(), ensemble: members(&task, 0), without_priors: members(&wide, MEMBERS) }
}

/// Parameters that neighbours have in common, and how alike they are at the least, one standard deviation.
const ALIKE: [(&str, f64); 8] = [
    ("gamma", 0.06),
    ("C", 0.3),
    ("share", 0.1),
    ("mu_ratio", 0.12),
    ("offset", 0.3),
    ("knee", 0.3),
    ("third_share", 0.05),
    ("third_mu_ratio", 0.1),
];

/// The family's priors, drawn to the neighbours' mean by as much as the neighbours agree.
pub fn priors(family: Family, neighbours: &[Law]) -> Vec<Prior> {
    let mut priors = family.priors();
    if neighbours.is_empty() {
        return priors;
    }
    let points: Vec<Vec<f64>> = neighbours.iter().map(coordinates).collect();
    for (j, prior) in priors.iter_mut().enumerate() {
        let Some((_, least)) = ALIKE.iter().find(|(name, _)| *name == prior.name) else { continue };
        let count = points.len() as f64;
        let mean = points.iter().map(|point| point[j]).sum::<f64>() / count;
        let square = points.iter().map(|point| (point[j] - mean) * (point[j] - mean)).sum::<f64>();
        let scatter = if points.len() > 1 { (square / (count - 1.0)).sqrt() } else { 0.0 };
        *prior = Prior { centre: mean.clamp(prior.low, prior.high), spread: scatter.max(*least), ..*prior };
    }
    priors
}
