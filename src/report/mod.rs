//! Results as text tables, CSV and JSON: read-only views.

mod interband;
mod levels;
mod materials;
pub mod svg;
mod table;
mod tolerance;
mod tuning;

pub use levels::Levels;
pub use materials::{MaterialList, MaterialSheet};
pub use tolerance::Tolerances;
pub use tuning::Tuning;

use serde::Serialize;

/// A result that can be printed in each form.
pub trait Report: Serialize {
    /// Tables for reading.
    fn text(&self) -> String;

    /// The tables as CSV, one after the other with an empty line between.
    fn csv(&self) -> Result<String, csv::Error>;

    /// One JSON object.
    fn json(&self) -> Result<String, serde_json::Error> {
        serde_json::to_string_pretty(self).map(|text| text + "\n")
    }
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
