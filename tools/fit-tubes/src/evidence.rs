//! What is known of one type: every published figure with its error, fitted or kept out.

use platewright_dsp::triode::fitting::{Condition, Figure, Quantity, Random, Set, Stage};
use platewright_dsp::triode::library::Sure;

use crate::tables::{ChartRow, CurveRow, Ecc83Row, Tables, TypeEntry, TypicalRow};

/// Figures of one quantity from one source.
pub struct Gathered {
    pub what: &'static str,
    pub quantity: &'static str,
    pub sure: Sure,
    pub source: String,
    pub at: &'static [&'static str],
    pub specimen: bool,
    pub rows: Vec<GatheredRow>,
}

/// One figure.
pub struct GatheredRow {
    pub at: Vec<f64>,
    pub figure: Figure,
    pub fitted: bool,
    pub note: Option<String>,
}

/// The note of a row that its source doubts.
pub const DOUBTFUL_ROW: &str = "doubtful in the source";

/// Relative standard errors. Typical operation is a maker's bogey, printed to two figures; an amplifier chart adds the
/// rounding of its whole numbers; a row off its own trend counts with three times the error.
const CURRENT_ERROR: f64 = 0.02;
/// A typical operation that stands at the maker's own rating is met closely: it must not count as an overload.
const AT_RATING_ERROR: f64 = 0.003;
const MU_ERROR: f64 = 0.05;
const SLOPE_ERROR: f64 = 0.05;
const CHART_ERROR: f64 = 0.012;
const ROUNDING: f64 = 0.29;
const TABLE_GAIN_ERROR: f64 = 0.012;
const TABLE_CURRENT_ERROR: f64 = 0.02;
const MU_LINE_ERROR: f64 = 0.007;
const DOUBTFUL: f64 = 3.0;

/// Measured curves: part of the reading, and part of the full scale; the points of a curve err together, so many points
/// count as `CURVE_COUNT` of them.
const CURVE_ERROR: f64 = 0.012;
const CURVE_FLOOR: f64 = 0.003;
const CURVE_COUNT: f64 = 40.0;

const TYPICAL_SOURCE: &str = "makers' data sheets and RCA Receiving Tube Manual RC-30, typical operation";
const CHART_SOURCE: &str = "RCA Receiving Tube Manual, resistance-coupled amplifier charts";
const ECC83_SOURCE: &str = "Philips ECC83 data, operating characteristics as a resistance-coupled amplifier";

/// All that is known of a type.
pub fn gather(tables: &Tables, entry: &TypeEntry) -> Vec<Gathered> {
    let mut out = typical(tables, &entry.name);
    let twin = entry.twin.as_deref().unwrap_or(&entry.name);
    out.extend(chart(tables, twin));
    if entry.name == "12AX7" {
        out.extend(ecc83(&tables.ecc83));
    }
    out.extend(mu_line(tables, twin));
    out.extend(curves(tables, entry, twin));
    out
}

impl Gathered {
    /// The rows that the fit may use.
    pub fn set(&self) -> Set {
        let figures = self.rows.iter().filter(|row| row.fitted).map(|row| row.figure).collect();
        Set { figures, specimen: self.specimen }
    }
}

fn sure(provenance: &str) -> Sure {
    if provenance.starts_with("seen") { Sure::Seen } else { Sure::FromMemory }
}

fn note(provenance: &str) -> Option<String> {
    provenance
        .split("; ")
        .find(|part| part.contains("off its own trend") || part.contains("doubtful"))
        .map(str::to_owned)
}

fn typical(tables: &Tables, name: &str) -> Vec<Gathered> {
    type Pick = fn(&TypicalRow) -> f64;
    let quantities: [(&str, Quantity, f64, Pick); 4] = [
        ("plate current, A", Quantity::PlateCurrent, CURRENT_ERROR, |row| row.plate_mA * 1e-3),
        ("mu", Quantity::Mu, MU_ERROR, |row| row.mu),
        ("gm, S", Quantity::Gm, SLOPE_ERROR, |row| row.gm_mS * 1e-3),
        ("rp, ohm", Quantity::Rp, SLOPE_ERROR, |row| row.rp_kohm * 1e3),
    ];
    let rows: Vec<&TypicalRow> = tables.typical.iter().filter(|row| row.name == name).collect();
    let one = |(unit, quantity, error, pick): (&'static str, Quantity, f64, Pick)| {
        let row = |row: &&TypicalRow| {
            let vpk = row.plate_volts;
            let (condition, bias) = match (row.grid_volts, row.cathode_resistor_ohms) {
                (None, Some(resistor)) => (Condition::CathodeResistor { vpk, resistor }, resistor),
                (vgk, _) => (Condition::Bias { vpk, vgk: vgk.unwrap_or_default() }, vgk.unwrap_or_default()),
            };
            let published = pick(row);
            let watts = vpk * row.plate_mA * 1e-3;
            let at_rating =
                quantity == Quantity::PlateCurrent && row.max_plate_W.is_some_and(|most| watts > 0.98 * most);
            let error = if at_rating { AT_RATING_ERROR } else { error };
            GatheredRow {
                at: vec![vpk, bias],
                figure: Figure { condition, quantity, published, error: error * published },
                fitted: true,
                note: note(&row.provenance),
            }
        };
        Gathered {
            what: "typical operation",
            quantity: unit,
            sure: rows.first().map_or(Sure::FromMemory, |row| sure(&row.provenance)),
            source: TYPICAL_SOURCE.into(),
            at: if rows.iter().any(|row| row.grid_volts.is_none()) {
                &["plate to cathode, V", "cathode resistor, ohm"]
            } else {
                &["plate to cathode, V", "grid to cathode, V"]
            },
            specimen: false,
            rows: rows.iter().map(row).collect(),
        }
    };
    quantities.into_iter().map(one).collect()
}

fn chart(tables: &Tables, name: &str) -> Option<Gathered> {
    let rows: Vec<&ChartRow> = tables.charts.iter().filter(|row| row.name == name).collect();
    if rows.is_empty() {
        return None;
    }
    let kept_out = seeded_third(rows.len(), name);
    let row = |(row, kept_out): (&&ChartRow, bool)| {
        let note = note(&row.provenance);
        let own = libm::hypot(CHART_ERROR * row.gain, ROUNDING);
        let error = own * if note.is_some() { DOUBTFUL } else { 1.0 };
        let stage = Stage {
            supply: row.supply_volts,
            plate_resistor: row.plate_resistor_Mohm * 1e6,
            cathode_resistor: row.cathode_resistor_ohms,
            next_grid_resistor: row.next_grid_resistor_Mohm * 1e6,
        };
        stage_row(stage, Quantity::Gain, row.gain, error, !kept_out, note)
    };
    Some(Gathered {
        what: "resistance-coupled amplifier chart, a seeded third of its rows kept out",
        quantity: "gain",
        sure: Sure::FromMemory,
        source: CHART_SOURCE.into(),
        at: STAGE_AT,
        specimen: false,
        rows: rows.iter().zip(kept_out).map(row).collect(),
    })
}

const STAGE_AT: &[&str] = &["supply, V", "plate resistor, ohm", "cathode resistor, ohm", "next grid resistor, ohm"];

fn stage_row(
    stage: Stage,
    quantity: Quantity,
    published: f64,
    error: f64,
    fitted: bool,
    note: Option<String>,
) -> GatheredRow {
    let at = vec![stage.supply, stage.plate_resistor, stage.cathode_resistor, stage.next_grid_resistor];
    GatheredRow {
        at,
        figure: Figure { condition: Condition::Stage(stage), quantity, published, error },
        fitted,
        note,
    }
}

/// A third of `count` rows, chosen by the name alone (a shuffle by Fisher & Yates).
fn seeded_third(count: usize, name: &str) -> Vec<bool> {
    let mut random = Random::new(seed_of(name));
    let mut order: Vec<usize> = (0..count).collect();
    for last in (1..count).rev() {
        order.swap(last, (random.bits() % (last as u64 + 1)) as usize);
    }
    let mut out = vec![false; count];
    for &row in &order[..count / 3] {
        out[row] = true;
    }
    out
}

/// FNV-1a of a name.
pub fn seed_of(name: &str) -> u64 {
    name.bytes().fold(0xcbf2_9ce4_8422_2325, |hash, byte| (hash ^ u64::from(byte)).wrapping_mul(0x100_0000_01b3))
}

fn ecc83(rows: &[Ecc83Row]) -> Vec<Gathered> {
    type Pick = fn(&Ecc83Row) -> f64;
    let quantities: [(&str, Quantity, f64, Pick); 2] = [
        ("gain", Quantity::Gain, TABLE_GAIN_ERROR, |row| row.gain),
        ("plate current, A", Quantity::PlateCurrent, TABLE_CURRENT_ERROR, |row| row.plate_mA * 1e-3),
    ];
    let one = |(unit, quantity, error, pick): (&'static str, Quantity, f64, Pick)| {
        let row = |row: &Ecc83Row| {
            let note = note(&row.provenance);
            let error = error * pick(row) * if note.is_some() { DOUBTFUL } else { 1.0 };
            let stage = Stage {
                supply: row.supply_volts,
                plate_resistor: row.plate_resistor_kohm * 1e3,
                cathode_resistor: row.cathode_resistor_ohms,
                next_grid_resistor: row.next_grid_resistor_kohm * 1e3,
            };
            stage_row(stage, quantity, pick(row), error, true, note)
        };
        Gathered {
            what: "resistance-coupled amplifier table",
            quantity: unit,
            sure: Sure::FromMemory,
            source: ECC83_SOURCE.into(),
            at: STAGE_AT,
            specimen: false,
            rows: rows.iter().map(row).collect(),
        }
    };
    quantities.into_iter().map(one).collect()
}

fn mu_line(tables: &Tables, name: &str) -> Option<Gathered> {
    let line = match name {
        "6SN7GTB" => "6SN7",
        "5842" => "417A",
        other => other,
    };
    let mut counted = 0;
    let mut rows = Vec::new();
    for row in tables.mu_lines.iter().filter(|row| row.tube_and_line.starts_with(&format!("{line} ("))) {
        let doubtful = row.doubtful == "yes";
        let fitted = !doubtful && counted % 2 == 0;
        counted += usize::from(!doubtful);
        let (vpk, current) = (row.plate_volts, row.cathode_mA * 1e-3);
        let condition = Condition::Current { vpk, current };
        let figure = Figure { condition, quantity: Quantity::Mu, published: row.mu, error: MU_LINE_ERROR * row.mu };
        let note = doubtful.then(|| DOUBTFUL_ROW.to_owned());
        rows.push(GatheredRow { at: vec![vpk, current], figure, fitted, note });
    }
    (!rows.is_empty()).then(|| Gathered {
        what: "measured along a load line, every second row kept out",
        quantity: "mu",
        sure: Sure::Seen,
        source: "jacmusic.com techcorner, gmmu3".into(),
        at: &["plate to cathode, V", "plate current, A"],
        specimen: false,
        rows,
    })
}

fn curves(tables: &Tables, entry: &TypeEntry, name: &str) -> Option<Gathered> {
    let (_, about, rows) = tables.curves.iter().find(|(stem, ..)| stem == name)?;
    let full_scale = rows.iter().map(|row| row.plate_mA).fold(0.0, f64::max) * 1e-3;
    let used: Vec<&CurveRow> = rows
        .iter()
        .filter(|row| entry.curve_reading_error.is_some() || row.plate_mA * 1e-3 > 0.01 * full_scale)
        .collect();
    let inflation = (used.len() as f64 / CURVE_COUNT).sqrt().max(1.0);
    let row = |row: &&CurveRow| {
        let (vpk, vgk, published) = (row.plate_volts, row.grid_volts, row.plate_mA * 1e-3);
        let measured = libm::hypot(CURVE_ERROR * published, CURVE_FLOOR * full_scale);
        let error = entry.curve_reading_error.unwrap_or(measured);
        let condition = Condition::Bias { vpk, vgk };
        let figure = Figure { condition, quantity: Quantity::PlateCurrent, published, error: error * inflation };
        GatheredRow { at: vec![vpk, vgk], figure, fitted: true, note: None }
    };
    Some(Gathered {
        what: if entry.curve_reading_error.is_some() {
            "plate curves read off a chart"
        } else {
            "measured plate curves above 1 % of full scale"
        },
        quantity: "plate current, A",
        sure: Sure::Seen,
        source: about.clone(),
        at: &["plate to cathode, V", "grid to cathode, V"],
        specimen: entry.curve_reading_error.is_none(),
        rows: used.iter().map(row).collect(),
    })
}
