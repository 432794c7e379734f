//! An electron mass that depends on the energy above the local band edge, in two published forms.
//!
//! Kane's bands with remote-band parameter F (Kane, J. Phys. Chem. Solids 1, 249 (1957); in this form Vurgaftman,
//! Meyer and Ram-Mohan, J. Appl. Phys. 89, 5815 (2001), eq. 2.15, with the gap replaced by the energy above the valence
//! edge):
//!
//! m₀/m(E, z) = 1 + 2F + (Ep/3) [2/(E − Ev) + 1/(E − Ev + Δ)],  Ev(z) = Ec(z) − Eg.
//!
//! In a layer under coherent strain on (001) the edges are those of the strained light holes and split-off band, each
//! with what it holds of Z in place of 2/3 and 1/3 (see [`growth_coupling`]). F and Ep stay, so that the edge mass becomes
//! that of the strained layer along growth.
//!
//! The two-band form m(E) = m* (1 + (E − Ec)/E′) of most published intersubband designs (Nelson, Miller and Kleinman,
//! Phys. Rev. B 35, 7770 (1987)), when a material states E′.
//!
//! Both are poles of A in E: the light-hole and split-off components of the state, eliminated. Range: the mass is
//! frozen where the energy comes nearer to the valence edge than a tenth of the gap (deep tails in a strong field), and
//! where a negative 1 + 2F would drive it beyond ten times the edge mass.

use super::{InPlane, Unsuitable};
use crate::constants::HBAR2_OVER_2M0;
use crate::materials::{Material, Number, growth_coupling};
use crate::numerics::pencil::{Coefficient, Pole};

/// The energy is followed down to this part of the gap above the valence edge.
const NEAREST_OF_GAP: f64 = 0.1;
/// The mass is followed up to this multiple of the edge mass.
const HEAVIEST_OF_EDGE: f64 = 10.0;

/// A(E) = ħ²/2m(E) and C = the conduction edge.
pub fn coefficient<T: Number>(
    material: &Material<T>,
    substrate_lattice_nm: Option<f64>,
) -> Result<Coefficient<T>, Unsuitable> {
    let missing = |key| Unsuitable::Missing {
        key,
        model: "energy-dependent",
    };
    let edge = material
        .conduction_edge_ev
        .ok_or(missing("conduction_edge"))?;
    let free = T::constant(HBAR2_OVER_2M0);
    if let Some(scale) = material.nonparabolicity_energy_ev {
        let mass = material.electron_mass_m0.ok_or(missing("electron_mass"))?;
        let pole = Pole {
            strength: free / mass * scale,
            position: edge - scale,
            nearest: scale * T::constant(NEAREST_OF_GAP),
            farthest: T::constant(f64::INFINITY),
        };
        return Ok(Coefficient {
            stiffness: T::constant(0.0),
            poles: [Some(pole), None],
            constant: edge,
        });
    }
    let (Some(gap), Some(spin_orbit), Some(kane)) = (
        material.gap_ev,
        material.spin_orbit_ev,
        material.kane_energy_ev,
    ) else {
        return Err(Unsuitable::NoLaw);
    };
    let third = kane / T::constant(3.0);
    let coupled =
        |distance: T| third * T::constant(2.0) / distance + third / (distance + spin_orbit);
    let remote = match material.remote_band_f {
        Some(f) => T::constant(1.0) + f * T::constant(2.0),
        // Without F the law is made to return the stated mass at the edge.
        None => {
            T::constant(1.0) / material.electron_mass_m0.ok_or(missing("electron_mass"))?
                - coupled(gap)
        }
    };
    // What couples now, which without strain is the same.
    let coupling = growth_coupling(material, (gap, spin_orbit), substrate_lattice_nm);
    let (gap, split) = (coupling.light_gap_ev, coupling.split_ev);
    let light_part = third * coupling.light_thirds;
    let split_off_part = third * coupling.split_off_thirds;
    let inverse_mass = (remote + light_part / gap + split_off_part / (gap + split)).value();
    if inverse_mass <= 0.0 || !inverse_mass.is_finite() || gap.value() <= 0.0 {
        return Err(Unsuitable::NegativeMass { inverse_mass });
    }
    let farthest = if remote.value() < inverse_mass / HEAVIEST_OF_EDGE {
        heaviest_distance(
            remote.value() - inverse_mass / HEAVIEST_OF_EDGE,
            [light_part.value(), split_off_part.value()],
            split.value(),
        )
    } else {
        f64::INFINITY
    };
    let nearest = gap * T::constant(NEAREST_OF_GAP);
    let light = Pole {
        strength: free * light_part,
        position: edge - gap,
        nearest,
        farthest: T::constant(farthest),
    };
    let split_off = Pole {
        strength: free * split_off_part,
        position: edge - gap - split,
        nearest: nearest + split,
        farthest: split + T::constant(farthest),
    };
    Ok(Coefficient {
        stiffness: free * remote,
        poles: [Some(light), Some(split_off)],
        constant: edge,
    })
}

/// What makes the mass in the plane, where strain makes it another one than along growth: the heavy holes with half of E_P, the
/// light holes and the split-off band with what they hold of X (see [`growth_coupling`]). `None` without strain, and for a material
/// that states E′.
pub fn in_plane(material: &Material, substrate_lattice_nm: Option<f64>) -> Option<InPlane> {
    if material.nonparabolicity_energy_ev.is_some() {
        return None;
    }
    let (gap, spin_orbit) = (material.gap_ev?, material.spin_orbit_ev?);
    let coupling = growth_coupling(material, (gap, spin_orbit), substrate_lattice_nm);
    if coupling.heavy_gap_ev == coupling.light_gap_ev {
        return None;
    }
    let along = coefficient(material, substrate_lattice_nm).ok()?;
    let [Some(light), Some(split_off)] = along.poles else {
        return None;
    };
    let sixth = HBAR2_OVER_2M0 * material.kane_energy_ev? / 6.0;
    let heavy_ev = along.constant - coupling.heavy_gap_ev;
    // The same range of energies as along growth, and no nearer to the heavy holes than to the light ones.
    let up = light.position - heavy_ev;
    let heavy = Pole {
        strength: 3.0 * sixth,
        position: heavy_ev,
        nearest: (light.nearest + up).max(NEAREST_OF_GAP * coupling.heavy_gap_ev),
        farthest: light.farthest + up,
    };
    let with = |pole: Pole, thirds: f64| Pole {
        strength: sixth * (3.0 - thirds),
        ..pole
    };
    Some(InPlane {
        stiffness: along.stiffness,
        poles: vec![
            heavy,
            with(light, coupling.light_thirds),
            with(split_off, coupling.split_off_thirds),
        ],
    })
}

/// The distance x from the light holes' edge at which a/x + b/(x + Δ) + `lack` = 0, with `lack` negative: the positive root of a
/// quadratic.
fn heaviest_distance(lack: f64, [a, b]: [f64; 2], split: f64) -> f64 {
    let linear = lack * split + a + b;
    (-linear - (linear * linear - 4.0 * lack * a * split).sqrt()) / (2.0 * lack)
}
