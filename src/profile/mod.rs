//! The profile file: which harmonics are wanted of a tone, at which level.

mod check;

use std::path::Path;

pub use platewright_dsp::analysis::{Target, Want};

use crate::failure::{Failure, RequestError};
use crate::spanned::problem::Diagnosis;
use crate::spanned::{FileKind, read};

const KIND: FileKind = FileKind {
    name: "profile file",
    start: "a profile file says [profile] with tone and level, then [profile.harmonics] with 2 = { wanted = -46 }",
    mistaken: "check the name: a profile file is a short text",
};

/// A profile that has been read and checked.
#[derive(Clone, Debug, PartialEq)]
pub struct Profile {
    /// Frequency of the tone, Hz.
    pub tone: f64,
    /// Its level.
    pub level: ProfileLevel,
    /// What is wanted, at least one harmonic, in rising order, none twice.
    pub harmonics: Vec<Target>,
}

/// The level of a profile's tone.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum ProfileLevel {
    /// V rms at `in`.
    Input(f64),
    /// V rms of the fundamental at `o`.
    Output(f64),
}

impl Profile {
    /// Reads and checks the file at `path`.
    ///
    /// # Errors
    /// [`RequestError`] where it cannot be read or anything in it is wrong.
    pub fn load(path: &Path) -> Result<Self, Failure> {
        let text = read::text(&KIND, path)?;
        let name = path.to_string_lossy();
        check::check(&KIND, &text)
            .map_err(|problems| RequestError::File(Box::new(Diagnosis::new(&name, &text, problems))).into())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn refusal(text: &str) -> String {
        let problems = check::check(&KIND, text).expect_err("refused");
        Diagnosis::new("target.toml", text, problems).render(false)
    }

    /// The whole file with one line replaced.
    fn with(old: &str, new: &str) -> String {
        assert!(WHOLE.contains(old), "{old}");
        WHOLE.replacen(old, new, 1)
    }

    const WHOLE: &str = "\
[profile]
tone = \"1k\"
level = 0.5
[profile.harmonics]
3 = { at_most = -70, weight = 2 }
2 = { wanted = -46, within = 1 }
10 = { at_least = \"-120\" }
";

    #[test]
    fn a_profile_is_read_in_rising_order() {
        let profile = check::check(&KIND, WHOLE).expect("right");
        let target = |order, want, within_db, weight| Target { order, want, within_db, weight };
        assert_eq!(profile.tone, 1000.0);
        assert_eq!(profile.level, ProfileLevel::Input(0.5));
        assert_eq!(
            profile.harmonics,
            [
                target(2, Want::Exactly(-46.0), 1.0, 1.0),
                target(3, Want::AtMost(-70.0), 0.0, 2.0),
                target(10, Want::AtLeast(-120.0), 0.0, 1.0),
            ]
        );
        let output = check::check(&KIND, &with("level = 0.5", "output_level = 2")).expect("right");
        assert_eq!(output.level, ProfileLevel::Output(2.0));
    }

    #[test]
    fn every_problem_names_its_line() {
        let cases = [
            (with("3 =", "1 ="), 5, "`profile.harmonics.1`", "H1 is the fundamental"),
            (with("3 =", "11 ="), 5, "`profile.harmonics.11`", "orders 2 to 10"),
            (with("3 =", "third ="), 5, "unknown key `profile.harmonics.third`", "orders 2 to 10"),
            (with("3 =", "03 ="), 5, "unknown key `profile.harmonics.03`", "orders 2 to 10"),
            (with("weight", "wieght"), 5, "unknown key `profile.harmonics.3.wieght`", "did you mean `weight`?"),
            (with("tone", "tune"), 2, "unknown key `profile.tune`", "did you mean `tone`?"),
            (with("[profile]", "titel = 1\n[profile]"), 1, "unknown key `titel`", "the keys here are profile"),
            (with("level = 0.5", "level = 0.5\noutput_level = 2"), 4, "both `profile.level`", "keep one"),
            (with("level = 0.5", ""), 1, "neither `profile.level`", "add level = 0.5"),
            (with("tone = \"1k\"", ""), 1, "`profile.tone` is missing", "add tone = 1000"),
            (with("weight = 2", "weight = 0"), 5, "`profile.harmonics.3.weight` is 0", "take its line out"),
            (with("weight = 2", "weight = -1"), 5, "`profile.harmonics.3.weight` is -1", "take its line out"),
            (with("within = 1", "within = -1"), 6, "`profile.harmonics.2.within` is -1 dB", "negative"),
            (with("within = 1", "at_most = -40"), 6, "both `wanted` and `at_most`", "keep one"),
            (with("at_least = \"-120\"", "within = 1"), 7, "says nothing that is wanted", "wanted = -46"),
            (with("wanted = -46", "wanted = nan"), 6, "not a number (NaN)", "dBc"),
            (with("wanted = -46", "wanted = 46"), 6, "`profile.harmonics.2.wanted` is 46 dBc", "too large"),
            (
                with("{ wanted = -46, within = 1 }", "-46"),
                6,
                "a number where a table belongs",
                "2 = { wanted = -46 }",
            ),
            (with("level = 0.5", "level = 0"), 3, "`profile.level` is 0 V", "nothing"),
            (with("tone = \"1k\"", "tone = \"1kHz\""), 2, "\"1kHz\" is not a value", "frequency"),
            (with("tone = \"1k\"", "tone = = 1"), 2, "this is not TOML", "a profile file is TOML"),
            (
                "[profile]\ntone = 1\nlevel = 1\n[profile.harmonics]\n".to_owned(),
                4,
                "wants no harmonic",
                "wanted = -46",
            ),
            ("[profile]\ntone = 1\nlevel = 1\n".to_owned(), 1, "`profile.harmonics` is missing", "wanted = -46"),
            ("profile = 3\n".to_owned(), 1, "`profile` is a number where a table belongs", "[profile]"),
            ("[profil]\n".to_owned(), 1, "unknown key `profil`", "did you mean `profile`?"),
        ];
        for (text, line, title, remedy) in cases {
            let message = refusal(&text);
            assert!(message.contains(&format!("target.toml:{line}:")), "line {line} is not named:\n{message}");
            assert!(message.contains(title) && message.contains(remedy), "{title}; {remedy}:\n{message}");
        }
    }

    #[test]
    fn all_problems_are_told_at_once() {
        let text = with("weight = 2", "weight = 0").replace("within = 1", "within = -1");
        let message = refusal(&text);
        assert!(message.contains(".weight` is 0") && message.contains(".within` is -1"), "{message}");
    }
}
