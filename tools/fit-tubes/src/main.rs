//! Derives the tube library's parameters from the published figures in `tests/published`.
//!
//! `cargo run --release -p fit-tubes` writes every data file anew, the same bytes on every machine;
//! `cargo run --release -p fit-tubes -- 12AX7 6SN7GTB` those types alone (their neighbours are fitted first);
//! `--check` prints the errors and writes nothing, `--rows` prints every figure;
//! `--nominal` leaves the ensembles out, which is quick, for trying things.

mod evidence;
mod fit;
mod record;
mod tables;
mod write;

use std::collections::BTreeMap;
use std::process::ExitCode;

use platewright_dsp::triode::Law;
use platewright_dsp::triode::library::Record;

use tables::{Failure, Tables, TypeEntry};

fn main() -> ExitCode {
    let (flags, names): (Vec<_>, Vec<_>) = std::env::args().skip(1).partition(|word| word.starts_with("--"));
    let given = |name: &str| flags.iter().any(|flag| flag == name);
    match run(&names, given("--check"), given("--rows"), given("--nominal")) {
        Ok(()) => ExitCode::SUCCESS,
        Err(failure) => {
            eprintln!("fit-tubes: {failure}");
            ExitCode::FAILURE
        }
    }
}

fn run(names: &[String], check: bool, rows: bool, nominal: bool) -> Result<(), Failure> {
    let tables = Tables::read()?;
    let mut laws: BTreeMap<String, Law> = BTreeMap::new();
    for entry in &tables.types {
        if !wanted(&tables, names, &entry.name) {
            continue;
        }
        let gathered = evidence::gather(&tables, entry);
        let neighbours: Vec<Law> = entry.neighbours.iter().filter_map(|name| laws.get(name)).copied().collect();
        if neighbours.len() != entry.neighbours.len() {
            return Err(format!("{}: a neighbour stands after it in types.toml", entry.name));
        }
        let fitted = fit::fit(&entry.name, entry.family(), &gathered, &neighbours, !nominal);
        laws.insert(entry.name.clone(), fitted.nominal.law);
        let record = record::assemble(&tables, entry, &gathered, &fitted)?;
        print_errors(&record, rows);
        if !check {
            let path = tables::library_folder().join(format!("{}.toml", entry.name));
            std::fs::write(&path, write::toml(&record)).map_err(|e| format!("{}: {e}", path.display()))?;
        }
    }
    Ok(())
}

/// Whether a type was asked for, or is needed for one that was.
fn wanted(tables: &Tables, names: &[String], name: &str) -> bool {
    let leans_on = |entry: &TypeEntry| entry.neighbours.iter().any(|neighbour| neighbour == name);
    names.is_empty()
        || names.iter().any(|other| other == name)
        || tables.types.iter().any(|entry| leans_on(entry) && wanted(tables, names, &entry.name))
}

fn print_errors(record: &Record, rows: bool) {
    let n = record.fit.nominal;
    println!(
        "{}: G {} mu {} gamma {} C {} share {} mu_ratio {} offset {} knee {} third {:?}",
        record.name,
        n.g,
        n.mu,
        n.gamma,
        n.c,
        n.share,
        n.mu_ratio,
        n.offset,
        n.knee,
        n.third_share.zip(n.third_mu_ratio)
    );
    for set in &record.evidence {
        println!("  {} ({})", set.what, set.quantity);
        for (which, errors) in [("fitted", set.fitted), ("kept out", set.kept_out)] {
            let Some(errors) = errors else { continue };
            let (median, worst) = (errors.median_percent, errors.worst_percent);
            println!("    {which:8} {:4} rows: median {median:6.2} %, worst {worst:6.2} %", errors.rows);
        }
        for row in set.rows.iter().filter(|_| rows) {
            let error = 100.0 * (row.law / row.published - 1.0);
            let fitted = if row.fitted { "" } else { "kept out" };
            println!("      {:?}: {} {} {error:+.1} % {fitted}", row.at, row.published, row.law);
        }
        if set.emission != 1.0 || set.mu_factor != 1.0 {
            let (emission, mu, offset) = (set.emission, set.mu_factor, set.grid_offset);
            println!("    specimens: emission {emission}, mu factor {mu}, grid offset {offset} V");
        }
    }
}
