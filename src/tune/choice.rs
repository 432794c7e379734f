//! Compositions that are chosen among those that the mounted cells give: the rest is tuned for each choice in turn, and
//! the best result is taken.

use super::{FRACTION_STEP, Outcome, TuneError, Variable};
use crate::growth;
use crate::structure::{Knob, Stack, Structure, Varied};

/// More combinations than this are not tried.
const MAX_COMBINATIONS: usize = 256;

/// A variable with the values that it may take.
#[derive(Clone, Debug, PartialEq)]
pub struct Choice {
    pub knob: Knob,
    /// How messages call it: `Al fraction of barrier`.
    pub name: String,
    /// Rising.
    pub values: Vec<f64>,
}

/// The choices that the file asks for.
pub(super) fn choices(structure: &Structure, stack: &Stack) -> Result<Vec<Choice>, TuneError> {
    let (Some(wish), Some(growth)) = (&structure.tune, &structure.growth) else {
        return Ok(Vec::new());
    };
    let mut found = Vec::new();
    for variable in &wish.vary {
        let Varied::FractionOfCells { entry, element } = variable.quantity else {
            continue;
        };
        let label = structure.entries.get(entry).map_or("layer", |e| &e.label);
        let name = format!("{} fraction of {label}", element.symbol());
        let mut values: Vec<f64> = stack
            .composition(entry)
            .map(|composition| growth::growable_fractions(growth, composition, element))
            .unwrap_or_default()
            .into_iter()
            .map(|value| (value / FRACTION_STEP).round() * FRACTION_STEP)
            .collect();
        values.sort_by(f64::total_cmp);
        values.dedup();
        if values.is_empty() {
            return Err(TuneError::NotGrowable { name });
        }
        found.push(Choice {
            knob: Knob::Fraction { entry, element },
            name,
            values,
        });
    }
    let combinations = combinations(&found);
    if combinations > MAX_COMBINATIONS {
        return Err(TuneError::TooManyChoices {
            combinations,
            most: MAX_COMBINATIONS,
        });
    }
    Ok(found)
}

fn combinations(choices: &[Choice]) -> usize {
    choices.iter().fold(1, |product: usize, choice| {
        product.saturating_mul(choice.values.len())
    })
}

/// Tunes the rest for every combination, and returns the best outcome: that with the fewest aims unmet, of equals the one
/// that comes nearest, of equals the first.
pub(super) fn best(
    choices: Vec<Choice>,
    stack: &Stack,
    tune: impl Fn(&Stack) -> Result<Outcome, TuneError>,
) -> Result<Outcome, TuneError> {
    let unmet = |outcome: &Outcome| outcome.met.iter().filter(|met| !**met).count();
    let mut best: Option<Outcome> = None;
    let mut refused = TuneError::Unsolved;
    for mut index in 0..combinations(&choices) {
        let mut chosen = stack.clone();
        for choice in &choices {
            let value = choice.values[index % choice.values.len()];
            index /= choice.values.len();
            choice.knob.set(&mut chosen, value);
        }
        let outcome = match tune(&chosen) {
            Ok(outcome) => outcome,
            Err(error) => {
                refused = error;
                continue;
            }
        };
        let better = best.as_ref().is_none_or(|known| {
            let (mine, theirs) = (unmet(&outcome), unmet(known));
            let nearer = outcome.after.cost() < known.after.cost() * (1.0 - 1e-9);
            mine < theirs || (mine == theirs && nearer)
        });
        if better {
            best = Some(outcome);
        }
    }
    let mut outcome = best.ok_or(refused)?;
    // The report speaks of the file's own design and of every variable.
    if let Ok(before) = outcome.task.design(stack.clone(), None) {
        outcome.before = before;
    }
    let variables = choices.iter().map(|choice| Variable {
        knob: choice.knob,
        low: choice.values.first().copied().unwrap_or(0.0),
        high: choice.values.last().copied().unwrap_or(1.0),
        name: choice.name.clone(),
    });
    outcome.task.variables.extend(variables);
    outcome.choices = choices;
    Ok(outcome)
}
