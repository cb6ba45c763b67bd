//! A record as TOML, laid out to be read: one figure a line.

use std::fmt::Write;

use platewright_dsp::triode::library::{Evidence, Parameters, Record, Row, Stated, Sure};

/// The text of a type's data file.
pub fn toml(record: &Record) -> String {
    let mut out = String::new();
    write(&mut out, record).map_or_else(|_| String::new(), |()| out)
}

fn write(out: &mut String, record: &Record) -> std::fmt::Result {
    writeln!(
        out,
        "# Written by tools/fit-tubes from tests/published and its types.toml: change those and run it again."
    )?;
    writeln!(out, "name = {}", text(&record.name))?;
    writeln!(out, "aliases = {}", list(record.aliases.iter().map(|alias| text(alias))))?;
    writeln!(out, "sections = {}", record.sections)?;
    writeln!(out, "basing = {}", stated(&record.basing, |name| text(name)))?;

    let heater = &record.heater;
    writeln!(out, "\n[heater]\nvoltage = {}\ncurrent = {}", number(heater.voltage), number(heater.current))?;
    if let Some(series) = heater.series {
        let (voltage, current) = (number(series.voltage), number(series.current));
        writeln!(out, "series = {{ voltage = {voltage}, current = {current} }}")?;
    }
    source(out, heater.sure, &heater.source)?;

    let c = &record.capacitance;
    writeln!(out, "\n[capacitance]\ngrid_cathode = {}", number(c.grid_cathode))?;
    writeln!(out, "grid_plate = {}\nplate_cathode = {}", number(c.grid_plate), number(c.plate_cathode))?;
    source(out, c.sure, &c.source)?;

    let l = &record.limits;
    writeln!(out, "\n[limits]")?;
    let limits = [
        ("plate_voltage", &l.plate_voltage),
        ("plate_voltage_cold", &l.plate_voltage_cold),
        ("plate_dissipation", &l.plate_dissipation),
        ("cathode_current", &l.cathode_current),
        ("heater_cathode_voltage", &l.heater_cathode_voltage),
        ("grid_circuit_resistance", &l.grid_circuit_resistance),
    ];
    for (key, limit) in limits {
        writeln!(out, "{key} = {}", stated(limit, |&value| number(value)))?;
    }

    let fit = &record.fit;
    writeln!(out, "\n[fit]\nrests_on = {}", text(&fit.rests_on))?;
    writeln!(out, "nominal = {}", parameters(&fit.nominal))?;
    writeln!(out, "ensemble = {}", lines(fit.ensemble.iter().map(parameters)))?;
    writeln!(out, "ensemble_without_priors = {}", lines(fit.ensemble_without_priors.iter().map(parameters)))?;
    let grid = &fit.grid;
    writeln!(out, "\n[fit.grid]\nGg = {}\nxi = {}\nCg = {}", number(grid.gg), number(grid.xi), number(grid.cg))?;
    writeln!(out, "borrowed = {}", grid.borrowed)?;
    source(out, grid.sure, &grid.source)?;
    record.evidence.iter().try_for_each(|set| evidence(out, set))
}

fn evidence(out: &mut String, set: &Evidence) -> std::fmt::Result {
    writeln!(out, "\n[[evidence]]\nwhat = {}\nquantity = {}", text(&set.what), text(&set.quantity))?;
    source(out, set.sure, &set.source)?;
    writeln!(out, "emission = {}\nmu_factor = {}", number(set.emission), number(set.mu_factor))?;
    writeln!(out, "grid_offset = {}", number(set.grid_offset))?;
    for (key, errors) in [("fitted", set.fitted), ("kept_out", set.kept_out)] {
        if let Some(e) = errors {
            let (median, worst) = (number(e.median_percent), number(e.worst_percent));
            let rows = e.rows;
            writeln!(out, "{key} = {{ rows = {rows}, median_percent = {median}, worst_percent = {worst} }}")?;
        }
    }
    writeln!(out, "at = {}", list(set.at.iter().map(|name| text(name))))?;
    writeln!(out, "rows = {}", lines(set.rows.iter().map(row)))
}

fn row(row: &Row) -> String {
    let at = list(row.at.iter().map(|&value| number(value)));
    let (published, law) = (number(row.published), number(row.law));
    let note = row.note.as_ref().map_or(String::new(), |note| format!(", note = {}", text(note)));
    format!("{{ at = {at}, published = {published}, law = {law}, fitted = {}{note} }}", row.fitted)
}

fn source(out: &mut String, sure: Sure, source: &str) -> std::fmt::Result {
    writeln!(out, "sure = \"{}\"\nsource = {}", sure_name(sure), text(source))
}

fn sure_name(sure: Sure) -> &'static str {
    match sure {
        Sure::Seen => "seen",
        Sure::FromMemory => "from memory",
    }
}

fn stated<T>(stated: &Stated<T>, value_text: impl Fn(&T) -> String) -> String {
    match stated {
        Stated::Not(_) => "\"not stated\"".into(),
        Stated::Value { value, sure, source } => {
            let (value, source) = (value_text(value), text(source));
            format!("{{ value = {value}, sure = \"{}\", source = {source} }}", sure_name(*sure))
        }
    }
}

fn parameters(p: &Parameters) -> String {
    let n = number;
    let head = format!("G = {}, mu = {}, gamma = {}, C = {}", n(p.g), n(p.mu), n(p.gamma), n(p.c));
    let tail = format!(
        "share = {}, mu_ratio = {}, offset = {}, knee = {}",
        n(p.share),
        n(p.mu_ratio),
        n(p.offset),
        n(p.knee)
    );
    let third = match (p.third_share, p.third_mu_ratio) {
        (Some(share), Some(ratio)) => format!(", third_share = {}, third_mu_ratio = {}", n(share), n(ratio)),
        _ => String::new(),
    };
    format!("{{ {head}, {tail}{third} }}")
}

/// The shortest text that reads back as the same number, as a TOML float.
fn number(value: f64) -> String {
    let plain = format!("{value:?}");
    if value != 0.0 && value.abs() < 1e-2 { format!("{value:e}") } else { plain }
}

/// A basic string.
fn text(value: &str) -> String {
    format!("\"{}\"", value.replace('\\', "\\\\").replace('"', "\\\""))
}

fn list(items: impl Iterator<Item = String>) -> String {
    format!("[{}]", items.collect::<Vec<_>>().join(", "))
}

/// A list with one item a line.
fn lines(items: impl Iterator<Item = String>) -> String {
    let body: String = items.map(|item| format!("    {item},\n")).collect();
    if body.is_empty() { "[]".into() } else { format!("[\n{body}]") }
}
