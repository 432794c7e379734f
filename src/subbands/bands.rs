//! All bands of a stack: those that are solved on their own, and those that are coupled.

use super::coupled::Coupled;
use super::multiband::{Band as Side, Wanted};
use super::state::{self, State};
use super::{Accuracy, Audit, Subbands, envelope, layer_envelopes, solve};
use crate::models::{Band, BandOperator, Unsuitable};
use crate::numerics::mesh::Mesh;
use crate::numerics::sensitivity::moment;
use crate::structure::{BandName, Level, Stack, Structure};
use std::sync::Arc;

/// The solved bands, the conduction band first.
#[derive(Clone, Debug)]
pub struct Bands(Vec<(Band, Solved)>);

#[derive(Clone, Debug)]
enum Solved {
    Alone(Box<Subbands>),
    /// One side of the gap of a solution that both sides share.
    Coupled(Arc<Coupled>, Side),
}

/// The solution that a band belongs to.
#[derive(Clone, Copy, Debug)]
pub enum Solution<'b> {
    Alone(&'b Subbands),
    /// One side of the gap.
    Coupled(&'b Coupled, Side),
}

/// One state: the number of its band, and its own there from the band's edge, both from 0.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Place {
    pub band: usize,
    pub state: usize,
}

impl Bands {
    /// Solves each band for a number of levels. The error carries the number of the first layer that does not suit.
    ///
    /// # Errors
    /// Why the material of a layer does not suit a model.
    pub fn solve(
        stack: &Stack,
        asked: &[(Band, usize)],
        accuracy: Accuracy,
    ) -> Result<Bands, (usize, Unsuitable)> {
        let side = |band: Band| match band.name() {
            BandName::Conduction => Side::Conduction,
            _ => Side::Valence,
        };
        let mut wanted = Wanted {
            conduction: 0,
            valence: 0,
        };
        for &(band, count) in asked {
            match (band.coupled(), side(band)) {
                (None, _) => {}
                (Some(_), Side::Conduction) => wanted.conduction = count,
                (Some(_), Side::Valence) => wanted.valence = count,
            }
        }
        let mut shared: Option<Arc<Coupled>> = None;
        let solved = asked.iter().map(|&(band, count)| {
            let Some(model) = band.coupled() else {
                let operator = BandOperator::new(stack, band)?;
                let subbands = Box::new(solve(&operator, count, accuracy));
                return Ok((band, Solved::Alone(subbands)));
            };
            let coupled = match &shared {
                Some(known) => known.clone(),
                None => Arc::new(Coupled::solve(stack, model, wanted, accuracy)?),
            };
            shared = Some(coupled.clone());
            Ok((band, Solved::Coupled(coupled, side(band))))
        });
        Ok(Bands(solved.collect::<Result<_, _>>()?))
    }

    /// The same with no more than so many levels of each band that was solved on its own.
    pub fn truncated(mut self, counts: &[usize]) -> Bands {
        for ((_, solved), count) in self.0.iter_mut().zip(counts) {
            if let Solved::Alone(subbands) = solved {
                subbands.pairs.truncate(*count);
                subbands.errors_ev.truncate(*count);
            }
        }
        self
    }

    /// Number of bands.
    pub fn count(&self) -> usize {
        self.0.len()
    }

    pub fn band(&self, band: usize) -> Band {
        self.0[band].0
    }

    /// The conduction band, where it was solved on its own.
    pub fn conduction(&self) -> Option<&Subbands> {
        match self.solution(0) {
            Solution::Alone(subbands) => Some(subbands),
            Solution::Coupled(..) => None,
        }
    }

    /// The bands that were solved on their own.
    pub fn alone(&self) -> impl Iterator<Item = &Subbands> {
        self.0.iter().filter_map(|(_, solved)| match solved {
            Solved::Alone(subbands) => Some(&**subbands),
            Solved::Coupled(..) => None,
        })
    }

    /// The solution of the coupled bands.
    pub fn coupled(&self) -> Option<&Coupled> {
        self.0.iter().find_map(|(_, solved)| match solved {
            Solved::Alone(_) => None,
            Solved::Coupled(coupled, _) => Some(&**coupled),
        })
    }

    pub fn solution(&self, band: usize) -> Solution<'_> {
        match &self.0[band].1 {
            Solved::Alone(subbands) => Solution::Alone(subbands),
            Solved::Coupled(coupled, side) => Solution::Coupled(coupled, *side),
        }
    }

    /// How many states of a band were solved for.
    pub fn level_count(&self, band: usize) -> usize {
        match self.solution(band) {
            Solution::Alone(subbands) => subbands.pairs.len(),
            Solution::Coupled(coupled, side) => coupled.pairs(side).len(),
        }
    }

    pub fn energy_ev(&self, place: Place) -> f64 {
        match self.solution(place.band) {
            Solution::Alone(subbands) => subbands.energy_ev(place.state),
            Solution::Coupled(coupled, side) => coupled.pairs(side)[place.state].value,
        }
    }

    /// The edge of a band where it is nearest to the gap, with the field, in eV.
    pub fn edge_ev(&self, band: usize) -> f64 {
        match self.solution(band) {
            // Floors of hole bands are those of minus the energy.
            Solution::Alone(subbands) => subbands.band.sign() * subbands.pencil.floor(),
            Solution::Coupled(coupled, side) => coupled.edge_ev(side),
        }
    }

    /// What is known of each state of a band, those nearest the band's edge first.
    pub fn states(&self, band: usize) -> Vec<State> {
        match self.solution(band) {
            Solution::Alone(subbands) => subbands.states(),
            Solution::Coupled(coupled, side) => coupled.states(side),
        }
    }

    /// The probability density of a state at the nodes of each element of a mesh, in 1/nm: all its components together.
    pub fn density(&self, place: Place) -> (&Mesh, Vec<f64>) {
        match self.solution(place.band) {
            Solution::Alone(subbands) => {
                (&subbands.pencil.mesh, state::density(subbands, place.state))
            }
            Solution::Coupled(coupled, side) => {
                (&coupled.pencil().mesh, coupled.density(side, place.state))
            }
        }
    }

    /// √(w ρ) of every state of a band at the nodes of each element; see [`amplitudes`](super::amplitudes).
    pub fn amplitudes(&self, band: usize) -> Vec<Vec<f64>> {
        match self.solution(band) {
            Solution::Alone(subbands) => envelope::amplitudes(subbands),
            Solution::Coupled(coupled, side) => coupled.amplitudes(side),
        }
    }

    /// Every state's functions for comparison with those of another stack; see [`layer_envelopes`].
    pub fn layer_envelopes(&self, band: usize, stack: &Stack) -> Vec<Vec<f64>> {
        match self.solution(band) {
            Solution::Alone(subbands) => layer_envelopes(subbands, stack),
            Solution::Coupled(coupled, side) => coupled.layer_envelopes(side, stack),
        }
    }

    /// |⟨i|z|j⟩| of two states of one band, in nm.
    pub fn dipole_nm(&self, band: usize, i: usize, j: usize) -> f64 {
        match self.solution(band) {
            Solution::Alone(Subbands { pencil, pairs, .. }) => {
                moment(pencil, &pairs[i], &pairs[j]).abs()
            }
            Solution::Coupled(coupled, side) => coupled.dipole_nm(side, i, j),
        }
    }

    /// Number of states of a band that lie nearer to its edge than both outer barriers.
    pub fn bound_count(&self, band: usize) -> usize {
        match self.solution(band) {
            Solution::Alone(subbands) => subbands.bound_count(),
            Solution::Coupled(coupled, side) => coupled.bound_count(side),
        }
    }

    /// Checks of all solutions against the commutation rule: the worst of each.
    pub fn audit(&self) -> Audit {
        let alone = self.alone().map(Subbands::audit);
        let coupled = self.coupled().into_iter().map(Coupled::audit);
        alone
            .chain(coupled)
            .reduce(Audit::with)
            .unwrap_or(Audit::CLEAN)
    }

    /// The hole states, highest first.
    pub fn holes(&self) -> Vec<Place> {
        let mut holes: Vec<Place> = (0..self.0.len())
            .filter(|&band| self.band(band).sign() < 0.0)
            .flat_map(|band| (0..self.level_count(band)).map(move |state| Place { band, state }))
            .collect();
        holes.sort_by(|a, b| self.energy_ev(*b).total_cmp(&self.energy_ev(*a)));
        holes
    }

    /// How many states of each band a structure asks for: the lowest electrons, and the highest of all holes.
    pub fn asked_for(&self, structure: &Structure) -> Vec<usize> {
        let mut counts = vec![0; self.0.len()];
        counts[0] = structure.conduction.states.min(self.level_count(0));
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
        let own = |band: &usize| self.band(*band).name() == level.band;
        let band = (0..self.0.len()).find(own).unwrap_or(0);
        let last = self.level_count(band).saturating_sub(1);
        Place {
            band,
            state: level.index.saturating_sub(1).min(last),
        }
    }

    /// The name of a state's level within its own band.
    pub fn level(&self, place: Place) -> Level {
        Level {
            band: self.band(place.band).name(),
            index: place.state + 1,
        }
    }
}
