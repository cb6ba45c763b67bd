//! A stage made ready to be stepped: its modes, its tabulated tubes and its state of rest.

use super::modes::Modes;
use super::root::{self, Solved};
use crate::circuit::{Network, Stage};
use crate::linear::Matrix;
use crate::triode::{Currents, LawKind, TabulatedSection};

/// Why a stage cannot be stepped.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum WaveError {
    /// A node has no way to any source or ground.
    FloatingNode,
    /// No state of rest was found.
    NoRest,
}

impl std::fmt::Display for WaveError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            WaveError::FloatingNode => write!(f, "a node of the stage has no path to ground or to a source"),
            WaveError::NoRest => write!(f, "the stage settles at no operating point"),
        }
    }
}

impl std::error::Error for WaveError {}

/// What lanes stepped together must share: the number of triodes, their kinds of law and the padded number of modes.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Shape {
    pub(crate) ports: usize,
    pub(crate) modes: usize,
    pub(crate) kinds: [LawKind; 2],
}

/// A stage ready to be stepped at one rate, in one lane.
#[derive(Clone, Debug)]
pub struct Machine {
    pub(crate) modes: Modes,
    pub(crate) tubes: Vec<TabulatedSection>,
    pub(crate) rest: Rest,
}

/// The state of rest of the tabulated machine.
#[derive(Clone, Debug)]
pub(crate) struct Rest {
    pub state: Vec<f64>,
    pub volts: Vec<f64>,
}

/// Numbers of modes that are compiled; a machine is padded to the next.
pub(crate) const PADDED: [usize; 4] = [6, 8, 10, 12];

impl Machine {
    /// `stage` at `rate` steps a second.
    ///
    /// # Errors
    /// [`WaveError`] where the network has no solution; a checked stage file gives none of these.
    pub fn new(stage: &Stage, rate: f64) -> Result<Machine, WaveError> {
        let network = Network::of(stage);
        let tubes: Vec<_> = network.triodes.iter().map(|t| TabulatedSection::new(&t.section)).collect();
        Machine::assemble(&network, rate, tubes)
    }

    /// Another machine of the same tubes, whose tables it shares: what a moved switch or pot makes.
    ///
    /// # Errors
    /// As [`Machine::new`].
    pub fn with_parts_of(&self, stage: &Stage) -> Result<Machine, WaveError> {
        Machine::assemble(&Network::of(stage), self.modes.rate(), self.tubes.clone())
    }

    fn assemble(network: &Network, rate: f64, tubes: Vec<TabulatedSection>) -> Result<Machine, WaveError> {
        let modes = Modes::derive(network, rate).ok_or(WaveError::FloatingNode)?;
        let rest = rest(&modes, &|tube, vgk, vpk| tubes[tube].currents(vgk, vpk)).ok_or(WaveError::NoRest)?;
        Ok(Machine { modes, tubes, rest })
    }

    /// What machines stepped together must share.
    pub fn shape(&self) -> Shape {
        let modes = PADDED.into_iter().find(|&n| n >= self.modes.count()).unwrap_or(usize::MAX);
        let kind = |tube: usize| self.tubes.get(tube).unwrap_or(&self.tubes[0]).kind;
        Shape { ports: self.modes.ports(), modes, kinds: [kind(0), kind(1)] }
    }

    /// The modes of its network.
    pub fn modes(&self) -> &Modes {
        &self.modes
    }
}

/// The resting state of `modes` under `law`, exactly a fixed point of the step.
pub(crate) fn rest(modes: &Modes, law: &dyn Fn(usize, f64, f64) -> Currents) -> Option<Rest> {
    let (ports, count) = (modes.ports(), modes.count());
    let idle = modes.resting_state(&vec![0.0; ports]);
    let offer: Vec<f64> = (0..ports)
        .map(|r| {
            modes.root_constant[r] + modes.root_by_mode.row(r).iter().zip(&idle).map(|(a, b)| a * b).sum::<f64>()
        })
        .collect();
    let mut resistance = Matrix::zeros(ports, ports);
    for row in 0..ports {
        for column in 0..ports {
            let slow: f64 = (0..count)
                .map(|k| {
                    modes.root_by_mode[(row, k)] * modes.mode_by_current[(k, column)] / (1.0 - modes.eigenvalue[k])
                })
                .sum();
            resistance[(row, column)] = modes.root_by_current[(row, column)] + slow;
        }
    }
    let Solved { volts, amps, counts, .. } = root::solve(&resistance, &offer, &offer, 1e-10, law);
    (counts.unresolved == 0)
        .then(|| Rest { state: modes.resting_state(&amps[..ports]), volts: volts[..ports].to_vec() })
}
