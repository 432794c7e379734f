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
use crate::structure::{BandName, ConductionModel, Level, Stack, Structure, ValenceModel};
use multiband::{Direction, MultibandModel, MultibandOperator, MultibandUnsuitable};

/// A band that is solved, on its own or coupled to others.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Band {
    /// Electrons; with the eight-band model coupled to the holes.
    Conduction(ConductionModel),
    /// Heavy or light holes on their own.
    Hole(Hole),
    /// All holes, coupled to one another or to the electrons too.
    Valence(MultibandModel),
}

impl Band {
    /// The bands that a structure asks for, the conduction band first, each with the number of levels to solve.
    ///
    /// The valence levels asked for are those of all holes together, so hole bands on their own are each solved for as
    /// many.
    pub fn of(structure: &Structure) -> Vec<(Band, usize)> {
        let conduction = structure.conduction;
        let mut bands = vec![(Band::Conduction(conduction.model), conduction.states)];
        if let Some(valence) = structure.valence {
            let holes: &[Band] = match valence.model {
                ValenceModel::Decoupled => &[Band::Hole(Hole::Heavy), Band::Hole(Hole::Light)],
                ValenceModel::SixBand => &[Band::Valence(MultibandModel::SixBand)],
                ValenceModel::EightBand => &[Band::Valence(MultibandModel::EightBand)],
            };
            bands.extend(holes.iter().map(|&hole| (hole, valence.states)));
        }
        bands
    }

    /// The bands of [`Band::of`] that are solved on their own.
    pub fn alone(structure: &Structure) -> Vec<(Band, usize)> {
        let mut bands = Self::of(structure);
        bands.retain(|(band, _)| band.coupled().is_none());
        bands
    }

    /// All bands that a structure asks for, with as many levels as it takes to hold the named ones too.
    pub fn holding(structure: &Structure, named: &[Level]) -> Vec<(Band, usize)> {
        let asked = Self::of(structure).into_iter();
        asked
            .map(|(band, count)| (band, count.max(band.highest(named))))
            .collect()
    }

    /// The highest number that names a level of the band, one of all holes included; 0 without one.
    pub fn highest(self, named: &[Level]) -> usize {
        let own = named.iter().filter(|level| {
            level.band == self.name() || (level.band == BandName::Valence && self.sign() < 0.0)
        });
        own.map(|level| level.index).max().unwrap_or(0)
    }

    /// The model of coupled bands that this one is part of.
    pub fn coupled(self) -> Option<MultibandModel> {
        match self {
            Band::Conduction(ConductionModel::EightBand) => Some(MultibandModel::EightBand),
            Band::Valence(model) => Some(model),
            Band::Conduction(_) | Band::Hole(_) => None,
        }
    }

    /// Checks that every layer has what the band's model needs. The error carries the number of the first layer that has
    /// not.
    ///
    /// # Errors
    /// Why the material of a layer does not suit the model.
    pub fn check(self, stack: &Stack) -> Result<(), (usize, Unsuitable)> {
        match self.coupled() {
            None => BandOperator::new(stack, self).map(|_| ()),
            Some(model) => MultibandOperator::new(stack, model, Direction::ALONG_100)
                .map(|_| ())
                .map_err(|(layer, reason)| (layer, reason.into())),
        }
    }

    /// What the energy away from the gap is multiplied with to give the electron's: −1 for holes.
    pub fn sign(self) -> f64 {
        match self {
            Band::Conduction(_) => 1.0,
            Band::Hole(_) | Band::Valence(_) => -1.0,
        }
    }

    pub fn name(self) -> BandName {
        match self {
            Band::Conduction(_) => BandName::Conduction,
            Band::Hole(Hole::Heavy) => BandName::HeavyHole,
            Band::Hole(Hole::Light) => BandName::LightHole,
            Band::Valence(_) => BandName::Valence,
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
            energy_dependent::coefficient(material, substrate_lattice_nm)
        }
        Band::Hole(hole) => hole::coefficient(hole, material, substrate_lattice_nm),
        Band::Conduction(ConductionModel::EightBand) | Band::Valence(_) => Err(Unsuitable::Coupled),
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
        "has a mass at the band edge that is not positive: 1 + 2F and the coupling to its valence edges make m0/m = {inverse_mass:.3}"
    )]
    NegativeMass { inverse_mass: f64 },
    #[error("is to be solved with coupled bands, which are no bands on their own")]
    Coupled,
    #[error(transparent)]
    Multiband(#[from] MultibandUnsuitable),
}

/// ħ²/2m in the plane at one place, in eV nm²: a constant and poles in the energy.
#[derive(Clone, Debug)]
pub struct InPlane {
    pub stiffness: f64,
    pub poles: Vec<Pole>,
}

impl InPlane {
    pub fn at(&self, energy_ev: f64) -> f64 {
        let poles = self.poles.iter();
        let poles = poles.map(|pole| pole.strength / pole.distance(energy_ev).0);
        self.stiffness + poles.sum::<f64>()
    }

    /// The same with all edges raised.
    pub fn raised(mut self, energy_ev: f64) -> InPlane {
        for pole in &mut self.poles {
            pole.position += energy_ev;
        }
        self
    }
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

    /// A and C at fraction `t` of a layer, `z_nm` above the bottom of the stack, with the energy of field and charge:
    /// eV nm² and eV.
    pub fn at(&self, layer: usize, t: f64, z_nm: f64) -> Coefficient {
        let own = self.flat(layer, t);
        let charge_ev = self
            .stack
            .potential
            .as_ref()
            .map_or(0.0, |potential| match self.band {
                Band::Conduction(_) => potential.electron_ev(layer, t),
                Band::Hole(_) | Band::Valence(_) => potential.hole_ev(layer, t),
            });
        let energy_ev = self.stack.field_v_per_nm * z_nm + charge_ev;
        raised(own, self.band.sign() * energy_ev)
    }

    /// A and C at fraction `t` of a layer without field and charge.
    pub fn flat(&self, layer: usize, t: f64) -> Coefficient {
        if self.stack.is_uniform(layer) || t <= 0.0 {
            return self.bottoms[layer];
        }
        // A grade runs between materials that were checked; should a point in between fail, the face stands in.
        let material = self.stack.material_at(layer, t);
        coefficient(self.band, &material, self.stack.substrate_lattice_nm())
            .unwrap_or(self.bottoms[layer])
    }

    /// The band's edge at the bottom face of a layer without the field, in eV.
    pub fn edge_ev(&self, layer: usize) -> f64 {
        self.band.sign() * self.bottoms[layer].constant
    }

    /// ħ²/2m∥ at fraction `t` of a layer, with no field, where it is not A: of hole bands, and of electrons in strained layers
    /// whose mass depends on energy.
    pub fn in_plane(&self, layer: usize, t: f64) -> Option<InPlane> {
        if self.band == Band::Conduction(ConductionModel::Parabolic) {
            return None;
        }
        let material = self.stack.material_at(layer, t);
        let substrate_lattice_nm = self.stack.substrate_lattice_nm();
        match self.band {
            Band::Conduction(_) => energy_dependent::in_plane(&material, substrate_lattice_nm),
            Band::Hole(hole) => Some(InPlane {
                stiffness: hole::in_plane_stiffness(hole, &material, substrate_lattice_nm)?,
                poles: Vec::new(),
            }),
            Band::Valence(_) => None,
        }
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
        ConductionModel::EightBand => "eight-band",
    }
}

/// The valence model's name in files and reports.
pub fn valence_model_name(model: ValenceModel) -> &'static str {
    match model {
        ValenceModel::Decoupled => "decoupled",
        ValenceModel::SixBand => "six-band",
        ValenceModel::EightBand => "eight-band",
    }
}
