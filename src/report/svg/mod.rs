//! Pictures as SVG: read-only views of plain data.
//!
//! One unit of a picture is a point (1/72 inch), so that text sizes are those of print. Nothing in a picture refers to
//! anything by an id: several may stand in one page.

mod axes;
mod band_diagram;
mod band_panel;
mod bars;
mod cascade;
mod dispersion;
mod histogram;
mod key;
mod ladder;
mod layer_strip;
mod minizone;
mod page;
pub mod palette;
mod spectrum;
mod spread;
mod sweep;
mod text;
mod tolerances;

pub use band_diagram::{BandDiagram, FINENESS};
pub use bars::{SensitivityBar, SensitivityBars};
pub use cascade::{CascadePicture, CascadeState};
pub use dispersion::DispersionCurves;
pub use histogram::{Gaussian, Window, YieldHistogram};
pub use minizone::{MinizoneCurves, MinizonePanel};
pub use spectrum::{Spectrum, SpectrumMark};
pub use sweep::{SweepLine, SweepPanel, SweepPicture};
pub use text::width_pt as text_width_pt;
pub use tolerances::{sensitivity_bars, yield_histogram};

/// How wide a picture is printed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Width {
    /// One column of a journal: 86 mm.
    Column,
    /// The text width of a page: 170 mm.
    Page,
}

impl Width {
    /// In points of 1/72 inch.
    pub fn points(self) -> f64 {
        let millimetres = match self {
            Width::Column => 86.0,
            Width::Page => 170.0,
        };
        millimetres * 72.0 / 25.4
    }
}
