//! Warnings about layers that hardly stay coherent.

use super::strain_budget::strain_budget;
use crate::diagnostics::Diagnostic;
use crate::structure::{Stack, Structure};

/// Below this misfit nothing is said: all of AlGaAs on GaAs stays below, whose mismatch mostly vanishes at the temperature
/// of growth, and which is grown to any thickness; common practice.
const DOUBTFUL_MISFIT: f64 = 2e-3;

/// A warning for each layer that is thicker than its critical thickness, and one when all strained layers together are.
pub fn doubts(structure: &Structure, stack: &Stack) -> Vec<Diagnostic> {
    let budget = strain_budget(structure, stack);
    let mut found = Vec::new();
    let is_doubtful = |misfit: f64| misfit.abs() > DOUBTFUL_MISFIT;
    for row in &budget.layers {
        if !is_doubtful(row.misfit) || row.width_nm <= row.matthews_blakeslee_nm {
            continue;
        }
        let Some(entry) = structure.entries.get(row.entry) else {
            continue;
        };
        let name = match &entry.name {
            Some(name) => format!("layer `{name}`"),
            None => entry.label.clone(),
        };
        let misfit = format!("{:+.2} %", 1e2 * row.misfit);
        let warning = Diagnostic::warning(if row.matthews_blakeslee_nm == 0.0 {
            format!("{name} has a misfit of {misfit}, with which no thickness of it is stable")
        } else {
            format!(
                "{name} ({:.1} nm, misfit {misfit}) is thicker than its critical thickness of {:.1} nm",
                row.width_nm, row.matthews_blakeslee_nm
            )
        });
        found.push(warning.at(entry.material.span.clone()).hint(remark(
            row.glide.k(),
            row.glide.in_words(),
            row.people_bean_nm,
            row.width_nm,
        )));
    }
    if let Some(whole) = &budget.whole
        && whole.layers.0 != whole.layers.1
        && whole.width_nm > whole.matthews_blakeslee_nm
        && budget.layers.iter().any(|row| is_doubtful(row.misfit))
    {
        let label = |layer: usize| stack.layers.get(layer).map_or("", |l| l.label.as_str());
        let warning = Diagnostic::warning(format!(
            "the strained layers from `{}` to `{}`, taken as one layer of {:.0} nm with their mean misfit of {:+.3} %, are \
             thicker than the critical thickness of {:.0} nm",
            label(whole.layers.0),
            label(whole.layers.1),
            whole.width_nm,
            1e2 * whole.misfit,
            whole.matthews_blakeslee_nm
        ));
        found.push(warning.hint(remark(
            whole.glide.k(),
            whole.glide.in_words(),
            whole.people_bean_nm,
            whole.width_nm,
        )));
    }
    found
}

fn remark(k: f64, glide: &str, people_bean_nm: f64, width_nm: f64) -> String {
    let other = if people_bean_nm == 0.0 {
        "the energy balance of People and Bean has no solution either".to_owned()
    } else if width_nm <= people_bean_nm {
        format!(
            "the energy balance of People and Bean allows {people_bean_nm:.0} nm: it may grow, but metastable"
        )
    } else {
        format!(
            "the energy balance of People and Bean allows {people_bean_nm:.1} nm, which is exceeded too"
        )
    };
    format!("by Matthews and Blakeslee for a {glide} (k = {k}); {other}")
}
