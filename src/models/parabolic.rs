//! One parabolic band.

use super::Unsuitable;
use crate::constants::HBAR2_OVER_2M0;
use crate::materials::{Material, Number};
use crate::numerics::pencil::Coefficient;

/// A = ħ²/2m*, C = the conduction edge (BenDaniel & Duke, Phys. Rev. 152, 683 (1966)).
pub fn coefficient<T: Number>(material: &Material<T>) -> Result<Coefficient<T>, Unsuitable> {
    let missing = |key| Unsuitable::Missing {
        key,
        model: "parabolic",
    };
    let mass = material.electron_mass_m0.ok_or(missing("electron_mass"))?;
    let edge = material
        .conduction_edge_ev
        .ok_or(missing("conduction_edge"))?;
    Ok(Coefficient {
        stiffness: T::constant(HBAR2_OVER_2M0) / mass,
        poles: [None; 2],
        constant: edge,
    })
}
