//! Band models: what a material contributes to the operator H = kz A kz + C, kz = −i d/dz, in the order that keeps it
//! Hermitian when the mass depends on position (BenDaniel & Duke, Phys. Rev. 152, 683 (1966)).
//!
//! A model supplies the coefficients of one layer and knows nothing of meshes.

pub mod eight_band;
mod energy_dependent;
mod hole;
pub mod multiband;
mod parabolic;
pub mod six_band;

pub use hole::Hole;

use crate::materials::{Dual, Element, Material, Number};
use crate::numerics::pencil::{Coefficient, Pole};
use crate::structure::{BandName, ConductionModel, Stack, Structure};

/// A band that is solved on its own.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Band {
    Conduction(ConductionModel),
    Hole(Hole),
}

impl Band {
    /// The bands that a structure asks for, the conduction band first, each with the number of levels to solve.
    ///
    /// The valence levels asked for are those of both hole bands together, so each is solved for as many.
    pub fn of(structure: &Structure) -> Vec<(Band, usize)> {
        let conduction = structure.conduction;
        let mut bands = vec![(Band::Conduction(conduction.model), conduction.states)];
        if let Some(valence) = structure.valence {
            bands.extend([Hole::Heavy, Hole::Light].map(|hole| (Band::Hole(hole), valence.states)));
        }
        bands
    }

    /// What the solver's eigenvalues are multiplied with to give the electron's energy: −1 for holes.
    pub fn sign(self) -> f64 {
        match self {
            Band::Conduction(_) => 1.0,
            Band::Hole(_) => -1.0,
        }
    }

    pub fn name(self) -> BandName {
        match self {
            Band::Conduction(_) => BandName::Conduction,
            Band::Hole(Hole::Heavy) => BandName::HeavyHole,
            Band::Hole(Hole::Light) => BandName::LightHole,
        }
    }
}

/// A and C of one material, with no field.
fn coefficient<T: Number>(
    band: Band,
    material: &Material<T>,
    substrate_lattice_nm: Option<f64>,
) -> Result<Coefficient<T>, Unsuitable> {
    match band {
        Band::Conduction(ConductionModel::Parabolic) => parabolic::coefficient(material),
        Band::Conduction(ConductionModel::EnergyDependent) => {
            energy_dependent::coefficient(material)
        }
        Band::Hole(hole) => hole::coefficient(hole, material, substrate_lattice_nm),
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

/// The operator of one band on one stack.
#[derive(Clone, Debug)]
pub struct BandOperator<'s> {
    stack: &'s Stack,
    band: Band,
    /// The coefficients of the layers at their bottom face, without field.
    bottoms: Vec<Coefficient>,
}

impl<'s> BandOperator<'s> {
    /// Checks that every layer has what the model needs. The error carries the number of the first layer that has not.
    pub fn new(stack: &'s Stack, band: Band) -> Result<Self, (usize, Unsuitable)> {
        let mut bottoms = Vec::with_capacity(stack.layers.len());
        let of = |layer, t| {
            let material = stack.material_at(layer, t);
            coefficient(band, &material, stack.substrate_lattice_nm())
                .map_err(|reason| (layer, reason))
        };
        for layer in 0..stack.layers.len() {
            bottoms.push(of(layer, 0.0)?);
            if !stack.is_uniform(layer) {
                for t in [0.25, 0.5, 0.75, 1.0] {
                    of(layer, t)?;
                }
            }
        }
        Ok(Self {
            stack,
            band,
            bottoms,
        })
    }

    /// The operator of the conduction band.
    pub fn conduction(
        stack: &'s Stack,
        model: ConductionModel,
    ) -> Result<Self, (usize, Unsuitable)> {
        Self::new(stack, Band::Conduction(model))
    }

    pub fn band(&self) -> Band {
        self.band
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
            let material = self.stack.material_at(layer, t);
            coefficient(self.band, &material, self.stack.substrate_lattice_nm())
                .unwrap_or(self.bottoms[layer])
        };
        raised(own, self.band.sign() * self.stack.field_v_per_nm * z_nm)
    }

    /// The band's edge at the bottom face of a layer without the field, in eV.
    pub fn edge_ev(&self, layer: usize) -> f64 {
        self.band.sign() * self.bottoms[layer].constant
    }

    /// ħ²/2m∥ of a hole band at fraction `t` of a layer, in eV nm². `None` for the conduction band, whose mass is the
    /// same in all directions; a hole without a mass in the plane has the one along growth.
    pub fn in_plane_stiffness(&self, layer: usize, t: f64) -> Option<f64> {
        let Band::Hole(hole) = self.band else {
            return None;
        };
        let material = self.stack.material_at(layer, t);
        hole::in_plane_stiffness(hole, &material).or(Some(self.at(layer, t, 0.0).stiffness))
    }

    /// The slopes of A and C with respect to the fraction of an element in the layer's material, the field left out.
    pub fn fraction_slope(&self, layer: usize, t: f64, element: Element) -> Coefficient {
        let slope = |d: Dual| d.slope;
        let material = self.stack.material_slope_at(layer, t, element).ok();
        let substrate_lattice_nm = self.stack.substrate_lattice_nm();
        match material.and_then(|m| coefficient(self.band, &m, substrate_lattice_nm).ok()) {
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

/// The coefficients with the edge raised by `energy_ev`; the gap moves along.
pub fn raised(mut own: Coefficient, energy_ev: f64) -> Coefficient {
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
