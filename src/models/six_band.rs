//! Heavy, light and split-off holes coupled: six bands.
//!
//! Luttinger & Kohn, Phys. Rev. 97, 869 (1955), in the basis X, Y, Z of Dresselhaus, Kip and Kittel, Phys. Rev. 98, 368
//! (1955), with L = −(γ₁ + 4γ₂), M = −(γ₁ − 2γ₂), N = −6γ₃ in ħ²/2m₀. The order of N and kz is that of the exact
//! envelopes (Burt, J. Phys.: Condens. Matter 4, 6651 (1992); Foreman, Phys. Rev. B 48, 4964 (1993) and 56, R12748
//! (1997)): N₋, what remote bands of Γ₁₅ symmetry contribute, is M without the free electron's own term, those of Γ₂₅
//! symmetry left out; N₊ is the rest. Spin–orbit splitting Δ at k = 0 only; strain after Pikus & Bir (1959), of which
//! biaxial strain on (001) needs a_v (in the edge of the material at hand) and b.

use super::multiband::{BlockCoefficient, Direction, MultibandUnsuitable, Valence};
use crate::materials::{Material, Strain};

const MODEL: &str = "six-band";

/// The coefficients of one part, in the order heavy, light, split-off: eV, nm.
///
/// # Errors
/// When a parameter is missing or γ₁ − 2γ₂ or γ₁ + 4γ₂ is not positive.
pub fn block(
    material: &Material,
    strain: Option<Strain>,
    direction: Direction,
) -> Result<BlockCoefficient, MultibandUnsuitable> {
    let missing = |key| MultibandUnsuitable::Missing { key, model: MODEL };
    let [g1, g2, g3] = material.luttinger.ok_or(missing("luttinger"))?;
    let (l, m) = (-(g1 + 4.0 * g2), -(g1 - 2.0 * g2));
    if l >= 0.0 || m >= 0.0 {
        return Err(MultibandUnsuitable::NotHoles {
            heavy: -m,
            light: -l,
        });
    }
    let valence = Valence::new(material, [g1, g2, g3], strain, MODEL)?;
    let mut block = BlockCoefficient::zeros(3);
    valence.add_to(&mut block, 0, direction);
    Ok(block.into_holes())
}
