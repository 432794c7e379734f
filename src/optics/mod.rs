//! Transitions between subbands of one band: energies, dipoles and strengths for light polarised along growth; and those
//! between the valence and the conduction band, with their exciton.

mod depolarisation;
mod exciton;
mod interband;

pub use depolarisation::{Depolarisation, Line, Shifted, depolarisation};
pub use exciton::{Exciton, Pair, exciton};
pub use interband::{Alignment, Interband, Selection, interband, lowest_exciton};

use crate::constants::{H_EV_PER_THZ, HBAR2_OVER_2M0, HC_EV_UM};
use crate::numerics::pencil::dot;
use crate::numerics::sensitivity::moment;
use crate::subbands::{Subbands, amplitudes, in_plane_mass_m0};

/// A pair of subbands, `from` below `to`, numbered from 0.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Transition {
    pub from: usize,
    pub to: usize,
    pub energy_ev: f64,
    /// |⟨from|z|to⟩|. With an energy-dependent mass the eliminated valence components are part of the states, and of
    /// this element.
    pub dipole_nm: f64,
    /// 2 m₀ E |z|²/ħ², with the free-electron mass.
    pub oscillator_strength: f64,
    /// The same with the lower state's in-plane mass: its sum over all states from one is 1 in a parabolic band of one
    /// mass (Thomas–Reiche–Kuhn).
    pub normalised_strength: f64,
    /// ∫ √(ρ_from ρ_to) dz of the probability densities: 1 for states in the same place, 0 for states apart.
    pub overlap: f64,
}

impl Transition {
    /// Vacuum wavelength in µm.
    pub fn wavelength_um(&self) -> f64 {
        HC_EV_UM / self.energy_ev
    }

    /// Frequency in THz.
    pub fn frequency_thz(&self) -> f64 {
        self.energy_ev / H_EV_PER_THZ
    }
}

/// All pairs of the solved subbands, ordered by lower state, then by upper state.
pub fn transitions(subbands: &Subbands) -> Vec<Transition> {
    let pairs = &subbands.pairs;
    let masses_m0: Vec<f64> = (0..pairs.len())
        .map(|index| in_plane_mass_m0(subbands, index))
        .collect();
    let amplitudes = amplitudes(subbands);
    let mut list = Vec::new();
    for from in 0..pairs.len() {
        for to in from + 1..pairs.len() {
            let energy_ev = pairs[to].value - pairs[from].value;
            let dipole_nm = moment(&subbands.pencil, &pairs[from], &pairs[to]).abs();
            let oscillator_strength = energy_ev * dipole_nm * dipole_nm / HBAR2_OVER_2M0;
            list.push(Transition {
                from,
                to,
                energy_ev,
                dipole_nm,
                oscillator_strength,
                normalised_strength: oscillator_strength * masses_m0[from],
                overlap: dot(&amplitudes[from], &amplitudes[to]),
            });
        }
    }
    list
}
