//! The material library as tables: all entries, or one material's parameters.

use super::table::{significant, table};
use super::{Report, csv_table};
use crate::materials::{Library, MaterialError, ReportRow, citation};
use serde::Serialize;

/// Every binary and ternary, and the alternatives where published values disagree.
#[derive(Debug, Serialize)]
pub struct MaterialList {
    materials: Vec<ListRow>,
    alternatives: Vec<AlternativeRow>,
}

#[derive(Debug, Serialize)]
struct ListRow {
    material: &'static str,
    between: String,
    parameters: usize,
}

#[derive(Debug, Serialize)]
struct AlternativeRow {
    material: String,
    key: &'static str,
    choose: String,
    source: String,
    known: String,
    note: String,
}

/// The parameters of one material at a temperature.
#[derive(Debug, Serialize)]
pub struct MaterialSheet {
    material: String,
    #[serde(rename = "temperature_K")]
    temperature_k: f64,
    parameters: Vec<ParameterRow>,
    alternatives: Vec<AlternativeRow>,
    notes: Vec<String>,
    sources: Vec<SourceRow>,
}

#[derive(Debug, Serialize)]
struct ParameterRow {
    key: &'static str,
    value: String,
    unit: &'static str,
    source: String,
    known: String,
}

#[derive(Debug, Serialize)]
struct SourceRow {
    key: String,
    citation: String,
}

impl MaterialList {
    /// Reads the whole library.
    ///
    /// # Errors
    /// Only when an embedded table cannot be read.
    pub fn new() -> Result<MaterialList, MaterialError> {
        let entries = Library::new().entries()?;
        let alternatives = entries
            .iter()
            .flat_map(|entry| &entry.alternatives)
            .map(alternative_row)
            .collect();
        let materials = entries
            .iter()
            .map(|entry| ListRow {
                material: entry.name,
                between: entry
                    .of
                    .map_or(String::new(), |[a, b]| format!("{a} and {b}")),
                parameters: entry.count,
            })
            .collect();
        Ok(MaterialList {
            materials,
            alternatives,
        })
    }
}

impl MaterialSheet {
    /// Resolves a formula.
    ///
    /// # Errors
    /// What is wrong with the formula; an alloy without all its fractions cannot be resolved.
    pub fn new(formula: &str, temperature_k: f64) -> Result<MaterialSheet, MaterialError> {
        let library = Library::new();
        let substance = library.find(formula)?;
        let rows = library.report(&substance, temperature_k)?;
        let mut notes: Vec<String> = rows
            .iter()
            .flat_map(|row| row.notes.iter().cloned())
            .collect();
        notes.sort();
        notes.dedup();
        let mut keys: Vec<String> = rows.iter().flat_map(|row| row.origin.sources()).collect();
        keys.sort();
        keys.dedup();
        let mut alternatives: Vec<AlternativeRow> = Vec::new();
        for alternative in rows
            .iter()
            .flat_map(|row| &row.alternatives)
            .map(alternative_row)
        {
            let known = |a: &AlternativeRow| (a.material.clone(), a.key, a.choose.clone());
            if !alternatives.iter().any(|a| known(a) == known(&alternative)) {
                alternatives.push(alternative);
            }
        }
        Ok(MaterialSheet {
            material: formula.trim().to_owned(),
            temperature_k,
            parameters: rows.iter().map(parameter_row).collect(),
            alternatives,
            notes,
            sources: keys
                .into_iter()
                .filter_map(|key| {
                    Some(SourceRow {
                        citation: citation(&key)?.to_owned(),
                        key,
                    })
                })
                .collect(),
        })
    }
}

fn alternative_row(alternative: &crate::materials::Alternative) -> AlternativeRow {
    AlternativeRow {
        material: alternative.entry.to_owned(),
        key: alternative.key,
        choose: alternative.name.clone(),
        source: alternative.source.clone(),
        known: alternative.known.to_string(),
        note: alternative.note.clone().unwrap_or_default(),
    }
}

fn parameter_row(row: &ReportRow) -> ParameterRow {
    let numbers: Vec<String> = row.numbers.iter().map(|n| shortest(*n)).collect();
    ParameterRow {
        key: row.key,
        value: numbers.join(" / "),
        unit: row.unit,
        source: row.origin.to_string(),
        known: row.known.map_or(String::new(), |known| known.to_string()),
    }
}

/// Six significant digits at most, without trailing zeros: tables give no more.
fn shortest(number: f64) -> String {
    let text = significant(number, 6);
    if text.contains('.') && !text.contains('e') {
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        text
    }
}

fn alternatives_table(rows: &[AlternativeRow]) -> String {
    table(
        &["material", "key", "choose", "source", "known"],
        &[0, 1, 2, 3, 4],
        rows.iter()
            .map(|a| {
                vec![
                    a.material.clone(),
                    a.key.to_owned(),
                    a.choose.clone(),
                    a.source.clone(),
                    a.known.clone(),
                ]
            })
            .collect(),
    )
}

impl Report for MaterialList {
    fn text(&self) -> String {
        let list = table(
            &["material", "between", "parameters"],
            &[0, 1],
            self.materials
                .iter()
                .map(|row| {
                    vec![
                        row.material.to_owned(),
                        row.between.clone(),
                        row.parameters.to_string(),
                    ]
                })
                .collect(),
        );
        let mut text = format!(
            "{list}\nAlloys take any composition, also of four elements: Al0.3Ga0.7As, In0.7Ga0.3As0.6P0.4.\n\n\
             Alternatives where published values disagree, for `materials: {{NAME: {{choose: {{KEY: ALTERNATIVE}}}}}}`\n\n{}",
            alternatives_table(&self.alternatives)
        );
        for row in self.alternatives.iter().filter(|row| !row.note.is_empty()) {
            text.push_str(&format!(
                "\n{} {} {}: {}",
                row.material, row.key, row.choose, row.note
            ));
        }
        text + "\n"
    }

    fn csv(&self) -> Result<String, csv::Error> {
        Ok(format!(
            "{}\n{}",
            csv_table(&self.materials)?,
            csv_table(&self.alternatives)?
        ))
    }
}

impl Report for MaterialSheet {
    fn text(&self) -> String {
        let parameters = table(
            &["parameter", "value", "unit", "source", "known"],
            &[0, 2, 3, 4],
            self.parameters
                .iter()
                .map(|row| {
                    vec![
                        row.key.to_owned(),
                        row.value.clone(),
                        row.unit.to_owned(),
                        row.source.clone(),
                        row.known.clone(),
                    ]
                })
                .collect(),
        );
        let mut text = format!(
            "{} at {} K\n\n{parameters}",
            self.material,
            significant(self.temperature_k, 4)
        );
        if !self.alternatives.is_empty() {
            text.push_str("\nAlternatives\n\n");
            text.push_str(&alternatives_table(&self.alternatives));
        }
        for note in &self.notes {
            text.push_str(&format!("\n{note}"));
        }
        if !self.notes.is_empty() {
            text.push('\n');
        }
        text.push('\n');
        for source in &self.sources {
            text.push_str(&format!("{}: {}\n", source.key, source.citation));
        }
        text
    }

    fn csv(&self) -> Result<String, csv::Error> {
        csv_table(&self.parameters)
    }
}
