//! Band models: what a material contributes to the operator H = kz A kz + C, kz = −i d/dz, in the order that keeps it
//! Hermitian when the mass depends on position (BenDaniel & Duke, Phys. Rev. 152, 683 (1966)).
//!
//! A model supplies the coefficients of one layer and knows nothing of meshes.

pub mod eight_band;
mod energy_dependent;
pub mod multiband;
mod parabolic;
pub mod six_band;

use crate::materials::{Dual, Element, Material, Number};
use crate::numerics::pencil::{Coefficient, Pole};
use crate::structure::{ConductionModel, Stack};

/// A and C of one material, with no field.
fn coefficient<T: Number>(
    model: ConductionModel,
    material: &Material<T>,
) -> Result<Coefficient<T>, Unsuitable> {
    match model {
        ConductionModel::Parabolic => parabolic::coefficient(material),
        ConductionModel::EnergyDependent => energy_dependent::coefficient(material),
    }
}

/// Why a material cannot be used with a model.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum Unsuitable {
    #[error("has no `{key}`, which the {model} model needs")]
    Missing {
        key: &'static str,
        model: &'static str,
    },
    #[error(
        "has no `gap` with `spin_orbit` and `kane_energy`, nor a `nonparabolicity_energy`, which the energy-dependent model needs"
    )]
    NoLaw,
    #[error(
        "has a mass at the band edge that is not positive: 1 + 2F + (Ep/3)(2/Eg + 1/(Eg + Δ)) = {inverse_mass:.3}"
    )]
    NegativeMass { inverse_mass: f64 },
}

/// The operator of the conduction band on one stack.
#[derive(Clone, Debug)]
pub struct ConductionOperator<'s> {
    stack: &'s Stack,
    model: ConductionModel,
    /// The coefficients of the layers at their bottom face, without field.
    bottoms: Vec<Coefficient>,
}

impl<'s> ConductionOperator<'s> {
    /// Checks that every layer has what the model needs. The error carries the number of the first layer that has not.
    pub fn new(stack: &'s Stack, model: ConductionModel) -> Result<Self, (usize, Unsuitable)> {
        let mut bottoms = Vec::with_capacity(stack.layers.len());
        for layer in 0..stack.layers.len() {
            bottoms.push(
                coefficient(model, &stack.material_at(layer, 0.0))
                    .map_err(|reason| (layer, reason))?,
            );
            if !stack.is_uniform(layer) {
                for t in [0.25, 0.5, 0.75, 1.0] {
                    coefficient(model, &stack.material_at(layer, t))
                        .map_err(|reason| (layer, reason))?;
                }
            }
        }
        Ok(Self {
            stack,
            model,
            bottoms,
        })
    }

    pub fn stack(&self) -> &'s Stack {
        self.stack
    }

    /// A and C at fraction `t` of a layer, `z_nm` above the bottom of the stack: eV nm² and eV.
    pub fn at(&self, layer: usize, t: f64, z_nm: f64) -> Coefficient {
        let own = if self.stack.is_uniform(layer) || t <= 0.0 {
            self.bottoms[layer]
        } else {
            // A grade runs between materials that were checked; should a point in between fail, the face stands in.
            coefficient(self.model, &self.stack.material_at(layer, t))
                .unwrap_or(self.bottoms[layer])
        };
        raised(own, self.stack.field_v_per_nm * z_nm)
    }

    /// The slopes of A and C with respect to the fraction of an element in the layer's material, the field left out.
    pub fn fraction_slope(&self, layer: usize, t: f64, element: Element) -> Coefficient {
        let slope = |d: Dual| d.slope;
        let material = self.stack.material_slope_at(layer, t, element).ok();
        match material.and_then(|material| coefficient(self.model, &material).ok()) {
            Some(c) => Coefficient {
                stiffness: slope(c.stiffness),
                poles: c.poles.map(|pole| {
                    pole.map(|p| Pole {
                        strength: slope(p.strength),
                        position: slope(p.position),
                        nearest: slope(p.nearest),
                        farthest: slope(p.farthest),
                    })
                }),
                constant: slope(c.constant),
            },
            // A layer without that element, which the structure file check refuses.
            None => unchanging(&self.bottoms[layer]),
        }
    }
}

/// The coefficients with the electron's potential energy raised by `energy_ev`; the gap moves along.
fn raised(mut own: Coefficient, energy_ev: f64) -> Coefficient {
    own.constant += energy_ev;
    for pole in own.poles.iter_mut().flatten() {
        pole.position += energy_ev;
    }
    own
}

/// Slopes of a coefficient that only moves up as a whole, by `per_unit`.
pub fn raising(at: &Coefficient, per_unit: f64) -> Coefficient {
    let mut slope = unchanging(at);
    slope.constant = per_unit;
    for pole in slope.poles.iter_mut().flatten() {
        pole.position = per_unit;
    }
    slope
}

/// Slopes that are all zero, with poles where `at` has them.
pub fn unchanging(at: &Coefficient) -> Coefficient {
    let still = Pole {
        strength: 0.0,
        position: 0.0,
        nearest: 0.0,
        farthest: 0.0,
    };
    Coefficient {
        stiffness: 0.0,
        poles: at.poles.map(|pole| pole.map(|_| still)),
        constant: 0.0,
    }
}

/// The model's name in files and reports.
pub fn model_name(model: ConductionModel) -> &'static str {
    match model {
        ConductionModel::Parabolic => "parabolic",
        ConductionModel::EnergyDependent => "energy-dependent",
    }
}
