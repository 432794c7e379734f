//! The search over continuous variables: a descent from the file's design, and where that does not reach the aims,
//! descents from the best of many starts spread over the box.

use super::evaluate::{Characters, Design, Task, characters};
use super::least_squares::BoundedLeastSquares;
use argmin::core::{Error, Executor, Jacobian, Operator};
use nalgebra::{DMatrix, DVector};
use rayon::prelude::*;
use std::cell::RefCell;

/// How far a search has come, for a progress display.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Stage {
    /// Descents towards the aims: solved designs so far.
    Descent { designs: usize },
    /// Starts tried of those planned.
    Starts { done: usize, planned: usize },
    /// Whole-monolayer designs tried.
    Monolayers { designs: usize },
}

/// Receives the stages of a search.
pub type Watch<'w> = &'w (dyn Fn(Stage) + Sync);

/// Starts per variable when the first descent fails, and the most of them.
const STARTS_PER_VARIABLE: usize = 96;
const MAX_STARTS: usize = 512;
/// The best starts that a descent is made from.
const DESCENTS: usize = 6;
/// Scrambles the quasi-random starts; any number serves, a fixed one keeps results the same.
const SCRAMBLE: u32 = 0x5eed;
/// Iterations of one descent.
const MAX_ITERATIONS: u64 = 120;

/// A point of the search with its solved design.
#[derive(Clone, Debug)]
pub struct Found {
    pub at: DVector<f64>,
    pub design: Design,
}

/// A task as argmin's problem. Residuals and Jacobian at one point share the solved design.
struct Descent<'t> {
    task: &'t Task,
    watch: Watch<'t>,
    designs: RefCell<usize>,
    last: RefCell<Option<Found>>,
    /// Characters are followed along the path: each accepted design is the reference for the next.
    characters: RefCell<Option<Characters>>,
}

impl Descent<'_> {
    fn solve(&self, at: &DVector<f64>) -> Result<Design, Error> {
        *self.designs.borrow_mut() += 1;
        (self.watch)(Stage::Descent {
            designs: *self.designs.borrow(),
        });
        let characters = self.characters.borrow();
        let design = self
            .task
            .design(self.task.stack_at(at), characters.as_ref());
        design.map_err(|error| Error::msg(error.to_string()))
    }
}

impl Operator for Descent<'_> {
    type Param = DVector<f64>;
    type Output = DVector<f64>;

    fn apply(&self, at: &DVector<f64>) -> Result<DVector<f64>, Error> {
        let design = self.solve(at)?;
        let residuals = design.residuals.clone();
        *self.last.borrow_mut() = Some(Found {
            at: at.clone(),
            design,
        });
        Ok(residuals)
    }
}

impl Jacobian for Descent<'_> {
    type Param = DVector<f64>;
    type Jacobian = DMatrix<f64>;

    fn jacobian(&self, at: &DVector<f64>) -> Result<DMatrix<f64>, Error> {
        let known = self.last.borrow().clone().filter(|found| found.at == *at);
        let design = match known {
            Some(found) => found.design,
            None => self.solve(at)?,
        };
        if let Some(characters) = self.characters.borrow_mut().as_mut() {
            follow(self.task, characters, &design);
        }
        Ok(self.task.jacobian(&design))
    }
}

/// Takes over the followed states' envelopes from a design.
pub fn follow(task: &Task, followed: &mut Characters, design: &Design) {
    let own = characters(design);
    for (aim, &(from, to)) in task.aims.iter().zip(&design.states) {
        for (wanted, now) in [(aim.from, from), (aim.to, to)] {
            let place = followed
                .get_mut(now.band)
                .and_then(|band| band.get_mut(wanted.index - 1));
            if let (Some(place), Some(envelope)) = (place, own[now.band].get(now.state)) {
                place.clone_from(envelope);
            }
        }
    }
}

/// A local descent. `None` when the start cannot be solved.
pub fn descend(
    task: &Task,
    start: DVector<f64>,
    characters: Option<Characters>,
    solver: BoundedLeastSquares,
    watch: Watch,
) -> Option<Found> {
    let descent = Descent {
        task,
        watch,
        designs: RefCell::new(0),
        last: RefCell::new(None),
        characters: RefCell::new(characters),
    };
    if task.variables.is_empty() {
        let design = descent.solve(&start).ok()?;
        return Some(Found { at: start, design });
    }
    let mut run = Executor::new(descent, solver)
        .configure(|state| state.param(start).max_iters(MAX_ITERATIONS))
        .timer(false)
        .run()
        .ok()?;
    let at = run.state.best_param.take()?;
    let descent = run.problem.take_problem()?;
    let known = descent
        .last
        .borrow_mut()
        .take()
        .filter(|found| found.at == at);
    match known {
        Some(found) => Some(found),
        None => Some(Found {
            design: descent.solve(&at).ok()?,
            at,
        }),
    }
}

/// The best design that descents from the file's design and, if need be, from many starts lead to. The number of starts
/// is returned with it.
pub fn search(
    task: &Task,
    characters: Option<&Characters>,
    watch: Watch,
) -> Option<(Found, usize)> {
    let descend = |start| {
        let solver = BoundedLeastSquares::default();
        descend(task, start, characters.cloned(), solver, watch)
    };
    let first = descend(task.start());
    if let Some(found) = &first
        && (task.is_met(&found.design) || task.variables.is_empty())
    {
        return first.map(|found| (found, 1));
    }
    let dimensions = task.variables.len();
    let planned = (STARTS_PER_VARIABLE * dimensions).min(MAX_STARTS);
    let done = std::sync::atomic::AtomicUsize::new(0);
    let mut costs: Vec<(usize, f64)> = (0..planned)
        .into_par_iter()
        .filter_map(|index| {
            let design = task
                .design(task.stack_at(&spread(index, dimensions)), characters)
                .ok()?;
            let done = 1 + done.fetch_add(1, std::sync::atomic::Ordering::Relaxed);
            watch(Stage::Starts { done, planned });
            Some((index, design.cost()))
        })
        .collect();
    costs.sort_by(|a, b| a.1.total_cmp(&b.1).then(a.0.cmp(&b.0)));
    let starts: Vec<usize> = costs
        .into_iter()
        .take(DESCENTS)
        .map(|(index, _)| index)
        .collect();
    let ends: Vec<Found> = starts
        .into_par_iter()
        .filter_map(|index| descend(spread(index, dimensions)))
        .collect();
    // The first of equals wins, so that the result does not depend on the order in which threads finish.
    let best = first.into_iter().chain(ends).reduce(|best, next| {
        let better = next.design.cost() < best.design.cost() * (1.0 - 1e-9);
        if better { next } else { best }
    });
    best.map(|found| (found, planned + 1))
}

/// Point `index` of a scrambled Sobol sequence (Burley, J. Comput. Graph. Tech. 9(4), 1 (2020)).
fn spread(index: usize, dimensions: usize) -> DVector<f64> {
    DVector::from_fn(dimensions, |dimension, _| {
        let (dimension, seed) = (
            dimension as u32 % sobol_burley::NUM_DIMENSIONS,
            SCRAMBLE + dimension as u32 / sobol_burley::NUM_DIMENSIONS,
        );
        f64::from(sobol_burley::sample(index as u32, dimension, seed))
    })
}
