//! How far a tone may be raised before the stage distorts, compresses, draws grid current or cuts off.

use super::cycle::Cycle;
use super::steady_state::NoSteadyState;
use super::{OperatingPoint, SmallSignal};
use crate::circuit::{Network, Role};
use crate::portable::{decibels, magnitude, ratio};

/// The tone, Hz.
const FREQUENCY: f64 = 1000.0;
/// Peak grid current at which data sheets state that grid current begins, A (from memory: 0.3 µA).
const GRID_CURRENT: f64 = 0.3e-6;
/// Part of the idle plate current below which a tube is called cut off.
const CUT_OFF: f64 = 0.01;
/// Fall of the gain from that of a small signal, dB.
const COMPRESSION_DB: f64 = 1.0;
/// The THDs looked for, as parts.
const THDS: [f64; 3] = [0.001, 0.01, 0.03];
/// The search begins this far below full scale, dB.
const BELOW_FULL_SCALE_DB: f64 = -80.0;
/// Where a bound holds there already, it is followed down to here; what still holds then holds at rest.
const AT_REST_DB: f64 = -200.0;
/// A gain below this lets no signal through, and what is left is rounding.
const NO_SIGNAL: f64 = 1e-9;
/// It ends this far above: 100 × full scale.
const ABOVE_FULL_SCALE_DB: f64 = 40.0;
/// Stride of the search for a bracket, dB. A limit that is passed twice within one stride may be missed.
const STRIDE_DB: f64 = 3.0;
/// Width to which a bracket is narrowed, dB.
const NARROW_DB: f64 = 0.002;

/// Something that ends the headroom.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Bound {
    /// THD_F reaches this part.
    Thd(f64),
    /// The gain is 1 dB below that of a small signal.
    Compression,
    /// A grid's peak current reaches 0.3 µA.
    GridCurrent(Role),
    /// A tube's least plate current falls below 1 % of idle.
    CutOff(Role),
}

/// The lowest level at which a bound is reached.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Reached {
    /// What is reached.
    pub bound: Bound,
    /// V rms at `in`, and of the fundamental at `o`; or why there is none.
    pub level: Result<(f64, f64), NotReached>,
}

/// Why a bound has no level.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum NotReached {
    /// Not even at 100 × full scale.
    Never,
    /// It holds with hardly any signal already.
    AtRest,
    /// The stage lets no signal through.
    NoSignal,
    /// Beyond some level, and before this bound, no steady state was found.
    NoSteadyState(NoSteadyState),
}

impl std::fmt::Display for NotReached {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            NotReached::Never => write!(f, "not reached below 100 times full scale"),
            NotReached::NoSignal => write!(f, "no signal reaches the output"),
            NotReached::AtRest => write!(f, "reached at rest already"),
            NotReached::NoSteadyState(reason) => write!(f, "not reached before {reason}"),
        }
    }
}

/// Finds every bound of `network` at 1 kHz, from 80 dB below `full_scale` (V rms at `in`) to 100 times it.
///
/// Order: THD 0.1, 1 and 3 %, compression, then grid current and cut-off of each tube.
pub fn headroom(network: &Network, point: &OperatingPoint, full_scale: f64) -> Vec<Reached> {
    let small = SmallSignal::new(network, point).at(FREQUENCY).map_or(0.0, |r| magnitude(r.gain));
    let mut search = Search { network, point, full_scale, small, seen: Vec::new(), failed: None };
    search.scan();
    let roles: Vec<Role> = network.triodes.iter().map(|t| t.role).collect();
    THDS.map(Bound::Thd)
        .into_iter()
        .chain([Bound::Compression])
        .chain(roles.iter().map(|&role| Bound::GridCurrent(role)))
        .chain(roles.iter().map(|&role| Bound::CutOff(role)))
        .map(|bound| Reached { bound, level: search.find(bound) })
        .collect()
}

/// A level that was looked at.
struct Seen {
    /// Over full scale, dB.
    level_db: f64,
    cycle: Cycle,
}

struct Search<'a> {
    network: &'a Network,
    point: &'a OperatingPoint,
    full_scale: f64,
    /// Gain of a vanishing signal.
    small: f64,
    /// In rising level.
    seen: Vec<Seen>,
    failed: Option<NoSteadyState>,
}

impl Search<'_> {
    fn cycle(&self, level_db: f64) -> Result<Cycle, NoSteadyState> {
        Cycle::of(self.network, FREQUENCY, self.full_scale * ratio(level_db))
    }

    /// Looks at levels in equal strides until the end or until no steady state is found.
    fn scan(&mut self) {
        let strides = ((ABOVE_FULL_SCALE_DB - BELOW_FULL_SCALE_DB) / STRIDE_DB).round() as usize;
        for stride in 0..=strides {
            let level_db = BELOW_FULL_SCALE_DB + STRIDE_DB * stride as f64;
            match self.cycle(level_db) {
                Ok(cycle) => self.seen.push(Seen { level_db, cycle }),
                Err(reason) => {
                    self.failed = Some(reason);
                    return;
                }
            }
            if self.all_passed() {
                return;
            }
        }
    }

    /// Whether every bound lies below the last level: nothing above it matters.
    fn all_passed(&self) -> bool {
        let roles = self.network.triodes.iter().map(|t| t.role);
        let tubes = roles.flat_map(|role| [Bound::GridCurrent(role), Bound::CutOff(role)]);
        let mut bounds = THDS.map(Bound::Thd).into_iter().chain([Bound::Compression]).chain(tubes);
        bounds.all(|bound| self.seen.iter().any(|seen| self.excess(bound, &seen.cycle) >= 0.0))
    }

    /// At least 0 where the bound is reached, rising with it: a logarithm, so that a straight line meets it well.
    fn excess(&self, bound: Bound, cycle: &Cycle) -> f64 {
        let tube = |role: Role| cycle.tubes.iter().position(|t| t.role == role);
        match bound {
            Bound::Thd(part) => decibels(cycle.thd() / part),
            Bound::Compression => -decibels(cycle.gain() / self.small) - COMPRESSION_DB,
            Bound::GridCurrent(role) => tube(role).map_or(f64::NEG_INFINITY, |t| {
                decibels(cycle.tubes[t].peak_grid_current.max(1e-30) / GRID_CURRENT)
            }),
            Bound::CutOff(role) => tube(role).map_or(f64::NEG_INFINITY, |t| {
                let idle = self.point.tubes[t].currents.plate.max(1e-30);
                decibels(CUT_OFF * idle / cycle.tubes[t].least_plate_current.max(1e-30))
            }),
        }
    }

    fn find(&self, bound: Bound) -> Result<(f64, f64), NotReached> {
        if self.small < NO_SIGNAL {
            return Err(NotReached::NoSignal);
        }
        let never = self.failed.map_or(NotReached::Never, NotReached::NoSteadyState);
        let above = self.seen.iter().position(|s| self.excess(bound, &s.cycle) >= 0.0).ok_or(never)?;
        if above == 0 {
            return self.find_below(bound);
        }
        let at = |index: usize| {
            let seen = &self.seen[index];
            (seen.level_db, self.excess(bound, &seen.cycle), seen.cycle.output_rms())
        };
        self.narrow(bound, at(above - 1), at(above)).map_err(NotReached::NoSteadyState)
    }

    /// A bound that holds at the lowest level of the scan: down from there in long strides until it does not.
    fn find_below(&self, bound: Bound) -> Result<(f64, f64), NotReached> {
        const STRIDE_DOWN_DB: f64 = 20.0;
        let point = |level_db: f64| -> Result<(f64, f64, f64), NotReached> {
            let cycle = self.cycle(level_db).map_err(NotReached::NoSteadyState)?;
            Ok((level_db, self.excess(bound, &cycle), cycle.output_rms()))
        };
        let mut high = point(BELOW_FULL_SCALE_DB)?;
        while high.0 > AT_REST_DB {
            let low = point(high.0 - STRIDE_DOWN_DB)?;
            if low.1 < 0.0 {
                return self.narrow(bound, low, high).map_err(NotReached::NoSteadyState);
            }
            high = low;
        }
        Err(NotReached::AtRest)
    }

    /// Narrows a bracket of (level, excess, output) by the Illinois form of the false position (Dowell & Jarratt, 1971),
    /// kept inside the bracket by halving where it creeps.
    fn narrow(
        &self,
        bound: Bound,
        mut low: (f64, f64, f64),
        mut high: (f64, f64, f64),
    ) -> Result<(f64, f64), NoSteadyState> {
        let mut kept_high = 0i32;
        while high.0 - low.0 > NARROW_DB && high.1 > 1e-9 {
            let share = -low.1 / (high.1 - low.1);
            let usable = share.is_finite() && kept_high.abs() < 4;
            let share = if usable { share.clamp(0.01, 0.99) } else { 0.5 };
            let level_db = low.0 + share * (high.0 - low.0);
            let cycle = self.cycle(level_db)?;
            let excess = self.excess(bound, &cycle);
            if excess >= 0.0 {
                high = (level_db, excess, cycle.output_rms());
                low.1 *= if kept_high > 0 { 0.5 } else { 1.0 };
                kept_high = kept_high.max(0) + 1;
            } else {
                low = (level_db, excess, cycle.output_rms());
                high.1 *= if kept_high < 0 { 0.5 } else { 1.0 };
                kept_high = kept_high.min(0) - 1;
            }
            if usable && excess.abs() < 1e-6 {
                return Ok((self.full_scale * ratio(level_db), cycle.output_rms()));
            }
        }
        Ok((self.full_scale * ratio(high.0), high.2))
    }
}
