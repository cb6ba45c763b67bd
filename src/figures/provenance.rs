//! Where the figures come from.

use platewright_dsp::triode::library::{self, Evidence, Sure};
use platewright_dsp::triode::{Law, TubeType};

use super::{ProvenanceFigures, TubeDataFigures};
use crate::stage_file::StageFile;

/// The provenance of figures of `file`, with the options in words.
pub fn of(file: &StageFile, options: Vec<[String; 2]>) -> ProvenanceFigures {
    let mut tubes: Vec<TubeDataFigures> = Vec::new();
    for configuration in &file.configurations {
        let follower = configuration.stage.follower.as_ref().map(|f| &*f.tube);
        for kind in std::iter::once(&*configuration.stage.gain.tube).chain(follower) {
            if tubes.iter().all(|known| known.tube != kind.name) {
                tubes.push(tube(kind));
            }
        }
    }
    let program = concat!("platewright ", env!("CARGO_PKG_VERSION")).to_owned();
    ProvenanceFigures { program, options, stage_file: file.text.clone(), tubes }
}

fn tube(kind: &TubeType) -> TubeDataFigures {
    let record = library::record(&kind.name).filter(|_| kind.from_library);
    let model = match kind.section.law {
        Law::TwoSection(_) => "two-section",
        Law::ThreeSection(_) => "three-section",
        Law::DempwolfZoelzer(_) => "dempwolf-zoelzer",
        Law::Koren(_) => "koren",
    };
    let own = "the stage file's own parameters; nothing is known of how well they fit";
    TubeDataFigures {
        tube: kind.name.clone(),
        from_library: kind.from_library,
        model: model.to_owned(),
        rests_on: record.map_or_else(|| own.to_owned(), |record| record.fit.rests_on.clone()),
        evidence: record.map_or_else(Vec::new, |record| record.evidence.iter().map(evidence).collect()),
        ensemble: kind.ensemble.len(),
        heater_voltage: kind.heater.map(|heater| heater.voltage),
        heater_current: kind.heater.map(|heater| heater.current),
        basing: kind.basing.clone(),
    }
}

fn evidence(evidence: &Evidence) -> String {
    let sure = match evidence.sure {
        Sure::Seen => "",
        Sure::FromMemory => ", from memory",
    };
    let errors = |name: &str, errors: &Option<library::Errors>| {
        errors.map_or_else(String::new, |e| {
            format!(
                "; {} {name}: median error {:.1} %, worst {:.1} %",
                rows(e.rows),
                e.median_percent,
                e.worst_percent
            )
        })
    };
    format!(
        "{}, {} ({}{sure}){}{}",
        evidence.what,
        evidence.quantity,
        evidence.source,
        errors("fitted", &evidence.fitted),
        errors("kept out of the fit", &evidence.kept_out)
    )
}

fn rows(count: usize) -> String {
    if count == 1 { "1 point".to_owned() } else { format!("{count} points") }
}
