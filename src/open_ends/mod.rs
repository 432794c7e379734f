//! Stacks whose ends let electrons out: quasi-bound states, transmission, absorption into the continuum.

mod absorption;
mod line;
mod moment;
mod quasi_bound;
mod search;
mod transmission;

pub use absorption::{Absorption, AbsorptionLine, NoSpectrum, SUM_TO_EV, absorption};
pub use line::{Line, Outside, PATH_ANGLE, leads_ev};
pub use moment::moment;
pub use quasi_bound::{
    NARROWEST_EV, QuasiBound, QuasiBoundStates, WIDEST_EV, edges_ev, on_path, quasi_bound,
};
pub use search::Wanted;
pub use transmission::{Point, Resonance, Transmission, crossing, transmission};
