//! The exciton of an electron and a hole state: a variational 1s state.
//!
//! Trial state f_e(z_e) f_h(z_h) √(2/π)/λ exp(−ρ/λ) with the subbands' own envelopes, λ varied (Bastard, Mendez, Chang and
//! Esaki, Phys. Rev. B 26, 1974 (1982)); against it states with a z-dependent exponent bind by a few tenths of a meV more
//! (Greene, Bajaj and Phelps, Phys. Rev. B 29, 1807 (1984)). With the in-plane Fourier transform of the Coulomb
//! interaction, 2π/q exp(−q|z|), and that of the trial density, (1 + (qλ/2)²)^(−3/2),
//!
//! E(λ) = ħ²/2μλ² − (e²/4πε₀ε)(2/λ) ∫₀^(π/2) F((2/λ) tan θ) cos θ dθ,
//! F(q) = ∫∫ ρ_e(z) ρ_h(z′) exp(−q|z − z′|) dz dz′.
//!
//! F = 1 is the two-dimensional limit: E = −4 Ry*, λ = half the Bohr radius. One static permittivity, no image charges,
//! parabolic bands in the plane.

use crate::constants::{COULOMB_EV_NM, HBAR2_OVER_2M0};
use crate::numerics::quadrature::Reference;
use argmin::core::{CostFunction, Error, Executor};
use argmin::solver::brent::BrentOpt;
use std::f64::consts::FRAC_PI_2;

/// The bound pair.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Exciton {
    pub binding_ev: f64,
    /// λ, over which the pair's envelope in the plane falls to 1/e.
    pub radius_nm: f64,
    /// m_e m_h/(m_e + m_h) in the plane, in free-electron masses.
    pub reduced_mass_m0: f64,
    pub permittivity: f64,
}

/// Where electron and hole are: probabilities at points of ascending height.
#[derive(Clone, Debug)]
pub struct Pair {
    pub positions_nm: Vec<f64>,
    /// The electron's probability at each point; the sum is 1.
    pub electron: Vec<f64>,
    /// The hole's.
    pub hole: Vec<f64>,
}

/// Panels of the quadrature over θ.
const PANELS: usize = 3;
const ORDER: usize = 14;
/// λ is sought between these multiples of the Bohr radius of the bulk.
const RANGE: (f64, f64) = (0.1, 30.0);
const ITERATIONS: u64 = 60;

impl Pair {
    /// F(q), q in 1/nm: one sweep, each point against all below it.
    fn form_factor(&self, q: f64) -> f64 {
        let (mut electrons_below, mut holes_below, mut sum) = (0.0, 0.0, 0.0);
        let mut below_nm = self.positions_nm.first().copied().unwrap_or(0.0);
        let points = self.positions_nm.iter().zip(&self.electron).zip(&self.hole);
        for ((z, electron), hole) in points {
            let decay = (-q * (z - below_nm)).exp();
            electrons_below *= decay;
            holes_below *= decay;
            sum += electron * (holes_below + hole) + hole * electrons_below;
            electrons_below += electron;
            holes_below += hole;
            below_nm = *z;
        }
        sum
    }

    /// ∫₀^(π/2) F((2/λ) tan θ) cos θ dθ: the Coulomb energy in units of that in two dimensions.
    fn coulomb(&self, radius_nm: f64) -> f64 {
        let rule = Reference::of_order(ORDER);
        let panel = FRAC_PI_2 / PANELS as f64;
        let mut sum = 0.0;
        for k in 0..PANELS {
            for (node, weight) in rule.nodes.iter().zip(&rule.weights) {
                let angle = panel * (k as f64 + 0.5 * (1.0 + node));
                let factor = self.form_factor(2.0 / radius_nm * angle.tan());
                sum += 0.5 * panel * weight * factor * angle.cos();
            }
        }
        sum
    }
}

/// The energy as a function of ln λ.
struct Trial<'p> {
    pair: &'p Pair,
    kinetic_ev_nm2: f64,
    coulomb_ev_nm: f64,
}

impl CostFunction for Trial<'_> {
    type Param = f64;
    type Output = f64;

    fn cost(&self, log_radius: &f64) -> Result<f64, Error> {
        let radius_nm = log_radius.exp();
        let kinetic = self.kinetic_ev_nm2 / (radius_nm * radius_nm);
        Ok(kinetic - self.coulomb_ev_nm * 2.0 / radius_nm * self.pair.coulomb(radius_nm))
    }
}

/// The 1s exciton of a pair whose inverse in-plane masses (in 1/m₀) add up to `inverse_mass`, in a medium of one static
/// permittivity. `None` when the numbers allow no bound state.
pub fn exciton(pair: &Pair, inverse_mass: f64, permittivity: f64) -> Option<Exciton> {
    let kinetic_ev_nm2 = HBAR2_OVER_2M0 * inverse_mass;
    let coulomb_ev_nm = COULOMB_EV_NM / permittivity;
    let bulk_radius_nm = 2.0 * kinetic_ev_nm2 / coulomb_ev_nm;
    if !(bulk_radius_nm > 0.0 && bulk_radius_nm.is_finite()) {
        return None;
    }
    let trial = Trial {
        pair,
        kinetic_ev_nm2,
        coulomb_ev_nm,
    };
    let solver = BrentOpt::new(
        (RANGE.0 * bulk_radius_nm).ln(),
        (RANGE.1 * bulk_radius_nm).ln(),
    );
    let run = Executor::new(trial, solver)
        .configure(|state| state.max_iters(ITERATIONS))
        .timer(false)
        .run()
        .ok()?;
    let binding_ev = -run.state.best_cost;
    (binding_ev > 0.0).then_some(Exciton {
        binding_ev,
        radius_nm: run.state.best_param?.exp(),
        reduced_mass_m0: 1.0 / inverse_mass,
        permittivity,
    })
}
