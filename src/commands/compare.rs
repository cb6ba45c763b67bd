//! `platewright compare`: all figures of every configuration, their sound, and the report.

use std::path::{Path, PathBuf};

use platewright_dsp::analysis::TonePair;

use super::csv_file::CsvFile;
use crate::audio_files::{OutputPlan, Recording};
use crate::failure::{Failure, Outcome};
use crate::figures::{Asked, AskedTone, Figures, gather, provenance, recording};
use crate::listening::{INDEX, PackJob};
use crate::plan::{self, ComparePlan, LevelUnit};
use crate::profile::Profile;
use crate::rendering::{self, Job};
use crate::stage_file::StageFile;
use crate::{report, show, terminal};

/// Figures and curves, as a program reads them.
pub const REPORT: &str = "report.json";
/// The same in a few lines of text.
const SUMMARY: &str = "summary.txt";
/// The listening pack's folder.
const PACK: &str = "pack";
/// The bench sheet's meter, Ω: what nearly every digital one has.
const METER: f64 = 10e6;
/// Tones of the comparison, Hz.
const TONES: [f64; 3] = [1000.0, 100.0, 10_000.0];
/// Frequencies of the response, Hz.
const FREQUENCIES: [f64; 7] = [5.0, 20.0, 100.0, 1000.0, 10_000.0, 20_000.0, 100_000.0];

/// Runs the command.
///
/// # Errors
/// [`Failure`] where an input is wrong, an output cannot be written, or the user interrupts.
pub fn run(plan: &ComparePlan) -> Result<Outcome, Failure> {
    let file = super::stage(&plan.stage)?;
    let recordings = super::recordings(&plan.play)?;
    let profile = plan.profile.as_deref().map(Profile::load).transpose()?;
    let inputs: Vec<_> = plan.play.iter().chain([&plan.stage]).chain(&plan.profile).cloned().collect();
    let comparison = Comparison {
        file: &file,
        recordings: &recordings,
        inputs: &inputs,
        extras: &[],
        into: &plan.into,
        csv: plan.csv.as_deref(),
        profile: profile.as_ref(),
        level: plan.level,
        trust: plan.trust,
        plots: plan.plots,
        levels: plan.levels,
        sound: &plan.sound,
        pack: plan.pack.as_ref(),
    };
    comparison.run(plan.figures)
}

/// Everything a comparison needs, its inputs checked.
pub struct Comparison<'a> {
    /// The stage.
    pub file: &'a StageFile,
    /// What is played.
    pub recordings: &'a [Recording],
    /// Files that no output may overwrite.
    pub inputs: &'a [PathBuf],
    /// Files to write beside the results, by name below the folder.
    pub extras: &'a [(&'a str, &'a [u8])],
    /// Where the results go.
    pub into: &'a plan::Into,
    /// Where the figures go as CSV.
    pub csv: Option<&'a Path>,
    /// Harmonics that are wanted.
    pub profile: Option<&'a Profile>,
    /// Level of the figures, V rms; none is a quarter of full scale.
    pub level: Option<f64>,
    /// Whether harmonics carry the spread of equally good tube fits.
    pub trust: bool,
    /// Whether pictures are written as files too.
    pub plots: bool,
    /// How levels are shown.
    pub levels: LevelUnit,
    /// How sound is rendered.
    pub sound: &'a plan::Sound,
    /// How a listening pack is made; none makes none.
    pub pack: Option<&'a plan::PackOptions>,
}

impl Comparison<'_> {
    /// Measures, renders, writes and prints.
    ///
    /// # Errors
    /// [`Failure`] where an output cannot be written or the user interrupts.
    pub fn run(&self, printed: plan::Figures) -> Result<Outcome, Failure> {
        let job = Job::new(&self.file.configurations, self.recordings, self.sound, super::kernel())?;
        let mut files: Vec<PathBuf> = job.files().cloned().collect();
        files.extend([REPORT, report::PAGE, SUMMARY].map(PathBuf::from));
        if self.plots {
            files.extend(report::plot_files(self.file.configurations.len(), self.recordings.len()));
        }
        files.extend(self.extras.iter().map(|(name, _)| PathBuf::from(name)));
        let make_pack = |options| PackJob::new(self.file, self.recordings, options, super::kernel());
        let pack = self.pack.map(make_pack).transpose()?;
        files.extend(pack.iter().flat_map(PackJob::files).map(|file| Path::new(PACK).join(file)));
        let outputs = OutputPlan::check(&self.into.folder, self.into.replace, &files, self.inputs)?;
        let targets: Vec<PathBuf> = outputs.targets().collect();
        let csv = CsvFile::check(self.csv, self.into.replace, self.inputs, &targets)?;
        let mut figures = gather(self.file, &self.asked()?)?;

        let folder = outputs.create()?;
        let (mut staged, renders) = job.run(&folder)?;
        let mut warnings = rendering::warnings(&renders);
        let mut tables = summary(&figures, &show::renders(&renders), self.levels);
        if let Some(pack) = pack {
            let (files, made) = pack.run(&folder, Path::new(PACK))?;
            staged.extend(files);
            warnings.extend(made.notes);
            tables.push(format!("Listening pack: send {PACK}/send, keep {PACK}/keep\n"));
            figures.listening_pack = Some(format!("{PACK}/{INDEX}"));
        }
        figures.renders = Some(renders);
        figures.recordings = Some(self.recordings.iter().map(recording::of).collect::<Result<_, _>>()?);
        figures.provenance = Some(provenance::of(self.file, self.options()));
        let json = figures.to_json()? + "\n";
        let page = report::draw(REPORT, &json)?;
        staged.push(folder.stage_contents(REPORT, json.as_bytes())?);
        staged.extend(page.staged(&folder, self.plots)?);
        staged.push(folder.stage_contents(SUMMARY, self.summary_file(&figures, &tables).as_bytes())?);
        for (name, contents) in self.extras {
            staged.push(folder.stage_contents(name, contents)?);
        }
        if let Some(csv) = csv {
            staged.push(csv.stage(&figures)?.1);
        }
        folder.commit(staged)?;

        for warning in &warnings {
            terminal::message(&format!("warning: {warning}"));
        }
        super::print_figures(&figures, printed.json, &tables)?;
        terminal::message(&format!("results in {}", terminal::path(&self.into.folder)));
        Ok(Outcome::of(printed.strict, figures.warn() || !warnings.is_empty()))
    }

    fn asked(&self) -> Result<Asked, Failure> {
        let tone = |frequency| AskedTone { frequency, level: self.level };
        Ok(Asked {
            tones: Some(TONES.map(tone).to_vec()),
            frequencies: Some(FREQUENCIES.to_vec()),
            trust: self.trust,
            level: self.level,
            level_sweep: true,
            frequency_sweep: true,
            imd: Some(vec![TonePair::Smpte, TonePair::Din, TonePair::Difference]),
            noise: true,
            headroom: true,
            profile: self.profile.cloned(),
            play_peak: Some(super::true_peak(self.recordings)?),
            meter_ohms: Some(METER),
            page: true,
        })
    }

    /// What was asked, in words and without a path.
    fn options(&self) -> Vec<[String; 2]> {
        let sound = self.sound;
        let mut options = Vec::new();
        let mut option = |name: &str, value: String| options.push([name.to_owned(), value]);
        option(
            "Level of the figures",
            match self.level {
                Some(volts) => format!("{volts} V rms"),
                None => "a quarter of full scale".to_owned(),
            },
        );
        option("Sample format", format!("{:?}", sound.format).to_lowercase());
        option(
            "Oversampling",
            sound.oversample.map_or_else(|| "by the rate".to_owned(), |times| format!("{times} times")),
        );
        if let Some(rate) = sound.rate {
            option("Sample rate", format!("{rate} Hz"));
        }
        if sound.drive != 0.0 {
            option("Drive", format!("{} dB", sound.drive));
        }
        if sound.tail != 0.0 {
            option("Tail", format!("{} s", sound.tail));
        }
        if sound.dither {
            option("Dither", "triangular".to_owned());
        }
        if let Some(volts) = sound.full_scale {
            option("0 dBFS at the output", format!("{volts} V rms"));
        }
        options
    }

    fn summary_file(&self, figures: &Figures, tables: &[String]) -> String {
        let title = figures.title.as_deref().map(|t| format!("{}\n\n", terminal::plain(t))).unwrap_or_default();
        let warnings = show::warnings(&figures.configurations, false);
        let undecided = show::undecided(&figures.undecided);
        format!("{title}{warnings}{}\n{undecided}\n{}", tables.join("\n"), show::CAUTIONS)
    }
}

fn summary(figures: &Figures, renders: &str, unit: LevelUnit) -> Vec<String> {
    let mut tables = vec![show::at_a_glance(&figures.configurations, unit).render(show::WIDTH)];
    tables.extend(show::measured(&figures.configurations, unit));
    tables.push(renders.to_owned());
    tables
}
