//! From a continuous design to one in whole monolayers: combinations of neighbouring whole numbers are ranked by the
//! linearised aims with the other variables readjusted, the best are solved with those variables tuned again, and the
//! best of these is improved by single and paired steps of one monolayer.

use super::evaluate::{Characters, Design, Task, Variable};
use super::search::{Found, Stage, Watch, descend};
use crate::structure::{Knob, Stack};
use nalgebra::{DMatrix, DVector};
use std::collections::BTreeMap;

/// Combinations that are ranked by the linearised aims.
const MAX_RANKED: usize = 20_000;
/// Combinations that are solved.
const SOLVED: usize = 10;
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
    let ranked = search.ranked(found)?;
    let mut best: Option<(Vec<i64>, Found)> = None;
    for counts in ranked {
        search.keep_better(&mut best, counts, found);
    }
    for _ in 0..MAX_ROUNDS {
        let Some((counts, from)) = best.clone() else {
            return Err(SnapError::Unsolved);
        };
        for neighbour in neighbours(&counts) {
            search.keep_better(&mut best, neighbour, &from);
        }
        if best.as_ref().is_some_and(|(now, _)| *now == counts) {
            break;
        }
    }
    best.map(|(_, found)| found).ok_or(SnapError::Unsolved)
}

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
    fn ranked(&self, found: &Found) -> Result<Vec<Vec<i64>>, SnapError> {
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
        let jacobian = self.task.jacobian(&found.design);
        let others: Vec<usize> = (0..self.task.variables.len())
            .filter(|k| !self.widths.contains(k))
            .collect();
        let spared = projector(&jacobian.select_columns(&others));
        let mut scored: Vec<(f64, Vec<i64>)> = combinations(&choices)
            .map(|counts| {
                let mut residuals = found.design.residuals.clone();
                for (slot, &k) in self.widths.iter().enumerate() {
                    let variable = &self.task.variables[k];
                    let moved_nm = (counts[slot] as f64 - ideal[slot].0) * ideal[slot].1;
                    residuals += jacobian.column(k) * (moved_nm / (variable.high - variable.low));
                }
                ((&spared * residuals).norm_squared(), counts)
            })
            .collect();
        scored.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
        Ok(scored
            .into_iter()
            .take(SOLVED)
            .map(|(_, counts)| counts)
            .collect())
    }

    fn keep_better(
        &mut self,
        best: &mut Option<(Vec<i64>, Found)>,
        counts: Vec<i64>,
        from: &Found,
    ) {
        if self.tried.contains_key(&counts) {
            return;
        }
        (self.watch)(Stage::Monolayers {
            designs: self.tried.len() + 1,
        });
        let solved = self.readjusted(&counts, from);
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

    /// The design with these whole numbers and the other variables tuned again; `None` when out of bounds.
    fn readjusted(&self, counts: &[i64], from: &Found) -> Option<Found> {
        let others: Vec<usize> = (0..self.task.variables.len())
            .filter(|k| !self.widths.contains(k))
            .collect();
        let mut at = from.at.clone();
        let mut stack = from.design.stack.clone();
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
            let found = descend(&task, start, self.characters.cloned(), &|_| {})?;
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

/// I − J J⁺: what of the residuals the other variables cannot take up.
fn projector(jacobian: &DMatrix<f64>) -> DMatrix<f64> {
    let size = jacobian.nrows();
    let identity = DMatrix::identity(size, size);
    if jacobian.ncols() == 0 {
        return identity;
    }
    let largest = jacobian.amax();
    match jacobian
        .clone()
        .pseudo_inverse(1e-9 * largest.max(f64::MIN_POSITIVE))
    {
        Ok(inverse) => identity - jacobian * inverse,
        Err(_) => identity,
    }
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
