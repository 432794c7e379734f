//! Transitions between subbands of one band: energies, dipoles and strengths for light polarised along growth; and those
//! between the valence and the conduction band, with their exciton and the photoluminescence.

mod depolarisation;
mod exciton;
mod interband;
mod photoluminescence;

pub use depolarisation::{Depolarisation, Line, Shifted, depolarisation};
pub use exciton::{Exciton, Pair, exciton};
pub use interband::{Alignment, Interband, NoExciton, Selection, interband, lowest_exciton};
pub use photoluminescence::{Photoluminescence, photoluminescence};

use crate::constants::{H_EV_PER_THZ, HBAR2_OVER_2M0, HC_EV_UM};
use crate::numerics::pencil::dot;
use crate::numerics::sensitivity::moment;
use crate::subbands::{Bands, Subbands, amplitudes, in_plane_mass_m0};

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
    let states: Vec<(f64, f64)> = (0..pairs.len())
        .map(|index| (pairs[index].value, in_plane_mass_m0(subbands, index)))
        .collect();
    let dipole_nm = |i: usize, j: usize| moment(&subbands.pencil, &pairs[i], &pairs[j]).abs();
    of_states(&states, &amplitudes(subbands), dipole_nm)
}

/// As [`transitions`], of one of the solved bands. Of coupled holes `from` is the deeper one, and the lower state of a
/// hole, whose mass normalises, is the other.
pub fn band_transitions(bands: &Bands, band: usize) -> Vec<Transition> {
    let states = bands.states(band);
    let sign = bands.band(band).sign();
    let states: Vec<(f64, f64)> = states
        .iter()
        .map(|state| (sign * state.energy_ev, state.in_plane_mass_m0))
        .collect();
    let dipole_nm = |i: usize, j: usize| bands.dipole_nm(band, i, j);
    let mut list = of_states(&states, &bands.amplitudes(band), dipole_nm);
    if sign < 0.0 {
        for transition in &mut list {
            std::mem::swap(&mut transition.from, &mut transition.to);
        }
    }
    list
}

/// Pairs of states with these energies away from the gap and in-plane masses.
fn of_states(
    states: &[(f64, f64)],
    amplitudes: &[Vec<f64>],
    dipole_nm: impl Fn(usize, usize) -> f64,
) -> Vec<Transition> {
    let mut list = Vec::new();
    for (from, (lower_ev, mass_m0)) in states.iter().enumerate() {
        for (to, (upper_ev, _)) in states.iter().enumerate().skip(from + 1) {
            let energy_ev = upper_ev - lower_ev;
            let dipole_nm = dipole_nm(from, to);
            let oscillator_strength = energy_ev * dipole_nm * dipole_nm / HBAR2_OVER_2M0;
            list.push(Transition {
                from,
                to,
                energy_ev,
                dipole_nm,
                oscillator_strength,
                normalised_strength: oscillator_strength * mass_m0,
                overlap: dot(&amplitudes[from], &amplitudes[to]),
            });
        }
    }
    list
}
