//! Energies of stacks that differ little from a solved one, fast: thousands of them, one after the other.

use super::{Subbands, pencil_on, state};
use crate::models::BandOperator;
use crate::numerics::mesh::Mesh;
use crate::numerics::nearby::lowest_near;
use crate::numerics::pencil::Pencil;

/// A solved stack as the place to start from. Its mesh serves for all stacks nearby, stretched with the layers.
#[derive(Clone, Debug)]
pub struct Nearby<'s> {
    solved: &'s Subbands,
    pieces: Vec<usize>,
}

impl<'s> Nearby<'s> {
    pub fn new(solved: &'s Subbands) -> Self {
        let elements = &solved.pencil.mesh.elements;
        let mut pieces = vec![0; elements.last().map_or(0, |element| element.segment + 1)];
        for element in elements {
            pieces[element.segment] += 1;
        }
        Self { solved, pieces }
    }

    pub fn solved(&self) -> &'s Subbands {
        self.solved
    }

    /// The discretised problem of a stack with the same number of layers.
    pub fn pencil(&self, operator: &BandOperator) -> Pencil {
        let layers = &operator.stack().layers;
        let lengths: Vec<f64> = layers.iter().map(|layer| layer.width_nm).collect();
        let order = self.solved.pencil.mesh.order();
        pencil_on(operator, Mesh::new(&lengths, &self.pieces, order))
    }

    /// The energies of as many levels as were solved, ascending, in eV: within the tolerance of the mesh's own levels.
    /// The guesses decide the time it takes, not the result.
    pub fn energies_ev(&self, pencil: &Pencil, guesses_ev: &[f64], tolerance_ev: f64) -> Vec<f64> {
        lowest_near(pencil, &self.solved.pairs, guesses_ev, tolerance_ev)
    }
}

/// The lower of the two outer barrier edges in eV, each at its highest point: a level above it is held by the walls only.
pub fn lower_outer_edge_ev(pencil: &Pencil) -> f64 {
    state::lower_outer_edge_ev(pencil)
}
