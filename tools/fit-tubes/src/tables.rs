//! The published tables, as their files give them.

use std::path::{Path, PathBuf};

use platewright_dsp::triode::fitting::Family;
use serde::Deserialize;
use serde::de::DeserializeOwned;

/// A failure with the file it concerns.
pub type Failure = String;

/// A row of `tubes.csv`.
#[derive(Clone, Debug, Deserialize)]
#[allow(non_snake_case)]
pub struct TypicalRow {
    #[serde(rename = "type")]
    pub name: String,
    pub plate_volts: f64,
    pub grid_volts: Option<f64>,
    pub cathode_resistor_ohms: Option<f64>,
    pub plate_mA: f64,
    pub mu: f64,
    pub gm_mS: f64,
    pub rp_kohm: f64,
    pub max_plate_W: Option<f64>,
    pub max_plate_V: Option<f64>,
    pub max_cathode_mA: Option<f64>,
    pub max_heater_cathode_V: Option<f64>,
    pub heater_V: f64,
    pub heater_A: f64,
    pub C_grid_plate_pF: f64,
    pub C_grid_cathode_pF: f64,
    pub C_plate_cathode_pF: f64,
    pub provenance: String,
}

/// A row of `rc-amplifier-charts.csv`.
#[derive(Clone, Debug, Deserialize)]
#[allow(non_snake_case)]
pub struct ChartRow {
    #[serde(rename = "type")]
    pub name: String,
    pub supply_volts: f64,
    pub plate_resistor_Mohm: f64,
    pub next_grid_resistor_Mohm: f64,
    pub cathode_resistor_ohms: f64,
    pub gain: f64,
    pub provenance: String,
}

/// A row of `ecc83-table.csv`; its distortion judges and is never read here.
#[derive(Clone, Debug, Deserialize)]
#[allow(non_snake_case)]
pub struct Ecc83Row {
    pub supply_volts: f64,
    pub plate_resistor_kohm: f64,
    pub next_grid_resistor_kohm: f64,
    pub cathode_resistor_ohms: f64,
    pub plate_mA: f64,
    pub gain: f64,
    pub provenance: String,
}

/// A row of a file in `curves/`.
#[derive(Clone, Debug, Deserialize)]
#[allow(non_snake_case)]
pub struct CurveRow {
    pub plate_volts: f64,
    pub grid_volts: f64,
    pub plate_mA: f64,
}

/// A row of `curves/mu-along-a-load-line.csv`.
#[derive(Clone, Debug, Deserialize)]
#[allow(non_snake_case)]
pub struct MuRow {
    pub tube_and_line: String,
    pub plate_volts: f64,
    pub cathode_mA: f64,
    pub mu: f64,
    pub doubtful: String,
}

/// A type of `types.toml`.
#[derive(Clone, Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct TypeEntry {
    pub name: String,
    #[serde(default)]
    pub aliases: Vec<String>,
    pub sections: u8,
    pub basing: Option<String>,
    #[serde(default)]
    pub tapped_heater: bool,
    pub plate_voltage_cold: Option<f64>,
    pub grid_circuit_resistance: Option<f64>,
    pub curve_reading_error: Option<f64>,
    #[serde(default)]
    pub neighbours: Vec<String>,
    pub twin: Option<String>,
    #[serde(default)]
    pub third_section: bool,
}

impl TypeEntry {
    /// The law that this type is fitted with.
    pub fn family(&self) -> Family {
        if self.third_section { Family::ThreeSection } else { Family::TwoSection }
    }
}

/// Everything read.
pub struct Tables {
    pub types: Vec<TypeEntry>,
    pub typical: Vec<TypicalRow>,
    pub charts: Vec<ChartRow>,
    pub ecc83: Vec<Ecc83Row>,
    pub mu_lines: Vec<MuRow>,
    /// File stem, first line without its mark, rows.
    pub curves: Vec<(String, String, Vec<CurveRow>)>,
}

impl Tables {
    /// Reads the files of the repository.
    pub fn read() -> Result<Tables, Failure> {
        #[derive(Deserialize)]
        struct File {
            r#type: Vec<TypeEntry>,
        }
        let tool = Path::new(env!("CARGO_MANIFEST_DIR"));
        let text = text(&tool.join("types.toml"))?;
        let file: File = toml::from_str(&text).map_err(|e| format!("types.toml: {e}"))?;
        let published = tool.join("../../tests/published");
        let curves = published.join("curves");
        let mut read_curves = Vec::new();
        for entry in &file.r#type {
            let path = curves.join(format!("{}.csv", entry.name));
            if path.exists() {
                let first = self::text(&path)?.lines().next().unwrap_or_default().to_owned();
                let about = first.trim_start_matches(['#', ' ']).to_owned();
                read_curves.push((entry.name.clone(), about, rows(&path)?));
            }
        }
        Ok(Tables {
            types: file.r#type,
            typical: rows(&published.join("tubes.csv"))?,
            charts: rows(&published.join("rc-amplifier-charts.csv"))?,
            ecc83: rows(&published.join("ecc83-table.csv"))?,
            mu_lines: rows(&curves.join("mu-along-a-load-line.csv"))?,
            curves: read_curves,
        })
    }
}

/// Where the data files go.
pub fn library_folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../../dsp/src/triode/library/types")
}

fn text(path: &Path) -> Result<String, Failure> {
    std::fs::read_to_string(path).map_err(|e| format!("{}: {e}", path.display()))
}

fn rows<T: DeserializeOwned>(path: &Path) -> Result<Vec<T>, Failure> {
    let reader = csv::ReaderBuilder::new().comment(Some(b'#')).from_path(path);
    let rows = reader.and_then(|mut reader| reader.deserialize().collect());
    rows.map_err(|e| format!("{}: {e}", path.display()))
}
