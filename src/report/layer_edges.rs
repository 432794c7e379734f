//! Strain and band edges of each layer, and which published band offsets they rest on.

use super::table::{signed, table};
use crate::epitaxy::{LayerStrain, Part, layer_strains};
use crate::materials::{Selection, citation};
use crate::structure::{Stack, Structure};
use serde::Serialize;

/// Below this strain in every layer a table of levels does without the table of edges.
const WORTH_SHOWING: f64 = 1e-3;

/// The table of a stack.
#[derive(Debug, Serialize)]
pub struct LayerEdges {
    pub layers: Vec<EdgeRow>,
    pub band_offsets: Vec<OffsetRow>,
    #[serde(skip)]
    on_substrate: bool,
}

/// One layer of the file, or a face of a graded one.
#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
pub struct EdgeRow {
    pub layer: String,
    material: String,
    width_nm: f64,
    copies: usize,
    /// (a − a_substrate)/a_substrate without strain.
    mismatch: Option<f64>,
    in_plane_strain: Option<f64>,
    growth_strain: Option<f64>,
    conduction_eV: Option<f64>,
    heavy_hole_eV: Option<f64>,
    light_hole_eV: Option<f64>,
    split_off_eV: Option<f64>,
    gap_eV: Option<f64>,
}

/// A choice among published band offsets.
#[derive(Debug, Serialize)]
pub struct OffsetRow {
    alloy: &'static str,
    parameter: &'static str,
    /// The name of an alternative, `library` or `structure file`.
    chosen: String,
    source: String,
    /// What `choose` takes.
    alternatives: Vec<String>,
}

impl LayerEdges {
    pub fn new(structure: &Structure, stack: &Stack) -> LayerEdges {
        let row = |row: LayerStrain| EdgeRow {
            layer: layer_name(structure, row.entry, row.part),
            material: row.material,
            width_nm: row.width_nm,
            copies: row.copies,
            mismatch: row.mismatch,
            in_plane_strain: row.in_plane,
            growth_strain: row.growth.map(|strain| strain + 0.0), // No minus before zero.
            conduction_eV: row.edges.conduction_ev,
            heavy_hole_eV: row.edges.heavy_hole_ev,
            light_hole_eV: row.edges.light_hole_ev,
            split_off_eV: row.edges.split_off_ev,
            gap_eV: row.edges.gap_ev(),
        };
        LayerEdges {
            layers: layer_strains(stack).into_iter().map(row).collect(),
            band_offsets: offsets(stack),
            on_substrate: stack.substrate_lattice_nm().is_some(),
        }
    }

    /// Whether a layer is strained enough to look at its edges.
    pub fn are_strained(&self) -> bool {
        let strain = |row: &EdgeRow| row.in_plane_strain.unwrap_or(0.0).abs();
        self.layers.iter().any(|row| strain(row) > WORTH_SHOWING)
    }

    /// The table of edges.
    pub fn text(&self) -> String {
        let mut header = vec!["layer", "material", "nm"];
        if self.on_substrate {
            header.extend(["mismatch %", "ε∥ %", "ε_zz %"]);
        }
        header.extend(["Ec eV", "heavy holes eV", "light holes eV", "gap eV"]);
        let percent = |part: Option<f64>| part.map_or("-".to_owned(), |v| signed(1e2 * v, 3));
        let edge = |ev: Option<f64>| ev.map_or("-".to_owned(), |v| format!("{v:.3}"));
        let rows = self.layers.iter().map(|row| {
            let mut cells = vec![
                row.layer.clone(),
                row.material.clone(),
                format!("{:.2}", row.width_nm),
            ];
            if self.on_substrate {
                cells.extend([row.mismatch, row.in_plane_strain, row.growth_strain].map(percent));
            }
            cells.extend(
                [
                    row.conduction_eV,
                    row.heavy_hole_eV,
                    row.light_hole_eV,
                    row.gap_eV,
                ]
                .map(edge),
            );
            cells
        });
        table(&header, &[0, 1], rows.collect())
    }

    /// A line for each choice among published band offsets that matters here.
    pub fn offset_lines(&self) -> String {
        self.band_offsets
            .iter()
            .map(|row| {
                let others: Vec<String> = row
                    .alternatives
                    .iter()
                    .filter(|name| **name != row.chosen)
                    .map(|name| format!("`choose: {{{}: {name}}}`", row.parameter))
                    .collect();
                let others = match others.join(" or ") {
                    none if none.is_empty() => none,
                    some => format!(
                        " Published values disagree; under `{}` in `materials`, {some} takes another.",
                        row.alloy
                    ),
                };
                let chosen = match row.chosen.as_str() {
                    "library" => "the library's own value".to_owned(),
                    "structure file" => "the structure file's value".to_owned(),
                    name => format!("`{name}`"),
                };
                format!(
                    "Band offsets of {}: {} from {chosen} ({}).{others}\n",
                    row.alloy, row.parameter, row.source
                )
            })
            .collect()
    }
}

/// A layer of the file as tables call it.
pub fn layer_name(structure: &Structure, entry: usize, part: Part) -> String {
    let label = structure
        .entries
        .get(entry)
        .map_or("", |e| e.label.as_str());
    match part {
        Part::Whole => label.to_owned(),
        Part::Bottom => format!("{label}, bottom"),
        Part::Top => format!("{label}, top"),
    }
}

fn offsets(stack: &Stack) -> Vec<OffsetRow> {
    let mut found: Vec<Selection> = Vec::new();
    let entries = layer_strains(stack).into_iter().map(|row| row.entry);
    for (lower, upper) in entries.filter_map(|entry| stack.substances(entry)) {
        for substance in [Some(lower), upper].into_iter().flatten() {
            let Some(composition) = stack.library().composition(substance) else {
                continue;
            };
            // The tables were read when the stack was resolved.
            let selections = stack.library().offset_selections(&composition);
            for selection in selections.unwrap_or_default() {
                if !found.iter().any(|known| known.entry == selection.entry) {
                    found.push(selection);
                }
            }
        }
    }
    found.into_iter().map(offset_row).collect()
}

fn offset_row(selection: Selection) -> OffsetRow {
    // A source without a citation is the structure file itself.
    let cited = citation(&selection.source).is_some();
    let chosen = match (selection.chosen, cited) {
        (Some(name), _) => name,
        (None, true) => "library".to_owned(),
        (None, false) => "structure file".to_owned(),
    };
    OffsetRow {
        alloy: selection.entry,
        parameter: selection.key,
        alternatives: selection.names,
        chosen,
        source: selection.source,
    }
}
