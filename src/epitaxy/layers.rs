//! Strain and band edges of each layer.

use crate::materials::{BandEdges, band_edges, strain};
use crate::structure::Stack;

/// What part of a layer a row speaks of.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Part {
    /// All of it: it has one material.
    Whole,
    /// The lower face of a graded layer.
    Bottom,
    /// The upper face of a graded layer.
    Top,
}

/// A layer of the file, or one face of a graded one.
#[derive(Clone, Debug, PartialEq)]
pub struct LayerStrain {
    /// Index of the file's layer entry.
    pub entry: usize,
    pub part: Part,
    pub material: String,
    pub width_nm: f64,
    /// How often the stack has it.
    pub copies: usize,
    /// (a − a_substrate)/a_substrate without strain; `None` without a substrate or a lattice constant.
    pub mismatch: Option<f64>,
    /// ε∥; `None` without a substrate, a lattice constant or elastic constants.
    pub in_plane: Option<f64>,
    /// ε_zz.
    pub growth: Option<f64>,
    /// At the stack's temperature; unstrained where the strain is not known.
    pub edges: BandEdges,
}

/// Each layer of the file once, in its order; both faces of a graded one.
pub fn layer_strains(stack: &Stack) -> Vec<LayerStrain> {
    let mut rows = Vec::new();
    for (layer, entry, copies) in first_copies(stack) {
        let Some((lower, upper)) = stack.substances(entry) else {
            continue;
        };
        let parts = match upper {
            None => vec![(Part::Whole, 0.0, lower)],
            Some(upper) => vec![(Part::Bottom, 0.0, lower), (Part::Top, 1.0, upper)],
        };
        for (part, t, substance) in parts {
            let material = stack.free_material_at(layer, t);
            let substrate = stack.substrate_lattice_nm();
            let strain = substrate.and_then(|lattice| strain(&material, lattice));
            let mismatch = material.lattice_constant_nm.zip(substrate);
            rows.push(LayerStrain {
                entry,
                part,
                material: substance.to_string(),
                width_nm: stack.layers[layer].width_nm,
                copies,
                mismatch: mismatch.map(|(own, substrate)| (own - substrate) / substrate),
                in_plane: strain.map(|strain| strain.in_plane),
                growth: strain.map(|strain| strain.growth),
                edges: band_edges(&material, substrate),
            });
        }
    }
    rows
}

/// For each entry of the file its first layer in the stack, and how many layers it has.
pub(super) fn first_copies(stack: &Stack) -> Vec<(usize, usize, usize)> {
    let entries = stack.layers.iter().map(|layer| layer.entry + 1).max();
    let mut found: Vec<Option<(usize, usize, usize)>> = vec![None; entries.unwrap_or(0)];
    for (index, layer) in stack.layers.iter().enumerate() {
        let place = &mut found[layer.entry];
        *place = match *place {
            None => Some((index, layer.entry, 1)),
            Some((first, entry, copies)) => Some((first, entry, copies + 1)),
        };
    }
    found.into_iter().flatten().collect()
}
