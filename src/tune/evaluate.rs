//! A stack at given values of its variables, solved and set against the aims.

use super::aim::{Aim, Goal};
use super::band_slopes::BandSlopes;
use super::keep::Keep;
use crate::charge::{self, ChargeError, Equilibrium};
use crate::models::Band;
use crate::structure::{BandName, Charge, Knob, Level, Stack};
use crate::subbands::{Accuracy, Bands, Place};
use nalgebra::{DMatrix, DVector};

/// One variable with its bounds, in inner units.
#[derive(Clone, Debug, PartialEq)]
pub struct Variable {
    pub knob: Knob,
    pub low: f64,
    pub high: f64,
    /// How messages call it: `width of well`.
    pub name: String,
}

impl Variable {
    /// From the unit interval of the search to the variable's own.
    pub fn from_unit(&self, u: f64) -> f64 {
        // The ends are given back exactly: bounds are honoured to the last bit.
        if u >= 1.0 {
            self.high
        } else {
            self.low + u.max(0.0) * (self.high - self.low)
        }
    }

    pub fn to_unit(&self, value: f64) -> f64 {
        ((value - self.low) / (self.high - self.low)).clamp(0.0, 1.0)
    }
}

/// Everything that stays the same during a search.
#[derive(Clone, Debug)]
pub struct Task {
    pub stack: Stack,
    /// The bands to solve, the conduction band first, with their numbers of states.
    pub bands: Vec<(Band, usize)>,
    /// Whether charge bends the bands of every design.
    pub charge: Charge,
    pub variables: Vec<Variable>,
    pub aims: Vec<Aim>,
    pub keeps: Vec<Keep>,
    pub accuracy: Accuracy,
}

/// A solved design.
#[derive(Clone, Debug)]
pub struct Design {
    pub stack: Stack,
    pub bands: Bands,
    /// Of the charge, where it bends the bands.
    pub equilibrium: Option<Equilibrium>,
    /// The pair of states that each aim speaks of here.
    pub states: Vec<(Place, Place)>,
    /// Energy in eV or dipole in nm of each aim.
    pub values: Vec<f64>,
    /// The value of each bound on strain.
    pub kept: Vec<f64>,
    /// Of the aims and then of the bounds.
    pub residuals: DVector<f64>,
}

impl Design {
    /// Half the sum of the squared residuals.
    pub fn cost(&self) -> f64 {
        0.5 * self.residuals.norm_squared()
    }
}

/// Envelopes of the states that aims by character speak of, band by band.
pub type Characters = Vec<Vec<Vec<f64>>>;

/// The envelopes of all states of a design.
pub fn characters(design: &Design) -> Characters {
    all_envelopes(&design.bands, &design.stack)
}

fn all_envelopes(bands: &Bands, stack: &Stack) -> Characters {
    (0..bands.count())
        .map(|band| bands.layer_envelopes(band, stack))
        .collect()
}

/// Half the distance of central differences, as a part of a variable's range: the curvature left out and the potential's
/// residual both stay below 1e-5 of a slope.
const DIFFERENCE: f64 = 1e-3;
/// States beyond the highest that an aim names, so that a followed state is still among the solved after crossings.
const SPARE_STATES: usize = 3;

impl Task {
    /// Number of states of a band that the aims need.
    pub fn states_needed(aims: &[Aim], band: Band) -> usize {
        let own = |level: &Level| {
            level.band == band.name() || (level.band == BandName::Valence && band.sign() < 0.0)
        };
        let levels = || aims.iter().flat_map(|aim| [aim.from, aim.to]);
        let highest = levels().filter(own).map(|l| l.index).max().unwrap_or(1);
        if aims.iter().any(|aim| aim.by_character) {
            highest + SPARE_STATES
        } else {
            highest
        }
    }

    /// The variables as they stand in the file's stack, on the unit interval.
    pub fn start(&self) -> DVector<f64> {
        DVector::from_iterator(
            self.variables.len(),
            self.variables
                .iter()
                .map(|v| v.to_unit(v.knob.value(&self.stack).unwrap_or(v.low))),
        )
    }

    /// The stack with the variables set.
    pub fn stack_at(&self, u: &DVector<f64>) -> Stack {
        let mut stack = self.stack.clone();
        for (variable, &u) in self.variables.iter().zip(u.iter()) {
            variable.knob.set(&mut stack, variable.from_unit(u));
        }
        stack
    }

    /// Solves a stack. `characters` are the envelopes that aims by character look for; without them the states are
    /// taken by their order.
    pub fn design(
        &self,
        stack: Stack,
        characters: Option<&Characters>,
    ) -> Result<Design, ChargeError> {
        let charge::Solution {
            stack,
            bands,
            equilibrium,
        } = charge::solve(&stack, &self.charge, &self.bands, self.accuracy)?;
        let own: Vec<Vec<Vec<f64>>> = match characters {
            Some(_) => all_envelopes(&bands, &stack),
            None => Vec::new(),
        };
        let states: Vec<(Place, Place)> = self
            .aims
            .iter()
            .map(|aim| {
                let place = |level: Level| {
                    let Place { band, state } = bands.place(level);
                    let wanted = characters
                        .filter(|_| aim.by_character)
                        .and_then(|all| all.get(band)?.get(level.index - 1));
                    Place {
                        band,
                        state: wanted.map_or(state, |envelope| most_alike(envelope, &own[band])),
                    }
                };
                (place(aim.from), place(aim.to))
            })
            .collect();
        let values = self.values(&bands, &states);
        let residuals = self
            .aims
            .iter()
            .zip(&values)
            .map(|(aim, &value)| aim.weight * aim.goal.residual(value).0);
        let kept: Vec<f64> = self.keeps.iter().map(|keep| keep.value(&stack)).collect();
        let excesses = self.keeps.iter().zip(&kept);
        let excesses = excesses.map(|(keep, &value)| keep.residual(value).0);
        let count = self.aims.len() + self.keeps.len();
        let residuals = DVector::from_iterator(count, residuals.chain(excesses));
        Ok(Design {
            stack,
            bands,
            equilibrium,
            states,
            values,
            kept,
            residuals,
        })
    }

    /// The aims' values for the states that they speak of.
    fn values(&self, bands: &Bands, states: &[(Place, Place)]) -> Vec<f64> {
        let pairs = self.aims.iter().zip(states);
        pairs
            .map(|(aim, &(from, to))| match aim.goal {
                Goal::Energy { .. } => bands.energy_ev(to) - bands.energy_ev(from),
                _ => bands.dipole_nm(from.band, from.state, to.state),
            })
            .collect()
    }

    /// The slopes of the aims' values where charge answers to the variables: central differences of full solves, each
    /// from the design's own potential.
    fn charged_slopes(&self, design: &Design) -> DMatrix<f64> {
        let mut slopes = DMatrix::zeros(self.aims.len(), self.variables.len());
        let exact = Accuracy::default();
        for (column, variable) in self.variables.iter().enumerate() {
            let Some(value) = variable.knob.value(&design.stack) else {
                continue;
            };
            let step = DIFFERENCE * (variable.high - variable.low);
            let ends =
                [value - step, value + step].map(|end| end.clamp(variable.low, variable.high));
            let [below, above] = ends.map(|end| {
                let mut stack = design.stack.clone();
                variable.knob.set(&mut stack, end);
                let solution = charge::solve(&stack, &self.charge, &self.bands, exact).ok()?;
                let mut all = self.bands.iter().enumerate();
                let enough =
                    all.all(|(band, (_, count))| solution.bands.level_count(band) >= *count);
                enough.then(|| self.values(&solution.bands, &design.states))
            });
            if let (Some(below), Some(above)) = (below, above)
                && ends[1] > ends[0]
            {
                for (row, (above, below)) in above.iter().zip(&below).enumerate() {
                    slopes[(row, column)] = (above - below) / (ends[1] - ends[0]);
                }
            }
        }
        slopes
    }

    /// The slopes of the aims' values: one row per aim, one column per variable, per inner unit of the variable.
    pub fn value_slopes(&self, design: &Design) -> DMatrix<f64> {
        if self.charge != Charge::Flat {
            return self.charged_slopes(design);
        }
        let mut slopes = DMatrix::zeros(self.aims.len(), self.variables.len());
        let knobs: Vec<Knob> = self.variables.iter().map(|v| v.knob).collect();
        let mut bands: Vec<BandSlopes> = (0..design.bands.count())
            .map(|band| BandSlopes::new(&design.stack, design.bands.solution(band), &knobs))
            .collect();
        for (row, (aim, &(from, to))) in self.aims.iter().zip(&design.states).enumerate() {
            for column in 0..self.variables.len() {
                slopes[(row, column)] = if aim.goal.is_energy() {
                    bands[to.band].energy(to.state, column)
                        - bands[from.band].energy(from.state, column)
                } else {
                    bands[from.band].dipole(from.state, to.state, column)
                };
            }
        }
        slopes
    }

    /// The slopes of the residuals on the unit intervals of the variables.
    pub fn jacobian(&self, design: &Design) -> DMatrix<f64> {
        let aims = self.aims.len();
        let mut jacobian = self
            .value_slopes(design)
            .resize_vertically(aims + self.keeps.len(), 0.0);
        for (row, (aim, &value)) in self.aims.iter().zip(&design.values).enumerate() {
            let outer = aim.weight * aim.goal.residual(value).1;
            jacobian.row_mut(row).scale_mut(outer);
        }
        for (row, (keep, &value)) in self.keeps.iter().zip(&design.kept).enumerate() {
            let outer = keep.residual(value).1;
            if outer != 0.0 {
                for (column, variable) in self.variables.iter().enumerate() {
                    let slope = keep.slope(&design.stack, variable.knob);
                    jacobian[(aims + row, column)] = outer * slope;
                }
            }
        }
        for (column, variable) in self.variables.iter().enumerate() {
            jacobian
                .column_mut(column)
                .scale_mut(variable.high - variable.low);
        }
        jacobian
    }

    /// Whether every aim is met and every bound kept.
    pub fn is_met(&self, design: &Design) -> bool {
        self.aims
            .iter()
            .zip(&design.values)
            .all(|(aim, &value)| aim.goal.is_met(value))
            && self
                .keeps
                .iter()
                .zip(&design.kept)
                .all(|(keep, &value)| keep.is_met(value))
    }
}

/// The state whose envelope overlaps most with the wanted one.
fn most_alike(wanted: &[f64], own: &[Vec<f64>]) -> usize {
    let overlap = |envelope: &Vec<f64>| {
        envelope
            .iter()
            .zip(wanted)
            .map(|(a, b)| a * b)
            .sum::<f64>()
            .abs()
    };
    (0..own.len())
        .max_by(|&a, &b| overlap(&own[a]).total_cmp(&overlap(&own[b])))
        .unwrap_or(0)
}
