//! How far equally good fits of a type's published points differ in what the stage does.

mod problems;
mod published;

use std::sync::Arc;

use platewright_dsp::analysis::Tone;
use platewright_dsp::circuit::Network;
use platewright_dsp::triode::{Law, Section, TubeType, library};

/// Half the range from the 5th to the 95th percentile of the second harmonic over an ensemble, dB, in a stage with
/// follower (290 V, 33 kΩ, 820 Ω bypassed) at 0.5 V rms and 1 kHz, both tubes of the type.
fn trust(name: &str, laws: &[Law]) -> f64 {
    let tube = library::find(name).unwrap();
    let second = |&law: &Law| {
        let section = Section { law, ..tube.section };
        let member = Arc::new(TubeType { section, ..(*tube).clone() });
        let mut stage = problems::two_tube_stage(true);
        stage.gain.tube = Arc::clone(&member);
        stage.follower.as_mut().unwrap().tube = member;
        Tone::measure(&Network::of(&stage), 1000.0, 0.5, 3).unwrap().dbc(2).unwrap()
    };
    let mut seconds: Vec<f64> = laws.iter().map(second).collect();
    seconds.sort_by(f64::total_cmp);
    let at = |part: f64| {
        let place = part * (seconds.len() - 1) as f64;
        let (below, above) = (seconds[place.floor() as usize], seconds[place.ceil() as usize]);
        below + (above - below) * place.fract()
    };
    println!("{name}: H2 {:?}", seconds.iter().map(|h| (10.0 * h).round() / 10.0).collect::<Vec<_>>());
    0.5 * (at(0.95) - at(0.05))
}

/// One published point cannot tell a type's second harmonic; two, a chart and a measured µ line can.
#[test]
fn trust_is_wide_where_little_is_known_and_narrow_where_much_is() {
    let of = |name: &str| {
        let record = library::record(name).unwrap();
        let laws = |sets: &[library::Parameters]| sets.iter().map(library::Parameters::law).collect::<Vec<_>>();
        let (with, without) = (laws(&record.fit.ensemble), laws(&record.fit.ensemble_without_priors));
        assert!(with.len() >= 16 && without.len() >= 16);
        let (with, without) = (trust(name, &with), trust(name, &without));
        println!("{name}: ±{with:.2} dB, ±{without:.2} dB before priors");
        (with, without)
    };
    let (one_point, one_point_alone) = of("12BH7A");
    assert!(one_point_alone >= 3.0, "12BH7A before priors narrow it");
    assert!(one_point < one_point_alone);
    assert!(of("6SN7GTB").0 <= 1.0);
}

/// Separate fits differ in every direction; one fit jittered would differ in few or by the same amount in all.
#[test]
fn ensembles_are_separate_fits() {
    for name in library::names() {
        let tube = library::find(name).unwrap();
        assert!(tube.ensemble.len() >= 16, "{name}");
        for (k, (law, _)) in tube.ensemble.iter().enumerate() {
            assert!(tube.ensemble[..k].iter().all(|(other, _)| other != law), "{name} repeats a member");
        }
    }
}
