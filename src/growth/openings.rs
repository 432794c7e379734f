//! The compositions that cells of fixed rates give.
//!
//! R = Σ R_i over the open cells, x_e = Σ R_i of the element e / R; common practice, with the rates in monolayers on the
//! substrate.

use crate::materials::{Composition, Element};
use crate::structure::Growth;

/// The group-III elements, in the order of arrays by element here.
pub const GROUP_THREE: [Element; 3] = [Element::Al, Element::Ga, Element::In];
/// Compositions nearer than this are the same.
const SAME: f64 = 1e-9;

/// One set of open cells.
#[derive(Clone, Debug, PartialEq)]
pub struct Opening {
    /// Indices into [`Growth::cells`].
    pub cells: Vec<usize>,
    /// The growth rate in monolayers per second.
    pub rate_ml_per_s: f64,
    /// The fractions of Al, Ga and In.
    pub fractions: [f64; 3],
}

/// Every set of open cells, those of few cells first, otherwise in the order of the file.
pub fn openings(growth: &Growth) -> Vec<Opening> {
    let count = growth.cells.len();
    let mut sets: Vec<Vec<usize>> = (1..1_usize << count)
        .map(|set| (0..count).filter(|cell| set >> cell & 1 == 1).collect())
        .collect();
    sets.sort_by(|a: &Vec<usize>, b| a.len().cmp(&b.len()).then_with(|| a.cmp(b)));
    sets.into_iter()
        .map(|cells| {
            let rates = GROUP_THREE.map(|element| {
                let of_element = cells
                    .iter()
                    .filter(|cell| growth.cells[**cell].element == element);
                of_element
                    .map(|cell| growth.cells[*cell].rate_ml_per_s)
                    .sum::<f64>()
            });
            let rate_ml_per_s: f64 = rates.iter().sum();
            Opening {
                cells,
                rate_ml_per_s,
                fractions: rates.map(|rate| rate / rate_ml_per_s),
            }
        })
        .collect()
}

/// The group-III fractions of a composition.
pub fn group_three(composition: &Composition) -> [f64; 3] {
    GROUP_THREE.map(|element| composition.fraction(element))
}

/// The largest difference of two sets of fractions.
pub fn miss(a: [f64; 3], b: [f64; 3]) -> f64 {
    a.iter()
        .zip(b)
        .map(|(a, b)| (a - b).abs())
        .fold(0.0, f64::max)
}

/// The set of open cells whose composition is nearest; of equals that of the fewest cells, then the file's first.
pub fn nearest(openings: &[Opening], wanted: [f64; 3]) -> Option<&Opening> {
    openings.iter().reduce(|best, next| {
        if miss(next.fractions, wanted) < miss(best.fractions, wanted) - SAME {
            next
        } else {
            best
        }
    })
}

/// The fractions of an element that the cells give to an alloy of two group-III elements, without 0 and 1, at which it is
/// no alloy any more.
pub fn growable_fractions(
    growth: &Growth,
    composition: &Composition,
    element: Element,
) -> Vec<f64> {
    let Some(of_element) = GROUP_THREE.iter().position(|known| *known == element) else {
        return Vec::new();
    };
    let fits = |opening: &Opening| {
        let fractions = GROUP_THREE.iter().zip(opening.fractions);
        fractions
            .into_iter()
            .all(|(element, fraction)| (fraction > 0.0) == composition.elements().contains(element))
    };
    let openings = openings(growth);
    let fitting = openings.iter().filter(|opening| fits(opening));
    fitting
        .map(|opening| opening.fractions[of_element])
        .collect()
}
