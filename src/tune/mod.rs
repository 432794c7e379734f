//! Tuning: layer widths, compositions and field changed, inside their bounds, until the transitions are the wanted ones.

mod aim;
mod band_slopes;
mod choice;
mod evaluate;
mod keep;
mod least_squares;
mod limits;
mod search;
mod snap;

pub use aim::{Aim, Goal};
pub use choice::Choice;
pub use evaluate::{Design, Task, Variable};
pub use keep::{Keep, Rule};
pub use limits::Limit;
pub use search::{Stage, Watch};
pub use snap::SnapError;

use crate::charge::ChargeError;
use crate::constants::HC_EV_UM;
use crate::models::Band;
use crate::structure::{
    self, BandName, Charge, Follow, Knob, Level, Stack, Structure, Target, Varied, Within,
};
use crate::subbands::Accuracy;
use search::Found;

/// An energy counts as met within this part of it, a dipole within the other, unless the file says `within`.
const ENERGY_WITHIN: f64 = 1e-3;
const DIPOLE_WITHIN: f64 = 1e-2;
/// Energies are this exact during the search, in eV: far less than any aim's tolerance. The result is solved anew.
const SEARCH_TOLERANCE_EV: f64 = 1e-6;

/// What came of a tuning.
#[derive(Clone, Debug)]
pub struct Outcome {
    pub task: Task,
    /// The file's design.
    pub before: Design,
    /// The continuous optimum, when the result is in whole monolayers.
    pub continuous: Option<Design>,
    /// The result.
    pub after: Design,
    /// Whether each aim is met. In whole monolayers an aim without `within` counts as met when the continuous design
    /// meets it and the rest is no more than half of what one monolayer moves.
    pub met: Vec<bool>,
    /// Whether the result keeps to each bound on strain.
    pub kept: Vec<bool>,
    /// Half of the largest change that one monolayer of a varied width makes, per aim; only in whole monolayers.
    pub half_step: Option<Vec<f64>>,
    /// What keeps unmet aims away.
    pub limits: Vec<Limit>,
    /// Starts that descents were chosen from.
    pub starts: usize,
    /// Variables whose value in the file lay outside their bounds.
    pub started_outside: Vec<usize>,
    /// Variables that take one of a few values; they stand last among the task's.
    pub choices: Vec<Choice>,
}

/// Why a tuning could not be done at all.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum TuneError {
    #[error("the file has no `tune` block")]
    NothingToTune,
    #[error(transparent)]
    Charge(ChargeError),
    #[error(transparent)]
    Snap(#[from] SnapError),
    #[error("no design inside the bounds can be solved")]
    Unsolved,
    #[error("the cells of `growth` give no alloy for the {name}")]
    NotGrowable { name: String },
    #[error(
        "the compositions that the cells give make {combinations} combinations, more than {most}"
    )]
    TooManyChoices { combinations: usize, most: usize },
}

/// Tunes a structure. `watch` is told how far the search has come.
pub fn tune(
    structure: &Structure,
    stack: &Stack,
    accuracy: Accuracy,
    watch: Watch,
) -> Result<Outcome, TuneError> {
    let choices = choice::choices(structure, stack)?;
    if choices.is_empty() {
        return within_bounds(structure, stack, accuracy, watch);
    }
    choice::best(choices, stack, |stack| {
        within_bounds(structure, stack, accuracy, watch)
    })
}

/// Tunes the variables that have bounds.
fn within_bounds(
    structure: &Structure,
    stack: &Stack,
    accuracy: Accuracy,
    watch: Watch,
) -> Result<Outcome, TuneError> {
    let wish = structure.tune.as_ref().ok_or(TuneError::NothingToTune)?;
    let aims: Vec<Aim> = wish.aims.iter().map(aim).collect();
    let variables: Vec<Variable> = wish
        .vary
        .iter()
        .filter_map(|v| variable(v, structure, stack))
        .collect();
    let asked = Band::of(structure);
    let counts = |listed: bool| -> Vec<(Band, usize)> {
        let needed = |&(band, count): &(Band, usize)| {
            let needed = Task::states_needed(&aims, band);
            (band, if listed { needed.max(count) } else { needed })
        };
        asked.iter().map(needed).collect()
    };
    let mut searched = counts(false);
    // Holes that no aim names need not be solved on the way.
    let electrons_only = |aim: &Aim| [aim.from, aim.to].iter().all(is_electron);
    if aims.iter().all(electrons_only) && structure.charge == Charge::Flat {
        searched.truncate(1);
    }
    let task = Task {
        stack: stack.clone(),
        bands: counts(true),
        charge: structure.charge.clone(),
        variables,
        aims,
        keeps: keep::keeps(structure, stack),
        accuracy,
    };
    let searching = Task {
        accuracy: Accuracy {
            tolerance_ev: accuracy.tolerance_ev.max(SEARCH_TOLERANCE_EV),
        },
        bands: searched,
        ..task.clone()
    };
    let before = task
        .design(stack.clone(), None)
        .map_err(TuneError::Charge)?;
    let by_character = task.aims.iter().any(|aim| aim.by_character);
    let characters = by_character.then(|| evaluate::characters(&before));
    let started_outside = task
        .variables
        .iter()
        .enumerate()
        .filter(|(_, v)| {
            v.knob
                .value(stack)
                .is_some_and(|value| value < v.low || value > v.high)
        })
        .map(|(k, _)| k)
        .collect();
    let (found, starts) =
        search::search(&searching, characters.as_ref(), watch).ok_or(TuneError::Unsolved)?;
    let outcome = Outcome {
        met: Vec::new(),
        kept: Vec::new(),
        half_step: None,
        limits: Vec::new(),
        continuous: None,
        before,
        after: found.design.clone(),
        task,
        starts,
        started_outside,
        choices: Vec::new(),
    };
    if wish.snap_to_monolayers {
        snapped(outcome, &searching, found, wish, watch)
    } else {
        Ok(judged(outcome))
    }
}

fn judged(mut outcome: Outcome) -> Outcome {
    outcome.after = on_written_steps(&outcome.task, &outcome.after, false).unwrap_or(outcome.after);
    outcome.met = outcome
        .task
        .aims
        .iter()
        .zip(&outcome.after.values)
        .map(|(aim, &value)| aim.goal.is_met(value))
        .collect();
    outcome.kept = kept(&outcome);
    outcome.limits = limits::limits(&outcome.task, &outcome.after);
    outcome
}

fn kept(outcome: &Outcome) -> Vec<bool> {
    let values = outcome.task.keeps.iter().zip(&outcome.after.kept);
    values.map(|(keep, &value)| keep.is_met(value)).collect()
}

impl Outcome {
    /// Whether every aim is met and every bound kept.
    pub fn is_reached(&self) -> bool {
        self.met.iter().chain(&self.kept).all(|met| *met)
    }
}

fn snapped(
    mut outcome: Outcome,
    searching: &Task,
    found: Found,
    wish: &structure::Tune,
    watch: Watch,
) -> Result<Outcome, TuneError> {
    let by_character = searching.aims.iter().any(|aim| aim.by_character);
    let characters = by_character.then(|| reference(searching, &outcome.before, &found.design));
    let whole = snap::snap(searching, &found, characters.as_ref(), watch)?;
    let steps = snap::monolayer_steps(&outcome.task, &whole.design);
    let half_step: Vec<f64> = (0..outcome.task.aims.len())
        .map(|a| {
            steps
                .iter()
                .map(|(_, step)| 0.5 * step[a].abs())
                .fold(0.0, f64::max)
        })
        .collect();
    outcome.after = on_written_steps(&outcome.task, &whole.design, true).unwrap_or(whole.design);
    let continuous = found.design;
    outcome.limits = limits::limits(&outcome.task, &continuous);
    outcome.met = (0..outcome.task.aims.len())
        .map(|a| {
            let goal = outcome.task.aims[a].goal;
            let strictly = goal.is_met(outcome.after.values[a]);
            let nearest_grid = wish.aims[a].within.is_none()
                && goal.is_met(continuous.values[a])
                && goal
                    .miss(outcome.after.values[a])
                    .is_some_and(|(miss, _)| miss.abs() <= half_step[a]);
            strictly || nearest_grid
        })
        .collect();
    outcome.kept = kept(&outcome);
    outcome.half_step = Some(half_step);
    outcome.continuous = Some(continuous);
    Ok(outcome)
}

/// The characters of the file's states, with the followed ones as they are in a design.
fn reference(task: &Task, before: &Design, design: &Design) -> evaluate::Characters {
    let mut characters = evaluate::characters(before);
    search::follow(task, &mut characters, design);
    characters
}

fn is_electron(level: &Level) -> bool {
    level.band == BandName::Conduction
}

fn aim(wish: &structure::Aim) -> Aim {
    let energy = |target_ev: f64, default: f64| Goal::Energy {
        target_ev,
        within_ev: match wish.within {
            Some(Within::EnergyEv(ev)) => ev,
            Some(Within::Fraction(part)) => part * target_ev,
            // Near the target a step of wavelength is the same part of it as a step of energy.
            Some(Within::LengthNm(nm)) => target_ev * target_ev * nm / (1e3 * HC_EV_UM),
            None => default * target_ev,
        },
    };
    let goal = match wish.target {
        Target::EnergyEv(ev) => energy(ev, ENERGY_WITHIN),
        Target::WavelengthUm(um) => energy(HC_EV_UM / um, ENERGY_WITHIN),
        Target::DipoleNm(nm) => Goal::Dipole {
            target_nm: nm,
            within_nm: match wish.within {
                Some(Within::LengthNm(within)) => within,
                Some(Within::Fraction(part)) => part * nm,
                _ => DIPOLE_WITHIN * nm,
            },
        },
        Target::MaximizeDipole => Goal::LargestDipole,
    };
    Aim {
        from: wish.from,
        to: wish.to,
        goal,
        weight: wish.weight,
        by_character: wish.follow == Follow::Character,
    }
}

/// Widths, fractions and fields are given to these steps: what a file then says is what was solved.
const WIDTH_STEP_NM: f64 = 1e-4;
const FRACTION_STEP: f64 = 1e-5;
const FIELD_STEP_V_PER_NM: f64 = 1e-8;

/// The design with its variables on the steps in which they are written. `whole` keeps widths in whole monolayers.
fn on_written_steps(task: &Task, design: &Design, whole: bool) -> Option<Design> {
    let mut stack = design.stack.clone();
    let monolayers = |stack: &Stack, entry| {
        Some(stack.entry_width_nm(entry)? / stack.entry_monolayer_nm(entry)?)
    };
    for variable in &task.variables {
        let step = match variable.knob {
            Knob::Width { .. } => WIDTH_STEP_NM,
            Knob::Fraction { .. } => FRACTION_STEP,
            Knob::Field => FIELD_STEP_V_PER_NM,
        };
        if whole && matches!(variable.knob, Knob::Width { .. }) {
            continue;
        }
        let value = variable.knob.value(&stack)?;
        variable.knob.set(
            &mut stack,
            ((value / step).round() * step).clamp(variable.low, variable.high),
        );
    }
    if whole {
        for variable in &task.variables {
            if let Knob::Width { entry } = variable.knob {
                let count = monolayers(&design.stack, entry)?.round();
                let width_nm = count * stack.entry_monolayer_nm(entry)?;
                stack.set_width(entry, width_nm);
            }
        }
    }
    // The step changes no order: the states are the design's own, by their numbers there.
    let mut same_states = task.clone();
    for (aim, &(from, to)) in same_states.aims.iter_mut().zip(&design.states) {
        (aim.from, aim.to) = (design.bands.level(from), design.bands.level(to));
    }
    same_states.design(stack, None).ok()
}

/// The knob of one wish, with its bounds in inner units.
fn variable(wish: &structure::Variable, structure: &Structure, stack: &Stack) -> Option<Variable> {
    let label = |entry: usize| {
        structure
            .entries
            .get(entry)
            .map_or("layer", |e| e.label.as_str())
    };
    Some(match &wish.quantity {
        Varied::Width { entry, bounds } => {
            let nm = |bound: &crate::units::Quantity| match bound.unit.dimension {
                crate::units::Dimension::Monolayers => {
                    Some(bound.number * stack.entry_monolayer_nm(*entry)?)
                }
                _ => Some(bound.value()),
            };
            Variable {
                knob: Knob::Width { entry: *entry },
                low: nm(&bounds[0])?,
                high: nm(&bounds[1])?,
                name: format!("width of {}", label(*entry)),
            }
        }
        Varied::Fraction {
            entry,
            element,
            bounds,
        } => Variable {
            knob: Knob::Fraction {
                entry: *entry,
                element: *element,
            },
            low: bounds[0],
            high: bounds[1],
            name: format!("{} fraction of {}", element.symbol(), label(*entry)),
        },
        // Chosen, see `choice`.
        Varied::FractionOfCells { .. } => return None,
        Varied::Field { bounds_v_per_nm } => Variable {
            knob: Knob::Field,
            low: bounds_v_per_nm[0],
            high: bounds_v_per_nm[1],
            name: "field".to_owned(),
        },
    })
}
