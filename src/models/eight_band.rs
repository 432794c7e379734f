//! The conduction band coupled to heavy, light and split-off holes: eight bands.
//!
//! Kane, J. Phys. Chem. Solids 1, 249 (1957); Pidgeon & Brown, Phys. Rev. 146, 575 (1966), in the order of the exact
//! envelopes (Burt, J. Phys.: Condens. Matter 4, 6651 (1992); Foreman, Phys. Rev. B 56, R12748 (1997)). The coupling of
//! S and Z is i(P kz + kz P)/2. Strain after Pikus & Bir moves the edges; its effect on P is left out (Bahder, Phys. Rev.
//! B 41, 11992 (1990) has it).
//!
//! The conduction edge mass and γ₁, γ₂, γ₃ stay as tabulated, while the coupling is reduced until no own term has the
//! wrong sign: with the tabulated E_P the conduction band's own term 1 + 2F would often be negative, or the light hole's
//! positive, and solutions would appear that oscillate without limit inside the gap (White & Sham, Phys. Rev. Lett. 47,
//! 879 (1981); Foreman 1997). That both signs are right makes the operator elliptic (Veprek, Steiger and Witzigmann,
//! Phys. Rev. B 76, 165320 (2007)), and at k∥ = 0 leaves no state in a gap that all layers share.

use super::multiband::{BlockCoefficient, Direction, MultibandUnsuitable, Valence};
use crate::constants::HBAR2_OVER_2M0;
use crate::materials::{Material, Strain};

const MODEL: &str = "eight-band";
/// The conduction band's own term is at least that of a free electron, in ħ²/2m₀.
const LEAST_CONDUCTION: f64 = 1.0;
/// The own term of Z along z, γ₁' + 4γ₂', is at least this.
const LEAST_VALENCE: f64 = 0.25;

/// How the coupling was reduced.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Reduction {
    /// E_P in use.
    pub kane_energy_ev: f64,
    /// The conduction band's own term in ħ²/2m₀: 1, or more where the light hole's own term demands it.
    pub conduction_term: f64,
    /// γ₁' = γ₁ − E_P/3E_g, γ₂' = γ₂ − E_P/6E_g, γ₃' = γ₃ − E_P/6E_g.
    pub luttinger: [f64; 3],
}

/// The largest E_P that keeps the own terms' signs, and what is left of the other parameters:
/// m₀/m = s + E_P (E_g + 2Δ/3)/(E_g (E_g + Δ)) with s the conduction band's own term. The gap is that without strain.
///
/// # Errors
/// When a parameter is missing or does not describe the bands.
pub fn reduction(material: &Material) -> Result<Reduction, MultibandUnsuitable> {
    let missing = |key| MultibandUnsuitable::Missing { key, model: MODEL };
    let [g1, g2, g3] = material.luttinger.ok_or(missing("luttinger"))?;
    let spin_orbit = material.spin_orbit_ev.ok_or(missing("spin_orbit"))?;
    let mass = material.electron_mass_m0.ok_or(missing("electron_mass"))?;
    let gap = material.gap_ev.ok_or(missing("gap"))?;
    if gap <= 0.0 || gap + spin_orbit <= 0.0 {
        return Err(MultibandUnsuitable::NoGap { gap_ev: gap });
    }
    let per_kane = (gap + 2.0 / 3.0 * spin_orbit) / (gap * (gap + spin_orbit));
    let by_conduction = (1.0 / mass - LEAST_CONDUCTION) / per_kane;
    let by_valence = (g1 + 4.0 * g2 - LEAST_VALENCE) * gap;
    if by_conduction <= 0.0 || mass <= 0.0 {
        return Err(MultibandUnsuitable::HeavyElectron { mass_m0: mass });
    }
    if by_valence <= 0.0 || g1 <= 2.0 * g2 {
        return Err(MultibandUnsuitable::NotHoles {
            heavy: g1 - 2.0 * g2,
            light: g1 + 4.0 * g2,
        });
    }
    let kane = by_conduction.min(by_valence);
    let sixth = kane / (6.0 * gap);
    Ok(Reduction {
        kane_energy_ev: kane,
        conduction_term: 1.0 / mass - kane * per_kane,
        luttinger: [g1 - 2.0 * sixth, g2 - sixth, g3 - sixth],
    })
}

/// The coefficients of one part, in the order conduction, heavy, light, split-off: eV, nm.
///
/// # Errors
/// When a parameter is missing or does not describe the bands.
pub fn block(
    material: &Material,
    strain: Option<Strain>,
    direction: Direction,
) -> Result<BlockCoefficient, MultibandUnsuitable> {
    let missing = |key| MultibandUnsuitable::Missing { key, model: MODEL };
    let reduced = reduction(material)?;
    // What the conduction band contributes to N is of the order N₊, and E_P is taken out of it there.
    let valence = Valence::new(material, reduced.luttinger, strain, MODEL)?;
    let mut block = BlockCoefficient::zeros(4);
    valence.add_to(&mut block, 1, direction);
    let [s, x, z] = [0, 1, 3];
    let own = HBAR2_OVER_2M0 * reduced.conduction_term;
    block.a[(s, s)] = own;
    block.c[2][(s, s)] = own;
    block.c[0][(s, s)] = material
        .conduction_edge_ev
        .ok_or(missing("conduction_edge"))?;
    let p = (HBAR2_OVER_2M0 * reduced.kane_energy_ev).sqrt();
    // ⟨S| i P kx |iX⟩, and ⟨S| i (P kz + kz P)/2 |Z⟩ with kz = −i d/dz.
    block.c[1][(s, x)] = -p;
    block.c[1][(x, s)] = -p;
    block.g[0][(z, s)] = 0.5 * p;
    block.g[0][(s, z)] = -0.5 * p;
    Ok(block.into_holes())
}
