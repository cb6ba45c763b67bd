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
pub fn fit(name: &str, gathered: &[Gathered], neighbours: &[Law]) -> Fitted {
    let task = Task {
        family: Family::TwoSection,
        priors: priors(neighbours),
        grid: GridLaw::BORROWED,
        sets: gathered.iter().map(Gathered::set).collect(),
    };
    if std::env::var("DEBUGFIT").is_ok() {
        use platewright_dsp::triode::TwoSection;
        let l = |g, mu, gamma, c, share, mu_ratio, offset, knee| Law::TwoSection(TwoSection { g, mu, gamma, c, share, mu_ratio, offset, knee });
        let start = match name {
            "12AX7" => l(1.18e-3, 111.8, 1.478, 5.44, 0.0256, 0.369, 0.590, 6.5),
            "12AU7" => l(2.01e-3, 25.5, 1.20, 1.342, 0.338, 0.531, -0.893, 6.5),
            "6SN7GTB" => l(1.70e-3, 21.5, 1.354, 0.472, 0.0043, 0.2, -1.0, 6.5),
            "12AT7" => l(4.0e-3, 76.6, 1.20, 4.23, 0.222, 0.479, 0.10, 6.5),
            _ => l(1.07e-2, 39.8, 1.20, 2.83, 0.404, 0.683, -0.187, 6.5),
        };
        task.debug(&start);
        let found = task.solve();
        eprintln!("solved: cost {}", found.cost);
        task.debug(&found.law);
    }
    let wide = task.without_priors();
    let seed = seed_of(name);
    let members = |task: &Task, from: u64| -> Vec<Law> {
        (0..MEMBERS).into_par_iter().map(|k| task.member(seed.wrapping_add(from + k)).law).collect()
    };
    Fitted { nominal: task.solve(), ensemble: members(&task, 0), without_priors: members(&wide, MEMBERS) }
}

/// Parameters that neighbours have in common, and how alike they are at the least, one standard deviation.
const ALIKE: [(&str, f64); 6] =
    [("gamma", 0.06), ("C", 0.3), ("share", 0.1), ("mu_ratio", 0.12), ("offset", 0.3), ("knee", 0.3)];

/// The family's priors, drawn to the neighbours' mean by as much as the neighbours agree.
pub fn priors(neighbours: &[Law]) -> Vec<Prior> {
    let mut priors = Family::TwoSection.priors();
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
