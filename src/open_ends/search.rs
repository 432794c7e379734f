//! The states of a stack from low energies upward, window by window, until as many are certain as are wanted.
//!
//! A window ends in the widest gap between the next few levels of the stack between walls: the border of a count is then
//! short of turns and far from states.

use super::line::Line;
use crate::numerics::complex_banded::C64;
use crate::numerics::eigenpairs::{self, Eigenpair};
use crate::numerics::outgoing::{Outgoing, Region, Work, all_in};
use crate::numerics::pencil::Pencil;

/// Which states are wanted: no more than `states`, the lowest of an energy range in eV.
#[derive(Clone, Copy, Debug)]
pub struct Wanted {
    pub states: usize,
    pub range_ev: [f64; 2],
}

impl Wanted {
    /// The lowest of all.
    pub fn lowest(states: usize) -> Wanted {
        Wanted {
            states,
            range_ev: [f64::NEG_INFINITY, f64::INFINITY],
        }
    }
}

/// Levels between walls in one window; their number doubles from window to window.
const LEVELS: [usize; 2] = [4, 32];
/// A window does not end in a narrower gap, in eV.
const NARROWEST_GAP_EV: f64 = 1e-6;
/// Bisections for the end of a window.
const MAX_BISECTIONS: usize = 60;
/// Factorisations that the description of one state takes.
const DESCRIPTION: usize = 30;

/// What was found, and up to where all of it.
pub(super) struct Searched {
    /// Ascending in energy.
    pub states: Vec<Outgoing>,
    pub counted: usize,
    pub top_ev: f64,
    /// Whether the work allowed was enough.
    pub complete: bool,
}

/// Searches adjoining regions, ascending in energy. `walls` is the stack between walls on the elements of `line`.
pub(super) fn upward(
    line: &Line,
    walls: &Pencil,
    regions: &[Region],
    wanted: usize,
    work: &mut Work,
) -> Searched {
    let mut searched = Searched {
        states: Vec::new(),
        counted: 0,
        top_ev: f64::NEG_INFINITY,
        complete: true,
    };
    let (Some(first), Some(last)) = (regions.first(), regions.last()) else {
        return searched;
    };
    searched.top_ev = first.low;
    let mut levels = wanted.clamp(LEVELS[0], LEVELS[1]);
    while searched.top_ev < last.high && searched.states.len() < wanted {
        let low_ev = searched.top_ev;
        let (high_ev, pairs) = window(walls, [low_ev, last.high], levels);
        let guesses: Vec<(C64, Vec<C64>)> = pairs
            .iter()
            .map(|pair| (C64::from(pair.value), line.embed(&pair.vector)))
            .collect();
        let (mut states, mut counted) = (Vec::new(), 0);
        for region in regions {
            let part = Region {
                low: region.low.max(low_ev),
                high: region.high.min(high_ev),
                ..*region
            };
            if part.low >= part.high {
                continue;
            }
            let Some(found) = all_in(&line.pencil, &part, &guesses, work) else {
                searched.complete = false;
                return searched;
            };
            states.extend(found.states);
            counted += found.counted;
        }
        let described = states.len().min(wanted - searched.states.len());
        if !work.spend(&line.pencil, DESCRIPTION * described) {
            searched.complete = false;
            return searched;
        }
        searched.states.extend(states);
        searched.counted += counted;
        searched.top_ev = high_ev;
        levels = (2 * levels).min(LEVELS[1]);
    }
    searched
}

/// The end of a window from `low_ev` on that holds `levels` levels between walls or a few more, with these levels.
fn window(walls: &Pencil, [low_ev, end_ev]: [f64; 2], mut levels: usize) -> (f64, Vec<Eigenpair>) {
    let below = eigenpairs::count_below(walls, low_ev);
    let all = eigenpairs::count_below(walls, end_ev).saturating_sub(below);
    while levels + 1 < all {
        let (mut near_ev, mut far_ev) = (low_ev, end_ev);
        for _ in 0..MAX_BISECTIONS {
            let middle_ev = 0.5 * (near_ev + far_ev);
            let count = eigenpairs::count_below(walls, middle_ev).saturating_sub(below);
            if count <= levels {
                near_ev = middle_ev;
            } else {
                far_ev = middle_ev;
                if count <= 2 * levels {
                    break;
                }
            }
        }
        let mut pairs = eigenpairs::between(walls, low_ev, far_ev);
        let gap = |k: usize| pairs[k].value - pairs[k - 1].value;
        let widest = (levels..pairs.len()).max_by(|a, b| gap(*a).total_cmp(&gap(*b)));
        if let Some(k) = widest.filter(|k| gap(*k) > NARROWEST_GAP_EV) {
            let border_ev = 0.5 * (pairs[k - 1].value + pairs[k].value);
            pairs.truncate(k);
            return (border_ev, pairs);
        }
        levels *= 2;
    }
    (end_ev, eigenpairs::between(walls, low_ev, end_ev))
}
