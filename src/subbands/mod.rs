//! Solved subbands of a stack: energies, envelopes, where they sit, and an audit of the solution.

mod audit;
mod bands;
mod change;
mod coupled;
mod curves;
mod envelope;
pub mod follow;
mod in_plane;
pub mod multiband;
mod nearby;
mod resolution;
mod state;
pub mod strengths;

pub use audit::Audit;
pub use bands::{Bands, Place, Solution};
pub use change::{change, coupled_change};
pub use coupled::Coupled;
pub use curves::{Curves, StateCurves, coupled_curves, curves};
pub use envelope::{amplitudes, layer_envelopes};
pub use in_plane::{InPlaneNodes, in_plane};
pub use nearby::{Nearby, lower_outer_edge_ev};
pub use resolution::pieces_up_to;
pub use state::{Hold, State, in_plane_mass_m0};

use crate::models::{Band, BandOperator};
use crate::numerics::eigenpairs::{self, Eigenpair};
use crate::numerics::mesh::Mesh;
use crate::numerics::pencil::Pencil;

/// What is asked of a solution.
#[derive(Clone, Copy, Debug)]
pub struct Accuracy {
    /// Each energy's discretisation error is brought below this, in eV.
    pub tolerance_ev: f64,
}

impl Default for Accuracy {
    /// A hundredth of a µeV: a tenth of the last digit that is printed.
    fn default() -> Self {
        Self { tolerance_ev: 1e-8 }
    }
}

/// Orders that are tried in turn before the elements are halved.
const ORDERS: [usize; 3] = [6, 8, 12];
/// A tolerance below this skips the lowest order, which seldom reaches it.
const FINE_EV: f64 = 1e-7;
/// No energy is held to less than this part of its height above the floor: a finer mesh would add rounding only.
const ROUNDING: f64 = 1e-11;
/// Halvings after which the error that is reached is reported as it is.
const MAX_HALVINGS: usize = 4;
/// The order is raised by this much for the error estimate.
const ORDER_STEP: usize = 2;

/// The states of one band nearest its edge with the discretised problem they solve.
///
/// For holes the problem is that of minus the energy: its lowest eigenvalue is the highest level.
#[derive(Clone, Debug)]
pub struct Subbands {
    pub band: Band,
    pub pencil: Pencil,
    pub pairs: Vec<Eigenpair>,
    /// Estimated discretisation error of each energy, eV.
    pub errors_ev: Vec<f64>,
    /// ħ²/2m∥ at the nodes of each element, where it is not the pencil's A.
    in_plane: InPlaneNodes,
}

/// Solves for the `count` lowest states; fewer come back only when the stack is too small a box to hold them on the
/// finest mesh.
pub fn solve(operator: &BandOperator, count: usize, accuracy: Accuracy) -> Subbands {
    let (lengths, mut pieces) = resolution::pieces(operator, count);
    let mut halvings = 0;
    loop {
        for order in ORDERS {
            if order == ORDERS[0] && accuracy.tolerance_ev < FINE_EV {
                continue;
            }
            let mesh = Mesh::new(&lengths, &pieces, order);
            let subbands = on_mesh(operator, mesh, count);
            let floor_ev = subbands.pencil.floor();
            let mut levels = subbands.errors_ev.iter().zip(&subbands.pairs);
            let exact = levels.all(|(error_ev, pair)| {
                let rounding_ev = ROUNDING * (pair.value - floor_ev);
                *error_ev <= accuracy.tolerance_ev.max(rounding_ev)
            });
            let enough = subbands.pairs.len() == count && exact;
            if enough || (halvings == MAX_HALVINGS && order == ORDERS[ORDERS.len() - 1]) {
                return subbands;
            }
        }
        pieces.iter_mut().for_each(|n| *n *= 2);
        halvings += 1;
    }
}

/// How many elements each layer gets at first for a number of states.
pub fn pieces(operator: &BandOperator, count: usize) -> Vec<usize> {
    resolution::pieces(operator, count).1
}

/// Solves on a given mesh, with the errors estimated on a higher order.
pub fn on_mesh(operator: &BandOperator, mesh: Mesh, count: usize) -> Subbands {
    let pencil = pencil_on(operator, mesh);
    let pairs = eigenpairs::lowest(&pencil, count);
    let finer = pencil_on(
        operator,
        pencil.mesh.with_order(pencil.mesh.order() + ORDER_STEP),
    );
    let errors_ev = eigenpairs::improvements(&pencil, &pairs, &finer);
    Subbands {
        band: operator.band(),
        in_plane: in_plane(operator, &pencil, |element, q| {
            (element.segment, pencil.mesh.fraction(element, q))
        }),
        pencil,
        pairs,
        errors_ev: errors_ev.into_iter().map(f64::abs).collect(),
    }
}

fn pencil_on(operator: &BandOperator, mesh: Mesh) -> Pencil {
    Pencil::new(mesh, |mesh, element, q| {
        operator.at(
            element.segment,
            mesh.fraction(element, q),
            mesh.position(element, q),
        )
    })
}

impl Subbands {
    /// Solutions of the conduction band that were found on a pencil of the caller's, with their errors.
    pub fn of_conduction(
        band: Band,
        pencil: Pencil,
        pairs: Vec<Eigenpair>,
        errors_ev: Vec<f64>,
        in_plane: InPlaneNodes,
    ) -> Subbands {
        Subbands {
            band,
            pencil,
            pairs,
            errors_ev,
            in_plane,
        }
    }

    /// The energy of a state, on the absolute scale, in eV.
    pub fn energy_ev(&self, index: usize) -> f64 {
        self.band.sign() * self.pairs[index].value
    }

    /// What is known of each state, those nearest the band's edge first.
    pub fn states(&self) -> Vec<State> {
        (0..self.pairs.len())
            .map(|index| state::describe(self, index))
            .collect()
    }

    /// Checks of the solution against the commutation rule.
    pub fn audit(&self) -> Audit {
        audit::audit(self)
    }

    /// Number of states that lie nearer to the band's edge than both outer barriers.
    pub fn bound_count(&self) -> usize {
        eigenpairs::count_below(&self.pencil, state::lower_outer_edge_ev(&self.pencil))
    }
}
