//! The stack: a flat list of layers from the substrate up, with materials resolved at the temperature and the strain.

use super::file::Profile;
use super::grade::{self, Law};
use super::potential::Potential;
use crate::materials::{
    Composition, Dual, Element, Library, Material, MaterialError, Number, Substance, monolayer_nm,
    strained,
};
use crate::units::{Dimension, Quantity};
use std::sync::Arc;

/// The most that all layers may have together, in nm: more than any epitaxial stack, and as much as one layer may have.
pub const MAX_TOTAL_NM: f64 = 1e5;

/// A stack of layers, lowest first, ready to be solved and cheap to change.
#[derive(Clone, Debug)]
pub struct Stack {
    /// The layers with all repeats laid out.
    pub layers: Vec<Layer>,
    /// The doping planes with all repeats laid out, the lowest first.
    pub planes: Vec<Plane>,
    /// The energy that charge adds to the band edges, if that was worked out.
    pub potential: Option<Arc<Potential>>,
    /// The field in V/nm; a positive one raises the electron's potential energy along the growth direction.
    pub field_v_per_nm: f64,
    pub(super) temperature_k: f64,
    pub(super) substrate: Option<Substance>,
    /// The in-plane lattice constant that all layers take over, if there is a substrate.
    pub(super) substrate_nm: Option<f64>,
    pub(super) library: Library,
    /// What each entry of the file consists of.
    pub(super) contents: Vec<Content>,
}

/// One layer of a stack.
#[derive(Clone, Debug, PartialEq)]
pub struct Layer {
    /// The user's name or `layer 3`; copies of a repeat add their number, as in `well [2]`.
    pub label: String,
    /// Index of the file's layer entry, which all copies of a repeat share.
    pub entry: usize,
    pub width_nm: f64,
    /// Donors per volume, in cm⁻³; those per area come on top.
    pub donors_cm3: f64,
    /// Acceptors per volume, in cm⁻³; those per area come on top.
    pub acceptors_cm3: f64,
    /// Donors per area that are spread over the width, in cm⁻².
    pub sheet_donors_cm2: f64,
    /// Acceptors per area that are spread over the width, in cm⁻².
    pub sheet_acceptors_cm2: f64,
}

/// 1 cm⁻² over 1 nm in cm⁻³.
const PER_NM_IN_CM: f64 = 1e7;

impl Layer {
    /// All donors per volume, in cm⁻³.
    pub fn all_donors_cm3(&self) -> f64 {
        self.donors_cm3 + PER_NM_IN_CM * self.sheet_donors_cm2 / self.width_nm
    }

    /// All acceptors per volume, in cm⁻³.
    pub fn all_acceptors_cm3(&self) -> f64 {
        self.acceptors_cm3 + PER_NM_IN_CM * self.sheet_acceptors_cm2 / self.width_nm
    }
}

/// A plane of dopants.
#[derive(Clone, Debug, PartialEq)]
pub struct Plane {
    /// The user's name or `plane 2`; copies of a repeat add their number.
    pub label: String,
    /// The layer in which it lies, and at which part of its width, from 0 at the bottom: at a face but in a graded
    /// interface.
    pub layer: usize,
    pub fraction: f64,
    pub donors_cm2: f64,
    pub acceptors_cm2: f64,
}

/// What a layer entry consists of, resolved.
#[derive(Clone, Debug)]
pub(super) struct Content {
    pub lower: Face,
    /// The upper face of a graded layer.
    pub upper: Option<Face>,
    pub law: Law,
    pub profile: Profile,
    pub monolayer_nm: Option<f64>,
    /// Whether this is the mixed crystal of an interface, whose parameters themselves go straight from face to face.
    pub interface: bool,
}

/// The material at one face of a layer.
#[derive(Clone, Debug)]
pub(super) struct Face {
    /// An alloy with all its fractions, or a material of the file.
    pub substance: Substance,
    /// Without strain.
    pub free: Material,
    /// With the edges moved by the strain.
    pub strained: Material,
}

impl Stack {
    pub fn temperature_k(&self) -> f64 {
        self.temperature_k
    }

    /// The in-plane lattice constant that all layers take over, in nm, if there is a substrate.
    pub fn substrate_lattice_nm(&self) -> Option<f64> {
        self.substrate_nm
    }

    pub fn total_width_nm(&self) -> f64 {
        self.layers.iter().map(|layer| layer.width_nm).sum()
    }

    /// All donors and all acceptors per area, in cm⁻².
    pub fn sheet_doping_cm2(&self) -> [f64; 2] {
        let layers = self.layers.iter().map(|layer| {
            let width_cm = layer.width_nm / PER_NM_IN_CM;
            [
                layer.donors_cm3 * width_cm + layer.sheet_donors_cm2,
                layer.acceptors_cm3 * width_cm + layer.sheet_acceptors_cm2,
            ]
        });
        let planes = self.planes.iter();
        let planes = planes.map(|plane| [plane.donors_cm2, plane.acceptors_cm2]);
        layers
            .chain(planes)
            .fold([0.0; 2], |sum, own| [sum[0] + own[0], sum[1] + own[1]])
    }

    /// The heights of all faces in nm, from 0 at the bottom: one more than there are layers.
    pub fn faces_nm(&self) -> Vec<f64> {
        let mut faces = Vec::with_capacity(self.layers.len() + 1);
        let mut height = 0.0;
        faces.push(height);
        for layer in &self.layers {
            height += layer.width_nm;
            faces.push(height);
        }
        faces
    }

    /// The layer at a height above the bottom, in nm, with the fraction of its width that lies below. An interface belongs
    /// to the layer above it. `None` outside of the stack.
    pub fn layer_at(&self, z_nm: f64) -> Option<(usize, f64)> {
        let faces = self.faces_nm();
        let above = faces.partition_point(|face| *face <= z_nm);
        let layer = above.checked_sub(1)?.min(self.layers.len().checked_sub(1)?);
        let t = (z_nm - faces[layer]) / self.layers[layer].width_nm;
        (t <= 1.0 + 1e-9).then_some((layer, t.clamp(0.0, 1.0)))
    }

    /// Whether the layer has one material throughout.
    pub fn is_uniform(&self, layer: usize) -> bool {
        self.content_of(layer)
            .is_none_or(|content| content.upper.is_none())
    }

    /// The material of a layer at a height in it (`t` from 0 at its lower to 1 at its upper face), with the edges moved
    /// by the strain.
    ///
    /// # Panics
    /// When there is no such layer.
    pub fn material_at(&self, layer: usize, t: f64) -> Material {
        let content = &self.contents[self.layers[layer].entry];
        let lower = &content.lower;
        let Some(upper) = &content.upper else {
            return lower.strained.clone();
        };
        let share = content.law.share(t);
        if content.interface {
            return grade::blend(&lower.strained, &upper.strained, share);
        }
        self.strain(self.free_material_at(layer, t))
    }

    /// As [`material_at`](Self::material_at), as it would be without strain.
    ///
    /// # Panics
    /// When there is no such layer.
    pub fn free_material_at(&self, layer: usize, t: f64) -> Material {
        let content = &self.contents[self.layers[layer].entry];
        let lower = &content.lower;
        let Some(upper) = &content.upper else {
            return lower.free.clone();
        };
        let share = content.law.share(t);
        match (&lower.substance, &upper.substance) {
            // That these can be mixed and resolved was found out when the stack was laid out.
            (Substance::Alloy(from), Substance::Alloy(to)) if !content.interface => from
                .towards(to, share)
                .and_then(|alloy| self.library.resolve(&alloy, self.temperature_k))
                .unwrap_or_else(|_| grade::blend(&lower.free, &upper.free, share)),
            _ => grade::blend(&lower.free, &upper.free, share),
        }
    }

    /// The composition of a layer at a height in it (`t` from 0 to 1), that which a material of the file is `like`
    /// included; `None` when a face has none or there is no such layer.
    pub fn composition_at(&self, layer: usize, t: f64) -> Option<Composition> {
        let content = self.content_of(layer)?;
        let lower = self.library.composition(&content.lower.substance)?;
        match &content.upper {
            None => Some(lower),
            Some(upper) => {
                let upper = self.library.composition(&upper.substance)?;
                lower.towards(&upper, content.law.share(t)).ok()
            }
        }
    }

    /// As [`material_at`](Self::material_at), with the derivative of every parameter with respect to the fraction of an
    /// element in the layer's lower material (`material` in the file), whose host compensates.
    ///
    /// # Errors
    /// When that material is no alloy, or holds no such element or nothing beside it.
    ///
    /// # Panics
    /// When there is no such layer.
    pub fn material_slope_at(
        &self,
        layer: usize,
        t: f64,
        element: Element,
    ) -> Result<Material<Dual>, MaterialError> {
        Ok(self.strain(self.free_material_slope_at(layer, t, element)?))
    }

    /// As [`material_slope_at`](Self::material_slope_at), as it would be without strain.
    ///
    /// # Errors
    /// As [`material_slope_at`](Self::material_slope_at).
    ///
    /// # Panics
    /// When there is no such layer.
    pub fn free_material_slope_at(
        &self,
        layer: usize,
        t: f64,
        element: Element,
    ) -> Result<Material<Dual>, MaterialError> {
        let content = &self.contents[self.layers[layer].entry];
        let from = self.composition_of(content)?;
        let Some(upper) = &content.upper else {
            return self
                .library
                .resolve(&from.along(element)?, self.temperature_k);
        };
        let share = content.law.share(t);
        let mixed = match &upper.substance {
            Substance::Alloy(to) => {
                let host = from.host(element)?;
                let alloy = from.towards(to, share)?;
                let whole = grade::along(&self.library, &alloy, self.temperature_k, element, host)?;
                grade::combine(&whole, &whole, |a, _| Dual {
                    value: a.value,
                    slope: (1.0 - share) * a.slope,
                })
            }
            _ => {
                let below = self
                    .library
                    .resolve(&from.along(element)?, self.temperature_k)?;
                grade::blend(&below, &grade::constant(&upper.free), share)
            }
        };
        Ok(mixed)
    }

    /// The materials of a layer at a height in it moved by `steps` along the slope of
    /// [`material_slope_at`](Self::material_slope_at): every parameter its value plus that many times its slope.
    ///
    /// # Errors
    /// As [`material_slope_at`](Self::material_slope_at).
    ///
    /// # Panics
    /// When there is no such layer.
    pub fn materials_moved_at(
        &self,
        layer: usize,
        t: f64,
        element: Element,
        steps: &[f64],
    ) -> Result<Vec<Material>, MaterialError> {
        let along = self.material_slope_at(layer, t, element)?;
        let moved = |step: &f64| grade::combine(&along, &along, |a, _| a.value + step * a.slope);
        Ok(steps.iter().map(moved).collect())
    }

    /// The monolayer of a layer in nm, strained when there is a substrate; the mean of both faces when it is graded.
    /// `None` when the material's lattice constant or elastic constants are unknown.
    pub fn monolayer_nm(&self, layer: usize) -> Option<f64> {
        self.content_of(layer)?.monolayer_nm
    }

    /// A length in nm, monolayers counted in those of the layer entry.
    pub fn length_nm(&self, entry: usize, length: &Quantity) -> Option<f64> {
        match length.unit.dimension {
            Dimension::Monolayers => Some(length.number * self.contents.get(entry)?.monolayer_nm?),
            _ => Some(length.value()),
        }
    }

    /// What a layer entry consists of at its lower and, where it is graded, at its upper face.
    pub fn substances(&self, entry: usize) -> Option<(&Substance, Option<&Substance>)> {
        let content = self.contents.get(entry)?;
        let upper = content.upper.as_ref().map(|face| &face.substance);
        Some((&content.lower.substance, upper))
    }

    /// The substrate, if there is one.
    pub fn substrate(&self) -> Option<&Substance> {
        self.substrate.as_ref()
    }

    /// The library with the materials of the structure.
    pub fn library(&self) -> &Library {
        &self.library
    }

    /// The composition of a layer entry's lower material; `None` when it is a material of the file.
    pub fn composition(&self, entry: usize) -> Option<&Composition> {
        match &self.contents.get(entry)?.lower.substance {
            Substance::Alloy(composition) => Some(composition),
            _ => None,
        }
    }

    /// Sets the width of a layer entry and so of all its copies.
    pub fn set_width(&mut self, entry: usize, width_nm: f64) {
        for layer in &mut self.layers {
            if layer.entry == entry {
                layer.width_nm = width_nm;
            }
        }
    }

    /// Sets the fraction of an element in the lower material of a layer entry; its host compensates. Widths stay in nm.
    ///
    /// # Errors
    /// When that material is no alloy, or the element has no partner, or the fraction does not fit.
    pub fn set_fraction(
        &mut self,
        entry: usize,
        element: Element,
        fraction: f64,
    ) -> Result<(), MaterialError> {
        let Some(content) = self.contents.get(entry) else {
            return Ok(());
        };
        let mut composition = self.composition_of(content)?.clone();
        composition.set_fraction(element, fraction)?;
        let lower = self.face(Substance::Alloy(composition))?;
        let changed = self.content(lower, content.upper.clone(), content.profile);
        self.contents[entry] = changed;
        Ok(())
    }

    fn content_of(&self, layer: usize) -> Option<&Content> {
        self.contents.get(self.layers.get(layer)?.entry)
    }

    fn composition_of<'c>(&self, content: &'c Content) -> Result<&'c Composition, MaterialError> {
        match &content.lower.substance {
            Substance::Alloy(composition) => Ok(composition),
            Substance::Named(name) => Err(MaterialError::UnknownMaterial {
                text: name.clone(),
                meant: None,
            }),
            Substance::Family(family) => Err(MaterialError::UnknownMaterial {
                text: family.formula(),
                meant: None,
            }),
        }
    }

    fn strain<T: Number>(&self, free: Material<T>) -> Material<T> {
        match self.substrate_nm {
            Some(lattice) => strained(&free, lattice),
            None => free,
        }
    }

    pub(super) fn face(&self, substance: Substance) -> Result<Face, MaterialError> {
        let free = self.library.material(&substance, self.temperature_k)?;
        let strained = self.strain(free.clone());
        Ok(Face {
            substance,
            free,
            strained,
        })
    }

    pub(super) fn content(&self, lower: Face, upper: Option<Face>, profile: Profile) -> Content {
        let monolayer = |face: &Face| monolayer_nm(&face.free, self.substrate_nm);
        let monolayer_nm = match &upper {
            None => monolayer(&lower),
            Some(upper) => monolayer(&lower)
                .zip(monolayer(upper))
                .map(|(a, b)| 0.5 * (a + b)),
        };
        let law = match &upper {
            None => Law::Linear,
            Some(upper) => Law::of(profile, &lower.strained, &upper.strained),
        };
        Content {
            lower,
            upper,
            law,
            profile,
            monolayer_nm,
            interface: false,
        }
    }
}
