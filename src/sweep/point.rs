//! Levels and transitions at one value of the swept number.

use super::anticrossing::{Anticrossing, Follows, names};
use super::nodes::{Along, SPARE};
use super::solution::{NotSolved, middle_ev, solved};
use crate::constants::HC_EV_UM;
use crate::models::Band;
use crate::optics::{Transition, band_transitions, interband};
use crate::structure::{BandName, Level};
use crate::subbands::{Bands, Hold, Place};

/// One point of a sweep.
#[derive(Clone, Debug, PartialEq)]
pub struct Point {
    /// Part of the way.
    pub part: f64,
    /// The swept number, in its shown unit.
    pub value: f64,
    pub found: Result<Found, NotSolved>,
}

/// What was found at a point.
#[derive(Clone, Debug, PartialEq)]
pub struct Found {
    /// Of each band, from its edge; only those that are shown.
    pub levels: Vec<Vec<LevelAt>>,
    /// In the order in which they are shown; `None` where the stack holds too few levels.
    pub transitions: Vec<Option<TransitionAt>>,
    /// What the audit of the solution objects to.
    pub faults: Vec<String>,
}

/// A level at a point.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LevelAt {
    /// By energy.
    pub level: Level,
    pub follows: Follows,
    pub energy_ev: f64,
    /// Distance from the band's edge where it is nearest to the gap, as in the table of levels.
    pub from_edge_ev: f64,
    /// Distance from that edge without the field, when the field is zero at the middle of the stack: in a field the edge
    /// itself moves with the ends of the stack.
    pub from_middle_ev: f64,
    pub error_ev: f64,
    /// Whether both outer barriers hold it.
    pub bound: bool,
    /// Whether a level of coupled bands bears the name of the other band: the gap is broken, and names count from it.
    pub inverted: bool,
}

/// A transition at a point.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TransitionAt {
    /// By energy within their bands; `valence` is resolved into heavy or light hole.
    pub from: Level,
    pub to: Level,
    pub from_follows: Follows,
    pub to_follows: Follows,
    pub energy_ev: f64,
    pub strength: Strength,
}

/// How strong a transition is.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Strength {
    /// Inside a band: |⟨from|z|to⟩| and 2 m₀ E |z|²/ħ².
    Dipole {
        dipole_nm: f64,
        oscillator_strength: f64,
    },
    /// Between a hole and an electron: the overlap of the envelopes, and the squared momentum matrix elements in units of
    /// the bulk's.
    Momentum { overlap: f64, te: f64, tm: f64 },
    /// Between heavy and light holes: there is none while they are solved apart.
    Apart,
}

impl TransitionAt {
    /// Vacuum wavelength in µm; `None` where the energy is not positive.
    pub fn wavelength_um(&self) -> Option<f64> {
        (self.energy_ev > 0.0).then(|| HC_EV_UM / self.energy_ev)
    }
}

/// What is shown at every point.
#[derive(Clone, Debug)]
pub struct Shown {
    /// The bands with the numbers of levels to solve.
    pub bands: Vec<(Band, usize)>,
    /// Levels of each band that are listed.
    pub listed: Vec<usize>,
    pub transitions: Vec<(Level, Level)>,
}

/// Solves one point.
pub fn point(along: &Along, shown: &Shown, anticrossings: &[Anticrossing], part: f64) -> Point {
    let value = along.axis.value(part);
    let found = found(along, shown, anticrossings, part);
    Point { part, value, found }
}

fn found(
    along: &Along,
    shown: &Shown,
    anticrossings: &[Anticrossing],
    part: f64,
) -> Result<Found, NotSolved> {
    let stack = along.axis.stack(along.stack, along.axis.value(part))?;
    let bands = solved(
        &stack,
        &along.structure.charge,
        &shown.bands,
        along.accuracy,
    )?;
    let names: Vec<Vec<usize>> = shown
        .bands
        .iter()
        .enumerate()
        .map(|(band, (_, count))| names(anticrossings, band, count + SPARE, part))
        .collect();
    let follows = |place: Place| {
        let names = &names[place.band];
        Follows::new(bands.band(place.band), names[place.state], names.len())
    };
    let levels = (0..bands.count()).map(|band| {
        let sign = bands.band(band).sign();
        let middle_ev = middle_ev(&stack, &bands, band);
        let states = bands.states(band).into_iter().enumerate();
        states
            .take(shown.listed[band])
            .map(|(state, own)| {
                let place = Place { band, state };
                LevelAt {
                    level: bands.level(place),
                    follows: follows(place),
                    energy_ev: own.energy_ev,
                    from_edge_ev: own.from_edge_ev,
                    from_middle_ev: sign * own.energy_ev - middle_ev,
                    error_ev: own.error_ev,
                    bound: own.hold != Hold::Walls,
                    inverted: own
                        .shares
                        .is_some_and(|shares| (shares.conduction > 0.5) != (sign > 0.0)),
                }
            })
            .collect()
    });
    let levels = levels.collect();
    let places = shown
        .transitions
        .iter()
        .map(|&(from, to)| Some((place(&bands, from)?, place(&bands, to)?)));
    let places: Vec<Option<(Place, Place)>> = places.collect();
    let inside = |band: usize| -> Vec<Transition> {
        let mut pairs = places.iter().flatten();
        match pairs.any(|(from, to)| from.band == band && to.band == band) {
            true => band_transitions(&bands, band),
            false => Vec::new(),
        }
    };
    let inside: Vec<Vec<Transition>> = (0..bands.count()).map(inside).collect();
    let across = places
        .iter()
        .flatten()
        .any(|(from, to)| (from.band == 0) != (to.band == 0));
    let across = match across {
        true => interband(&stack, &bands),
        false => Vec::new(),
    };
    let transitions = places.into_iter().map(|places| {
        let (from, to) = places?;
        let strength = if from.band == to.band {
            let own = &inside[from.band];
            let (lower, upper) = (from.state.min(to.state), from.state.max(to.state));
            let found = own
                .iter()
                .find(|t| (t.from.min(t.to), t.from.max(t.to)) == (lower, upper))?;
            Strength::Dipole {
                dipole_nm: found.dipole_nm,
                oscillator_strength: found.oscillator_strength,
            }
        } else {
            let (electron, hole) = if from.band == 0 {
                (from, to)
            } else {
                (to, from)
            };
            match across
                .iter()
                .find(|pair| pair.electron == electron && pair.hole == hole)
            {
                Some(pair) => Strength::Momentum {
                    overlap: pair.overlap,
                    te: pair.te,
                    tm: pair.tm,
                },
                None => Strength::Apart,
            }
        };
        Some(TransitionAt {
            from: bands.level(from),
            to: bands.level(to),
            from_follows: follows(from),
            to_follows: follows(to),
            energy_ev: bands.energy_ev(to) - bands.energy_ev(from),
            strength,
        })
    });
    let faults = bands.audit().faults().into_iter();
    Ok(Found {
        transitions: transitions.collect(),
        faults: faults.map(|fault| fault.to_string()).collect(),
        levels,
    })
}

/// The place of a level, if the stack holds it.
fn place(bands: &Bands, level: Level) -> Option<Place> {
    let place = bands.place(level);
    let exists = match level.band {
        BandName::Valence => level.index <= bands.holes().len(),
        _ => place.state + 1 == level.index && place.state < bands.level_count(place.band),
    };
    exists.then_some(place)
}
