//! What `check` prints: that a file holds no mistake, the strain of its layers against what can be grown, and where x-ray
//! diffraction will show them.

use super::layer_edges::LayerEdges;
use super::strain::StrainReport;
use super::table::significant;
use super::{Report, csv_table};
use crate::structure::{Charge, Stack, Structure};
use serde::Serialize;

/// The tables of one file.
#[derive(Debug, Serialize)]
pub struct Check {
    file: String,
    title: Option<String>,
    #[serde(rename = "temperature_K")]
    temperature_k: f64,
    layer_count: usize,
    width_nm: f64,
    has_tune: bool,
    /// What dopants do to the bands; nothing without dopants.
    #[serde(skip_serializing_if = "Option::is_none")]
    charge: Option<String>,
    #[serde(flatten)]
    edges: LayerEdges,
    #[serde(flatten)]
    strain: StrainReport,
}

impl Check {
    pub fn new(file: &str, structure: &Structure, stack: &Stack) -> Check {
        Check {
            file: file.to_owned(),
            title: structure.title.clone(),
            temperature_k: structure.temperature_k,
            layer_count: stack.layers.len(),
            width_nm: stack.total_width_nm(),
            has_tune: structure.tune.is_some(),
            charge: charge(structure, stack),
            edges: LayerEdges::new(structure, stack),
            strain: StrainReport::new(structure, stack),
        }
    }
}

/// What dopants do to the bands, in a sentence.
fn charge(structure: &Structure, stack: &Stack) -> Option<String> {
    let [donors, acceptors] = stack.sheet_doping_cm2();
    let bending = match &structure.charge {
        Charge::Flat if donors + acceptors == 0.0 => return None,
        Charge::Flat => "the bands stay flat".to_owned(),
        Charge::Bent(bending) => {
            let level = match (bending.contact, bending.surface_ev) {
                (false, None) => "follows from neutrality".to_owned(),
                (false, Some(ev)) => format!("lies {ev} eV below the edge at the top face"),
                (true, None) => "is that of the lowest layer".to_owned(),
                (true, Some(ev)) => {
                    format!(
                        "is that of the lowest layer, and lies {ev} eV below the edge at the top face"
                    )
                }
            };
            format!("charge bends the bands, and the Fermi level {level}")
        }
    };
    Some(format!(
        "Doping {} donors and {} acceptors per cm²: {bending}.",
        significant(donors, 4),
        significant(acceptors, 4)
    ))
}

impl Report for Check {
    fn text(&self) -> String {
        let tuning = if self.has_tune {
            ", with a tune block"
        } else {
            ""
        };
        let mut text = format!(
            "{}: {} layers, {:.2} nm{tuning}; no mistakes\n\n{}{}",
            self.file,
            self.layer_count,
            self.width_nm,
            self.edges.text(),
            self.edges.offset_lines(),
        );
        if let Some(charge) = &self.charge {
            text.push_str(&format!("\n{charge}\n"));
        }
        for table in self.strain.tables() {
            text.push('\n');
            text.push_str(&table.text());
        }
        text
    }

    fn csv(&self) -> Result<String, csv::Error> {
        let mut tables = vec![csv_table(&self.edges.layers)?];
        if self.strain.substrate.is_some() {
            tables.push(csv_table(&self.strain.thickness)?);
            tables.push(csv_table(&self.strain.x_ray)?);
        }
        if !self.strain.repeats.is_empty() {
            tables.push(csv_table(&self.strain.repeats)?);
        }
        tables.retain(|table| !table.is_empty());
        Ok(tables.join("\n"))
    }
}
