//! Four machines stepped at once: the fast engine.
//!
//! A step predicts the root's voltages from the last three, corrects them by one Newton step and takes the currents from
//! that linearisation, so that Kirchhoff's laws hold exactly whatever the laws' tables say. A lane whose correction was
//! not small goes on by its own test, so that its bits never depend on its neighbours.

use super::coefficients::{Coefficients, coefficients};
use super::machine::Machine;
use super::root::{self, RootCounts};
#[cfg(target_arch = "x86_64")]
use crate::lanes::avx2::Avx2x4;
use crate::lanes::{F64x4, FourLanes, LANES};
use crate::linear::Matrix;
use crate::triode::{LaneCurrents, LawKind, Lookup, Tables, currents};

/// A correction below this many volts at every port ends a lane's Newton steps.
pub(crate) const SMALL_CORRECTION: f64 = 1e-3;
/// Newton steps a lane may take before the damped solver takes over.
const PLAIN_STEPS: usize = 12;
/// Volts to which the damped solver works.
const DAMPED_TOLERANCE: f64 = 1e-6;

/// What changes from step to step: mode amplitudes, and the root's voltages of the last three steps, newest first.
#[derive(Clone, Copy)]
struct State<V, const PORTS: usize, const MODES: usize> {
    modes: [V; MODES],
    volts: [[V; PORTS]; 3],
}

impl<V: FourLanes, const PORTS: usize, const MODES: usize> State<V, PORTS, MODES> {
    #[inline(always)]
    fn load(from: &State<F64x4, PORTS, MODES>) -> Self {
        State {
            modes: from.modes.each_ref().map(V::load),
            volts: from.volts.each_ref().map(|v| v.each_ref().map(V::load)),
        }
    }
    #[inline(always)]
    fn store(self) -> State<F64x4, PORTS, MODES> {
        State { modes: self.modes.map(V::store), volts: self.volts.map(|v| v.map(V::store)) }
    }
}

/// Four lanes, in the form of one kernel, that the engine's loop can be compiled for.
trait Form: FourLanes + for<'a> Lookup<Tables<'a> = [&'a Tables; LANES]> {}
impl<V: FourLanes + for<'a> Lookup<Tables<'a> = [&'a Tables; LANES]>> Form for V {}

/// Four lanes of machines of one shape.
pub(crate) struct Quad<const PORTS: usize, const MODES: usize> {
    machines: [Machine; LANES],
    kinds: [LawKind; 2],
    coefficients: Box<Coefficients<PORTS, MODES>>,
    state: State<F64x4, PORTS, MODES>,
    /// Volts on capacitors that a lane's network has left out.
    held: [Vec<(&'static str, f64)>; LANES],
    counts: [RootCounts; LANES],
}

/// What the engine needs of a quad, whatever its size.
pub(crate) trait Step: Send {
    /// Steps through `input`, volts at `in`, into `output`, volts at `o`.
    fn portable(&mut self, input: &[F64x4], output: &mut [F64x4]);
    /// The same compiled for AVX2.
    ///
    /// # Safety
    /// The CPU must have AVX2.
    #[cfg(target_arch = "x86_64")]
    unsafe fn avx2(&mut self, input: &[F64x4], output: &mut [F64x4]);
    /// Puts another machine of the same shape into a lane; capacitors keep their charge.
    fn refill(&mut self, lane: usize, machine: &Machine);
    /// Back to rest.
    fn reset(&mut self);
    /// How the roots of a lane were found so far.
    fn counts(&self, lane: usize) -> RootCounts;
    /// Root voltages of a lane after the last step: vgk and vpk, tube after tube.
    fn root_volts(&self, lane: usize) -> Vec<f64>;
}

impl<const PORTS: usize, const MODES: usize> Quad<PORTS, MODES> {
    pub fn new(machines: [Machine; LANES]) -> Self {
        let kinds = machines[0].shape().kinds;
        let coefficients = Box::new(coefficients(&machines));
        let state = State { modes: [F64x4::default(); MODES], volts: [[F64x4::default(); PORTS]; 3] };
        let mut quad = Quad {
            machines,
            kinds,
            coefficients,
            state,
            held: Default::default(),
            counts: [RootCounts::default(); LANES],
        };
        quad.reset();
        quad
    }

    #[inline(always)]
    fn run<V: Form>(&mut self, input: &[F64x4], output: &mut [F64x4]) {
        let tables: [[&Tables; LANES]; 2] = std::array::from_fn(|tube| {
            std::array::from_fn(|lane| &*self.machines[lane].tubes[tube.min(PORTS / 2 - 1)].tables)
        });
        let mut state = State::<V, PORTS, MODES>::load(&self.state);
        let c = &*self.coefficients;
        let mut repeats = Repeats { counts: &mut self.counts, machines: &self.machines };
        for (u, out) in input.iter().zip(output.iter_mut()) {
            *out = step(c, self.kinds, &tables, &mut state, V::load(u), &mut repeats).store();
        }
        for counts in repeats.counts.iter_mut() {
            counts.newton += input.len() as u64;
        }
        self.state = state.store();
    }
}

impl<const PORTS: usize, const MODES: usize> Step for Quad<PORTS, MODES> {
    fn portable(&mut self, input: &[F64x4], output: &mut [F64x4]) {
        self.run::<F64x4>(input, output);
    }

    #[cfg(target_arch = "x86_64")]
    #[target_feature(enable = "avx2")]
    unsafe fn avx2(&mut self, input: &[F64x4], output: &mut [F64x4]) {
        self.run::<Avx2x4>(input, output);
    }

    fn refill(&mut self, lane: usize, machine: &Machine) {
        let old = &self.machines[lane].modes;
        let amplitudes: Vec<f64> = (0..old.count()).map(|k| self.state.modes[k].0[lane]).collect();
        let moved = old.wave_by_mode.times_vector(&amplitudes);
        let volts = moved.iter().zip(&old.resting_wave).map(|(moved, rest)| moved + rest);
        let mut waves: Vec<_> = old.capacitors.iter().copied().zip(volts).collect();
        waves.append(&mut self.held[lane]);
        let new = &machine.modes;
        let volts_of = |key: &str| waves.iter().find(|(k, _)| *k == key).map_or(0.0, |(_, volts)| *volts);
        let from_rest = |(key, rest): (&&str, &f64)| volts_of(key) - rest;
        let taken: Vec<f64> = new.capacitors.iter().zip(&new.resting_wave).map(from_rest).collect();
        let amplitudes = new.mode_by_wave.times_vector(&taken);
        for k in 0..MODES {
            self.state.modes[k].0[lane] = amplitudes.get(k).copied().unwrap_or(0.0);
        }
        waves.retain(|(key, _)| !new.capacitors.contains(key));
        self.held[lane] = waves;
        self.machines[lane] = machine.clone();
        *self.coefficients = coefficients(&self.machines);
    }

    fn reset(&mut self) {
        for lane in 0..LANES {
            let rest = &self.machines[lane].rest;
            for k in 0..MODES {
                self.state.modes[k].0[lane] = 0.0;
            }
            for past in &mut self.state.volts {
                for port in 0..PORTS {
                    past[port].0[lane] = rest.volts[port];
                }
            }
            self.held[lane].clear();
            self.counts[lane] = RootCounts::default();
        }
    }

    fn counts(&self, lane: usize) -> RootCounts {
        self.counts[lane]
    }

    fn root_volts(&self, lane: usize) -> Vec<f64> {
        self.state.volts[0].iter().map(|v| v.0[lane]).collect()
    }
}

#[inline(always)]
fn step<V: Form, const PORTS: usize, const MODES: usize>(
    c: &Coefficients<PORTS, MODES>,
    kinds: [LawKind; 2],
    tables: &[[&Tables; LANES]; 2],
    state: &mut State<V, PORTS, MODES>,
    u: V,
    repeats: &mut Repeats<'_>,
) -> V {
    let mut offer = [V::splat(0.0); PORTS];
    let mut volts = [V::splat(0.0); PORTS];
    for p in 0..PORTS {
        let mut sum = V::load(&c.root_by_signal[p]) * u + V::load(&c.root_constant[p]);
        for k in 0..MODES {
            sum = sum + V::load(&c.root_by_mode[p][k]) * state.modes[k];
        }
        offer[p] = sum;
        // A parabola through the last three.
        let [v0, v1, v2] = [state.volts[0][p], state.volts[1][p], state.volts[2][p]];
        volts[p] = V::splat(3.0) * (v0 - v1) + v2;
    }
    let mut currents = [V::splat(0.0); PORTS];
    let correction = correct(c, kinds, tables, &offer, &mut volts, &mut currents);
    if !correction.all_below(SMALL_CORRECTION) {
        let store = |values: &[V; PORTS]| values.map(V::store);
        let mut root = OpenRoot {
            offer: store(&offer),
            volts: store(&volts),
            currents: store(&currents),
            correction: correction.store(),
        };
        repeats.go_on::<V, PORTS, MODES>(c, kinds, tables, &mut root);
        volts = root.volts.each_ref().map(V::load);
        currents = root.currents.each_ref().map(V::load);
    }
    let mut output = V::load(&c.output_by_signal) * u + V::load(&c.output_constant);
    for k in 0..MODES {
        output = output + V::load(&c.output_by_mode[k]) * state.modes[k];
    }
    for p in 0..PORTS {
        output = output + V::load(&c.output_by_current[p]) * currents[p];
    }
    for k in 0..MODES {
        let mut next = V::load(&c.mode_by_signal[k]) * u + V::load(&c.mode_constant[k]);
        next = next + V::load(&c.eigenvalue[k]) * state.modes[k];
        for p in 0..PORTS {
            next = next + V::load(&c.mode_by_current[k][p]) * currents[p];
        }
        state.modes[k] = next;
    }
    state.volts = [volts, state.volts[0], state.volts[1]];
    output
}

/// One Newton step in every lane: moves `volts`, leaves the currents of the linearisation there, and returns the largest
/// move of each lane.
#[inline(always)]
fn correct<V: Form, const PORTS: usize, const MODES: usize>(
    c: &Coefficients<PORTS, MODES>,
    kinds: [LawKind; 2],
    tables: &[[&Tables; LANES]; 2],
    offer: &[V; PORTS],
    volts: &mut [V; PORTS],
    amps: &mut [V; PORTS],
) -> V {
    let first = currents(kinds[0], &c.tubes[0].map(V::load), tables[0], volts[0], volts[1]);
    amps[0] = first.grid;
    amps[1] = first.plate;
    let mut second = None;
    if PORTS == 4 {
        let s = currents(kinds[1], &c.tubes[1].map(V::load), tables[1], volts[2], volts[3]);
        amps[2] = s.grid;
        amps[3] = s.plate;
        second = Some(s);
    }
    let mut residual = [V::splat(0.0); PORTS];
    let mut matrix = [[V::splat(0.0); PORTS]; PORTS];
    for p in 0..PORTS {
        let r = c.resistance[p].each_ref().map(V::load);
        let mut sum = volts[p] - offer[p];
        for q in 0..PORTS {
            sum = sum + r[q] * amps[q];
        }
        residual[p] = sum;
        jacobian_row(&first, r[0], r[1], &mut matrix[p], 0);
        if let Some(second) = &second {
            jacobian_row(second, r[2], r[3], &mut matrix[p], 2);
        }
        matrix[p][p] = matrix[p][p] + V::splat(1.0);
    }
    let move_by = solve(&matrix, &residual);
    let mut largest = V::splat(0.0);
    for p in 0..PORTS {
        volts[p] = volts[p] - move_by[p];
        // In this order a NaN move, which reaches the last port whenever it reaches any, is not lost.
        largest = largest.max(move_by[p].abs());
    }
    linearise(&first, amps, &move_by, 0);
    if let Some(second) = &second {
        linearise(second, amps, &move_by, 2);
    }
    largest
}

#[inline(always)]
fn jacobian_row<V: Form>(s: &LaneCurrents<V>, by_grid: V, by_plate: V, row: &mut [V], at: usize) {
    row[at] = by_grid * s.grid_by_vgk + by_plate * s.plate_by_vgk;
    row[at + 1] = by_plate * s.plate_by_vpk;
}

#[inline(always)]
fn linearise<V: Form>(s: &LaneCurrents<V>, amps: &mut [V], move_by: &[V], at: usize) {
    amps[at] = amps[at] - s.grid_by_vgk * move_by[at];
    amps[at + 1] = amps[at + 1] - (s.plate_by_vgk * move_by[at] + s.plate_by_vpk * move_by[at + 1]);
}

/// Solves by 2 × 2 blocks: two reciprocal determinants instead of four divisions one after another.
#[inline(always)]
fn solve<V: Form, const PORTS: usize>(m: &[[V; PORTS]; PORTS], f: &[V; PORTS]) -> [V; PORTS] {
    let mut x = [V::splat(0.0); PORTS];
    let inverse = V::splat(1.0) / (m[0][0] * m[1][1] - m[0][1] * m[1][0]);
    let upper = |a: V, b: V| (inverse * (m[1][1] * a - m[0][1] * b), inverse * (m[0][0] * b - m[1][0] * a));
    let (g0, g1) = upper(f[0], f[1]);
    if PORTS == 2 {
        (x[0], x[1]) = (g0, g1);
        return x;
    }
    let (b02, b12) = upper(m[0][2], m[1][2]);
    let (b03, b13) = upper(m[0][3], m[1][3]);
    let below = |r: usize, a: V, b: V, c: V| c - m[r][0] * a - m[r][1] * b;
    let (s22, s23) = (below(2, b02, b12, m[2][2]), below(2, b03, b13, m[2][3]));
    let (s32, s33) = (below(3, b02, b12, m[3][2]), below(3, b03, b13, m[3][3]));
    let (h2, h3) = (below(2, g0, g1, f[2]), below(3, g0, g1, f[3]));
    let inverse = V::splat(1.0) / (s22 * s33 - s23 * s32);
    x[2] = inverse * (s33 * h2 - s23 * h3);
    x[3] = inverse * (s22 * h3 - s32 * h2);
    x[0] = g0 - b02 * x[2] - b03 * x[3];
    x[1] = g1 - b12 * x[2] - b13 * x[3];
    x
}

/// A root after its first correction.
struct OpenRoot<const PORTS: usize> {
    offer: [F64x4; PORTS],
    volts: [F64x4; PORTS],
    currents: [F64x4; PORTS],
    correction: F64x4,
}

/// The rare rest of a step: lanes whose first correction was not small.
struct Repeats<'a> {
    counts: &'a mut [RootCounts; LANES],
    machines: &'a [Machine; LANES],
}

impl Repeats<'_> {
    #[inline(always)]
    fn go_on<V: Form, const PORTS: usize, const MODES: usize>(
        &mut self,
        c: &Coefficients<PORTS, MODES>,
        kinds: [LawKind; 2],
        tables: &[[&Tables; LANES]; 2],
        root: &mut OpenRoot<PORTS>,
    ) {
        for lane in 0..LANES {
            if root.offer.iter().any(|v| !v.0[lane].is_finite()) {
                // Nothing can be solved: the lane stays as it is until it is reset.
                root.correction.0[lane] = 0.0;
            }
        }
        let offer = root.offer.each_ref().map(V::load);
        for _ in 0..PLAIN_STEPS {
            if root.correction.all_below(SMALL_CORRECTION) {
                return;
            }
            let mut volts = root.volts.each_ref().map(V::load);
            let mut amps = root.currents.each_ref().map(V::load);
            let correction = correct(c, kinds, tables, &offer, &mut volts, &mut amps).store();
            let (volts, amps) = (volts.map(V::store), amps.map(V::store));
            for lane in 0..LANES {
                if root.correction.0[lane] < SMALL_CORRECTION {
                    continue;
                }
                self.counts[lane].newton += 1;
                root.correction.0[lane] = correction.0[lane];
                for p in 0..PORTS {
                    root.volts[p].0[lane] = volts[p].0[lane];
                    root.currents[p].0[lane] = amps[p].0[lane];
                }
            }
        }
        for lane in 0..LANES {
            let small = root.correction.0[lane] < SMALL_CORRECTION;
            if !small {
                self.damped(lane, root);
            }
        }
    }

    /// The damped solver, from the junction's offer: slow, sure and bounded.
    #[cold]
    #[inline(never)]
    fn damped<const PORTS: usize>(&mut self, lane: usize, root: &mut OpenRoot<PORTS>) {
        let machine = &self.machines[lane];
        let offer: [f64; PORTS] = std::array::from_fn(|p| root.offer[p].0[lane]);
        let resistance: &Matrix<f64> = &machine.modes.root_by_current;
        let law = |tube: usize, vgk: f64, vpk: f64| machine.tubes[tube].currents(vgk, vpk);
        let solved = root::solve(resistance, &offer, &offer, DAMPED_TOLERANCE, &law);
        self.counts[lane].add(solved.counts);
        for p in 0..PORTS {
            root.volts[p].0[lane] = solved.volts[p];
            root.currents[p].0[lane] = solved.amps[p];
        }
    }
}
