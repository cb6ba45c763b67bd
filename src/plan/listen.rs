//! Plans of `listen`.

use std::path::PathBuf;

use super::{Into, Sound};
use crate::cli::{ListenCommand, PackArguments, TallyArguments, TrialArguments};
use crate::failure::RequestError;
use crate::option_values::{DRIVE, EFFECT, FROM, LENGTH, PROBABILITY, oversample};

/// What `listen` is to do.
#[derive(Debug)]
pub enum ListenPlan {
    /// Make a pack.
    Pack(PackPlan),
    /// Count answers.
    Tally(TallyPlan),
    /// Plan a number of trials.
    Trials(TrialsPlan),
}

/// Make a listening pack.
#[derive(Debug)]
pub struct PackPlan {
    /// The stage file.
    pub stage: PathBuf,
    /// Recordings in the order given; at least one.
    pub play: Vec<PathBuf>,
    /// Where the pack goes.
    pub into: Into,
    /// How it is made.
    pub options: PackOptions,
    /// Whether the key is printed as JSON.
    pub json: bool,
    /// Whether a warning ends in exit code 3.
    pub strict: bool,
}

/// How a pack is made.
#[derive(Clone, Debug, PartialEq)]
pub struct PackOptions {
    /// Changes the letters.
    pub seed: u64,
    /// Where the passage begins, s; none finds the most dynamic one.
    pub from: Option<f64>,
    /// How long it is, s; none is the usual length, or what there is.
    pub length: Option<f64>,
    /// Whether the recording itself is a take.
    pub with_dry: bool,
    /// Whether the stage's polarity stays.
    pub keep_polarity: bool,
    /// Whether WAV files are added.
    pub wav: bool,
    /// Trials of a run.
    pub trials: u32,
    /// How sound is rendered; its format and rate do not matter here.
    pub sound: Sound,
}

/// Count answers.
#[derive(Debug)]
pub struct TallyPlan {
    /// The pack's folder.
    pub pack: PathBuf,
    /// Files of answers; at least one.
    pub answers: Vec<PathBuf>,
    /// Whether the counts are printed as JSON.
    pub json: bool,
}

/// Plan a number of trials.
#[derive(Debug, PartialEq)]
pub struct TrialsPlan {
    /// The probability of a right answer, above 0.5.
    pub effect: f64,
    /// The probability that such a listener passes.
    pub power: f64,
    /// The probability that a guessing listener may pass with.
    pub alpha: f64,
    /// Whether the plan is printed as JSON.
    pub json: bool,
}

/// The most trials of a run; more tire anybody.
const MOST_TRIALS: u32 = 200;

impl Default for PackOptions {
    fn default() -> Self {
        Self {
            seed: 1,
            from: None,
            length: None,
            with_dry: false,
            keep_polarity: false,
            wav: false,
            trials: 16,
            sound: Sound::default(),
        }
    }
}

impl ListenPlan {
    /// Understands the arguments.
    ///
    /// # Errors
    /// [`RequestError`] naming the option that is wrong, and why.
    pub fn new(command: ListenCommand) -> Result<Self, RequestError> {
        Ok(match command {
            ListenCommand::Pack(pack) => Self::Pack(PackPlan::new(pack)?),
            ListenCommand::Tally(TallyArguments { pack, answers, json }) => {
                Self::Tally(TallyPlan { pack, answers, json })
            }
            ListenCommand::Plan(trials) => Self::Trials(TrialsPlan::new(&trials)?),
        })
    }
}

impl PackPlan {
    fn new(arguments: PackArguments) -> Result<Self, RequestError> {
        if !(1..=MOST_TRIALS).contains(&arguments.trials) {
            return Err(RequestError::new(
                format!("--trials: {} is out of range", arguments.trials),
                format!("expected 1 to {MOST_TRIALS}, such as 16"),
            ));
        }
        let sound = Sound {
            drive: DRIVE.option("--drive", arguments.drive.as_deref())?.unwrap_or(0.0),
            oversample: arguments.oversample.as_deref().map(oversample).transpose()?,
            ..Sound::default()
        };
        let options = PackOptions {
            seed: arguments.seed,
            from: FROM.option("--from", arguments.from.as_deref())?,
            length: LENGTH.option("--length", arguments.length.as_deref())?,
            with_dry: arguments.with_dry,
            keep_polarity: arguments.keep_polarity,
            wav: arguments.wav,
            trials: arguments.trials,
            sound,
        };
        Ok(Self {
            stage: arguments.stage,
            play: arguments.play.files,
            into: arguments.into.into(),
            options,
            json: arguments.json,
            strict: arguments.strict,
        })
    }
}

impl TrialsPlan {
    fn new(arguments: &TrialArguments) -> Result<Self, RequestError> {
        Ok(Self {
            effect: EFFECT.value("--effect", &arguments.effect, &arguments.effect)?,
            power: PROBABILITY.value("--power", &arguments.power, &arguments.power)?,
            alpha: PROBABILITY.value("--alpha", &arguments.alpha, &arguments.alpha)?,
            json: arguments.json,
        })
    }
}

#[cfg(test)]
mod tests {
    use clap::Parser;

    use super::*;
    use crate::cli::Arguments;
    use crate::plan::Plan;

    fn plan(arguments: &str) -> Result<ListenPlan, RequestError> {
        let words = std::iter::once("platewright").chain(arguments.split(' '));
        match Plan::new(Arguments::try_parse_from(words).expect("understood by clap"))? {
            Plan::Listen(plan) => Ok(plan),
            other => panic!("{other:?}"),
        }
    }

    #[test]
    fn options_that_are_left_out_have_their_usual_values() {
        let Ok(ListenPlan::Pack(pack)) = plan("listen pack s.toml --play a --into b") else { panic!("a pack") };
        assert_eq!(pack.options, PackOptions::default());
        let Ok(ListenPlan::Trials(trials)) = plan("listen plan --effect 0.7 --power 0.8") else { panic!("a plan") };
        assert_eq!(trials, TrialsPlan { effect: 0.7, power: 0.8, alpha: 0.05, json: false });
    }

    #[test]
    fn wrong_values_are_named() {
        for (arguments, part) in [
            ("listen pack s.toml --play a --into b --from -1", "--from"),
            ("listen pack s.toml --play a --into b --length 0.3", "--length"),
            ("listen pack s.toml --play a --into b --trials 0", "--trials"),
            ("listen plan --effect 0.5 --power 0.8", "--effect"),
            ("listen plan --effect 0.7 --power 1.2", "--power"),
            ("listen plan --effect 0.7 --power 0.8 --alpha 0", "--alpha"),
        ] {
            match plan(arguments) {
                Err(RequestError::Refused { problem, .. }) => assert!(problem.contains(part), "{problem}"),
                other => panic!("{arguments}: {other:?}"),
            }
        }
    }
}
