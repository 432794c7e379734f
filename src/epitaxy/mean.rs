//! A layer as the elastic problem sees it: what enters strain balance and critical thickness, graded layers averaged.

use crate::materials::{Dual, Element, Material, Number, strain};
use crate::structure::Stack;

/// Means over the width of one layer.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LayerMean<T = f64> {
    /// Lattice constant without strain, in nm.
    pub lattice_nm: T,
    /// (a − a_substrate)/a_substrate; positive when the layer is compressed.
    pub misfit: T,
    /// ν = c₁₂/(c₁₁ + c₁₂), Poisson's ratio along ⟨100⟩.
    pub poisson: T,
    /// Lattice constant along the growth direction in the strained layer, in nm.
    pub perpendicular_nm: T,
    /// A/a in GPa/nm, with the stiffness A = c₁₁ + c₁₂ − 2c₁₂²/c₁₁ of a layer that is strained alike along both in-plane
    /// axes and free along the third.
    pub stiffness: T,
    /// ε∥ A/a in GPa/nm.
    pub tension: T,
}

/// The heights at which a graded layer is looked at, and their weights: Simpson's rule.
const SIMPSON: [(f64, f64); 3] = [(0.0, 1.0 / 6.0), (0.5, 4.0 / 6.0), (1.0, 1.0 / 6.0)];
const MIDDLE: [(f64, f64); 1] = [(0.5, 1.0)];

/// The means of a layer; `None` without a substrate, or when a lattice or elastic constant is unknown.
pub fn layer_mean(stack: &Stack, layer: usize) -> Option<LayerMean> {
    mean(stack, layer, |t| Some(stack.free_material_at(layer, t)))
}

/// As [`layer_mean`], with derivatives with respect to the fraction of an element in the layer's lower material.
pub(super) fn layer_mean_slope(
    stack: &Stack,
    layer: usize,
    element: Element,
) -> Option<LayerMean<Dual>> {
    mean(stack, layer, |t| {
        stack.free_material_slope_at(layer, t, element).ok()
    })
}

fn mean<T: Number>(
    stack: &Stack,
    layer: usize,
    material: impl Fn(f64) -> Option<Material<T>>,
) -> Option<LayerMean<T>> {
    let substrate_nm = stack.substrate_lattice_nm()?;
    let points: &[(f64, f64)] = if stack.is_uniform(layer) {
        &MIDDLE
    } else {
        &SIMPSON
    };
    let mut sum: Option<LayerMean<T>> = None;
    for &(t, weight) in points {
        let here = at(&material(t)?, substrate_nm)?.map(|v| v * T::constant(weight));
        sum = Some(match sum {
            None => here,
            Some(sum) => sum.plus(here),
        });
    }
    sum
}

fn at<T: Number>(material: &Material<T>, substrate_nm: f64) -> Option<LayerMean<T>> {
    let [one, two] = [1.0, 2.0].map(T::constant);
    let (a, c11, c12) = (
        material.lattice_constant_nm?,
        material.c11_gpa?,
        material.c12_gpa?,
    );
    let strain = strain(material, substrate_nm)?;
    let stiffness = (c11 + c12 - two * c12 * c12 / c11) / a;
    let substrate = T::constant(substrate_nm);
    Some(LayerMean {
        lattice_nm: a,
        misfit: (a - substrate) / substrate,
        poisson: c12 / (c11 + c12),
        perpendicular_nm: a * (one + strain.growth),
        stiffness,
        tension: stiffness * strain.in_plane,
    })
}

impl<T: Number> LayerMean<T> {
    pub(super) fn map<U: Number>(self, convert: impl Fn(T) -> U) -> LayerMean<U> {
        LayerMean {
            lattice_nm: convert(self.lattice_nm),
            misfit: convert(self.misfit),
            poisson: convert(self.poisson),
            perpendicular_nm: convert(self.perpendicular_nm),
            stiffness: convert(self.stiffness),
            tension: convert(self.tension),
        }
    }

    pub(super) fn plus(self, other: Self) -> Self {
        LayerMean {
            lattice_nm: self.lattice_nm + other.lattice_nm,
            misfit: self.misfit + other.misfit,
            poisson: self.poisson + other.poisson,
            perpendicular_nm: self.perpendicular_nm + other.perpendicular_nm,
            stiffness: self.stiffness + other.stiffness,
            tension: self.tension + other.tension,
        }
    }
}
