//! The keys of a material: name, unit, number of values and the range in which a value makes sense.

use super::error::MaterialError;
use crate::diagnostics::probably_meant;
use crate::units::Dimension;

/// A parameter of a material; the position in [`KEYS`] of the key with the same name.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Parameter {
    LatticeConstant,
    Gap,
    GapX,
    GapL,
    SpinOrbit,
    ElectronMass,
    ElectronMassX,
    ElectronMassL,
    DensityOfStatesMassX,
    DensityOfStatesMassL,
    Luttinger,
    HeavyHoleMass,
    LightHoleMass,
    SplitOffMass,
    KaneEnergy,
    RemoteBandF,
    ValenceEdge,
    ConductionEdge,
    HydrostaticConduction,
    HydrostaticValence,
    ShearB,
    ShearD,
    Elastic,
    PermittivityStatic,
    PermittivityOptical,
    LoPhonon,
    NonparabolicityEnergy,
    Density,
}

/// A key of a material in a structure file or in a file of the library.
#[derive(Debug, PartialEq)]
pub struct Key {
    pub name: &'static str,
    pub parameter: Parameter,
    /// The dimension of its unit; `None` for a pure number (masses are in units of the free-electron mass).
    pub dimension: Option<Dimension>,
    /// How many numbers the key takes: 1, or 2 for (longitudinal, transverse), or 3 for (γ₁, γ₂, γ₃) and (c₁₁, c₁₂, c₄₄).
    pub components: usize,
    /// Lowest and highest value that is accepted, in the inner unit. Wide: meant for slips of unit or sign, not for physics.
    pub range: (f64, f64),
}

const fn key(
    name: &'static str,
    parameter: Parameter,
    dimension: Option<Dimension>,
    components: usize,
    range: (f64, f64),
) -> Key {
    Key {
        name,
        parameter,
        dimension,
        components,
        range,
    }
}

const ENERGY: Option<Dimension> = Some(Dimension::Energy);
const MASS: (f64, f64) = (1e-4, 100.0);

/// How many parameters there are.
pub(super) const COUNT: usize = 28;

/// Every key, in the order in which tables show them.
#[rustfmt::skip]
pub static KEYS: [Key; COUNT] = [
    key("lattice_constant", Parameter::LatticeConstant, Some(Dimension::Length), 1, (0.3, 1.0)),
    key("gap", Parameter::Gap, ENERGY, 1, (0.0, 10.0)),
    key("gap_x", Parameter::GapX, ENERGY, 1, (0.0, 10.0)),
    key("gap_l", Parameter::GapL, ENERGY, 1, (0.0, 10.0)),
    key("spin_orbit", Parameter::SpinOrbit, ENERGY, 1, (0.0, 3.0)),
    key("electron_mass", Parameter::ElectronMass, None, 1, MASS),
    key("electron_mass_x", Parameter::ElectronMassX, None, 2, MASS),
    key("electron_mass_l", Parameter::ElectronMassL, None, 2, MASS),
    key("density_of_states_mass_x", Parameter::DensityOfStatesMassX, None, 1, MASS),
    key("density_of_states_mass_l", Parameter::DensityOfStatesMassL, None, 1, MASS),
    key("luttinger", Parameter::Luttinger, None, 3, (-10.0, 200.0)),
    key("heavy_hole_mass", Parameter::HeavyHoleMass, None, 1, MASS),
    key("light_hole_mass", Parameter::LightHoleMass, None, 1, MASS),
    key("split_off_mass", Parameter::SplitOffMass, None, 1, MASS),
    key("kane_energy", Parameter::KaneEnergy, ENERGY, 1, (0.0, 100.0)),
    key("remote_band_f", Parameter::RemoteBandF, None, 1, (-50.0, 50.0)),
    key("valence_edge", Parameter::ValenceEdge, ENERGY, 1, (-20.0, 20.0)),
    key("conduction_edge", Parameter::ConductionEdge, ENERGY, 1, (-20.0, 20.0)),
    key("hydrostatic_conduction", Parameter::HydrostaticConduction, ENERGY, 1, (-50.0, 50.0)),
    key("hydrostatic_valence", Parameter::HydrostaticValence, ENERGY, 1, (-50.0, 50.0)),
    key("shear_b", Parameter::ShearB, ENERGY, 1, (-50.0, 50.0)),
    key("shear_d", Parameter::ShearD, ENERGY, 1, (-50.0, 50.0)),
    key("elastic", Parameter::Elastic, Some(Dimension::Stiffness), 3, (0.1, 1e4)),
    key("permittivity_static", Parameter::PermittivityStatic, None, 1, (1.0, 1e4)),
    key("permittivity_optical", Parameter::PermittivityOptical, None, 1, (1.0, 1e3)),
    key("lo_phonon", Parameter::LoPhonon, ENERGY, 1, (1e-4, 1.0)),
    key("nonparabolicity_energy", Parameter::NonparabolicityEnergy, ENERGY, 1, (1e-3, 100.0)),
    key("density_g_per_cm3", Parameter::Density, None, 1, (0.1, 30.0)),
];

impl Parameter {
    pub fn key(self) -> &'static Key {
        &KEYS[self as usize]
    }
}

impl Key {
    /// The key of a name, or the error that names the key that was probably meant.
    pub fn find(name: &str) -> Result<&'static Key, MaterialError> {
        KEYS.iter().find(|key| key.name == name).ok_or_else(|| {
            let meant = probably_meant(name, KEYS.iter().map(|key| key.name));
            MaterialError::UnknownKey {
                key: name.to_owned(),
                meant,
            }
        })
    }

    /// The symbol of the inner unit, for tables; empty for a pure number.
    pub fn unit(&self) -> &'static str {
        match self.dimension {
            Some(Dimension::Length) => "nm",
            Some(Dimension::Energy) => "eV",
            Some(Dimension::Stiffness) => "GPa",
            _ => "",
        }
    }

    /// Checks the numbers of a value (in the inner unit) and pads them to three.
    pub fn components_of(&self, numbers: &[f64]) -> Result<[f64; 3], MaterialError> {
        if numbers.len() != self.components {
            return Err(MaterialError::WrongCount {
                key: self.name,
                expected: self.components,
                found: numbers.len(),
            });
        }
        let mut padded = [0.0; 3];
        for (place, &number) in padded.iter_mut().zip(numbers) {
            // Written so that a value that is no number fails too.
            if !(number >= self.range.0 && number <= self.range.1) {
                return Err(MaterialError::OutOfRange {
                    key: self.name,
                    number,
                    unit: self.unit(),
                    range: self.range,
                });
            }
            *place = number;
        }
        Ok(padded)
    }
}
