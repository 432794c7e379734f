//! Sweeps: levels and transitions while one number of the stack goes through a range.

mod anticrossing;
mod axis;
mod minimum;
mod nodes;
mod part;
mod point;
mod solution;

pub use anticrossing::{Anticrossing, Follows};
pub use axis::Axis;
pub use part::Part;
pub use point::{Found, LevelAt, Point, Strength, TransitionAt};
pub use solution::NotSolved;

use crate::models::Band;
use crate::structure::{BandName, Level, Stack, Structure};
use crate::subbands::Accuracy;
use nodes::{Along, with_spare};
use point::Shown;
use rayon::prelude::*;
use std::sync::atomic::{AtomicUsize, Ordering};

/// Receives the number of points done and of all.
pub type Watch<'w> = &'w (dyn Fn(usize, usize) + Sync);

/// A sweep, or a slice of one.
#[derive(Clone, Debug)]
pub struct Outcome {
    pub axis: Axis,
    /// The bands with the numbers of their levels that are listed.
    pub bands: Vec<(BandName, usize)>,
    /// The transitions that are listed, `from` the lower.
    pub transitions: Vec<(Level, Level)>,
    /// Of the listed levels and of the whole range, also when only a slice of its points is solved.
    pub anticrossings: Vec<Anticrossing>,
    /// Whether every state was known again along the whole range.
    pub followed: bool,
    pub points: Vec<Point>,
}

/// Why there is no sweep.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum SweepError {
    #[error("the file has no `sweep` block")]
    NothingToSweep,
    #[error("no point of the sweep can be solved: {0}")]
    Unsolved(NotSolved),
}

/// Sweeps what a structure says. `points` takes the place of the file's number.
///
/// Which state is which follows from solved places of the whole range, that do not depend on the number of points nor on
/// the slice: slices of a sweep are the sweep.
///
/// # Errors
/// When there is no `sweep` block, or no place of the range can be solved.
pub fn sweep(
    structure: &Structure,
    stack: &Stack,
    points: Option<usize>,
    part: Part,
    accuracy: Accuracy,
    watch: Watch,
) -> Result<Outcome, SweepError> {
    let wish = structure.sweep.as_ref().ok_or(SweepError::NothingToSweep)?;
    let axis = Axis::new(structure, stack, wish).ok_or(SweepError::NothingToSweep)?;
    let transitions = transitions(structure);
    let bands = bands(structure, &transitions);
    let along = Along {
        structure,
        stack,
        axis: &axis,
        accuracy,
    };
    let (nodes, followed) = nodes::nodes(&along, &bands).map_err(SweepError::Unsolved)?;
    let anticrossings = anticrossing::anticrossings(&along, &nodes, &with_spare(&bands));
    // Of the holes those are listed that are among the highest anywhere on the way.
    let listed = (0..bands.len()).map(|band| {
        let asked = nodes.iter().map(|node| node.asked[band]).max().unwrap_or(0);
        asked.max(highest(&transitions, bands[band].0.name()))
    });
    let shown = Shown {
        listed: listed.collect(),
        bands,
        transitions,
    };
    let count = points.unwrap_or(wish.points).max(2);
    let range = part.range(count);
    let (done, all) = (AtomicUsize::new(0), range.len());
    let points = range
        .into_par_iter()
        .map(|index| {
            let part = index as f64 / (count - 1) as f64;
            let point = point::point(&along, &shown, &anticrossings, part);
            watch(done.fetch_add(1, Ordering::Relaxed) + 1, all);
            point
        })
        .collect();
    let names = shown.bands.iter().map(|(band, _)| band.name());
    let anticrossings = anticrossings.into_iter();
    let anticrossings =
        anticrossings.filter(|crossing| crossing.level < shown.listed[crossing.band]);
    Ok(Outcome {
        anticrossings: anticrossings.collect(),
        bands: names.zip(shown.listed).collect(),
        transitions: shown.transitions,
        followed,
        points,
        axis,
    })
}

/// The highest number of a band's own level that a transition names.
fn highest(transitions: &[(Level, Level)], band: BandName) -> usize {
    let levels = transitions.iter().flat_map(|&(from, to)| [from, to]);
    let own = levels.filter(|level| level.band == band);
    own.map(|level| level.index).max().unwrap_or(0)
}

/// The bands to solve, with as many levels as are asked for and as transitions name.
fn bands(structure: &Structure, transitions: &[(Level, Level)]) -> Vec<(Band, usize)> {
    let mut bands = Band::of(structure);
    for (band, count) in &mut bands {
        *count = (*count).max(highest(transitions, band.name()));
        if band.sign() < 0.0 {
            *count = (*count).max(highest(transitions, BandName::Valence));
        }
    }
    bands
}

/// The transitions that are listed: those of `show`, or those that aims and windows name, or all neighbouring levels.
fn transitions(structure: &Structure) -> Vec<(Level, Level)> {
    let wished = structure.sweep.iter().flat_map(|sweep| &sweep.show);
    let mut list: Vec<(Level, Level)> = wished.copied().collect();
    if !list.is_empty() {
        return list;
    }
    let aims = structure.tune.iter().flat_map(|tune| &tune.aims);
    let windows = structure.tolerance.iter().flat_map(|t| &t.windows);
    for pair in aims
        .map(|aim| (aim.from, aim.to))
        .chain(windows.map(|window| (window.from, window.to)))
    {
        if !list.contains(&pair) {
            list.push(pair);
        }
    }
    if !list.is_empty() {
        return list;
    }
    let level = |band: BandName, index: usize| Level { band, index };
    if structure.valence.is_some() {
        list.push((level(BandName::Valence, 1), level(BandName::Conduction, 1)));
    }
    let neighbours = (1..structure.conduction.states).map(|index| {
        let band = BandName::Conduction;
        (level(band, index), level(band, index + 1))
    });
    list.extend(neighbours);
    list
}
