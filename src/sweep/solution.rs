//! The one place where a sweep solves a stack.

use crate::charge::{self, ChargeError};
use crate::materials::MaterialError;
use crate::models::{Band, Unsuitable};
use crate::structure::{Charge, Stack};
use crate::subbands::multiband::Band as Side;
use crate::subbands::{Accuracy, Bands, Place, Solution};

/// Why there is nothing at one value of the swept number.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum NotSolved {
    #[error(transparent)]
    Material(#[from] MaterialError),
    #[error("the layers are thicker than 100 µm together")]
    TooThick,
    #[error("the material of layer {} {reason}", .layer + 1)]
    Unsuitable { layer: usize, reason: Unsuitable },
    #[error(transparent)]
    Charge(ChargeError),
}

/// Solves each band for a number of levels, bent by charge where the file says so.
pub fn solved(
    stack: &Stack,
    charge: &Charge,
    bands: &[(Band, usize)],
    accuracy: Accuracy,
) -> Result<Bands, NotSolved> {
    let solution = charge::settled(stack, charge, bands, accuracy);
    solution
        .map(|found| found.bands)
        .map_err(|error| match error {
            ChargeError::Unsuitable { layer, reason } => NotSolved::Unsuitable { layer, reason },
            other => NotSolved::Charge(other),
        })
}

/// The levels of a band counted away from the gap, ascending, in eV.
pub fn values_ev(bands: &Bands, band: usize) -> Vec<f64> {
    let sign = bands.band(band).sign();
    let states = 0..bands.level_count(band);
    states
        .map(|state| sign * bands.energy_ev(Place { band, state }))
        .collect()
}

/// A band's edge where it is nearest to the gap without the field, and with a field that is zero at the middle of the
/// stack: counted away from the gap, in eV. In a field the edge itself moves with the ends of the stack.
pub fn middle_ev(stack: &Stack, bands: &Bands, band: usize) -> f64 {
    let field = bands.band(band).sign() * stack.field_v_per_nm;
    let edge_ev = match bands.solution(band) {
        Solution::Alone(solved) => {
            let mesh = &solved.pencil.mesh;
            let edges = mesh.elements.iter().enumerate().flat_map(|(e, element)| {
                let nodes = solved.pencil.at(e).iter().enumerate();
                nodes.map(move |(q, at)| at.constant - field * mesh.position(element, q))
            });
            edges.fold(f64::INFINITY, f64::min)
        }
        Solution::Coupled(coupled, side) => coupled
            .layer_edges_ev()
            .into_iter()
            .map(|[conduction, heavy, light]| match side {
                Side::Conduction => conduction,
                Side::Valence => -heavy.max(light),
            })
            .fold(f64::INFINITY, f64::min),
    };
    edge_ev + field * 0.5 * stack.total_width_nm()
}
