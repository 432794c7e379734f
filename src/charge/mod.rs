//! Charge of dopants and carriers in equilibrium: the Fermi level, the filling of the subbands and the bands that this
//! bends, solved together. The solve itself is handed in as bands and accuracy; no band model is picked here.

mod anderson;
mod contact;
mod dopants;
mod equilibrium;
mod exchange;
mod fermi;
mod poisson;
mod settled;

pub use equilibrium::{Equilibrium, Solution, solve};
pub use settled::settled;

use crate::models::Unsuitable;

/// Why there is no equilibrium.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum ChargeError {
    #[error("layer {} {reason}", .layer + 1)]
    Unsuitable { layer: usize, reason: Unsuitable },
    #[error("layer {} has no `permittivity_static`, which band bending needs", .layer + 1)]
    NoPermittivity { layer: usize },
    #[error("coupled bands are solved flat")]
    Coupled,
    #[error(
        "the stack cannot be neutral: no solved band holds the carriers that its dopants leave"
    )]
    NotNeutral,
    #[error(
        "the lowest layer has no Fermi level of its own: it is not doped, or its carriers have no band"
    )]
    NoContact,
    #[error(
        "more than {most} subbands are filled: the doped layers are too thick or hold too many carriers for subbands"
    )]
    TooManySubbands { most: usize },
    #[error(
        "charge and potential did not settle: the last iteration still moved the bands by {residual_ev:.0e} eV"
    )]
    Unsettled { residual_ev: f64 },
}
