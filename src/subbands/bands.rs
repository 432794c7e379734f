//! All bands of a stack, each solved on its own.

use super::{Accuracy, Subbands, solve};
use crate::models::{Band, BandOperator, Unsuitable};
use crate::structure::{BandName, Level, Stack, Structure};

/// The solved bands, the conduction band first.
#[derive(Clone, Debug)]
pub struct Bands(Vec<Subbands>);

/// One state: the number of its band, and its own there from the band's edge, both from 0.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Place {
    pub band: usize,
    pub state: usize,
}

impl Bands {
    /// Solves each band for a number of levels. The error carries the number of the first layer that does not suit.
    pub fn solve(
        stack: &Stack,
        asked: &[(Band, usize)],
        accuracy: Accuracy,
    ) -> Result<Bands, (usize, Unsuitable)> {
        let solved = asked.iter().map(|&(band, count)| {
            let operator = BandOperator::new(stack, band)?;
            Ok(solve(&operator, count, accuracy))
        });
        Ok(Bands(solved.collect::<Result<_, _>>()?))
    }

    pub fn all(&self) -> &[Subbands] {
        &self.0
    }

    pub fn conduction(&self) -> &Subbands {
        &self.0[0]
    }

    pub fn of(&self, place: Place) -> &Subbands {
        &self.0[place.band]
    }

    pub fn energy_ev(&self, place: Place) -> f64 {
        self.of(place).energy_ev(place.state)
    }

    /// The hole states, highest first.
    pub fn holes(&self) -> Vec<Place> {
        let mut holes: Vec<Place> = (1..self.0.len())
            .flat_map(|band| (0..self.0[band].pairs.len()).map(move |state| Place { band, state }))
            .collect();
        holes.sort_by(|a, b| self.energy_ev(*b).total_cmp(&self.energy_ev(*a)));
        holes
    }

    /// How many states of each band a structure asks for: the lowest electrons, and the highest of all holes.
    pub fn asked_for(&self, structure: &Structure) -> Vec<usize> {
        let mut counts = vec![0; self.0.len()];
        counts[0] = structure.conduction.states.min(self.0[0].pairs.len());
        let wanted = structure.valence.map_or(0, |valence| valence.states);
        for place in self.holes().into_iter().take(wanted) {
            counts[place.band] += 1;
        }
        counts
    }

    /// The state that a level's name means; the last one there is when its number is too high.
    pub fn place(&self, level: Level) -> Place {
        if level.band == BandName::Valence {
            let holes = self.holes();
            let nearest = level.index.min(holes.len()).saturating_sub(1);
            if let Some(place) = holes.get(nearest) {
                return *place;
            }
        }
        let own = |band: &usize| self.0[*band].band.name() == level.band;
        let band = (0..self.0.len()).find(own).unwrap_or(0);
        let last = self.0[band].pairs.len().saturating_sub(1);
        Place {
            band,
            state: level.index.saturating_sub(1).min(last),
        }
    }

    /// The name of a state's level within its own band.
    pub fn level(&self, place: Place) -> Level {
        Level {
            band: self.of(place).band.name(),
            index: place.state + 1,
        }
    }
}
