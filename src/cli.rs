//! The arguments alone: what may be written on the command line, and the help that explains it.

mod listen;

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand, ValueEnum};

pub use listen::{ListenCommand, PackArguments, TallyArguments, TrialArguments};

/// Bench figures, rendered sound and honest comparisons of triode line stages, before they are built.
#[derive(Debug, Parser)]
#[command(name = "platewright", version, about, long_about = None, disable_help_subcommand = true)]
#[command(after_help = "\
A first look, without any file:   platewright demo --into out
A stage of your own:              platewright new stage.toml
The main job:                     platewright compare stage.toml --play take.wav --into out")]
pub struct Arguments {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
}

/// The commands.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Write a commented stage file to edit
    #[command(after_help = "Example:  platewright new stage.toml")]
    New(NewArguments),
    /// Print where every configuration biases: volts, milliamps, watts, margins
    #[command(after_help = "\
Example:  platewright bias stage.toml
          platewright bias stage.toml --meter 10M --sheet")]
    Bias(BiasArguments),
    /// Measure gain, harmonics and response of every configuration
    #[command(override_usage = "platewright measure <STAGE> [OPTIONS]")]
    #[command(after_help = "\
Example:  platewright measure stage.toml --tone 1000:0.5 --frequencies 20,1k,20k
          platewright measure stage.toml --headroom --noise --imd smpte,difference --play take.wav
          platewright measure stage.toml --tone 100:0.5 --tone 1k:0.5 --json")]
    Measure(MeasureArguments),
    /// Render recordings through every configuration
    #[command(after_help = "\
Example:  platewright render stage.toml --play take.wav --into out
          platewright render stage.toml --play a.wav --play b.wav --into out --format f32")]
    Render(RenderArguments),
    /// Compare every configuration: all figures, renders and the report
    #[command(after_help = "Example:  platewright compare stage.toml --play take.wav --into out")]
    Compare(CompareArguments),
    /// Make a blind listening pack, count its answers, plan a test
    #[command(subcommand)]
    #[command(after_help = "Example:  platewright listen pack stage.toml --play take.wav --into pack")]
    Listen(ListenCommand),
    /// Compare the built-in stage on the built-in recording: needs no file
    #[command(after_help = "Example:  platewright demo --into out")]
    Demo(DemoArguments),
    /// Draw the page of a comparison again, from its report.json alone
    #[command(after_help = "Example:  platewright report out")]
    Report(ReportArguments),
}

/// Arguments of `new`.
#[derive(Debug, Args)]
pub struct NewArguments {
    /// The file to write; one that exists is never overwritten
    #[arg(value_name = "FILE")]
    pub file: PathBuf,
}

/// Arguments of `bias`.
#[derive(Debug, Args)]
pub struct BiasArguments {
    /// The stage file
    #[arg(value_name = "STAGE")]
    pub stage: PathBuf,
    /// Solve again for each node with a meter of this resistance attached, such as 10M
    #[arg(long, value_name = "OHMS", allow_negative_numbers = true)]
    pub meter: Option<String>,
    /// Print a bench sheet for the stage once built, with the cautions
    #[arg(long, conflicts_with = "json")]
    pub sheet: bool,
    #[command(flatten)]
    pub figures: FigureArguments,
}

/// Arguments of `measure`.
#[derive(Debug, Args)]
pub struct MeasureArguments {
    /// The stage file
    // Optional for the parser alone: --tone and --frequencies may have swallowed it, which the plan sorts out.
    #[arg(value_name = "STAGE")]
    pub stage: Option<PathBuf>,
    /// Tones to measure harmonics at, frequency:volts (V rms at the input); repeat it, or separate them by commas
    #[arg(long = "tone", value_name = "F:V", num_args = 1..)]
    pub tones: Vec<String>,
    /// Frequencies to measure gain, phase and impedances at, separated by commas
    #[arg(long, value_name = "F,F…", num_args = 1..)]
    pub frequencies: Vec<String>,
    /// Sweep the level (THD, harmonics and gain into clipping) or the frequency (response, impedances, −3 dB points)
    #[arg(long, value_name = "WHAT", num_args = 1..)]
    pub sweep: Vec<SweepKind>,
    /// Intermodulation of these pairs of tones, separated by commas: smpte, din, difference
    #[arg(long, value_name = "PAIRS", num_args = 1..)]
    pub imd: Vec<String>,
    /// Noise at output and input, 20 Hz to 20 kHz (a best case)
    #[arg(long)]
    pub noise: bool,
    /// The levels at which THD, compression, grid current and cut-off set in
    #[arg(long)]
    pub headroom: bool,
    /// A profile file: how far each configuration misses the harmonics it wants
    #[arg(long, value_name = "FILE")]
    pub profile: Option<PathBuf>,
    /// Recordings (WAV) whose true peak the headroom is also given over; repeat it for more
    #[arg(long = "play", value_name = "FILE")]
    pub play: Vec<PathBuf>,
    /// Level of everything that does not name its own, V rms at the input [default: a quarter of source.full_scale]
    #[arg(long, value_name = "V", allow_negative_numbers = true)]
    pub level: Option<String>,
    /// Write every figure to a CSV file, one a row; one that exists is refused
    #[arg(long, value_name = "FILE")]
    pub csv: Option<PathBuf>,
    /// Let --csv overwrite a file that exists
    #[arg(long, requires = "csv")]
    pub replace: bool,
    /// How far the tube data carry each harmonic: on, or off to save the time
    #[arg(long, value_name = "SWITCH", default_value = "on")]
    pub trust: Switch,
    #[command(flatten)]
    pub units: UnitArguments,
    #[command(flatten)]
    pub figures: FigureArguments,
}

/// On or off.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum Switch {
    /// Do it
    On,
    /// Leave it out
    Off,
}

/// What a sweep goes over.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum SweepKind {
    /// Level of a 1 kHz tone
    Level,
    /// Frequency, 1 Hz to 1 MHz
    Frequency,
}

/// How levels are shown in tables.
#[derive(Clone, Copy, Debug, Args)]
#[group(multiple = false)]
pub struct UnitArguments {
    /// Show levels in volts (the default)
    #[arg(long)]
    pub volts: bool,
    /// Show levels in dBu, over 0.7746 V
    #[arg(long)]
    pub dbu: bool,
    /// Show levels in dBV, over 1 V
    #[arg(long)]
    pub dbv: bool,
}

/// Arguments of `render`.
#[derive(Debug, Args)]
pub struct RenderArguments {
    /// The stage file
    #[arg(value_name = "STAGE")]
    pub stage: PathBuf,
    #[command(flatten)]
    pub play: PlayArguments,
    #[command(flatten)]
    pub into: IntoArguments,
    #[command(flatten)]
    pub sound: SoundArguments,
    #[command(flatten)]
    pub figures: FigureArguments,
}

/// Arguments of `compare`.
#[derive(Debug, Args)]
pub struct CompareArguments {
    /// The stage file
    #[arg(value_name = "STAGE")]
    pub stage: PathBuf,
    #[command(flatten)]
    pub play: PlayArguments,
    #[command(flatten)]
    pub into: IntoArguments,
    /// Make a listening pack of the same configurations and recordings too, in DIR/pack
    #[arg(long)]
    pub pack: bool,
    /// Level of the figures, V rms at the input [default: a quarter of source.full_scale]
    #[arg(long, value_name = "V", allow_negative_numbers = true)]
    pub level: Option<String>,
    /// A profile file: rank the configurations by how far they miss the harmonics it wants
    #[arg(long, value_name = "FILE")]
    pub profile: Option<PathBuf>,
    /// Write every figure to this CSV file too, one a row; one that exists is refused unless --replace
    #[arg(long, value_name = "FILE")]
    pub csv: Option<PathBuf>,
    /// How far the tube data carry each harmonic: on, or off to save the time
    #[arg(long, value_name = "SWITCH", default_value = "on")]
    pub trust: Switch,
    #[command(flatten)]
    pub units: UnitArguments,
    #[command(flatten)]
    pub plots: PlotArguments,
    #[command(flatten)]
    pub sound: SoundArguments,
    #[command(flatten)]
    pub figures: FigureArguments,
}

/// Arguments of `demo`.
#[derive(Debug, Args)]
pub struct DemoArguments {
    #[command(flatten)]
    pub into: IntoArguments,
    #[command(flatten)]
    pub plots: PlotArguments,
    #[command(flatten)]
    pub figures: FigureArguments,
}

/// Arguments of `report`.
#[derive(Debug, Args)]
pub struct ReportArguments {
    /// The folder of a comparison, which holds its report.json
    #[arg(value_name = "FOLDER")]
    pub folder: PathBuf,
    #[command(flatten)]
    pub plots: PlotArguments,
}

/// Whether the page's pictures are also written as files.
#[derive(Clone, Copy, Debug, Args)]
pub struct PlotArguments {
    /// Write each picture of the page as a file too, into the folder plots
    #[arg(long, value_name = "FORMAT")]
    pub plots: Option<PlotFormat>,
}

/// Formats of pictures.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum PlotFormat {
    /// Scalable vector graphics
    Svg,
}

/// How figures are handed over.
#[derive(Clone, Copy, Debug, Args)]
pub struct FigureArguments {
    /// Print the figures as JSON on standard output, and nothing else there
    #[arg(long)]
    pub json: bool,
    /// End with exit code 3 where anything calls for a warning
    #[arg(long)]
    pub strict: bool,
}

/// What to play.
#[derive(Debug, Args)]
pub struct PlayArguments {
    /// A recording to play through the stage (WAV); repeat it for more
    #[arg(long = "play", value_name = "FILE", required = true)]
    pub files: Vec<PathBuf>,
}

/// Where results go.
#[derive(Debug, Args)]
pub struct IntoArguments {
    /// The folder for the results; made where it is missing
    #[arg(long = "into", value_name = "DIR")]
    pub folder: PathBuf,
    /// Write into a folder that holds something already: files of our own names are replaced, others left alone
    #[arg(long)]
    pub replace: bool,
}

/// How sound is rendered and written.
#[derive(Debug, Args)]
pub struct SoundArguments {
    /// Sample format of the files
    #[arg(long, value_name = "FORMAT", default_value = "i24")]
    pub format: SampleFormat,
    /// Steps a sample, a power of two to 64 [default: the fewest that reach 352.8 kHz]
    #[arg(long, value_name = "TIMES")]
    pub oversample: Option<String>,
    /// Sample rate of the files, Hz [default: that of the recording]
    #[arg(long, value_name = "HZ")]
    pub rate: Option<String>,
    /// Go on after the end of the recording until the stage has come to rest, in seconds
    #[arg(long, value_name = "SECONDS", allow_negative_numbers = true)]
    pub tail: Option<String>,
    /// Add triangular dither to 16-bit files
    #[arg(long)]
    pub dither: bool,
    /// Raise or lower the recording before the stage, dB
    #[arg(long, value_name = "DB", allow_hyphen_values = true)]
    pub drive: Option<String>,
    /// V rms at the output written as 0 dBFS [default: output.full_scale, or the loudest peak at −1 dBFS]
    #[arg(long, value_name = "V", allow_negative_numbers = true)]
    pub full_scale: Option<String>,
}

/// Sample formats that can be written.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum SampleFormat {
    /// 16-bit integer
    I16,
    /// 24-bit integer
    I24,
    /// 32-bit integer
    I32,
    /// 32-bit float
    F32,
}
