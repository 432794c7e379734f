//! The one place where a sweep solves a stack.

use crate::materials::MaterialError;
use crate::models::{Band, Unsuitable};
use crate::structure::Stack;
use crate::subbands::{Accuracy, Bands};

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
