//! A type's data file from its published figures and its fits.

use platewright_dsp::triode::fitting::Specimen;
use platewright_dsp::triode::library::{
    CapacitanceRecord, Errors, Evidence, FitRecord, GridRecord, HeaterRecord, LimitsRecord, Parameters, Record,
    Row, SeriesHeater, Stated, Sure,
};
use platewright_dsp::triode::{GridLaw, Law, Section};

use crate::evidence::{DOUBTFUL_ROW, Gathered, GatheredRow};
use crate::fit::Fitted;
use crate::tables::{Failure, Tables, TypeEntry, TypicalRow};

const RATINGS_SOURCE: &str = "makers' data sheets and RCA Receiving Tube Manual RC-30";
const BASING_SOURCE: &str = "basing diagrams of RCA Receiving Tube Manual RC-30";

/// The whole record.
pub fn assemble(
    tables: &Tables,
    entry: &TypeEntry,
    gathered: &[Gathered],
    fitted: &Fitted,
) -> Result<Record, Failure> {
    let row = tables.typical.iter().find(|row| row.name == entry.name);
    let row = row.ok_or_else(|| format!("{} has no row in tubes.csv", entry.name))?;
    // What is shipped is what is judged: the rounded parameters.
    let nominal = rounded(&fitted.nominal.law)?;
    let grid = GridRecord {
        gg: GridLaw::BORROWED.gg,
        xi: GridLaw::BORROWED.xi,
        cg: GridLaw::BORROWED.cg,
        borrowed: true,
        sure: Sure::FromMemory,
        source: "Dempwolf & Zölzer 2011, first of three measured 12AX7".into(),
    };
    let all = |laws: &[Law]| laws.iter().map(rounded).collect::<Result<Vec<_>, _>>();
    let evidence = gathered.iter().zip(&fitted.nominal.specimens);
    Ok(Record {
        name: entry.name.clone(),
        aliases: entry.aliases.clone(),
        sections: entry.sections,
        basing: from_memory(entry.basing.clone(), BASING_SOURCE),
        heater: heater(row, entry),
        capacitance: CapacitanceRecord {
            grid_cathode: pico(row.C_grid_cathode_pF),
            grid_plate: pico(row.C_grid_plate_pF),
            plate_cathode: pico(row.C_plate_cathode_pF),
            sure: Sure::FromMemory,
            source: RATINGS_SOURCE.into(),
        },
        limits: limits(row, entry),
        fit: FitRecord {
            rests_on: rests_on(entry),
            nominal,
            grid,
            ensemble: all(&fitted.ensemble)?,
            ensemble_without_priors: all(&fitted.without_priors)?,
        },
        evidence: evidence.map(|(set, specimen)| beside(set, specimen, &nominal)).collect(),
    })
}

fn rests_on(entry: &TypeEntry) -> String {
    let mut text = "the published figures below".to_owned();
    if let Some(twin) = &entry.twin {
        text += &format!(", those of {twin} among them, which is published as the same electrodes");
    }
    text += "; beliefs about any triode's exponent, sharpness, knee and offset";
    if !entry.neighbours.is_empty() {
        text += &format!(", narrowed to the shape of its neighbours {}", entry.neighbours.join(", "));
    }
    text
}

fn pico(value: f64) -> f64 {
    // Through the decimal text, so that 1.7 becomes 1.7e-12 and no neighbour of it.
    format!("{value}e-12").parse().unwrap_or(value * 1e-12)
}

fn milli(value: f64) -> f64 {
    format!("{value}e-3").parse().unwrap_or(value * 1e-3)
}

/// A figure of `types.toml`.
fn from_memory<T>(value: Option<T>, source: &str) -> Stated<T> {
    value.map_or(Stated::NOT, |value| Stated::Value { value, sure: Sure::FromMemory, source: source.into() })
}

fn row_sure(row: &TypicalRow) -> Sure {
    if row.provenance.starts_with("seen") { Sure::Seen } else { Sure::FromMemory }
}

fn limits(row: &TypicalRow, entry: &TypeEntry) -> LimitsRecord {
    let stated = |value: Option<f64>| {
        value.map_or(Stated::NOT, |value| Stated::Value {
            value,
            sure: row_sure(row),
            source: RATINGS_SOURCE.into(),
        })
    };
    LimitsRecord {
        plate_voltage: stated(row.max_plate_V),
        plate_voltage_cold: from_memory(entry.plate_voltage_cold, "European data sheets"),
        plate_dissipation: stated(row.max_plate_W),
        cathode_current: stated(row.max_cathode_mA.map(milli)),
        heater_cathode_voltage: stated(row.max_heater_cathode_V),
        grid_circuit_resistance: from_memory(entry.grid_circuit_resistance, "RCA Receiving Tube Manual RC-30"),
    }
}

fn heater(row: &TypicalRow, entry: &TypeEntry) -> HeaterRecord {
    let (voltage, current) = (row.heater_V, row.heater_A);
    let series = entry.tapped_heater.then_some(SeriesHeater { voltage: 2.0 * voltage, current: 0.5 * current });
    HeaterRecord { voltage, current, series, sure: row_sure(row), source: RATINGS_SOURCE.into() }
}

/// Six figures: far finer than anything that is known of a tube.
pub fn six_figures(value: f64) -> f64 {
    format!("{value:.5e}").parse().unwrap_or(value)
}

fn rounded(law: &Law) -> Result<Parameters, Failure> {
    let p = Parameters::of(law).ok_or("the library's types are of its own law")?;
    let r = six_figures;
    Ok(Parameters {
        g: r(p.g),
        mu: r(p.mu),
        gamma: r(p.gamma),
        c: r(p.c),
        share: r(p.share),
        mu_ratio: r(p.mu_ratio),
        offset: r(p.offset),
        knee: r(p.knee),
        third_share: p.third_share.map(r),
        third_mu_ratio: p.third_mu_ratio.map(r),
    })
}

/// A set of figures beside what the nominal law says, scaled to the set's specimens.
fn beside(set: &Gathered, found: &Specimen, nominal: &Parameters) -> Evidence {
    let specimen = Specimen {
        emission: four_figures(found.emission),
        mu_factor: four_figures(found.mu_factor),
        grid_offset: four_figures(found.grid_offset),
    };
    let tube = Section { law: nominal.law(), grid: GridLaw::BORROWED, capacitance: Default::default() };
    let row = |row: &GatheredRow| Row {
        at: row.at.iter().map(|&value| six_figures(value)).collect(),
        published: six_figures(row.figure.published),
        law: four_figures(row.figure.of_specimen(&tube, &specimen)),
        fitted: row.fitted,
        note: row.note.clone(),
    };
    let rows: Vec<Row> = set.rows.iter().map(row).collect();
    // A row that its own source doubts is shown and counts in neither.
    let counts = |row: &&GatheredRow| row.note.as_deref() != Some(DOUBTFUL_ROW);
    let error =
        |row: &GatheredRow| 100.0 * (row.figure.of_specimen(&tube, &specimen) / row.figure.published - 1.0).abs();
    let errors =
        |fitted: bool| errors(set.rows.iter().filter(|row| row.fitted == fitted).filter(counts).map(error));
    Evidence {
        what: set.what.into(),
        quantity: set.quantity.into(),
        sure: set.sure,
        source: set.source.clone(),
        emission: specimen.emission,
        mu_factor: specimen.mu_factor,
        grid_offset: specimen.grid_offset,
        at: set.at.iter().map(|&name| name.into()).collect(),
        fitted: errors(true),
        kept_out: errors(false),
        rows,
    }
}

fn four_figures(value: f64) -> f64 {
    format!("{value:.3e}").parse().unwrap_or(value)
}

fn errors(sizes: impl Iterator<Item = f64>) -> Option<Errors> {
    let mut sizes: Vec<f64> = sizes.filter(|size| size.is_finite()).collect();
    sizes.sort_by(f64::total_cmp);
    let worst = *sizes.last()?;
    let median = 0.5 * (sizes[(sizes.len() - 1) / 2] + sizes[sizes.len() / 2]);
    let round = |value: f64| format!("{value:.2}").parse().unwrap_or(value);
    Some(Errors { rows: sizes.len(), median_percent: round(median), worst_percent: round(worst) })
}
