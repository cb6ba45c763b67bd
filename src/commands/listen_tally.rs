//! `platewright listen tally`: what the answers say.

use crate::failure::{Failure, Outcome, WorkError};
use crate::listening::{Comparison, Counts, Tally, tally};
use crate::plan::TallyPlan;
use crate::terminal::{self, plain};

/// Columns that text fills.
const WIDTH: usize = 78;

/// Runs the command.
///
/// # Errors
/// [`Failure`] where the folder is no pack or a file of answers is refused.
pub fn run(plan: &TallyPlan) -> Result<Outcome, Failure> {
    let tally = tally(&plan.pack, &plan.answers)?;
    if plan.json {
        let json = serde_json::to_string_pretty(&tally).map_err(|error| WorkError::Failed {
            problem: format!("the counts cannot be printed: {error}"),
            remedy: "leave --json out".to_owned(),
        })?;
        terminal::print(&(json + "\n"))?;
    } else {
        terminal::print(&text(&tally))?;
    }
    Ok(Outcome::Done)
}

fn text(tally: &Tally) -> String {
    let listeners: Vec<_> = tally.listeners.iter().map(|name| plain(name).into_owned()).collect();
    let mut text = format!("Pack {}, listeners: {}\n", &tally.pack[..8], listeners.join(", "));
    if tally.comparisons.is_empty() {
        text.push_str("\nNo run was finished and no preference stated.\n");
    }
    for comparison in &tally.comparisons {
        text.push_str(&about(comparison));
    }
    if tally.broken_off > 0 {
        let runs =
            if tally.broken_off == 1 { "1 run was".to_owned() } else { format!("{} runs were", tally.broken_off) };
        text.push_str(&format!("\n{runs} broken off and count nowhere.\n"));
    }
    if tally.comparisons.len() > 1 {
        text.push('\n');
        let caution = "Each comparison is judged by itself: among 20 in which nothing is heard, one is expected to \
                       pass at 95 %.";
        text.push_str(&wrapped(caution, 0));
    }
    text
}

fn about(comparison: &Comparison) -> String {
    let mut text = format!("\n{}  |  {}\n", plain(&comparison.one), plain(&comparison.other));
    if let Some(together) = &comparison.together {
        let name = |name: &str| plain(name).into_owned();
        let mut rows: Vec<(String, &Counts)> =
            comparison.each.iter().map(|each| (name(&each.listener), &each.counts)).collect();
        if rows.len() > 1 {
            rows.push(("together".to_owned(), together));
        }
        let width = rows.iter().map(|(name, _)| name.chars().count()).max().unwrap_or(0).max(8);
        text.push_str(&format!(
            "  {:<width$}  correct     by guessing  needed 95/99 %  right answers, 95 % interval\n",
            "listener"
        ));
        for (name, counts) in rows {
            text.push_str(&row(&name, width, counts));
        }
    }
    if let Some(preference) = &comparison.preference {
        text.push_str(&format!(
            "  preferred: {} {}, {} {}, neither {}; by chance {:.4} (two-sided sign test)\n",
            plain(&comparison.one),
            preference.one,
            plain(&comparison.other),
            preference.other,
            preference.ties,
            preference.by_chance
        ));
        for note in &preference.notes {
            let preferred = note.preferred.as_deref().unwrap_or("neither");
            text.push_str(&format!(
                "    {}, {}, for {}: {}\n",
                plain(&note.listener),
                plain(&note.recording),
                plain(preferred),
                plain(&note.note)
            ));
        }
    }
    text.push_str(&wrapped(&comparison.conclusion, 2));
    text
}

fn row(name: &str, width: usize, counts: &Counts) -> String {
    let needed = |count: Option<u32>| count.map_or_else(|| "-".to_owned(), |count| count.to_string());
    let correct = format!("{} of {}", counts.correct, counts.trials);
    let both = format!("{} / {}", needed(counts.needed_95), needed(counts.needed_99));
    let [low, high] = counts.interval_95.map(|p| 100.0 * p);
    format!("  {name:<width$}  {correct:<10}  {:<11.4}  {both:<14}  {low:.1} to {high:.1} %\n", counts.by_guessing)
}

fn wrapped(text: &str, indent: usize) -> String {
    let mut lines = vec![String::new()];
    for word in text.split(' ') {
        let last = lines.len() - 1;
        let line = &mut lines[last];
        if line.is_empty() {
            line.push_str(word);
        } else if indent + line.chars().count() + 1 + word.chars().count() <= WIDTH {
            line.push(' ');
            line.push_str(word);
        } else {
            lines.push(word.to_owned());
        }
    }
    lines.iter().map(|line| format!("{}{line}\n", " ".repeat(indent))).collect()
}
