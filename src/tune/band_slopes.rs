//! Exact slopes of a band's energies and dipoles along the knobs of a task.

use crate::models::BandOperator;
use crate::numerics::matrix_sensitivity::{self, MatrixChange, MatrixPairSlope};
use crate::numerics::sensitivity::{self, Change, PairSlope};
use crate::structure::{Knob, Stack};
use crate::subbands::multiband::Band as Side;
use crate::subbands::{Coupled, Solution, Subbands, change, coupled_change};
use std::collections::HashMap;

/// A solved band with its changes along each knob, and the slopes of states that have been asked for.
pub(super) enum BandSlopes<'b> {
    Alone {
        subbands: &'b Subbands,
        changes: Vec<Change>,
        pairs: HashMap<usize, Vec<PairSlope>>,
    },
    Coupled {
        coupled: &'b Coupled,
        side: Side,
        changes: Vec<MatrixChange>,
        pairs: HashMap<usize, Vec<MatrixPairSlope>>,
    },
}

impl<'b> BandSlopes<'b> {
    pub fn new(stack: &Stack, solution: Solution<'b>, knobs: &[Knob]) -> Self {
        // What was solved has its operator: nothing is left out.
        match solution {
            Solution::Alone(subbands) => {
                let operator = BandOperator::new(stack, subbands.band).ok();
                let changes = knobs
                    .iter()
                    .filter_map(|&knob| Some(change(operator.as_ref()?, &subbands.pencil, knob)));
                BandSlopes::Alone {
                    subbands,
                    changes: changes.collect(),
                    pairs: HashMap::new(),
                }
            }
            Solution::Coupled(coupled, side) => {
                let changes = knobs.iter();
                BandSlopes::Coupled {
                    coupled,
                    side,
                    changes: changes
                        .filter_map(|&knob| coupled_change(stack, coupled, knob).ok())
                        .collect(),
                    pairs: HashMap::new(),
                }
            }
        }
    }

    /// The slope of a state's energy along one of the knobs, in eV.
    pub fn energy(&self, state: usize, knob: usize) -> f64 {
        match self {
            BandSlopes::Alone {
                subbands, changes, ..
            } => changes.get(knob).map_or(0.0, |change| {
                let pair = &subbands.pairs[state];
                subbands.band.sign() * sensitivity::value_slope(&subbands.pencil, change, pair)
            }),
            BandSlopes::Coupled {
                coupled,
                side,
                changes,
                ..
            } => changes.get(knob).map_or(0.0, |change| {
                let at = |element, q| coupled.at(element, q);
                let pair = &coupled.pairs(*side)[state];
                matrix_sensitivity::value_slope(coupled.pencil(), at, change, pair)
            }),
        }
    }

    /// The slope of |⟨i|z|j⟩| along one of the knobs, in nm.
    pub fn dipole(&mut self, i: usize, j: usize, knob: usize) -> f64 {
        match self {
            BandSlopes::Alone {
                subbands,
                changes,
                pairs,
            } => {
                let pencil = &subbands.pencil;
                for state in [i, j] {
                    pairs.entry(state).or_insert_with(|| {
                        sensitivity::pair_slopes(pencil, changes, &subbands.pairs[state])
                    });
                }
                let [a, b] = [i, j].map(|state| &subbands.pairs[state]);
                let sign = sensitivity::moment(pencil, a, b).signum();
                changes.get(knob).map_or(0.0, |change| {
                    let [from, to] = [(a, &pairs[&i][knob]), (b, &pairs[&j][knob])];
                    sign * sensitivity::moment_slope(pencil, change, from, to)
                })
            }
            BandSlopes::Coupled {
                coupled,
                side,
                changes,
                pairs,
            } => {
                let pencil = coupled.pencil();
                let states = coupled.pairs(*side);
                let known = coupled.all_pairs();
                for state in [i, j] {
                    pairs.entry(state).or_insert_with(|| {
                        let at = |element, q| coupled.at(element, q);
                        let slope = |change| {
                            matrix_sensitivity::pair_slope(
                                pencil,
                                at,
                                change,
                                &known,
                                &states[state],
                            )
                        };
                        changes.iter().map(slope).collect()
                    });
                }
                let [a, b] = [i, j].map(|state| &states[state]);
                let sign = matrix_sensitivity::moment(pencil, &a.vector, &b.vector).signum();
                changes.get(knob).map_or(0.0, |change| {
                    let [from, to] = [(a, &pairs[&i][knob]), (b, &pairs[&j][knob])];
                    sign * matrix_sensitivity::moment_slope(pencil, change, from, to)
                })
            }
        }
    }
}
