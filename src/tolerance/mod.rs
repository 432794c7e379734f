//! Tolerances: how far each transition moves with everything that a grower and a user cannot hold exactly, and what share
//! of wafers will do.

mod charged;
mod derivative;
mod radial;
mod sampling;
mod sensitivities;
mod statistics;

pub use charged::bands as charged_bands;
pub use derivative::level_slopes;
pub use radial::Ring;
pub use sampling::{Distributed, Sampled, Source, Watch, WindowYield, sample, sources};
pub use sensitivities::{Sensitivity, sensitivities};
pub use statistics::{Histogram, Share, Statistics, share};

use crate::charge::{self, ChargeError};
use crate::models::Unsuitable;
use crate::structure::{Design, Stack, Structure};
use crate::subbands::{Accuracy, Nearby, Subbands};

/// Everything about a structure's tolerances.
#[derive(Clone, Debug)]
pub struct Outcome {
    /// The file's stack with abrupt interfaces, solved.
    pub abrupt: Subbands,
    /// The levels that all below starts from, in eV: those with graded interfaces where the file says so.
    pub levels_ev: Vec<f64>,
    pub sensitivities: Vec<Sensitivity>,
    /// `None` when the file states nothing by which wafers differ.
    pub sampled: Option<Sampled>,
    /// From the centre outwards; empty when the file states no `radial`.
    pub rings: Vec<Ring>,
}

/// Why there are no tolerances.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum ToleranceError {
    /// A layer of the file's stack.
    #[error("layer {} {reason}", .layer + 1)]
    Unsuitable { layer: usize, reason: Unsuitable },
    #[error("the {interface} cannot be graded: the mixed crystal {reason}")]
    Interface {
        interface: String,
        reason: Unsuitable,
    },
    #[error("graded interfaces leave nothing of a layer")]
    NoLayer,
    #[error(
        "a window names conduction {wanted}, but the stack is too small a box for more than {levels} levels"
    )]
    NoLevel { wanted: usize, levels: usize },
    #[error(transparent)]
    Charge(ChargeError),
    #[error(
        "charge and potential of a wafer did not settle: the last iteration still moved the bands by {residual_ev:.0e} eV"
    )]
    Unsettled { residual_ev: f64 },
}

impl ToleranceError {
    /// What is wrong with a design, when all layers of the file suit.
    fn of_design(design: &Design, error: ToleranceError) -> Self {
        match error {
            ToleranceError::Unsuitable { layer, reason } => ToleranceError::Interface {
                interface: design.stack().layers[layer].label.clone(),
                reason,
            },
            other => other,
        }
    }
}

/// A stack with the potential of its charge, and so many levels of its conduction band.
fn solved(
    structure: &Structure,
    stack: &Stack,
    levels: usize,
    accuracy: Accuracy,
) -> Result<(Stack, Subbands), ToleranceError> {
    let bands = charged::bands(structure, levels);
    let solution =
        charge::solve(stack, &structure.charge, &bands, accuracy).map_err(|error| match error {
            ChargeError::Unsuitable { layer, reason } => {
                ToleranceError::Unsuitable { layer, reason }
            }
            other => ToleranceError::Charge(other),
        })?;
    if let Some(found) = &solution.equilibrium
        && !found.is_settled()
    {
        let residual_ev = found.residual_ev;
        return Err(ToleranceError::Unsettled { residual_ev });
    }
    let mut conduction = solution.bands.conduction().clone();
    // More may have been solved because they are filled.
    conduction.pairs.truncate(levels);
    conduction.errors_ev.truncate(levels);
    Ok((solution.stack, conduction))
}

/// The mesh of sampled wafers is this exact, in eV: far less than any spread that can be grown.
const SAMPLING_TOLERANCE_EV: f64 = 1e-6;

/// Works out the tolerances of a structure. `samples` takes the place of the file's number of wafers. `watch` is told how
/// many wafers are done.
///
/// # Errors
/// When a material, or the mixed crystal of two at an interface, does not suit the model; when a layer vanishes or a
/// window's level does not exist.
pub fn tolerance(
    structure: &Structure,
    stack: &Stack,
    samples: Option<usize>,
    accuracy: Accuracy,
    watch: Watch,
) -> Result<Outcome, ToleranceError> {
    let model = structure.conduction.model;
    let stated = structure.tolerance.as_ref();
    let windows = stated.map_or(&[][..], |tolerance| &tolerance.windows);
    let highest = windows.iter().map(|window| window.to.index).max();
    let levels = structure.conduction.states.max(highest.unwrap_or(0));

    let (bent, abrupt) = solved(structure, stack, levels, accuracy)?;

    let grading_nm = stated
        .and_then(|tolerance| tolerance.grading.as_ref())
        .map(|grading| grading.length_nm);
    let mut design = Design::new(&bent, grading_nm).map_err(|_| ToleranceError::NoLayer)?;
    let solved_as = |design: &Design, accuracy: Accuracy| {
        solved(structure, design.stack(), levels, accuracy)
            .map_err(|error| ToleranceError::of_design(design, error))
    };
    let solved = match grading_nm {
        None => abrupt.clone(),
        Some(_) => {
            let (bent, solved) = solved_as(&design, accuracy)?;
            design.take_potential(&bent);
            solved
        }
    };
    if let Some(wanted) = highest.filter(|wanted| *wanted > solved.pairs.len()) {
        let levels = solved.pairs.len();
        return Err(ToleranceError::NoLevel { wanted, levels });
    }
    let nearby = Nearby::new(&solved);
    let sensitivities = sensitivities(structure, stack, &design, &nearby);
    let sampled = match stated {
        None => None,
        Some(tolerance) => {
            let coarse = Accuracy {
                tolerance_ev: accuracy.tolerance_ev.max(SAMPLING_TOLERANCE_EV),
            };
            let (_, solved) = solved_as(&design, coarse)?;
            let nearby = Nearby::new(&solved);
            let sources = sources(structure, stack, tolerance, &design, &nearby);
            let count = (samples.unwrap_or(tolerance.samples), tolerance.seed);
            (!sources.is_empty())
                .then(|| sample(model, &design, &nearby, &sources, windows, count, watch))
        }
    };
    let rings = match stated.and_then(|tolerance| tolerance.radial) {
        Some(radial) => radial::rings(structure, &design, radial, levels, accuracy)?,
        None => Vec::new(),
    };
    Ok(Outcome {
        levels_ev: solved.pairs.iter().map(|pair| pair.value).collect(),
        abrupt,
        sensitivities,
        sampled,
        rings,
    })
}
