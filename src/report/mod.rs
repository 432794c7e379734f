//! Results as text tables, CSV and JSON: read-only views.

mod absorption;
mod cascade;
mod charge;
mod check;
mod dispersion;
mod interband;
mod layer_edges;
mod levels;
mod lifetime;
mod materials;
mod minibands;
mod open_levels;
mod sheet;
mod sheet_csv;
mod sheet_html;
mod sheet_text;
mod strain;
pub mod svg;
mod sweep;
mod sweep_csv;
mod sweep_picture;
mod sweep_text;
mod table;
mod tolerance;
mod transmission;
mod tuning;

pub use absorption::Absorption;
pub use cascade::Cascade;
pub use charge::ChargeReport;
pub use check::Check;
pub use dispersion::Dispersion;
pub use levels::Levels;
pub use materials::{MaterialList, MaterialSheet};
pub use minibands::{MinibandLevels, Minizone};
pub use open_levels::OpenLevels;
pub use sheet::Sheet;
pub use sweep::Sweeps;
pub use tolerance::Tolerances;
pub use transmission::Transmission;
pub use tuning::Tuning;

use serde::Serialize;

/// A result that can be printed in each form.
pub trait Report: Serialize {
    /// Tables for reading.
    fn text(&self) -> String;

    /// The tables as CSV, one after the other with an empty line between.
    fn csv(&self) -> Result<String, csv::Error>;

    /// One JSON object, its numbers to twelve significant digits.
    fn json(&self) -> Result<String, serde_json::Error> {
        let mut object = serde_json::to_value(self)?;
        round(&mut object);
        serde_json::to_string_pretty(&object).map(|text| text + "\n")
    }
}

/// What an audit says.
fn verdict(faults: &[String]) -> String {
    match faults {
        [] => "passed".to_owned(),
        faults => format!("objects ({})", faults.join("; ")),
    }
}

/// Enough for any use, and free of the last bits of arithmetic: 12, never 12.000000000000002.
const JSON_DIGITS: usize = 12;

fn round(value: &mut serde_json::Value) {
    match value {
        serde_json::Value::Array(list) => list.iter_mut().for_each(round),
        serde_json::Value::Object(object) => object.values_mut().for_each(round),
        serde_json::Value::Number(number) if number.is_f64() => {
            let value = rounded(number.as_f64().unwrap_or(0.0));
            if let Some(rounded) = serde_json::Number::from_f64(value) {
                *number = rounded;
            }
        }
        _ => {}
    }
}

/// A number to the digits that JSON has.
fn rounded(value: f64) -> f64 {
    let text = format!("{value:.*e}", JSON_DIGITS - 1);
    text.parse().unwrap_or(value)
}

/// Rows of one CSV table, with a header.
fn csv_table<R: Serialize>(rows: &[R]) -> Result<String, csv::Error> {
    let mut writer = csv::Writer::from_writer(Vec::new());
    for row in rows {
        writer.serialize(row)?;
    }
    let bytes = writer
        .into_inner()
        .map_err(|error| csv::Error::from(error.into_error()))?;
    Ok(String::from_utf8_lossy(&bytes).into_owned())
}
