//! Structure files: reading, checking, laying out as a stack of layers, and writing tuned values back.
//!
//! ```text
//! text → document (nodes with places) → Structure (what the file says, checked) → Stack (flat layers, materials resolved)
//! ```

pub mod document;
mod doubts;
mod fields;
mod file;
mod grade;
mod growth;
mod read;
mod read_aims;
mod read_growth;
mod read_keep;
mod read_layers;
mod read_materials;
mod read_tolerance;
mod read_tune;
mod rewrite;
mod spreads;
mod stack;
mod temperature;
mod wafer;

pub use file::{
    Aim, BandName, ConductionBand, ConductionModel, Ends, Follow, Item, Keep, LayerEntry, Level,
    Profile, Spanned, StrainBound, Structure, Target, Tune, ValenceBand, Variable, Varied, Within,
};
pub use growth::{Cell, DOPANTS, Dopant, Growth};
pub use read::read;
pub use rewrite::{Edits, NewWidth, rewrite};
pub use spreads::{Grading, Radial, Tolerance, Window};
pub use stack::{Layer, Stack};
pub use wafer::{Cause, Design, NotGrown};

mod knob;
pub use document::{MAX_BYTES, decode};
pub use knob::Knob;
