//! The one place where a sweep solves a stack.

use crate::materials::MaterialError;
use crate::models::{Band, Unsuitable};
use crate::structure::Stack;
use crate::subbands::{Accuracy, Bands, Subbands};

/// Why there is nothing at one value of the swept number.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum NotSolved {
    #[error(transparent)]
    Material(#[from] MaterialError),
    #[error("the layers are thicker than 100 µm together")]
    TooThick,
    #[error("the material of layer {} {reason}", .layer + 1)]
    Unsuitable { layer: usize, reason: Unsuitable },
}

/// Solves each band for a number of levels.
pub fn solved(
    stack: &Stack,
    bands: &[(Band, usize)],
    accuracy: Accuracy,
) -> Result<Bands, NotSolved> {
    Bands::solve(stack, bands, accuracy)
        .map_err(|(layer, reason)| NotSolved::Unsuitable { layer, reason })
}

/// The lowest band edge without the field, and with a field that is zero at the middle of the stack: on the solver's
/// scale, in eV. In a field the edge itself moves with the ends of the stack.
pub fn middle_ev(stack: &Stack, solved: &Subbands) -> f64 {
    let mesh = &solved.pencil.mesh;
    let field = solved.band.sign() * stack.field_v_per_nm;
    let edges = mesh.elements.iter().enumerate().flat_map(|(e, element)| {
        let nodes = solved.pencil.at(e).iter().enumerate();
        nodes.map(move |(q, at)| at.constant - field * mesh.position(element, q))
    });
    edges.fold(f64::INFINITY, f64::min) + field * 0.5 * stack.total_width_nm()
}
