//! Graded layers: the fluxes that would have to change while the layer grows.
//!
//! The host element keeps its rate R_h, and every other one follows R_e(z) = R_h x_e(z)/x_h(z). Where the host nearly
//! vanishes at a face, no element keeps its rate and the total stays at R_h instead.

use super::openings::{GROUP_THREE, Opening, group_three, miss};
use crate::structure::{Growth, Stack};

/// An element this scarce at a face cannot be the one that keeps its rate.
const LEAST_HOST: f64 = 0.05;

/// A fraction below this is the rounding of another one.
const NO_FRACTION: f64 = 1e-6;

/// What the cells do in a graded layer.
#[derive(Clone, Debug, PartialEq)]
pub struct Ramp {
    pub cells: Vec<RampedCell>,
    /// The growth rate at the lower and at the upper face, in monolayers per second.
    pub rate_ml_per_s: [f64; 2],
    /// How long the layer takes per monolayer of its thickness, in seconds.
    pub seconds_per_monolayer: f64,
}

/// The rate of one cell at the lower and at the upper face.
#[derive(Clone, Debug, PartialEq)]
pub struct RampedCell {
    /// Index into [`Growth::cells`].
    pub cell: usize,
    pub rate_ml_per_s: [f64; 2],
}

impl RampedCell {
    /// Whether the rate stays what it is.
    pub fn is_steady(&self) -> bool {
        self.rate_ml_per_s[0] == self.rate_ml_per_s[1]
    }
}

/// The ramp of a graded layer; `None` when it has no composition.
pub fn ramp(growth: &Growth, openings: &[Opening], stack: &Stack, layer: usize) -> Option<Ramp> {
    let at = |t: f64| stack.composition_at(layer, t).map(|c| group_three(&c));
    let (lower, middle, upper) = (at(0.0)?, at(0.5)?, at(1.0)?);
    let held = |e: usize| lower[e].max(upper[e]) > NO_FRACTION;
    // Along the height the fractions are at most quadratic, for which Simpson's rule is exact.
    let mean: [f64; 3] = std::array::from_fn(|e| (lower[e] + 4.0 * middle[e] + upper[e]) / 6.0);
    // The fewest cells that bring all elements; of equals those that give one of the faces best without a ramp.
    let near =
        |opening: &Opening| miss(opening.fractions, lower).min(miss(opening.fractions, upper));
    let opening = openings
        .iter()
        .filter(|opening| (0..3).all(|e| held(e) == (opening.fractions[e] > 0.0)))
        .min_by(|a, b| {
            let fewer = a.cells.len().cmp(&b.cells.len());
            fewer.then(near(a).total_cmp(&near(b)))
        })?;
    let host = (0..3).max_by(|a, b| {
        let least = |e: usize| lower[e].min(upper[e]);
        least(*a).total_cmp(&least(*b))
    })?;
    let of_element = |e: usize| opening.rate_ml_per_s * opening.fractions[e];
    let steady = lower[host].min(upper[host]) >= LEAST_HOST;
    let rate = if steady {
        [lower[host], upper[host]].map(|fraction| of_element(host) / fraction)
    } else {
        [opening.rate_ml_per_s; 2]
    };
    let cells = opening
        .cells
        .iter()
        .map(|&cell| {
            let element = growth.cells[cell].element;
            let e = GROUP_THREE.iter().position(|known| *known == element)?;
            // Several cells of one element keep their ratio.
            let share = growth.cells[cell].rate_ml_per_s / of_element(e);
            Some(RampedCell {
                cell,
                rate_ml_per_s: if steady && e == host {
                    [growth.cells[cell].rate_ml_per_s; 2]
                } else {
                    [share * rate[0] * lower[e], share * rate[1] * upper[e]]
                },
            })
        })
        .collect::<Option<Vec<_>>>()?;
    Some(Ramp {
        cells,
        rate_ml_per_s: rate,
        seconds_per_monolayer: if steady {
            mean[host] / of_element(host)
        } else {
            1.0 / opening.rate_ml_per_s
        },
    })
}
