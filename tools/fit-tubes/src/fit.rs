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
pub fn fit(name: &str, family: Family, gathered: &[Gathered], neighbours: &[Law], ensembles: bool) -> Fitted {
    let task = Task {
        family,
        priors: priors(family, neighbours, published_mu(gathered)),
        grid: GridLaw::BORROWED,
        sets: gathered.iter().map(Gathered::set).collect(),
    };
    let wide = task.without_priors();
    let seed = seed_of(name);
    let members = |task: &Task, from: u64| -> Vec<Law> {
        (0..if ensembles { MEMBERS } else { 0 })
            .into_par_iter()
            .map(|k| task.member(seed.wrapping_add(from + k)).law)
            .collect()
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

/// µ of the first section over the published one, and the standard deviation of its logarithm: the types with curves
/// lie from 1.05 to 1.6.
const MU_OVER_PUBLISHED: (f64, f64) = (1.25, 0.15);

/// The mean of the published µ.
fn published_mu(gathered: &[Gathered]) -> f64 {
    let typical = gathered.iter().find(|set| set.what == "typical operation" && set.quantity == "mu");
    let rows = typical.map_or(&[][..], |set| &set.rows);
    rows.iter().map(|row| row.figure.published).sum::<f64>() / rows.len() as f64
}

/// The family's priors, drawn to the neighbours' mean by as much as the neighbours agree.
pub fn priors(family: Family, neighbours: &[Law], published_mu: f64) -> Vec<Prior> {
    let mut priors = family.priors();
    for prior in priors.iter_mut().filter(|prior| prior.name == "mu") {
        *prior =
            Prior { centre: libm::log(MU_OVER_PUBLISHED.0 * published_mu), spread: MU_OVER_PUBLISHED.1, ..*prior };
    }
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
