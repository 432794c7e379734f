//! Tolerances: how far each transition moves with everything that a grower and a user cannot hold exactly, and what share
//! of wafers will do.

mod charged;
mod derivative;
mod followed;
mod radial;
mod sampling;
mod sensitivities;
mod statistics;

pub use derivative::level_slopes;
pub use followed::Followed;
pub use radial::Ring;
pub use sampling::{Distributed, Sampled, Source, Watch, WindowYield, sample, sources};
pub use sensitivities::{Sensitivity, sensitivities};
pub use statistics::{Histogram, Share, Statistics, share};

use crate::charge::{self, ChargeError};
use crate::models::{Band, Unsuitable};
use crate::structure::{Charge, Design, Level, Stack, Structure, Window};
use crate::subbands::{Accuracy, Bands};

/// Everything about a structure's tolerances.
#[derive(Clone, Debug)]
pub struct Outcome {
    /// The file's stack with abrupt interfaces, solved.
    pub abrupt: Bands,
    /// The levels that are followed, the conduction band's first.
    pub levels: Vec<Level>,
    /// Their energies that all below starts from, in eV: those with graded interfaces where the file says so.
    pub levels_ev: Vec<f64>,
    /// The same with abrupt interfaces.
    pub abrupt_levels_ev: Vec<f64>,
    /// The transitions, as places in the list of levels.
    pub pairs: Vec<(usize, usize)>,
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
    #[error("a window names {wanted}, but the stack is too small a box for so many levels")]
    NoLevel { wanted: Level },
    #[error(
        "a window names {wanted}, which is a level of coupled bands, and tolerances are those of bands that are solved on their own"
    )]
    Coupled { wanted: Level },
    #[error(transparent)]
    Charge(ChargeError),
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

/// A stack with the potential of its charge, and so many levels of its bands.
fn solved(
    charge: &Charge,
    stack: &Stack,
    asked: &[(Band, usize)],
    accuracy: Accuracy,
) -> Result<(Stack, Bands), ToleranceError> {
    let solution = charge::settled(stack, charge, asked, accuracy);
    solution
        .map(|found| (found.stack, found.bands))
        .map_err(|error| match error {
            ChargeError::Unsuitable { layer, reason } => {
                ToleranceError::Unsuitable { layer, reason }
            }
            other => ToleranceError::Charge(other),
        })
}

/// The first level of the windows that belongs to coupled bands.
pub fn coupled_level(structure: &Structure, windows: &[Window]) -> Option<Level> {
    let coupled: Vec<Band> = Band::of(structure)
        .into_iter()
        .map(|(band, _)| band)
        .filter(|band| band.coupled().is_some())
        .collect();
    followed::named_by(windows)
        .into_iter()
        .find(|level| coupled.iter().any(|band| band.highest(&[*level]) > 0))
}

/// The mesh of sampled wafers is this exact, in eV: far less than any spread that can be grown.
const SAMPLING_TOLERANCE_EV: f64 = 1e-6;

/// Works out the tolerances of a structure. `samples` takes the place of the file's number of wafers. `watch` is told how
/// many wafers are done.
///
/// # Errors
/// When a material, or the mixed crystal of two at an interface, does not suit the model; when a layer vanishes or a
/// window's level does not exist or belongs to coupled bands.
pub fn tolerance(
    structure: &Structure,
    stack: &Stack,
    samples: Option<usize>,
    accuracy: Accuracy,
    watch: Watch,
) -> Result<Outcome, ToleranceError> {
    let stated = structure.tolerance.as_ref();
    let windows = stated.map_or(&[][..], |tolerance| &tolerance.windows);
    if let Some(wanted) = coupled_level(structure, windows) {
        return Err(ToleranceError::Coupled { wanted });
    }
    let named = followed::named_by(windows);
    let mut asked = Band::holding(structure, &named);
    asked.retain(|(band, _)| band.coupled().is_none());
    let charge = &structure.charge;
    let (bent, abrupt) = solved(charge, stack, &asked, accuracy)?;

    let grading_nm = stated
        .and_then(|tolerance| tolerance.grading.as_ref())
        .map(|grading| grading.length_nm);
    let mut design = Design::new(&bent, grading_nm).map_err(|_| ToleranceError::NoLayer)?;
    let of_design = |design: &Design, asked: &[(Band, usize)], accuracy| {
        solved(charge, design.stack(), asked, accuracy)
            .map_err(|error| ToleranceError::of_design(design, error))
    };
    let bands = match grading_nm {
        None => abrupt.clone(),
        Some(_) => {
            let (bent, bands) = of_design(&design, &asked, accuracy)?;
            design.take_potential(&bent);
            bands
        }
    };
    let levels = followed::names(structure, windows, &bands);
    if let Some(wanted) = named.into_iter().find(|level| !levels.contains(level)) {
        return Err(ToleranceError::NoLevel { wanted });
    }
    let pairs = followed::pairs(structure, windows, &levels);
    let followed = Followed::new(&bands, levels.clone());
    let sensitivities = sensitivities(structure, stack, &design, &followed);
    let fewest = followed::fewest(&asked, &levels);
    let sampled = match stated {
        None => None,
        Some(tolerance) => {
            let coarse = Accuracy {
                tolerance_ev: accuracy.tolerance_ev.max(SAMPLING_TOLERANCE_EV),
            };
            let (_, bands) = of_design(&design, &fewest, coarse)?;
            let followed = Followed::new(&bands, levels.clone());
            let sources = sources(structure, stack, tolerance, &design, &followed);
            let count = (samples.unwrap_or(tolerance.samples), tolerance.seed);
            (!sources.is_empty())
                .then(|| sample(&design, &followed, &pairs, &sources, windows, count, watch))
        }
    };
    let rings = match stated.and_then(|tolerance| tolerance.radial) {
        Some(radial) => radial::rings(charge, &design, &fewest, &levels, radial, accuracy)?,
        None => Vec::new(),
    };
    Ok(Outcome {
        abrupt_levels_ev: followed::energies_ev(&abrupt, &levels),
        levels_ev: followed.energies_ev().to_vec(),
        abrupt,
        levels,
        pairs,
        sensitivities,
        sampled,
        rings,
    })
}
