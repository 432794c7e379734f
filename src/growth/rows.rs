//! The layers in growth order, the lowest first, with repeats kept as loops.
//!
//! Thickness, monolayers and time are whole numbers of the last printed digit, so that every total is exactly the sum of
//! the rows above it.

use super::ramp::Ramp;
use crate::materials::Element;

/// Thickness, monolayers and time, in the steps in which they are printed.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Sums {
    /// In 0.001 nm.
    pub width_pm: u64,
    /// In 0.01 monolayers.
    pub monolayers_hundredths: u64,
    /// In 0.01 s.
    pub time_cs: u64,
    pub layers: u64,
}

impl Sums {
    pub fn of_layer(width_nm: f64, monolayers: f64, time_s: f64) -> Sums {
        // Negative and undefined values become 0, excessive ones the largest.
        let steps = |value: f64, per_unit: f64| (value * per_unit).round() as u64;
        Sums {
            width_pm: steps(width_nm, 1e3),
            monolayers_hundredths: steps(monolayers, 1e2),
            time_cs: steps(time_s, 1e2),
            layers: 1,
        }
    }

    pub fn plus(self, other: Sums) -> Sums {
        Sums {
            width_pm: self.width_pm.saturating_add(other.width_pm),
            monolayers_hundredths: self
                .monolayers_hundredths
                .saturating_add(other.monolayers_hundredths),
            time_cs: self.time_cs.saturating_add(other.time_cs),
            layers: self.layers.saturating_add(other.layers),
        }
    }

    pub fn times(self, count: u32) -> Sums {
        let count = u64::from(count);
        Sums {
            width_pm: self.width_pm.saturating_mul(count),
            monolayers_hundredths: self.monolayers_hundredths.saturating_mul(count),
            time_cs: self.time_cs.saturating_mul(count),
            layers: self.layers.saturating_mul(count),
        }
    }

    pub fn width_nm(self) -> f64 {
        self.width_pm as f64 / 1e3
    }

    pub fn monolayers(self) -> f64 {
        self.monolayers_hundredths as f64 / 1e2
    }

    pub fn time_s(self) -> f64 {
        self.time_cs as f64 / 1e2
    }
}

/// One line of the sheet.
#[derive(Clone, Debug, PartialEq)]
pub enum Row {
    Layer(LayerRow),
    Plane(PlaneRow),
    /// What follows, up to the end of the loop, is grown `count` times.
    LoopBegins {
        count: u32,
        depth: usize,
    },
    LoopEnds {
        count: u32,
        depth: usize,
        /// One pass.
        pass: Sums,
        /// From the substrate to the end of the last pass.
        after: Sums,
    },
}

/// A plane of dopants: growth stops, and the dopant alone is supplied.
#[derive(Clone, Debug, PartialEq)]
pub struct PlaneRow {
    /// How many loops it stands in.
    pub depth: usize,
    pub label: String,
    pub donors_cm2: f64,
    pub acceptors_cm2: f64,
    /// From the substrate to the plane, in the first pass of the loops that it stands in; the stop itself takes no time
    /// here, since no rate of the dopant is known.
    pub after: Sums,
}

/// One layer.
#[derive(Clone, Debug, PartialEq)]
pub struct LayerRow {
    /// Counted over the file from 1.
    pub number: usize,
    /// How many loops it stands in.
    pub depth: usize,
    /// Index into the structure's entries.
    pub entry: usize,
    pub label: String,
    /// The formula, with the name of the file's own material before it.
    pub material: String,
    /// The formula at the upper face of a graded layer.
    pub to: Option<String>,
    /// Of one copy of the layer.
    pub own: Sums,
    /// From the substrate to the top of this layer, in the first pass of the loops that it stands in.
    pub after: Sums,
    /// Not rounded.
    pub monolayers: f64,
    pub monolayer_nm: f64,
    pub donors_cm3: f64,
    pub acceptors_cm3: f64,
    pub filling: Filling,
    /// The fractions of the group-V elements, where there are several.
    pub group_five: Vec<(Element, f64)>,
}

/// What the group-III cells do while a layer grows.
#[derive(Clone, Debug, PartialEq)]
pub enum Filling {
    /// These cells are open, by index.
    Open {
        cells: Vec<usize>,
        rate_ml_per_s: f64,
    },
    Ramped(Ramp),
}

impl Filling {
    /// The open cells, by index.
    pub fn cells(&self) -> Vec<usize> {
        match self {
            Filling::Open { cells, .. } => cells.clone(),
            Filling::Ramped(ramp) => ramp.cells.iter().map(|ramped| ramped.cell).collect(),
        }
    }
}
