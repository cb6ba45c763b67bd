//! What a command is to do, once the arguments have been understood: nothing below sees a raw argument again.

mod listen;

use std::path::PathBuf;

use platewright_dsp::analysis::TonePair;

use crate::cli::{
    Arguments, BiasArguments, Command, CompareArguments, DemoArguments, FigureArguments, IntoArguments,
    MeasureArguments, RenderArguments, ReportArguments, SampleFormat, SoundArguments, SweepKind, Switch,
    UnitArguments,
};
use crate::failure::RequestError;
use crate::iec60062;
use crate::option_values::{DRIVE, HERTZ, LEVEL, OHMS, TAIL, items, oversample, rate, tone, tone_pair};

pub use listen::{ListenPlan, PackOptions, PackPlan, TallyPlan, TrialsPlan};

/// A command with everything it needs.
#[derive(Debug)]
pub enum Plan {
    /// Write an example.
    New(NewPlan),
    /// Operating points.
    Bias(BiasPlan),
    /// Figures.
    Measure(MeasurePlan),
    /// Sound.
    Render(RenderPlan),
    /// Figures, sound and report.
    Compare(ComparePlan),
    /// Listening packs and their answers.
    Listen(ListenPlan),
    /// The same for the built-in stage and recording.
    Demo(DemoPlan),
    /// The page of a comparison again.
    Report(ReportPlan),
}

/// Write an example stage file.
#[derive(Debug)]
pub struct NewPlan {
    /// The file to write.
    pub file: PathBuf,
}

/// Print operating points.
#[derive(Debug)]
pub struct BiasPlan {
    /// The stage file.
    pub stage: PathBuf,
    /// Resistance of a meter to solve with, Ω.
    pub meter: Option<f64>,
    /// Whether the bench sheet is wanted.
    pub sheet: bool,
    /// How figures are handed over.
    pub figures: Figures,
}

/// Measure.
#[derive(Debug)]
pub struct MeasurePlan {
    /// The stage file.
    pub stage: PathBuf,
    /// Tones in the order given.
    pub tones: Vec<Tone>,
    /// Frequencies in the order given, Hz.
    pub frequencies: Vec<f64>,
    /// Sweeps.
    pub sweep: Vec<SweepKind>,
    /// Pairs of tones in the order given.
    pub imd: Vec<TonePair>,
    /// Whether the noise is wanted.
    pub noise: bool,
    /// Whether the headroom is wanted.
    pub headroom: bool,
    /// A target profile.
    pub profile: Option<PathBuf>,
    /// Recordings that the headroom is given over.
    pub play: Vec<PathBuf>,
    /// Level of everything that does not name its own, V rms; none is a quarter of full scale.
    pub level: Option<f64>,
    /// Where the figures go as CSV.
    pub csv: Option<PathBuf>,
    /// Whether that file may exist already.
    pub replace: bool,
    /// Whether harmonics carry the spread of equally good tube fits.
    pub trust: bool,
    /// How levels are shown.
    pub levels: LevelUnit,
    /// How figures are handed over.
    pub figures: Figures,
}

/// Render recordings.
#[derive(Debug)]
pub struct RenderPlan {
    /// The stage file.
    pub stage: PathBuf,
    /// Recordings in the order given; at least one.
    pub play: Vec<PathBuf>,
    /// Where the files go.
    pub into: Into,
    /// How they are rendered.
    pub sound: Sound,
    /// How figures are handed over.
    pub figures: Figures,
}

/// Compare configurations.
#[derive(Debug)]
pub struct ComparePlan {
    /// The stage file.
    pub stage: PathBuf,
    /// Recordings in the order given; at least one.
    pub play: Vec<PathBuf>,
    /// Where the files go.
    pub into: Into,
    /// How a listening pack is made beside the rest; none makes none.
    pub pack: Option<PackOptions>,
    /// Level of the figures, V rms; none is a quarter of full scale.
    pub level: Option<f64>,
    /// A target profile.
    pub profile: Option<PathBuf>,
    /// Where the figures go as CSV.
    pub csv: Option<PathBuf>,
    /// Whether harmonics carry the spread of equally good tube fits.
    pub trust: bool,
    /// How levels are shown.
    pub levels: LevelUnit,
    /// Whether pictures are written as files too.
    pub plots: bool,
    /// How sound is rendered.
    pub sound: Sound,
    /// How figures are handed over.
    pub figures: Figures,
}

/// Draw a page again.
#[derive(Debug)]
pub struct ReportPlan {
    /// The folder that holds report.json.
    pub folder: PathBuf,
    /// Whether pictures are written as files too.
    pub plots: bool,
}

/// Compare the built-in stage.
#[derive(Debug)]
pub struct DemoPlan {
    /// Where the files go.
    pub into: Into,
    /// Whether pictures are written as files too.
    pub plots: bool,
    /// How figures are handed over.
    pub figures: Figures,
}

/// How levels are shown.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum LevelUnit {
    /// Volts.
    #[default]
    Volts,
    /// Over 0.7746 V, the voltage of 1 mW in 600 Ω.
    Dbu,
    /// Over 1 V.
    Dbv,
}

/// How figures are handed over.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Figures {
    /// As JSON on standard output.
    pub json: bool,
    /// Whether a warning ends in exit code 3.
    pub strict: bool,
}

/// Where files go.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Into {
    /// The folder.
    pub folder: PathBuf,
    /// Whether it may hold something already.
    pub replace: bool,
}

/// One tone.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tone {
    /// Hz.
    pub frequency: f64,
    /// V rms at the input.
    pub level: f64,
}

/// How sound is rendered and written.
#[derive(Clone, Debug, PartialEq)]
pub struct Sound {
    /// Sample format.
    pub format: SampleFormat,
    /// Steps a sample: a power of two to 64; none chooses by the rate.
    pub oversample: Option<usize>,
    /// Sample rate of the files, Hz; none keeps the recording's.
    pub rate: Option<u32>,
    /// What is rendered past the end, s.
    pub tail: f64,
    /// Whether 16-bit files are dithered.
    pub dither: bool,
    /// Gain before the stage, dB.
    pub drive: f64,
    /// V rms written as 0 dBFS; none leaves it to the stage file or the loudest peak.
    pub full_scale: Option<f64>,
}

impl Plan {
    /// Understands the arguments.
    ///
    /// # Errors
    /// [`RequestError`] naming the option and the item that is wrong, and why.
    pub fn new(arguments: Arguments) -> Result<Self, RequestError> {
        Ok(match arguments.command {
            Command::New(new) => Self::New(NewPlan { file: new.file }),
            Command::Bias(bias) => Self::Bias(BiasPlan::new(bias)?),
            Command::Measure(measure) => Self::Measure(MeasurePlan::new(measure)?),
            Command::Render(render) => Self::Render(RenderPlan::new(render)?),
            Command::Compare(compare) => Self::Compare(ComparePlan::new(compare)?),
            Command::Listen(listen) => Self::Listen(ListenPlan::new(listen)?),
            Command::Demo(DemoArguments { into, plots, figures }) => {
                Self::Demo(DemoPlan { into: into.into(), plots: plots.plots.is_some(), figures: figures.into() })
            }
            Command::Report(ReportArguments { folder, plots }) => {
                Self::Report(ReportPlan { folder, plots: plots.plots.is_some() })
            }
        })
    }
}

impl BiasPlan {
    fn new(arguments: BiasArguments) -> Result<Self, RequestError> {
        let meter = OHMS.option("--meter", arguments.meter.as_deref())?;
        Ok(Self { stage: arguments.stage, meter, sheet: arguments.sheet, figures: arguments.figures.into() })
    }
}

impl MeasurePlan {
    fn new(mut arguments: MeasureArguments) -> Result<Self, RequestError> {
        let stage = arguments.stage.take().or_else(|| swallowed(&mut arguments)).ok_or_else(|| {
            RequestError::new(
                "no stage file is named",
                "write it first: platewright measure stage.toml --tone 1000:0.5",
            )
        })?;
        let tones = items(&arguments.tones).map(tone).collect::<Result<_, _>>()?;
        let frequencies = items(&arguments.frequencies)
            .map(|item| HERTZ.value("--frequencies", item, item))
            .collect::<Result<_, _>>()?;
        let level = LEVEL.option("--level", arguments.level.as_deref())?;
        let imd = items(&arguments.imd).map(tone_pair).collect::<Result<_, _>>()?;
        Ok(Self {
            stage,
            tones,
            frequencies,
            sweep: arguments.sweep,
            imd,
            noise: arguments.noise,
            headroom: arguments.headroom,
            profile: arguments.profile,
            play: arguments.play,
            level,
            csv: arguments.csv,
            replace: arguments.replace,
            trust: arguments.trust == Switch::On,
            levels: arguments.units.into(),
            figures: arguments.figures.into(),
        })
    }
}

impl RenderPlan {
    fn new(arguments: RenderArguments) -> Result<Self, RequestError> {
        Ok(Self {
            stage: arguments.stage,
            play: arguments.play.files,
            into: arguments.into.into(),
            sound: Sound::new(&arguments.sound)?,
            figures: arguments.figures.into(),
        })
    }
}

impl ComparePlan {
    fn new(arguments: CompareArguments) -> Result<Self, RequestError> {
        let sound = Sound::new(&arguments.sound)?;
        let pack = arguments.pack.then(|| PackOptions {
            sound: Sound { drive: sound.drive, oversample: sound.oversample, ..Sound::default() },
            ..PackOptions::default()
        });
        Ok(Self {
            stage: arguments.stage,
            play: arguments.play.files,
            into: arguments.into.into(),
            level: LEVEL.option("--level", arguments.level.as_deref())?,
            profile: arguments.profile,
            csv: arguments.csv,
            trust: arguments.trust == Switch::On,
            levels: arguments.units.into(),
            plots: arguments.plots.plots.is_some(),
            sound,
            pack,
            figures: arguments.figures.into(),
        })
    }
}

impl From<FigureArguments> for Figures {
    fn from(arguments: FigureArguments) -> Self {
        Self { json: arguments.json, strict: arguments.strict }
    }
}

impl From<UnitArguments> for LevelUnit {
    fn from(arguments: UnitArguments) -> Self {
        match (arguments.dbu, arguments.dbv) {
            (true, _) => Self::Dbu,
            (_, true) => Self::Dbv,
            _ => Self::Volts,
        }
    }
}

impl From<IntoArguments> for Into {
    fn from(arguments: IntoArguments) -> Self {
        Self { folder: arguments.folder, replace: arguments.replace }
    }
}

impl Default for Sound {
    fn default() -> Self {
        let format = SampleFormat::I24;
        Self { format, oversample: None, rate: None, tail: 0.0, dither: false, drive: 0.0, full_scale: None }
    }
}

impl Sound {
    fn new(arguments: &SoundArguments) -> Result<Self, RequestError> {
        if arguments.dither && arguments.format != SampleFormat::I16 {
            return Err(RequestError::new(
                "--dither is for 16-bit files",
                "add --format i16, or leave --dither out",
            ));
        }
        Ok(Self {
            format: arguments.format,
            oversample: arguments.oversample.as_deref().map(oversample).transpose()?,
            rate: arguments.rate.as_deref().map(rate).transpose()?,
            tail: TAIL.option("--tail", arguments.tail.as_deref())?.unwrap_or(0.0),
            dither: arguments.dither,
            drive: DRIVE.option("--drive", arguments.drive.as_deref())?.unwrap_or(0.0),
            full_scale: LEVEL.option("--full-scale", arguments.full_scale.as_deref())?,
        })
    }
}

/// A stage file written behind `--tone` or `--frequencies`, which take several values: the last one that is none.
fn swallowed(arguments: &mut MeasureArguments) -> Option<PathBuf> {
    let is_file = |last: &String, is_item: fn(&str) -> bool| !last.split(',').any(is_item);
    let tones = arguments.tones.pop_if(|last| is_file(last, |item| tone(item).is_ok()));
    let file =
        tones.or_else(|| arguments.frequencies.pop_if(|last| is_file(last, |item| iec60062::parse(item).is_ok())));
    file.map(PathBuf::from)
}

#[cfg(test)]
mod tests {
    use clap::Parser;

    use super::*;

    fn plan(arguments: &str) -> Result<Plan, RequestError> {
        let words = std::iter::once("platewright").chain(arguments.split(' '));
        Plan::new(Arguments::try_parse_from(words).expect("understood by clap"))
    }

    fn measure(arguments: &str) -> MeasurePlan {
        match plan(arguments) {
            Ok(Plan::Measure(measure)) => measure,
            other => panic!("{other:?}"),
        }
    }

    fn refusal(arguments: &str) -> String {
        match plan(arguments) {
            Err(RequestError::Refused { problem, remedy }) => format!("{problem}; {remedy}"),
            other => panic!("{other:?}"),
        }
    }

    #[test]
    fn tones_keep_their_order_and_repetitions_however_written() {
        let expected = [(1000.0, 0.5), (60.0, 0.1), (1000.0, 0.5)];
        for arguments in [
            "measure s.toml --tone 1000:0.5 --tone 60:0.1 --tone 1k:500m",
            "measure s.toml --tone 1000:0.5,60:0.1,1k:500m",
            "measure s.toml --tone 1000:0.5 60:0.1 1k:500m",
            "measure --tone=1000:0.5 --tone=60:0.1,1k:500m -- s.toml",
            "measure --tone 1000:0.5 60:0.1 1k:500m s.toml",
            "measure --tone 1000:0.5,60:0.1,1k:500m --frequencies 20,20k s.toml",
        ] {
            assert_eq!(measure(arguments).stage, PathBuf::from("s.toml"), "{arguments}");
            let found: Vec<_> = measure(arguments).tones.iter().map(|tone| (tone.frequency, tone.level)).collect();
            assert_eq!(found, expected, "{arguments}");
        }
        assert_eq!(measure("measure s.toml --frequencies 20k,20,20 1k").frequencies, [20e3, 20.0, 20.0, 1e3]);
    }

    #[test]
    fn a_wrong_item_is_named_with_the_reason() {
        let cases = [
            ("measure s.toml --tone 1000:0.5,60", ["--tone: \"60\"", "no colon"]),
            ("measure s.toml --tone 1000:x", ["\"1000:x\"", "no digits"]),
            ("measure s.toml --tone 1000:0", ["\"1000:0\"", "out of range"]),
            ("measure s.toml --tone 1000:nan", ["\"1000:nan\"", "no digits"]),
            ("measure s.toml --tone 1000:1e400", ["\"1000:1e400\"", "larger than any number"]),
            ("measure s.toml --frequencies 20,,20k", ["an empty item", "it is empty"]),
            ("measure s.toml --frequencies 20,-5", ["\"-5\"", "out of range"]),
            ("measure --tone 1000:0.5", ["no stage file", "write it first"]),
            ("measure s.toml --level 0", ["--level", "out of range"]),
            ("bias s.toml --meter ten", ["--meter: \"ten\"", "10M"]),
            ("render s.toml --play a --into b --oversample 3", ["--oversample: \"3\"", "power of two"]),
            ("render s.toml --play a --into b --oversample 128", ["--oversample: \"128\"", "power of two"]),
            ("render s.toml --play a --into b --rate 44100.5", ["--rate: \"44100.5\"", "8000 to 192000"]),
            ("render s.toml --play a --into b --dither", ["--dither", "i16"]),
        ];
        for (arguments, parts) in cases {
            let message = refusal(arguments);
            assert!(parts.iter().all(|part| message.contains(part)), "{arguments}: {message}");
        }
    }

    #[test]
    fn sound_takes_values_as_parts_carry_them() {
        let arguments = "render s.toml --play a --play b --into c --format i16 --dither --drive -6 --rate 48k --tail 1.5 \
                         --full-scale 4 --oversample 64 --replace --strict";
        let Ok(Plan::Render(render)) = plan(arguments) else { panic!("a render") };
        assert_eq!(render.play, [PathBuf::from("a"), PathBuf::from("b")]);
        assert_eq!(render.into, Into { folder: "c".into(), replace: true });
        let expected = Sound {
            format: SampleFormat::I16,
            oversample: Some(64),
            rate: Some(48_000),
            tail: 1.5,
            dither: true,
            drive: -6.0,
            full_scale: Some(4.0),
        };
        assert_eq!(render.sound, expected);
        assert!(render.figures.strict && !render.figures.json);
    }
}
