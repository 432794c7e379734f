//! Stacks that go on: minibands of a period repeated for ever, and the ladder of levels of a cascade's modules in a field.

mod anticrossing;
mod cell;
mod density;
mod ladder;
mod minibands;
mod window;

pub use anticrossing::Anticrossing;
pub use density::{DensityPoint, density_of_states};
pub use ladder::{Alignment, Ladder, LadderState, LadderTransition, Module, ladder, ladder_in};
pub use minibands::{
    Dispersed, FLAT_EV, Miniband, MinibandTransition, Minibands, NO_GAP_EV, Zone, minibands,
};
pub use window::Neighbours;
