//! What a structure file says of tolerances, checked: how far a grown wafer may be off, and what it must still do.
//!
//! Every spread is one standard deviation of a normal distribution, and all of them are independent.

use super::file::{Level, Spanned};
use crate::materials::Element;
use crate::units::Quantity;
use std::ops::Range;

/// The `tolerance` block.
#[derive(Clone, Debug, PartialEq)]
pub struct Tolerance {
    /// Of all growth rates together, as a part.
    pub rate: Option<f64>,
    /// Of each group-III flux, as a part.
    pub flux: Vec<Spanned<(Element, f64)>>,
    /// Of each layer's width on its own: a length, monolayers of the layer, or a part of its width.
    pub jitter: Option<Spanned<Quantity>>,
    /// Of an element's fraction, the same in all layers of an alloy.
    pub composition: Option<Spanned<f64>>,
    pub grading: Option<Grading>,
    /// Of all dopants together, as a part.
    pub doping: Option<f64>,
    pub field_v_per_nm: Option<f64>,
    pub temperature_k: Option<f64>,
    /// Wafers to sample.
    pub samples: usize,
    pub seed: u64,
    pub windows: Vec<Window>,
    pub radial: Option<Radial>,
}

impl Tolerance {
    /// Whether wafers differ from one another at all.
    pub fn has_spreads(&self) -> bool {
        self.rate.is_some()
            || !self.flux.is_empty()
            || self.jitter.is_some()
            || self.composition.is_some()
            || self.grading.as_ref().is_some_and(|g| g.spread_nm > 0.0)
            || self.doping.is_some()
            || self.field_v_per_nm.is_some()
            || self.temperature_k.is_some()
    }
}

/// Interfaces over which the crystals on both sides have mixed.
///
/// Each interface becomes a layer of this length, centred where the abrupt interface would be, in which every material
/// parameter goes linearly from the crystal below to the crystal above. The length is the same at all interfaces.
#[derive(Clone, Debug, PartialEq)]
pub struct Grading {
    pub length_nm: f64,
    /// From wafer to wafer.
    pub spread_nm: f64,
    pub span: Range<usize>,
}

/// What a wafer must do to be good.
#[derive(Clone, Debug, PartialEq)]
pub struct Window {
    pub from: Level,
    pub to: Level,
    /// The bounds of the transition's energy, the lower first.
    pub energies_ev: [f64; 2],
    /// Whether the file gives wavelengths.
    pub as_wavelength: bool,
}

/// How the layers become thinner towards the edge of the wafer: all by the same part, `drop` (r/radius)².
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Radial {
    /// The missing part of the thickness at `radius_mm`.
    pub drop: f64,
    pub radius_mm: f64,
}
