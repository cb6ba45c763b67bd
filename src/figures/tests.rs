//! What is written can be read back.

use platewright_dsp::analysis::TonePair;
use platewright_dsp::triode::library;

use super::*;
use crate::profile::{Profile, ProfileLevel, Target, Want};
use crate::stage_file::{Library, StageFile};

#[test]
fn json_with_everything_is_read_back_as_the_same_figures() {
    let names: Vec<String> = library::names().map(str::to_owned).collect();
    let known = Library { find: &library::find, names: &names };
    let text = crate::commands::EXAMPLE_STAGE
        .replace("voltage = 290", "ripple_rms = 1\nripple_frequency = 100\nvoltage = 290");
    let Ok(file) = StageFile::parse("the example", text, &known) else { panic!("the example is right") };
    let target = Target { order: 2, want: Want::AtMost(-50.0), within_db: 1.0, weight: 2.0 };
    let asked = Asked {
        tones: Some(vec![AskedTone { frequency: 1000.0, level: Some(1e-6) }]),
        frequencies: Some(vec![20.0]),
        level_sweep: true,
        frequency_sweep: true,
        imd: Some(vec![TonePair::Din, TonePair::Difference]),
        noise: true,
        headroom: true,
        play_peak: Some(0.5),
        profile: Some(Profile { tone: 1000.0, level: ProfileLevel::Output(2.0), harmonics: vec![target] }),
        meter_ohms: Some(10e6),
        ..Asked::default()
    };
    let Ok(mut figures) = gather(&file, &asked) else { panic!("the example settles") };
    let Ok(json) = figures.to_json() else { panic!("written") };
    // What JSON does not show goes first: the levels of each fit.
    for harmonic in
        figures.configurations.iter_mut().flat_map(|c| c.tones.iter_mut().flatten()).flat_map(|t| &mut t.harmonics)
    {
        harmonic.fits_dbc.clear();
    }
    let back: Figures = serde_json::from_str(&json).expect("read back");
    assert_eq!(back, figures);
}
