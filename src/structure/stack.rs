//! The stack: a flat list of layers from the substrate up, with materials resolved at the temperature and the strain.

use super::file::{Item, LayerEntry, Profile, Spanned, Structure, Substance};
use crate::diagnostics::Diagnostic;
use crate::materials::{Composition, Dual, Library, Material, strain};
use crate::units::{Dimension, Quantity};
use std::ops::Range;

/// A stack of layers, lowest first, ready to be solved and cheap to change.
#[derive(Clone, Debug)]
pub struct Stack {
    /// The layers with all repeats laid out.
    pub layers: Vec<Layer>,
    /// The field in V/nm; a positive one raises the electron's potential energy along the growth direction.
    pub field_v_per_nm: f64,
    temperature_k: f64,
    /// The in-plane lattice constant that all layers take over, if there is a substrate.
    substrate_nm: Option<f64>,
    library: Library,
    /// What each entry of the file consists of.
    contents: Vec<Content>,
}

/// One layer of a stack.
#[derive(Clone, Debug, PartialEq)]
pub struct Layer {
    /// The user's name or `layer 3`; copies of a repeat add their number, as in `well [2]`.
    pub label: String,
    /// Index of the file's layer entry, which all copies of a repeat share.
    pub entry: usize,
    pub width_nm: f64,
    /// Donors per volume, in cm⁻³.
    pub donors_cm3: f64,
    /// Acceptors per volume, in cm⁻³.
    pub acceptors_cm3: f64,
}
