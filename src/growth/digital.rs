//! Digital alloys: two materials that the cells do give, a few monolayers of each in turn, with the mean of a composition
//! that they do not give.
//!
//! Coherent monolayers hold equally many group-III atoms, so the mean fraction of n_a monolayers of A and n_b of B is
//! (n_a x_a + n_b x_b)/(n_a + n_b) exactly.

use super::openings::{Opening, miss};
use crate::materials::{Composition, Library, strain};

/// Longer periods form wells of their own instead of an alloy, in monolayers; common practice.
const LONGEST_PERIOD: u32 = 12;
/// A mean this near counts as the wanted one: calibrations of a composition are hardly better.
pub const COMPOSITION_TOLERANCE: f64 = 0.002;
/// Layers strained more than this are used only where nothing else serves.
const HIGH_STRAIN: f64 = 0.02;

/// A digital alloy that takes the place of one layer.
#[derive(Clone, Debug, PartialEq)]
pub struct Digital {
    /// The formulas of the two materials, the lower one first.
    pub formulas: [String; 2],
    /// Whole monolayers of each in one period.
    pub monolayers: [u32; 2],
    pub repeats: u32,
    /// Whole monolayers of each after the last full period.
    pub rest: [u32; 2],
    /// The mean of the whole.
    pub mean: Composition,
    /// The larger strain of the two materials.
    pub strain: f64,
}

/// The digital alloy for a layer of so many monolayers; `None` when it is too thin for two periods, or nothing comes
/// nearer than the best single opening.
pub fn digital(
    openings: &[Opening],
    wanted: &Composition,
    fractions: [f64; 3],
    monolayers: f64,
    strain_of: impl Fn([f64; 3]) -> f64,
) -> Option<Digital> {
    let total = monolayers.round() as u32;
    let distinct = distinct(openings);
    let best_single = distinct
        .iter()
        .map(|single| miss(*single, fractions))
        .fold(f64::INFINITY, f64::min);
    let strains: Vec<f64> = distinct.iter().map(|single| strain_of(*single)).collect();
    // Beyond tolerance the miss counts first, then strain, then the period.
    let mut best: Option<((f64, bool, u32, f64), Digital)> = None;
    for (i, a) in distinct.iter().enumerate() {
        for (j, b) in distinct.iter().enumerate().skip(i + 1) {
            let Some(share) = projection(*a, *b, fractions) else {
                continue;
            };
            for period in 2..=LONGEST_PERIOD.min(total / 2) {
                let of_b = ((f64::from(period) * share).round() as u32).clamp(1, period - 1);
                let repeats = total / period;
                let left = total - repeats * period;
                let rest_b = (f64::from(left) * share).round() as u32;
                let (all_b, all) = (f64::from(repeats * of_b + rest_b), f64::from(total));
                let mean: [f64; 3] =
                    std::array::from_fn(|e| (a[e] * (all - all_b) + b[e] * all_b) / all);
                let off = miss(mean, fractions);
                let most = strains[i].abs().max(strains[j].abs());
                let score = (
                    if off <= COMPOSITION_TOLERANCE {
                        0.0
                    } else {
                        off
                    },
                    most > HIGH_STRAIN,
                    period,
                    off,
                );
                if off < best_single && best.as_ref().is_none_or(|(known, _)| score < *known) {
                    best = Some((
                        score,
                        Digital {
                            formulas: [a, b].map(|f| wanted.with_group_three(*f).formula()),
                            monolayers: [period - of_b, of_b],
                            repeats,
                            rest: [left - rest_b, rest_b],
                            mean: wanted.with_group_three(mean),
                            strain: if strains[i].abs() > strains[j].abs() {
                                strains[i]
                            } else {
                                strains[j]
                            },
                        },
                    ));
                }
            }
        }
    }
    best.map(|(_, digital)| digital)
}

/// The strain of a composition on a substrate; 0 where it is not known.
pub fn strain_on(
    library: &Library,
    temperature_k: f64,
    substrate_nm: Option<f64>,
    composition: &Composition,
) -> f64 {
    let known = || {
        let material = library.resolve(composition, temperature_k).ok()?;
        Some(strain(&material, substrate_nm?)?.in_plane)
    };
    known().unwrap_or(0.0)
}

/// The compositions of the openings, each once.
pub(super) fn distinct(openings: &[Opening]) -> Vec<[f64; 3]> {
    let mut found: Vec<[f64; 3]> = Vec::new();
    for opening in openings {
        if !found
            .iter()
            .any(|known| miss(*known, opening.fractions) < 1e-9)
        {
            found.push(opening.fractions);
        }
    }
    found
}

/// How far from `a` to `b` the point lies that is nearest to `wanted`, when it lies between them.
fn projection(a: [f64; 3], b: [f64; 3], wanted: [f64; 3]) -> Option<f64> {
    let along: f64 = (0..3).map(|e| (b[e] - a[e]) * (wanted[e] - a[e])).sum();
    let length: f64 = (0..3).map(|e| (b[e] - a[e]).powi(2)).sum();
    let share = along / length;
    (share > 0.0 && share < 1.0).then_some(share)
}

impl Digital {
    /// Whole monolayers of one period.
    pub fn period(&self) -> u32 {
        self.monolayers[0] + self.monolayers[1]
    }

    /// Whole monolayers of all.
    pub fn total(&self) -> u32 {
        self.period() * self.repeats + self.rest[0] + self.rest[1]
    }

    /// The layers as they are written in a structure file, in place of the layer.
    pub fn yaml(&self) -> String {
        let layer = |index: usize, monolayers: u32| {
            format!(
                "{{material: {}, width: {monolayers} ML}}",
                self.formulas[index]
            )
        };
        let mut text = format!(
            "- repeat: {}\n  layers:\n    - {}\n    - {}\n",
            self.repeats,
            layer(0, self.monolayers[0]),
            layer(1, self.monolayers[1])
        );
        for (index, rest) in self.rest.into_iter().enumerate() {
            if rest > 0 {
                text.push_str(&format!("- {}\n", layer(index, rest)));
            }
        }
        text
    }
}
