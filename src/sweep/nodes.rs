//! Solved places along a sweep, near enough to one another for every state to be known again from place to place.
//!
//! They are the same whatever the number of points, and whatever slice of them is asked for.

use super::Axis;
use super::solution::{NotSolved, middle_ev, solved, values_ev};
use crate::models::Band;
use crate::structure::{Stack, Structure};
use crate::subbands::Accuracy;
use rayon::prelude::*;

/// Intervals that the range is cut into to begin with: an anticrossing of a field sweep is seldom narrower than a
/// thirtieth of it, and narrower ones are found by the states that change places.
const INTERVALS: usize = 32;
/// A state is known again when its squared overlap with itself at the next place is above this: no other can have more.
const ALIKE: f64 = 0.5;
/// Intervals are halved so often at most: two levels that cross in less than a thirty-thousandth of the range change
/// places between two of these.
const MOST_HALVINGS: usize = 10;
/// No more places than this are solved for.
const MOST_NODES: usize = 3000;
/// Levels beyond those that are shown. The last one is where states come from that are not solved, and go to: it is
/// followed no further.
pub const SPARE: usize = 2;

/// A solved place.
#[derive(Clone, Debug)]
pub struct Node {
    /// Part of the way.
    pub part: f64,
    /// Of each band, from its edge: on the solver's scale, ascending, in eV.
    pub energies_ev: Vec<Vec<f64>>,
    /// Where the levels of each band are counted from in pictures, on the same scale.
    pub middles_ev: Vec<f64>,
    /// Envelopes at the same fractions of all layers, each of norm 1.
    envelopes: Vec<Vec<Vec<f64>>>,
    /// Levels of each band that the structure asks for.
    pub asked: Vec<usize>,
}

impl Node {
    /// The squared overlap of a state here with one elsewhere.
    pub fn alike(&self, other: &Node, band: usize, own: usize, theirs: usize) -> f64 {
        let (a, b) = (
            self.envelopes[band].get(own),
            other.envelopes[band].get(theirs),
        );
        let (Some(a), Some(b)) = (a, b) else {
            return 0.0;
        };
        let overlap: f64 = a.iter().zip(b).map(|(a, b)| a * b).sum();
        overlap * overlap
    }

    /// The distance of a level of a band to the next one away from the band's edge, in eV.
    pub fn gap_ev(&self, band: usize, lower: usize) -> Option<f64> {
        let levels = self.energies_ev.get(band)?;
        Some(levels.get(lower + 1)? - levels.get(lower)?)
    }
}

/// How stacks along the way are solved.
#[derive(Clone, Copy, Debug)]
pub struct Along<'s> {
    pub structure: &'s Structure,
    pub stack: &'s Stack,
    pub axis: &'s Axis,
    pub accuracy: Accuracy,
}

impl Along<'_> {
    pub fn node(&self, part: f64, bands: &[(Band, usize)]) -> Result<Node, NotSolved> {
        let stack = self.axis.stack(self.stack, self.axis.value(part))?;
        let found = solved(&stack, &self.structure.charge, bands, self.accuracy)?;
        let count = 0..found.count();
        let envelopes = count.clone().map(|band| {
            let mut all = found.layer_envelopes(band, &stack);
            for envelope in &mut all {
                let norm = envelope.iter().map(|v| v * v).sum::<f64>().sqrt();
                // With an energy-dependent mass part of the norm lies in the valence components.
                envelope.iter_mut().for_each(|v| *v /= norm);
            }
            all
        });
        let energies_ev = count.clone().map(|band| values_ev(&found, band));
        let middles_ev = count.map(|band| middle_ev(&stack, &found, band));
        Ok(Node {
            part,
            envelopes: envelopes.collect(),
            middles_ev: middles_ev.collect(),
            energies_ev: energies_ev.collect(),
            asked: found.asked_for(self.structure),
        })
    }
}

/// The places along the whole way, and whether every state is known again from one to the next. Those that cannot be
/// solved are left out.
///
/// `bands` holds the numbers of levels that are shown; [`SPARE`] more are solved.
///
/// # Errors
/// When no place can be solved: the reason at the first one.
pub fn nodes(along: &Along, bands: &[(Band, usize)]) -> Result<(Vec<Node>, bool), NotSolved> {
    let more = with_spare(bands);
    let solve = |part: f64| along.node(part, &more);
    let parts: Vec<f64> = (0..=INTERVALS)
        .map(|k| k as f64 / INTERVALS as f64)
        .collect();
    let first: Vec<Result<Node, NotSolved>> = parts.into_par_iter().map(solve).collect();
    let mut nodes = Vec::new();
    let mut refused = None;
    for node in first {
        match node {
            Ok(node) => nodes.push(node),
            Err(reason) => {
                refused.get_or_insert(reason);
            }
        }
    }
    if let (true, Some(reason)) = (nodes.is_empty(), refused) {
        return Err(reason);
    }
    for _ in 0..MOST_HALVINGS {
        let halves: Vec<f64> = nodes
            .windows(2)
            .filter(|pair| !is_followed(&pair[0], &pair[1], &more))
            .map(|pair| 0.5 * (pair[0].part + pair[1].part))
            .collect();
        if halves.is_empty() || nodes.len() + halves.len() > MOST_NODES {
            break;
        }
        let between: Vec<Node> = halves
            .into_par_iter()
            .filter_map(|part| solve(part).ok())
            .collect();
        nodes.extend(between);
        nodes.sort_by(|a, b| a.part.total_cmp(&b.part));
    }
    let followed = nodes.windows(2).all(|pair| {
        is_followed(&pair[0], &pair[1], &more) || change_places(&pair[0], &pair[1], &more)
    });
    Ok((nodes, followed))
}

/// The bands with the spare levels.
pub fn with_spare(bands: &[(Band, usize)]) -> Vec<(Band, usize)> {
    let more = |&(band, count): &(Band, usize)| (band, count + SPARE);
    bands.iter().map(more).collect()
}

/// Whether every state but the last keeps its number from one place to the next.
fn is_followed(a: &Node, b: &Node, bands: &[(Band, usize)]) -> bool {
    bands.iter().enumerate().all(|(band, &(_, count))| {
        let solved = |node: &Node| node.energies_ev[band].len();
        (0..(count - 1).min(solved(a)).min(solved(b)))
            .all(|state| a.alike(b, band, state, state) > ALIKE)
    })
}

/// Whether every state but the last keeps its number or changes places with a neighbour.
fn change_places(a: &Node, b: &Node, bands: &[(Band, usize)]) -> bool {
    bands.iter().enumerate().all(|(band, &(_, count))| {
        let solved = |node: &Node| node.energies_ev[band].len();
        (0..(count - 1).min(solved(a)).min(solved(b))).all(|state| {
            (state.saturating_sub(1)..=state + 1).any(|other| {
                a.alike(b, band, state, other) > ALIKE && a.alike(b, band, other, state) > ALIKE
            })
        })
    })
}
