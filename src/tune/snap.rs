//! From a continuous design to one in whole monolayers: combinations of neighbouring whole numbers are ranked by the
//! linearised aims with the other variables readjusted, the best are solved with those variables tuned again, and the
//! best of these is improved by single and paired steps of one monolayer. Steps that the linearised aims rule out clearly
//! are not solved.

use super::evaluate::{Characters, Design, Task, Variable};
use super::least_squares::BoundedLeastSquares;
use super::search::{Found, Stage, Watch, descend};
use crate::structure::{Knob, Stack};
use nalgebra::{DMatrix, DVector};
use std::collections::BTreeMap;

/// Combinations that are ranked by the linearised aims.
const MAX_RANKED: usize = 20_000;
/// Combinations that are solved.
const SOLVED: usize = 10;
/// A step of one monolayer is solved when the linearised residuals, less this part of what the step changes in them,
/// are below those of the best design: the linear form is off by less, measured on the shipped structures.
const NONLINEARITY: f64 = 0.3;
/// Rounds of one-monolayer steps.
const MAX_ROUNDS: usize = 20;
/// Rounds in which widths and compositions are made to agree: a monolayer's height depends on the composition.
const AGREEMENT_ROUNDS: usize = 4;

/// A width's bounds hold no whole monolayer, or a layer has no known monolayer.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum SnapError {
    #[error("the bounds of the {name} hold no whole monolayer: one is {monolayer_nm:.4} nm")]
    NoWholeMonolayer { name: String, monolayer_nm: f64 },
    #[error(
        "the {name} cannot be counted in monolayers: the layer's lattice constant is not known"
    )]
    NoMonolayer { name: String },
    #[error("the design cannot be solved in whole monolayers")]
    Unsolved,
}

/// The best design in whole monolayers near a continuous one. Widths that are not varied stay as they are.
pub fn snap(
    task: &Task,
    found: &Found,
    characters: Option<&Characters>,
    watch: Watch,
) -> Result<Found, SnapError> {
    let widths: Vec<usize> = (0..task.variables.len())
        .filter(|&k| matches!(task.variables[k].knob, Knob::Width { .. }))
        .collect();
    if widths.is_empty() {
        return Ok(found.clone());
    }
    let mut search = Snap {
        task,
        characters,
        watch,
        widths,
        tried: BTreeMap::new(),
    };
    let near = Linear::new(task, found, &search.widths);
    let ranked = search.ranked(found, &near)?;
    let mut best: Option<(Vec<i64>, Found)> = None;
    for (step_nm, counts) in ranked {
        let (rest, change) = near.predict(&step_nm);
        let known = best
            .as_ref()
            .map(|(_, known)| known.design.residuals.norm());
        if known.is_none_or(|known| rest - NONLINEARITY * change < known) {
            search.keep_better(&mut best, counts, found, &near);
        }
    }
    for _ in 0..MAX_ROUNDS {
        let Some((counts, from)) = best.clone() else {
            return Err(SnapError::Unsolved);
        };
        let near = Linear::new(task, &from, &search.widths);
        for neighbour in neighbours(&counts) {
            let (rest, change) = near.predict(&search.step_nm(&counts, &neighbour, &from)?);
            if rest - NONLINEARITY * change < from.design.residuals.norm() {
                search.keep_better(&mut best, neighbour, &from, &near);
            }
        }
        if best.as_ref().is_some_and(|(now, _)| *now == counts) {
            break;
        }
    }
    let (counts, rough) = best.ok_or(SnapError::Unsolved)?;
    let fine = search.readjusted(&counts, &rough, None, BoundedLeastSquares::default());
    Ok(fine
        .filter(|fine| fine.design.cost() <= rough.design.cost())
        .unwrap_or(rough))
}

/// The aims near a design, to first order.
struct Linear {
    residuals: DVector<f64>,
    /// Slopes of the residuals along the widths, per nm.
    widths: DMatrix<f64>,
    /// How the other variables, on their unit intervals, answer residuals.
    answer: DMatrix<f64>,
    /// What of the residuals the other variables cannot take up.
    spared: DMatrix<f64>,
}

impl Linear {
    fn new(task: &Task, found: &Found, widths: &[usize]) -> Self {
        let jacobian = task.jacobian(&found.design);
        let others: Vec<usize> = (0..task.variables.len())
            .filter(|k| !widths.contains(k))
            .collect();
        let mut along = jacobian.select_columns(widths);
        for (slot, &k) in widths.iter().enumerate() {
            let variable = &task.variables[k];
            along
                .column_mut(slot)
                .scale_mut(1.0 / (variable.high - variable.low));
        }
        let others = jacobian.select_columns(&others);
        let aims = others.nrows();
        let least = 1e-9 * others.iter().fold(f64::MIN_POSITIVE, |m, v| m.max(v.abs()));
        let answer = if others.ncols() == 0 {
            DMatrix::zeros(0, aims)
        } else {
            -others
                .clone()
                .pseudo_inverse(least)
                .unwrap_or_else(|_| DMatrix::zeros(others.ncols(), aims))
        };
        let spared = DMatrix::identity(aims, aims) + &others * &answer;
        Self {
            residuals: found.design.residuals.clone(),
            widths: along,
            answer,
            spared,
        }
    }

    /// The norm of the residuals when the widths move by these steps in nm and the others answer; and the norm of what
    /// the step changes in the residuals.
    fn predict(&self, step_nm: &DVector<f64>) -> (f64, f64) {
        let change = &self.widths * step_nm;
        let norm = change.norm();
        ((&self.spared * (&self.residuals + change)).norm(), norm)
    }

    /// The others' answer to a step of the widths.
    fn answer(&self, step_nm: &DVector<f64>) -> DVector<f64> {
        &self.answer * (&self.residuals + &self.widths * step_nm)
    }
}

/// The step from the continuous design in nm, and the whole numbers it leads to.
type Ranked = (DVector<f64>, Vec<i64>);

struct Snap<'t> {
    task: &'t Task,
    characters: Option<&'t Characters>,
    watch: Watch<'t>,
    /// Which variables are widths.
    widths: Vec<usize>,
    tried: BTreeMap<Vec<i64>, f64>,
}

impl Snap<'_> {
    fn monolayer_nm(&self, variable: usize, stack: &Stack) -> Result<f64, SnapError> {
        let Variable { knob, name, .. } = &self.task.variables[variable];
        let missing = || SnapError::NoMonolayer { name: name.clone() };
        let Knob::Width { entry } = *knob else {
            return Err(missing());
        };
        stack.entry_monolayer_nm(entry).ok_or_else(missing)
    }

    /// Whole numbers around the continuous design, best first by the linearised aims.
    fn ranked(&self, found: &Found, near: &Linear) -> Result<Vec<Ranked>, SnapError> {
        let mut choices = Vec::with_capacity(self.widths.len());
        let reach = if self.widths.len() <= 5 { 1 } else { 0 };
        let mut ideal = Vec::with_capacity(self.widths.len());
        for &k in &self.widths {
            let variable = &self.task.variables[k];
            let monolayer_nm = self.monolayer_nm(k, &found.design.stack)?;
            let (lowest, highest) = whole_range(variable, monolayer_nm);
            if lowest > highest {
                return Err(SnapError::NoWholeMonolayer {
                    name: variable.name.clone(),
                    monolayer_nm,
                });
            }
            let here = variable.from_unit(found.at[k]) / monolayer_nm;
            let floor = here.floor() as i64;
            let mut options: Vec<i64> = (floor - reach..=floor + 1 + reach)
                .map(|n| n.clamp(lowest, highest))
                .collect();
            options.sort_by(|a, b| {
                (*a as f64 - here)
                    .abs()
                    .total_cmp(&(*b as f64 - here).abs())
            });
            options.dedup();
            choices.push(options);
            ideal.push((here, monolayer_nm));
        }
        let mut scored: Vec<(f64, DVector<f64>, Vec<i64>)> = combinations(&choices)
            .map(|counts| {
                let step_nm = DVector::from_fn(counts.len(), |slot, _| {
                    (counts[slot] as f64 - ideal[slot].0) * ideal[slot].1
                });
                (near.predict(&step_nm).0, step_nm, counts)
            })
            .collect();
        scored.sort_by(|a, b| a.0.total_cmp(&b.0).then_with(|| a.2.cmp(&b.2)));
        Ok(scored
            .into_iter()
            .take(SOLVED)
            .map(|(_, step_nm, counts)| (step_nm, counts))
            .collect())
    }

    /// The step from one set of whole numbers to another, in nm.
    fn step_nm(&self, from: &[i64], to: &[i64], found: &Found) -> Result<DVector<f64>, SnapError> {
        let mut step_nm = DVector::zeros(from.len());
        for (slot, &k) in self.widths.iter().enumerate() {
            let monolayer_nm = self.monolayer_nm(k, &found.design.stack)?;
            step_nm[slot] = (to[slot] - from[slot]) as f64 * monolayer_nm;
        }
        Ok(step_nm)
    }

    fn keep_better(
        &mut self,
        best: &mut Option<(Vec<i64>, Found)>,
        counts: Vec<i64>,
        from: &Found,
        near: &Linear,
    ) {
        if self.tried.contains_key(&counts) {
            return;
        }
        (self.watch)(Stage::Monolayers {
            designs: self.tried.len() + 1,
        });
        let solved = self.readjusted(&counts, from, Some(near), BoundedLeastSquares::rough());
        let cost = solved
            .as_ref()
            .map_or(f64::INFINITY, |found| found.design.cost());
        self.tried.insert(counts.clone(), cost);
        if let Some(found) = solved
            && best
                .as_ref()
                .is_none_or(|(_, known)| cost < known.design.cost() * (1.0 - 1e-9))
        {
            *best = Some((counts, found));
        }
    }

    /// The design with these whole numbers and the other variables tuned again; `None` when out of bounds. With the aims
    /// near `from` to first order the search begins where the others should come to lie.
    fn readjusted(
        &self,
        counts: &[i64],
        from: &Found,
        near: Option<&Linear>,
        solver: BoundedLeastSquares,
    ) -> Option<Found> {
        let others: Vec<usize> = (0..self.task.variables.len())
            .filter(|k| !self.widths.contains(k))
            .collect();
        let mut at = from.at.clone();
        let mut stack = from.design.stack.clone();
        if let Some(near) = near {
            let mut step_nm = DVector::zeros(counts.len());
            for (slot, &k) in self.widths.iter().enumerate() {
                let width_nm = counts[slot] as f64 * self.monolayer_nm(k, &stack).ok()?;
                step_nm[slot] = width_nm - self.task.variables[k].from_unit(at[k]);
            }
            for (&k, step) in others.iter().zip(near.answer(&step_nm).iter()) {
                at[k] = (at[k] + step).clamp(0.0, 1.0);
                let variable = &self.task.variables[k];
                variable.knob.set(&mut stack, variable.from_unit(at[k]));
            }
        }
        let mut solved: Option<Found> = None;
        for _ in 0..AGREEMENT_ROUNDS {
            for (slot, &k) in self.widths.iter().enumerate() {
                let variable = &self.task.variables[k];
                let monolayer_nm = self.monolayer_nm(k, &stack).ok()?;
                let (lowest, highest) = whole_range(variable, monolayer_nm);
                if !(lowest..=highest).contains(&counts[slot]) {
                    return None;
                }
                let width_nm = counts[slot] as f64 * monolayer_nm;
                variable.knob.set(&mut stack, width_nm);
                at[k] = variable.to_unit(width_nm);
            }
            let settled = solved
                .as_ref()
                .is_some_and(|found| same_widths(&found.design.stack, &stack));
            if settled {
                break;
            }
            let task = Task {
                stack: stack.clone(),
                variables: others
                    .iter()
                    .map(|&k| self.task.variables[k].clone())
                    .collect(),
                ..self.task.clone()
            };
            let start = DVector::from_iterator(others.len(), others.iter().map(|&k| at[k]));
            let found = descend(
                &task,
                start,
                self.characters.cloned(),
                solver.clone(),
                &|_| {},
            )?;
            for (slot, &k) in others.iter().enumerate() {
                at[k] = found.at[slot];
            }
            stack = found.design.stack.clone();
            let done = others.is_empty();
            solved = Some(Found {
                at: at.clone(),
                design: found.design,
            });
            if done {
                break;
            }
        }
        solved
    }
}

fn same_widths(a: &Stack, b: &Stack) -> bool {
    a.layers
        .iter()
        .zip(&b.layers)
        .all(|(a, b)| (a.width_nm - b.width_nm).abs() < 1e-9)
}

/// The whole numbers of monolayers inside a variable's bounds.
fn whole_range(variable: &Variable, monolayer_nm: f64) -> (i64, i64) {
    let lowest = (variable.low / monolayer_nm - 1e-9).ceil().max(1.0);
    let highest = (variable.high / monolayer_nm + 1e-9).floor();
    (lowest as i64, highest as i64)
}

/// One monolayer more or less in one width, or moved from one width to another.
fn neighbours(counts: &[i64]) -> Vec<Vec<i64>> {
    let mut list = Vec::new();
    let mut push = |steps: &[(usize, i64)]| {
        let mut next = counts.to_vec();
        for &(slot, step) in steps {
            next[slot] += step;
        }
        list.push(next);
    };
    for i in 0..counts.len() {
        for step in [-1, 1] {
            push(&[(i, step)]);
            for j in i + 1..counts.len() {
                push(&[(i, step), (j, -step)]);
                push(&[(i, step), (j, step)]);
            }
        }
    }
    list
}

/// All combinations of one option per slot, at most [`MAX_RANKED`] of them; the first options come first.
fn combinations(choices: &[Vec<i64>]) -> impl Iterator<Item = Vec<i64>> + '_ {
    let total = choices
        .iter()
        .try_fold(1usize, |product, c| product.checked_mul(c.len()))
        .unwrap_or(usize::MAX);
    (0..total.min(MAX_RANKED)).map(move |mut index| {
        choices
            .iter()
            .map(|options| {
                let option = options[index % options.len()];
                index /= options.len();
                option
            })
            .collect()
    })
}

/// How far each aim's value moves when one monolayer more of a width is grown.
pub fn monolayer_steps(task: &Task, design: &Design) -> Vec<(usize, DVector<f64>)> {
    let slopes = task.value_slopes(design);
    (0..task.variables.len())
        .filter_map(|k| match task.variables[k].knob {
            Knob::Width { entry } => Some((
                k,
                slopes.column(k) * design.stack.entry_monolayer_nm(entry)?,
            )),
            _ => None,
        })
        .collect()
}
