//! What keeps a design from its aims, in words.

use super::evaluate::{Design, Task};

/// A variable this near to a bound, as a part of its range, rests on it.
const AT_BOUND: f64 = 1e-6;
/// Slopes smaller than this part of the largest do not count.
const NEGLIGIBLE: f64 = 1e-6;

/// One reason.
#[derive(Clone, Debug, PartialEq)]
pub enum Limit {
    /// The variable rests on a bound, and going beyond would lower the miss.
    Bound { variable: usize, at_high: bool },
    /// No variable moves this aim.
    Unmoved { aim: usize },
    /// The variables move these aims only together.
    Conflict { aims: Vec<usize> },
    /// None of these: the search ended in a minimum of the miss inside the bounds.
    NoDesignFound,
}

/// The reasons, the most telling first; empty when all aims are met.
pub fn limits(task: &Task, design: &Design) -> Vec<Limit> {
    let missed: Vec<usize> = (0..task.aims.len())
        .filter(|&a| !task.aims[a].goal.is_met(design.values[a]))
        .collect();
    let mut bounds = task.keeps.iter().zip(&design.kept);
    if missed.is_empty() && bounds.all(|(keep, &value)| keep.is_met(value)) {
        return Vec::new();
    }
    let jacobian = task.jacobian(design);
    let largest = jacobian.amax();
    let mut found = Vec::new();
    for &aim in &missed {
        if jacobian.row(aim).amax() <= NEGLIGIBLE * largest {
            found.push(Limit::Unmoved { aim });
        }
    }
    let gradient = jacobian.tr_mul(&design.residuals);
    let steepest = gradient.amax();
    for (k, variable) in task.variables.iter().enumerate() {
        let u = variable.to_unit(variable.knob.value(&design.stack).unwrap_or(variable.low));
        let pushes = gradient[k].abs() > NEGLIGIBLE * steepest;
        if pushes && u <= AT_BOUND && gradient[k] > 0.0 {
            found.push(Limit::Bound {
                variable: k,
                at_high: false,
            });
        } else if pushes && u >= 1.0 - AT_BOUND && gradient[k] < 0.0 {
            found.push(Limit::Bound {
                variable: k,
                at_high: true,
            });
        }
    }
    if found.is_empty() && task.aims.len() > 1 {
        let aims: Vec<usize> = (0..task.aims.len())
            .filter(|&a| jacobian.row(a).amax() > NEGLIGIBLE * largest)
            .collect();
        if aims.len() > 1 {
            found.push(Limit::Conflict { aims });
        }
    }
    if found.is_empty() {
        found.push(Limit::NoDesignFound);
    }
    found
}
