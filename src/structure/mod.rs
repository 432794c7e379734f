//! Structure files: reading, checking, laying out as a stack of layers, and writing tuned values back.
//!
//! ```text
//! text → document (nodes with places) → Structure (what the file says, checked) → Stack (flat layers, materials resolved)
//! ```

mod charge;
pub mod document;
mod doubts;
mod fields;
mod file;
mod grade;
mod growth;
mod knob;
mod lay_out;
mod period;
mod potential;
mod read;
mod read_aims;
mod read_charge;
mod read_growth;
mod read_keep;
mod read_layers;
mod read_materials;
mod read_sweep;
mod read_tolerance;
mod read_tune;
mod rewrite;
mod spreads;
mod stack;
mod sweeps;
mod temperature;
mod wafer;

pub use charge::{Bending, Charge, Ionisation};
pub use document::{MAX_BYTES, decode};
pub use file::{
    Aim, BandName, ConductionBand, ConductionModel, Ends, Follow, Item, Keep, LayerEntry, Level,
    PlaneEntry, Profile, Spanned, StrainBound, Structure, Target, Tune, ValenceBand, ValenceModel,
    Variable, Varied, Within,
};
pub use growth::{Cell, DOPANTS, Dopant, Growth};
pub use knob::Knob;
pub use period::{NoModule, Repeated};
pub use potential::Potential;
pub use read::read;
pub use read_sweep::MOST_POINTS;
pub use rewrite::{Edits, NewWidth, rewrite};
pub use spreads::{Grading, Radial, Tolerance, Window};
pub use stack::{Layer, MAX_TOTAL_NM, Plane, Stack};
pub use sweeps::{Doping, Steps, Sweep, Swept};
pub use wafer::{Cause, Design, NotGrown};
