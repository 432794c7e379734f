//! The thickness up to which a strained (001) layer stays coherent.
//!
//! Both formulas are for 60° dislocations of zincblende with the Burgers vector b = a/√2 on {111} planes, a being the
//! layer's own lattice constant, f = |a − a_substrate|/a_substrate and ν Poisson's ratio of the layer.

use crate::materials::Number;
use std::f64::consts::{PI, SQRT_2};

/// How dislocations can form, which decides the force that a layer has to bring up.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Glide {
    /// A layer with a free surface: one dislocation line. k = 4.
    FreeLayer,
    /// A layer between others: a pair of lines, one at each face. k = 2.
    Buried,
    /// A superlattice whose layers share the misfit with opposite signs. k = 1.
    Superlattice,
}

impl Glide {
    /// The number k in the formula of Matthews and Blakeslee.
    pub fn k(self) -> f64 {
        match self {
            Glide::FreeLayer => 4.0,
            Glide::Buried => 2.0,
            Glide::Superlattice => 1.0,
        }
    }

    pub fn in_words(self) -> &'static str {
        match self {
            Glide::FreeLayer => "free layer",
            Glide::Buried => "buried layer",
            Glide::Superlattice => "superlattice",
        }
    }
}

/// In Burgers vectors; a critical thickness of a metre is none.
const UNLIMITED: f64 = 1e9;

/// The critical thickness in nm by the balance of forces on a dislocation:
///
///   h = a/(k √2 π f) · (1 − ν/4)/(1 + ν) · [ln(h √2/a) + 1]
///
/// (J. W. Matthews and A. E. Blakeslee, J. Cryst. Growth 27, 118 (1974)). Infinite for a matched layer; 0 for a misfit so
/// large (above 5 % with k = 4) that no thickness fulfils the equation.
pub fn matthews_blakeslee_nm<T: Number>(lattice_nm: T, misfit: T, poisson: T, glide: Glide) -> T {
    let [one, four] = [1.0, 4.0].map(T::constant);
    let scale = lattice_nm / (T::constant(glide.k() * SQRT_2 * PI) * size(misfit))
        * (one - poisson / four)
        / (one + poisson);
    larger_root(scale, lattice_nm / T::constant(SQRT_2), 1.0)
}

/// The critical thickness in nm by the balance of energies, which takes dislocations to be harder to form and gives larger
/// values:
///
///   h = (1 − ν)/(1 + ν) · 1/(16 π √2) · b²/a · 1/f² · ln(h/b)
///
/// (R. People and J. C. Bean, Appl. Phys. Lett. 47, 322 (1985)). Infinite for a matched layer; 0 for a misfit so large
/// that no thickness fulfils the equation.
pub fn people_bean_nm<T: Number>(lattice_nm: T, misfit: T, poisson: T) -> T {
    let one = T::constant(1.0);
    let burgers = lattice_nm / T::constant(SQRT_2);
    let scale = (one - poisson) / (one + poisson) * burgers * burgers
        / (T::constant(16.0 * PI * SQRT_2) * lattice_nm * misfit * misfit);
    larger_root(scale, burgers, 0.0)
}

fn size<T: Number>(misfit: T) -> T {
    if misfit.value() < 0.0 {
        -misfit
    } else {
        misfit
    }
}

/// The larger root h of h = s [ln(h/b) + c], with its derivative.
fn larger_root<T: Number>(scale: T, burgers: T, constant: f64) -> T {
    let alpha = scale / burgers;
    let ratio = alpha.value();
    // Also catches a misfit of zero, which leaves no number.
    if ratio.is_nan() || ratio > UNLIMITED {
        return T::constant(f64::INFINITY);
    }
    // In u = h/b: F(u) = u − α (ln u + c) is convex with its minimum at u = α. From a start right of the larger root
    // Newton's method falls onto it monotonically.
    if ratio - ratio * (ratio.ln() + constant) > 0.0 {
        return T::constant(0.0);
    }
    let mut u = 2.0 * ratio * (ratio.ln() + 1.0);
    for _ in 0..60 {
        let step = (u - ratio * (u.ln() + constant)) / (1.0 - ratio / u);
        if !step.is_finite() {
            break;
        }
        u -= step;
        if step.abs() < 1e-14 * u {
            break;
        }
    }
    // One more step, in α with its derivative, gives the root its own.
    let slope = 1.0 - ratio / u;
    if slope <= 1e-9 {
        return burgers * T::constant(u);
    }
    let at = T::constant(u);
    burgers * (at - (at - alpha * T::constant(u.ln() + constant)) / T::constant(slope))
}
