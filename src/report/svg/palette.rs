//! Line styles of states, told apart in colour, in grey and with any of the common colour deficiencies.
//!
//! The lightnesses (CIE 1976 L*) of the colours are about 19, 46, 34 and 61: every two differ by 12 or more, neighbours
//! mostly by more, and each has a contrast of 3 : 1 or more to white paper. Dashes tell the fifth state from the first.
//! `tests/pictures.rs` computes both.

/// Colours of successive states.
pub const STATES: [&str; 4] = ["#1b2a66", "#1f7a78", "#8a2f4f", "#bf8a1e"];
/// Dashes of successive fours of states, in points.
const DASHES: [&str; 4] = ["", "4 1.6", "5 1.4 1.2 1.4", "1.4 1.4"];

/// Dashes of all that belongs to light holes.
pub const LIGHT_HOLES: &str = "3 1.4";

/// Text, axes and the band edge.
pub const INK: &str = "#1d1f22";
/// Captions.
pub const SOFT_INK: &str = "#4a4e54";
/// Leader lines and guides.
pub const GUIDE: &str = "#9499a1";
/// The body below a band edge, and filled areas.
pub const BODY: &str = "#eceef1";
/// Bars above zero, and the rim of all bars.
pub const BAR: &str = "#4d5f7d";
/// Bars below zero.
pub const BAR_LIGHT: &str = "#c3cddd";
/// The bins of a histogram.
pub const BIN: &str = "#d5dce7";

/// A line's look.
#[derive(Clone, Copy, Debug)]
pub struct Stroke {
    pub colour: &'static str,
    pub width_pt: f64,
    pub dash: &'static str,
}

impl Stroke {
    pub const fn solid(colour: &'static str, width_pt: f64) -> Stroke {
        Stroke {
            colour,
            width_pt,
            dash: "",
        }
    }
}

/// The line of a state, numbered from 0.
pub fn state(index: usize, width_pt: f64) -> Stroke {
    Stroke {
        colour: STATES[index % STATES.len()],
        width_pt,
        dash: DASHES[index / STATES.len() % DASHES.len()],
    }
}

/// The line of a hole state, numbered from 0 from the gap on; light holes are dashed.
pub fn hole(index: usize, light: bool, width_pt: f64) -> Stroke {
    Stroke {
        colour: STATES[index % STATES.len()],
        width_pt,
        dash: if light { LIGHT_HOLES } else { "" },
    }
}
