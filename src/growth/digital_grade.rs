//! A graded layer as a digital alloy: two materials that the cells give without a ramp, a few monolayers of each in turn,
//! their ratio following the grade (Gossard, IEEE J. Quantum Electron. 22, 1649 (1986), from memory).
//!
//! In each period the whole monolayers of the second material are those that bring the sum so far nearest to that of the grade, so
//! that what rounding leaves out in one period goes into the next, and the sum is never off by more than half a monolayer.

use super::digital::{COMPOSITION_TOLERANCE, distinct};
use super::openings::{Opening, group_three, miss};
use crate::structure::Stack;

/// Monolayers of one period: less than 2 nm, thin enough for electrons to see the mean; common practice.
const PERIOD: u32 = 6;
/// More periods than this fill no sheet.
const MOST_PERIODS: usize = 60;

/// A digital alloy that takes the place of a graded layer.
#[derive(Clone, Debug, PartialEq)]
pub struct DigitalGrade {
    /// The formulas of the two materials, that of the lower face first.
    pub formulas: [String; 2],
    /// Whole monolayers of each in each period, from the bottom up.
    pub periods: Vec<[u32; 2]>,
    /// The largest difference between the mean fraction of a period and that of the grade there.
    pub largest_miss: f64,
    /// That of the whole layer.
    pub mean_miss: f64,
}

/// The digital alloy for a graded layer of so many monolayers. `None` when no two openings have the whole grade between them,
/// when group V changes too, or when the layer is thinner than two periods or too thick for a list.
pub fn digital_grade(
    openings: &[Opening],
    stack: &Stack,
    layer: usize,
    monolayers: f64,
) -> Option<DigitalGrade> {
    let compositions = [0.0, 0.5, 1.0].map(|t| stack.composition_at(layer, t));
    let [Some(lower), Some(_), Some(upper)] = &compositions else {
        return None;
    };
    // What is not of group III stays as it is.
    if lower.with_group_three(group_three(upper)).formula() != upper.formula()
        && upper.with_group_three(group_three(lower)).formula() != lower.formula()
    {
        return None;
    }
    let wanted = |t: f64| stack.composition_at(layer, t).map(|c| group_three(&c));
    let faces = [group_three(lower), group_three(upper)];
    let found = distinct(openings);
    let mut best: Option<(f64, [[f64; 3]; 2])> = None;
    for a in &found {
        for b in &found {
            let length = squared(*a, *b);
            // The one that is richer at the upper face stands second.
            if length > 0.0
                && faces.iter().all(|face| lies_between(*a, *b, *face))
                && along(*a, *b, faces[1]) >= along(*a, *b, faces[0])
                && best.is_none_or(|(known, _)| length < known)
            {
                best = Some((length, [*a, *b]));
            }
        }
    }
    let (_, [a, b]) = best?;
    let total = monolayers.round() as u32;
    let count = total.div_ceil(PERIOD) as usize;
    if !(2..=MOST_PERIODS).contains(&count) {
        return None;
    }
    let scale = miss(a, b);
    let share = |t: f64| Some(along(a, b, wanted(t)?).clamp(0.0, 1.0));
    let mut periods = Vec::with_capacity(count);
    let (mut grown, mut placed, mut sum) = (0, 0, 0.0);
    let mut largest_miss: f64 = 0.0;
    while grown < total {
        let own = PERIOD.min(total - grown);
        let [bottom, top] = [grown, grown + own].map(|n| f64::from(n) / f64::from(total));
        // The fractions are at most quadratic in the height, for which Simpson's rule is exact.
        let mean = (share(bottom)? + 4.0 * share(0.5 * (bottom + top))? + share(top)?) / 6.0;
        sum += mean * f64::from(own);
        let of_b = ((sum.round() as u32).saturating_sub(placed)).min(own);
        placed += of_b;
        grown += own;
        periods.push([own - of_b, of_b]);
        let off = scale * (f64::from(of_b) / f64::from(own) - mean).abs();
        largest_miss = largest_miss.max(off);
    }
    Some(DigitalGrade {
        formulas: [a, b].map(|f| lower.with_group_three(f).formula()),
        periods,
        largest_miss,
        mean_miss: scale * (f64::from(placed) - sum).abs() / f64::from(total),
    })
}

fn squared(a: [f64; 3], b: [f64; 3]) -> f64 {
    (0..3).map(|e| (b[e] - a[e]).powi(2)).sum()
}

/// How far from `a` to `b` the point of the line lies that is nearest.
fn along(a: [f64; 3], b: [f64; 3], point: [f64; 3]) -> f64 {
    let product: f64 = (0..3).map(|e| (b[e] - a[e]) * (point[e] - a[e])).sum();
    product / squared(a, b)
}

fn lies_between(a: [f64; 3], b: [f64; 3], point: [f64; 3]) -> bool {
    let share = along(a, b, point).clamp(0.0, 1.0);
    let nearest: [f64; 3] = std::array::from_fn(|e| a[e] + share * (b[e] - a[e]));
    miss(nearest, point) <= COMPOSITION_TOLERANCE
}

impl DigitalGrade {
    pub fn total(&self) -> u32 {
        self.periods.iter().flatten().sum()
    }

    /// The layers as they are written in a structure file, in place of the graded layer: in each period the scarcer material in
    /// the middle, so that no period leans to one side; neighbours of one material are one layer.
    pub fn yaml(&self) -> String {
        let mut layers: Vec<(usize, u32)> = Vec::new();
        for &[first, second] in &self.periods {
            let (around, middle) = match second <= first {
                true => ((0, first), (1, second)),
                false => ((1, second), (0, first)),
            };
            let below = around.1 / 2;
            for (material, monolayers) in [(around.0, below), middle, (around.0, around.1 - below)]
            {
                match layers.last_mut() {
                    Some((last, sum)) if *last == material => *sum += monolayers,
                    _ if monolayers > 0 => layers.push((material, monolayers)),
                    _ => {}
                }
            }
        }
        let line = |(material, monolayers): &(usize, u32)| {
            let formula = &self.formulas[*material];
            format!("- {{material: {formula}, width: {monolayers} ML}}\n")
        };
        layers.iter().map(line).collect()
    }
}
