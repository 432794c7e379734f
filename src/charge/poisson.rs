//! Poisson's equation with carriers that answer to the potential.
//!
//! −d/dz (ε/C du/dz) = n − p − N_D⁺ + N_A⁻ for the energy u of an electron, with C = e²/ε₀. The predictor of Trellakis,
//! Galick, Pacelli and Ravaioli, J. Appl. Phys. 81, 7880 (1997), eq. 13: states keep their densities |ψ|² while the
//! potential moves by δ, and their levels move along with δ at each place. The equation is then monotone in δ, and Newton's
//! method solves it.

use super::dopants::Dopants;
use super::fermi::filling;
use crate::numerics::boundary_value::BoundaryValue;

/// Newton steps before the reached state is taken as it is: the next densities start from there.
const MAX_STEPS: usize = 100;
const MAX_HALVINGS: usize = 30;
/// Steps below this end the iteration, in eV.
const SMALLEST_STEP_EV: f64 = 1e-13;

/// One subband as it is filled.
#[derive(Clone, Debug)]
pub struct Filled {
    /// 1 for electrons, −1 for holes.
    pub sign: f64,
    /// Per area and energy, in 1/(eV nm²).
    pub density_of_states: f64,
    /// The level; minus its energy for holes.
    pub level_ev: f64,
    /// The part of the state at each node.
    pub parts: Vec<f64>,
}

impl Filled {
    /// Carriers per area in 1/nm².
    pub fn density(&self, fermi_ev: f64, kt_ev: f64) -> f64 {
        let below_ev = self.sign * fermi_ev - self.level_ev;
        self.density_of_states * filling(below_ev, kt_ev).0
    }
}

pub struct Poisson {
    pub boundary: BoundaryValue,
    pub dopants: [Dopants; 2],
    pub kt_ev: f64,
    /// Whether the ends' energies are given.
    pub held: [bool; 2],
}

impl Poisson {
    /// The charge that is missing to neutrality, in 1/nm², with levels as they are: falls as the Fermi level rises.
    pub fn excess(&self, states: &[Filled], u: &[f64], fermi_ev: f64) -> f64 {
        let mut sum = self.ionised(u, fermi_ev).iter().sum();
        for state in states {
            sum -= state.sign * state.density(fermi_ev, self.kt_ev);
        }
        sum
    }

    /// The charge of donors and of acceptors, in 1/nm².
    pub fn ionised(&self, u: &[f64], fermi_ev: f64) -> [f64; 2] {
        [0, 1].map(|kind| {
            let mut sum = 0.0;
            self.dopants[kind].each(|node| u[node], fermi_ev, |_, charge, _| sum += charge);
            sum
        })
    }

    /// What the equation is off by at each node, and the slope of the charge; u and δ in eV.
    fn residual(
        &self,
        states: &[Filled],
        moved: &[f64],
        u: &[f64],
        fermi_ev: f64,
    ) -> (Vec<f64>, Vec<f64>) {
        let mut residual = self.boundary.times(u);
        let mut slope = vec![0.0; u.len()];
        for state in states {
            let below_ev = state.sign * fermi_ev - state.level_ev;
            for (node, part) in state.parts.iter().enumerate() {
                let here_ev = below_ev - state.sign * moved[node];
                let (filled_ev, step) = filling(here_ev, self.kt_ev);
                let weight = state.density_of_states * part;
                residual[node] -= state.sign * weight * filled_ev;
                slope[node] += weight * step;
            }
        }
        for kind in &self.dopants {
            kind.each(
                |node| u[node],
                fermi_ev,
                |node, charge, rise| {
                    residual[node] += charge;
                    slope[node] += rise;
                },
            );
        }
        let last = u.len() - 1;
        for (end, held) in [0, last].into_iter().zip(self.held) {
            if held {
                residual[end] = 0.0;
            }
        }
        (residual, slope)
    }

    /// The potential with which the carriers agree that answer to it, from the one that the states were solved in.
    pub fn answer(&self, states: &[Filled], solved: &[f64], fermi_ev: f64) -> Vec<f64> {
        let size = |residual: &[f64]| residual.iter().map(|r| r * r).sum::<f64>();
        let mut u = solved.to_vec();
        let mut moved = vec![0.0; u.len()];
        let (mut residual, mut slope) = self.residual(states, &moved, &u, fermi_ev);
        for _ in 0..MAX_STEPS {
            let step = self.boundary.solve(&slope, &residual, self.held);
            let largest = step.iter().fold(0.0_f64, |most, s| most.max(s.abs()));
            if !largest.is_finite() || largest < SMALLEST_STEP_EV {
                break;
            }
            let before = size(&residual);
            let mut part = 1.0;
            for halving in 0..=MAX_HALVINGS {
                let next: Vec<f64> = u.iter().zip(&step).map(|(u, s)| u - part * s).collect();
                moved = next.iter().zip(solved).map(|(u, s)| u - s).collect();
                let tried = self.residual(states, &moved, &next, fermi_ev);
                if size(&tried.0) < before || halving == MAX_HALVINGS {
                    u = next;
                    (residual, slope) = tried;
                    break;
                }
                part *= 0.5;
            }
            // At rounding the residual no longer falls.
            if part < 1e-3 && largest < 1e-9 {
                break;
            }
        }
        u
    }

    /// Electrons per area at each node, in 1/nm², as they answer to the move from `solved` to `u`.
    pub fn electrons(
        &self,
        states: &[Filled],
        solved: &[f64],
        u: &[f64],
        fermi_ev: f64,
    ) -> Vec<Vec<f64>> {
        states
            .iter()
            .filter(|state| state.sign > 0.0)
            .map(|state| {
                let below_ev = fermi_ev - state.level_ev;
                let moved = u.iter().zip(solved).map(|(u, s)| u - s);
                moved
                    .map(|moved| state.density_of_states * filling(below_ev - moved, self.kt_ev).0)
                    .collect()
            })
            .collect()
    }
}
