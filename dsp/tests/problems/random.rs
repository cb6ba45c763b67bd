//! Random stages and signals, the same ones on every machine and in every run.

use std::sync::Arc;

use platewright_dsp::circuit::*;
use platewright_dsp::triode::*;

use super::{medium_mu, two_tube_stage};

/// SplitMix64 (Steele, Lea & Flood, "Fast splittable pseudorandom number generators", OOPSLA 2014).
pub struct Random(pub u64);

impl Random {
    fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    /// Even between `low` and `high`.
    pub fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * (self.next() >> 11) as f64 / (1u64 << 53) as f64
    }

    /// Even in the logarithm between `low` and `high`.
    pub fn log_between(&mut self, low: f64, high: f64) -> f64 {
        libm::exp(self.between(libm::log(low), libm::log(high)))
    }

    /// True once in `times`.
    pub fn once_in(&mut self, times: u64) -> bool {
        self.next().is_multiple_of(times)
    }
}

/// A tube of any of the three laws, of low, medium or high µ.
fn any_tube(random: &mut Random) -> Arc<TubeType> {
    let mut tube = (*medium_mu()).clone();
    let mu = random.log_between(5.0, 120.0);
    tube.section.law = match random.next() % 3 {
        0 => Law::DempwolfZoelzer(DempwolfZoelzer {
            g: random.log_between(5e-4, 5e-3),
            mu,
            gamma: random.between(1.1, 1.6),
            c: random.between(0.6, 5.0),
        }),
        1 => Law::Koren(Koren {
            mu,
            ex: random.between(1.2, 1.5),
            kg1: random.log_between(200.0, 2000.0),
            kp: random.log_between(80.0, 600.0),
            kvb: random.log_between(100.0, 1000.0),
        }),
        _ => Law::TwoSection(TwoSection {
            g: random.log_between(5e-4, 5e-3),
            mu,
            gamma: random.between(1.1, 1.6),
            c: random.between(0.6, 5.0),
            share: random.between(0.0, 0.5),
            mu_ratio: random.between(0.3, 0.9),
            offset: random.between(-1.0, 1.0),
            knee: random.between(1.0, 12.0),
        }),
    };
    Arc::new(tube)
}

/// How far values stray.
#[derive(Clone, Copy, PartialEq)]
pub enum Values {
    /// What a designer might draw.
    Sensible,
    /// 1 Ω and 10 MΩ in any resistor's place, supplies from 5 V to 1000 V.
    Extreme,
}

/// A stage of a random topology with random tubes and values.
pub fn any_stage(random: &mut Random, values: Values) -> Stage {
    let mut stage = two_tube_stage(true);
    let extreme = values == Values::Extreme;
    let mut ohms = |random: &mut Random, low: f64, high: f64| match extreme && random.once_in(3) {
        true if random.once_in(2) => 1.0,
        true => 10e6,
        false => random.log_between(low, high),
    };
    stage.supply.voltage = match extreme {
        true if random.once_in(4) => 5.0,
        true if random.once_in(4) => 1000.0,
        _ => random.log_between(120.0, 400.0),
    };
    stage.supply.resistance = ohms(random, 100.0, 22e3);
    stage.supply.reservoir = random.log_between(4.7e-6, 100e-6);
    stage.source.resistance = ohms(random, 50.0, 10e3);
    stage.source.full_scale = random.log_between(0.5, 4.0);
    let position = if random.once_in(6) { 1.0 } else { random.between(0.05, 1.0) };
    stage.input.pot = Some(Pot { resistance: ohms(random, 10e3, 500e3), position, taper: Taper::Linear });
    if random.once_in(3) {
        stage.input.pot = None;
        stage.input.grid_leak = Some(ohms(random, 47e3, 1e6));
    }
    stage.input.grid_stopper = if random.once_in(4) { 0.0 } else { ohms(random, 100.0, 68e3) };
    stage.gain.tube = any_tube(random);
    stage.gain.plate_resistor = ohms(random, 22e3, 270e3);
    stage.gain.cathode_resistor = ohms(random, 220.0, 4.7e3);
    stage.gain.bypass = match random.next() % 4 {
        0 => None,
        kind => Some(Bypass {
            capacitance: random.log_between(1e-6, 470e-6),
            esr: if random.once_in(3) { 0.0 } else { random.log_between(0.05, 2.0) },
            engaged: kind != 1,
            trickle_resistor: random.once_in(2).then(|| ohms(random, 10e3, 470e3)),
        }),
    };
    stage.follower = (!random.once_in(4)).then(|| any_follower(random, &mut ohms));
    stage.output.capacitor = random.log_between(100e-9, 10e-6);
    stage.output.bleed = ohms(random, 100e3, 1e6);
    stage.output.load_resistance = ohms(random, 10e3, 470e3);
    stage.output.load_capacitance = (!random.once_in(3)).then(|| random.log_between(47e-12, 2.2e-9));
    stage
}

fn any_follower(random: &mut Random, ohms: &mut impl FnMut(&mut Random, f64, f64) -> f64) -> Follower {
    let tube = any_tube(random);
    let stopper = if random.once_in(4) { 0.0 } else { ohms(random, 100.0, 10e3) };
    if random.once_in(3) {
        let tail = ohms(random, 10e3, 150e3);
        let coupling = Coupling::Direct { grid_stopper: stopper };
        return Follower { tube, coupling, bias_resistor: None, tail_resistor: tail };
    }
    let returns_to = if random.once_in(3) { LeakReturn::Ground } else { LeakReturn::BiasJunction };
    Follower {
        tube,
        coupling: Coupling::Capacitor {
            capacitor: random.log_between(10e-9, 1e-6),
            grid_stopper: stopper,
            grid_leak: ohms(random, 220e3, 2.2e6),
            returns_to,
        },
        bias_resistor: (!random.once_in(4)).then(|| ohms(random, 220.0, 4.7e3)),
        tail_resistor: ohms(random, 4.7e3, 100e3),
    }
}
