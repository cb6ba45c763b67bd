//! Arguments of `listen`.

use std::path::PathBuf;

use clap::{Args, Subcommand};

use super::{IntoArguments, PlayArguments};

/// What `listen` does.
#[derive(Debug, Subcommand)]
pub enum ListenCommand {
    /// Make a listening pack: matched takes of every configuration and a page that plays them blind
    #[command(after_help = "\
Example:  platewright listen pack stage.toml --play take.wav --into pack
          platewright listen pack stage.toml --play a.wav --from 12 --length 15 --with-dry --into pack

Send everything in pack/send; pack/keep holds the key and stays with you.")]
    Pack(PackArguments),
    /// Count the answers that came back
    #[command(after_help = "Example:  platewright listen tally pack answers/*.json")]
    Tally(TallyArguments),
    /// Work out how many trials a test needs
    #[command(after_help = "\
Example:  platewright listen plan --effect 0.7 --power 0.8

An effect of 0.7 means a listener who is right 7 times in 10; guessing is right 5 times.")]
    Plan(TrialArguments),
}

/// Arguments of `listen pack`.
#[derive(Debug, Args)]
pub struct PackArguments {
    /// The stage file
    #[arg(value_name = "STAGE")]
    pub stage: PathBuf,
    #[command(flatten)]
    pub play: PlayArguments,
    #[command(flatten)]
    pub into: IntoArguments,
    /// Changes which letters the takes get
    #[arg(long, value_name = "N", default_value = "1")]
    pub seed: u64,
    /// Where the passage begins, in seconds [default: where the level moves most]
    #[arg(long, value_name = "SECONDS", allow_hyphen_values = true)]
    pub from: Option<String>,
    /// How long the passage is, in seconds [default: 20, or the whole recording]
    #[arg(long, value_name = "SECONDS", allow_hyphen_values = true)]
    pub length: Option<String>,
    /// Add the recording itself to the takes
    #[arg(long)]
    pub with_dry: bool,
    /// Leave the polarity as the stage makes it
    #[arg(long)]
    pub keep_polarity: bool,
    /// Add WAV files of the takes
    #[arg(long)]
    pub wav: bool,
    /// Trials of a "which is which" run, fixed before anybody listens
    #[arg(long, value_name = "N", default_value = "16")]
    pub trials: u32,
    /// Raise or lower the recording before the stage, dB
    #[arg(long, value_name = "DB", allow_hyphen_values = true)]
    pub drive: Option<String>,
    /// Steps a sample, a power of two to 64 [default: the fewest that reach 352.8 kHz]
    #[arg(long, value_name = "TIMES")]
    pub oversample: Option<String>,
    /// Print the key as JSON on standard output, and nothing else there
    #[arg(long)]
    pub json: bool,
    /// End with exit code 3 where anything calls for a warning
    #[arg(long)]
    pub strict: bool,
}

/// Arguments of `listen tally`.
#[derive(Debug, Args)]
pub struct TallyArguments {
    /// The pack's folder, with keep/ in it
    #[arg(value_name = "DIR")]
    pub pack: PathBuf,
    /// Files of answers that listeners sent back
    #[arg(value_name = "ANSWERS", required = true)]
    pub answers: Vec<PathBuf>,
    /// Print the counts as JSON on standard output, and nothing else there
    #[arg(long)]
    pub json: bool,
}

/// Arguments of `listen plan`.
#[derive(Debug, Args)]
pub struct TrialArguments {
    /// How often a listener who hears the difference is right, above 0.5
    #[arg(long, value_name = "PROBABILITY")]
    pub effect: String,
    /// How surely such a listener is to be found
    #[arg(long, value_name = "PROBABILITY")]
    pub power: String,
    /// How often a guessing listener may pass
    #[arg(long, value_name = "PROBABILITY", default_value = "0.05")]
    pub alpha: String,
    /// Print the plan as JSON on standard output, and nothing else there
    #[arg(long)]
    pub json: bool,
}
