//! Levels that come near each other and exchange their characters, and the names that states carry through.
//!
//! A state is named by its number at the lower end of the range. Where the gap between two neighbouring levels has a
//! minimum, the states on both sides of it are compared: when each is more like the other one across, the names change
//! places at the minimum. So a name belongs to a character, it depends on the place alone, and a broad anticrossing that
//! the range only begins to enter changes no name.

use super::minimum::least_gap;
use super::nodes::{Along, Node};
use crate::models::Band;
use crate::structure::Level;
use rayon::prelude::*;

/// The states are compared where the gap has grown to this many times its least: by the two-level model the exchange is
/// three quarters done there.
const GROWN: f64 = 2.0;
/// A minimum must be below its surroundings by this part: rounding of levels that do not move is none.
const DIP: f64 = 1e-6;

/// Two followed states at their least distance.
#[derive(Clone, Debug, PartialEq)]
pub struct Anticrossing {
    /// Number of the band.
    pub band: usize,
    /// The nearer of the two levels to the band's edge, counted from 0; the other is the next one.
    pub level: usize,
    /// The states of the two levels below this place; above it they are exchanged.
    pub follows: [Follows; 2],
    /// Part of the way.
    pub part: f64,
    /// The full gap.
    pub gap_ev: f64,
    /// Both levels there, counted from the band's edge as `LevelAt::from_middle_ev`.
    pub from_middle_ev: [f64; 2],
    /// Whether the search for the minimum settled.
    pub settled: bool,
}

/// Which state of the lower end of the range a state is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Follows {
    Level(Level),
    /// One from this level on: it has come from beyond those that are followed.
    FromOn(Level),
}

impl Follows {
    /// `name` counts from 0 among `count` names.
    pub fn new(band: Band, name: usize, count: usize) -> Follows {
        let level = Level {
            band: band.name(),
            index: name + 1,
        };
        if name + 1 == count {
            Follows::FromOn(level)
        } else {
            Follows::Level(level)
        }
    }

    pub fn level(self) -> Level {
        match self {
            Follows::Level(level) | Follows::FromOn(level) => level,
        }
    }
}

/// All anticrossings along solved places, in their order. `bands` are those that the nodes were solved for.
pub fn anticrossings(along: &Along, nodes: &[Node], bands: &[(Band, usize)]) -> Vec<Anticrossing> {
    let mut candidates = Vec::new();
    for (band, &(_, count)) in bands.iter().enumerate() {
        for level in 0..count.saturating_sub(1) {
            candidates.extend(dips(nodes, band, level).map(|at| (band, level, at)));
        }
    }
    let mut found: Vec<Anticrossing> = candidates
        .into_par_iter()
        .filter(|&(band, level, at)| is_exchange(nodes, band, level, at))
        .filter_map(|(band, level, at)| {
            let gap = |node: &Node| Some((node.part, node.gap_ev(band, level)?));
            let bracket = [gap(&nodes[at - 1])?, gap(&nodes[at])?, gap(&nodes[at + 1])?];
            let least = least_gap(bracket, |part| {
                along.node(part, bands).ok()?.gap_ev(band, level)
            })?;
            let there = along.node(least.part, bands).ok()?;
            let from_middle =
                |level: usize| Some(there.energies_ev[band].get(level)? - there.middles_ev[band]);
            let (of, count) = bands[band];
            Some(Anticrossing {
                band,
                level,
                follows: [level, level + 1].map(|name| Follows::new(of, name, count)),
                part: least.part,
                from_middle_ev: [from_middle(level)?, from_middle(level + 1)?],
                gap_ev: least.gap_ev,
                settled: least.settled,
            })
        })
        .collect();
    found.sort_by(|a, b| a.part.total_cmp(&b.part));
    for (band, &(of, count)) in bands.iter().enumerate() {
        let mut names: Vec<usize> = (0..count).collect();
        for crossing in found.iter_mut().filter(|crossing| crossing.band == band) {
            let level = crossing.level;
            crossing.follows =
                [names[level], names[level + 1]].map(|name| Follows::new(of, name, count));
            exchange(&mut names, level);
        }
    }
    found
}

/// The nodes at which a gap is least among its neighbours.
fn dips(nodes: &[Node], band: usize, level: usize) -> impl Iterator<Item = usize> + '_ {
    (1..nodes.len().saturating_sub(1)).filter(move |&at| {
        let gap = |at: usize| nodes[at].gap_ev(band, level);
        match (gap(at - 1), gap(at), gap(at + 1)) {
            (Some(before), Some(here), Some(after)) => {
                // Of two equal ones the first counts.
                here < before && here <= after && before.max(after) > here * (1.0 + DIP)
            }
            _ => false,
        }
    })
}

/// Whether the two states around a dip have changed characters from one side to the other.
fn is_exchange(nodes: &[Node], band: usize, level: usize, at: usize) -> bool {
    let gap = |at: usize| nodes[at].gap_ev(band, level).unwrap_or(0.0);
    let grown = |side: usize| gap(side) >= GROWN * gap(at);
    let (mut below, mut above) = (at - 1, at + 1);
    while below > 0 && !grown(below) && gap(below - 1) > gap(below) {
        below -= 1;
    }
    while above + 1 < nodes.len() && !grown(above) && gap(above + 1) > gap(above) {
        above += 1;
    }
    let (a, b) = (&nodes[below], &nodes[above]);
    let alike = |own: usize, theirs: usize| a.alike(b, band, own, theirs);
    let kept = alike(level, level) + alike(level + 1, level + 1);
    let exchanged = alike(level, level + 1) + alike(level + 1, level);
    exchanged > kept
}

/// Lets a level and the next one exchange their names. The last level lets go of what comes to it, since it may go on
/// from there among levels that are not solved, and gives what has its own name.
fn exchange(names: &mut [usize], level: usize) {
    names.swap(level, level + 1);
    if let Some(last) = names.len().checked_sub(1) {
        names[last] = last;
    }
}

/// The names of the levels of a band at a place: `names[level]` is the number that the state had at the lower end.
pub fn names(anticrossings: &[Anticrossing], band: usize, count: usize, part: f64) -> Vec<usize> {
    let mut names: Vec<usize> = (0..count).collect();
    let passed = anticrossings
        .iter()
        .filter(|c| c.band == band && c.part < part);
    for crossing in passed {
        if crossing.level + 1 < count {
            exchange(&mut names, crossing.level);
        }
    }
    names
}
