//! Figures of a stage: operating point, small signal, steady state.

mod alias;
mod cycle;
mod headroom;
mod intermodulation;
mod law_reach;
mod noise;
mod operating_point;
mod profile;
mod ratings;
mod refine;
mod scatter;
mod small_signal;
mod steady_state;
mod sweep;
mod tone;
mod trust;

pub use alias::alias_estimate;
pub use cycle::{Cycle, TubeCycle};
pub use headroom::{Bound, NotReached, Reached, headroom};
pub use intermodulation::{Intermodulation, TonePair};
pub use law_reach::{BeyondLaw, PUBLISHED_LAW_VOLTS, beyond_law_at_rest, beyond_law_under_tone};
pub use noise::{Noise, a_weighting, supply_transfer};
pub use operating_point::{Meter, OperatingPoint, PartStress, TubePoint};
pub use profile::{NoLevel, Target, Want, distance_db, level_for_output};
pub use ratings::{Limit, TubeStress, cold_volts, tube_stresses, tube_type};
pub use refine::Amplitude;
pub use scatter::{Scatter, TubeScatter, metered_volts};
pub use small_signal::{Response, SmallSignal};
pub use steady_state::{NoSteadyState, Period, bins, harmonics, steady_state, steady_state_near};
pub use sweep::{Band, band, frequencies, level_sweep, levels, ripple_rejection_db};
pub use tone::{THD_ORDERS, Tone};
pub use trust::{ensemble, fits, half_range, median, percentile};
