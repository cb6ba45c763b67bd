//! A stage made ready to be stepped: its modes, its tabulated tubes and its state of rest.

use super::modes::Modes;
use super::rest::{NoRest, Rest};
use crate::circuit::{Network, Stage};
use crate::triode::{LawKind, TabulatedSection};

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

impl From<NoRest> for WaveError {
    fn from(reason: NoRest) -> Self {
        match reason {
            NoRest::Floating => WaveError::FloatingNode,
            NoRest::Unsolved => WaveError::NoRest,
        }
    }
}

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
    /// The state of rest of the tabulated machine.
    pub(crate) rest: Rest,
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
        let rest = Rest::solve(network, None, &|tube, vgk, vpk| tubes[tube].currents(vgk, vpk))?;
        let modes = Modes::derive(network, rate, &rest).ok_or(WaveError::FloatingNode)?;
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
