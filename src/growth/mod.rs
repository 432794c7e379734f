//! The growth of a stack: which cells are open in each layer and for how long, what they cannot give, and what is used up.
//!
//! Monolayers are counted on the substrate: a coherent monolayer takes 2/a² group-III atoms per area, a being the
//! substrate's lattice constant, whatever it consists of. In this unit the rates of open cells add up (common practice):
//! R = Σ R_cell, and the fraction of an element is the part of R that its cells bring.

mod cautions;
mod digital;
mod digital_grade;
mod identity;
mod openings;
mod plan;
mod ramp;
mod rows;
mod totals;

pub use cautions::{Caution, Limit, cautions};
pub use digital::Digital;
pub use digital_grade::DigitalGrade;
pub use identity::content_id;
pub use openings::{Opening, growable_fractions, nearest, openings};
pub use plan::{Flag, FluxTarget, NotGiven, Plan, plan};
pub use ramp::{Ramp, RampedCell};
pub use rows::{Filling, LayerRow, PlaneRow, Row, Sums};
pub use totals::{MaterialTotal, ShutterUse};
