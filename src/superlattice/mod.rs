//! Stacks that go on: minibands of a period repeated for ever, and the ladder of levels of a cascade's modules in a field.

mod cell;
mod density;
mod minibands;

pub use density::{DensityPoint, density_of_states};
pub use minibands::{
    Dispersed, Miniband, MinibandTransition, Minibands, NO_GAP_EV, Zone, minibands,
};
