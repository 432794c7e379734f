//! The density of states of minibands that are parabolic in the plane: each phase of the minizone adds the step of a
//! two-dimensional subband, m∥/πħ² with spin, where its energy is passed.
//!
//! The phase at an energy is exact (Bloch's condition solved for the phase), so is the density while the in-plane mass is
//! the same in the whole miniband; else the mass is taken at evenly spread phases.

use super::minibands::{Minibands, SAMPLES};
use crate::constants::{HBAR2_OVER_2M0, NM2_PER_CM2};
use crate::numerics::quasiperiodic::Condensed;
use std::f64::consts::PI;

/// States per area and energy of one period, and per volume.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DensityPoint {
    pub energy_ev: f64,
    /// 1/(eV cm²), one period, both spins.
    pub per_period: f64,
    /// 1/(eV cm³), both spins.
    pub per_volume: f64,
}

/// The density at each of these energies, which lie between the band's edge and the last miniband's far edge.
pub fn density_of_states(minibands: &Minibands, energies_ev: &[f64]) -> Vec<DensityPoint> {
    let sign = minibands.band.sign();
    // For each miniband ∫ m∥ dφ from the centre of the minizone up to each of the phases.
    let step = PI / SAMPLES as f64;
    let sums: Vec<Vec<f64>> = (0..minibands.minibands.len())
        .map(|band| {
            let mut sum = vec![0.0];
            for k in 0..SAMPLES {
                // Half-way: at the ends minibands may touch, and have no state of their own.
                let mass = minibands.in_plane_mass_m0(band, step * (k as f64 + 0.5));
                sum.push(sum[k] + step * mass);
            }
            sum
        })
        .collect();
    let up_to = |band: usize, phase: f64| {
        let place = (phase / step).clamp(0.0, SAMPLES as f64);
        let below = (place as usize).min(SAMPLES - 1);
        let share = place - below as f64;
        sums[band][below] * (1.0 - share) + sums[band][below + 1] * share
    };
    energies_ev
        .iter()
        .map(|&energy_ev| {
            let level = sign * energy_ev;
            let mut mass = 0.0;
            for (band, sum) in sums.iter().enumerate() {
                let [centre, border] = minibands.levels[band];
                if level >= centre.max(border) {
                    mass += sum[SAMPLES] / PI;
                } else if level > centre.min(border)
                    && let Some(phase) = Condensed::at(&minibands.pencil, level).phase()
                {
                    let inside = up_to(band, phase);
                    mass += if centre < border {
                        inside / PI
                    } else {
                        (sum[SAMPLES] - inside) / PI
                    };
                }
            }
            // m/πħ² with ħ²/2m₀ at hand.
            let per_period = NM2_PER_CM2 * mass / (2.0 * PI * HBAR2_OVER_2M0);
            DensityPoint {
                energy_ev,
                per_period,
                per_volume: per_period / (1e-7 * minibands.period_nm),
            }
        })
        .collect()
}
