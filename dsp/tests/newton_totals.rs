//! How many Newton and shooting steps the named problems take, beside a committed table, so that a slower convergence is
//! seen when it comes.
//!
//! Where a change is meant to alter the counts, mint the table again and look at the difference:
//! `MINT=1 cargo test -p platewright-dsp --test newton_totals`

mod problems;

use std::path::PathBuf;

use platewright_dsp::analysis::{OperatingPoint, steady_state};
use platewright_dsp::circuit::{Network, Stage};
use platewright_dsp::wave::{Engine, Machine};
use platewright_dsp::{F64x4, Kernel, LANES};
use problems::signals::{chord, sine};
use problems::{known_answer, topologies};

const RATE: f64 = 384e3;
const HEAD: &str = "# problem: Newton steps at DC; steps, Newton steps (damped, fallbacks) of a chord at full scale and at \
                    ten times that; shots of a 1 kHz sine at full scale and at ten times that\n";

fn totals(name: &str, stage: &Stage) -> String {
    let network = Network::of(stage);
    let point = OperatingPoint::solve(&network, None).unwrap();
    let mut line = format!("{name}: {} at DC", point.counts.newton);
    for loudness in [1.0, 10.0] {
        let peak = loudness * stage.source.full_scale * std::f64::consts::SQRT_2;
        let input: Vec<F64x4> = chord(20_000, RATE, peak).iter().map(|&v| F64x4([v; LANES])).collect();
        let mut engine = Engine::new(&[Machine::new(stage, RATE).unwrap()], Kernel::detect()).unwrap();
        engine.process(&input, &mut vec![F64x4::default(); input.len()]);
        let c = engine.counts(0);
        assert_eq!(c.unresolved, 0, "{name}");
        line += &format!("; {} {} ({}, {})", input.len(), c.newton, c.damped, c.fallback);
    }
    for loudness in [1.0, 10.0] {
        let input = sine(385, 385e3, 1000.0, loudness * stage.source.full_scale);
        let shots = steady_state(&network, &input, 385e3).map_or("none".into(), |p| p.shots.to_string());
        line += &format!("; {shots} shots");
    }
    line + "\n"
}

#[test]
fn newton_totals_stay_as_they_are() {
    let known = (1..=6).map(|k| (format!("known {k}"), known_answer(k).stage));
    let lines = topologies().into_iter().chain(known).map(|(name, stage)| totals(&name, &stage));
    let found: String = std::iter::once(HEAD.to_string()).chain(lines).collect();
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/newton_totals.txt");
    if std::env::var_os("MINT").is_some() {
        std::fs::write(&path, &found).unwrap();
    }
    let committed = std::fs::read_to_string(&path).unwrap();
    for (found, committed) in found.lines().zip(committed.lines()) {
        assert_eq!(found, committed, "counts changed; mint the table again if that is meant");
    }
    assert_eq!(found.lines().count(), committed.lines().count());
}
