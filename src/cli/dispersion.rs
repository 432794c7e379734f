//! `dispersion`: subbands of coupled bands along an in-plane wave vector.

use super::arguments::{Along, Coupled, Output};
use super::deliver::{Exit, check_output, complain, deliver, show, write};
use super::input::Input;
use super::minibands;
use crate::diagnostics::Diagnostic;
use crate::models::Band;
use crate::models::multiband::{Direction, MultibandModel, MultibandOperator};
use crate::report::Dispersion;
use crate::report::svg::Width;
use crate::structure::{Ends, Structure};
use crate::subbands::multiband::{Wanted, follow_multiband, solve_multiband, zone_centre_masses};
use crate::units::{self, Dimension};
use std::path::Path;

/// Each energy is this exact, in eV: a tenth of the last digit that is printed.
const TOLERANCE_EV: f64 = 1e-6;
/// Beyond this wave vector, in 1/nm, no model of bands around the zone's centre holds.
const LARGEST_PER_NM: f64 = 2.0;
/// Subbands of each band when nothing asks for a number, and the most that are followed.
const DEFAULT_STATES: usize = 4;
const MOST_STATES: usize = 50;

pub fn dispersion(
    file: &Path,
    (model, states): (Option<Coupled>, Option<u8>),
    (along, to, points): (Along, &str, u16),
    output: &Output,
) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output.output.as_deref(), file)?;
    if input.structure.ends == Ends::Periodic {
        return minibands::dispersion(&input, points, output, file);
    }
    input.with_walls("subbands are followed");
    let furthest = match units::parse(to, &[Dimension::WaveVector]) {
        Ok(quantity) if quantity.value() > 0.0 && quantity.value() <= LARGEST_PER_NM => {
            quantity.value()
        }
        Ok(_) => {
            complain(&format!(
                "error: --to {to}: expected a wave vector above 0 and up to {LARGEST_PER_NM} nm^-1"
            ));
            return Err(Exit::WrongInput);
        }
        Err(error) => {
            complain(&format!(
                "error: --to: {error}; expected one such as \"0.5 nm^-1\""
            ));
            return Err(Exit::WrongInput);
        }
    };
    let named = Band::of(&input.structure)
        .into_iter()
        .find_map(|(band, _)| band.coupled());
    let model = match model {
        Some(Coupled::SixBand) => MultibandModel::SixBand,
        Some(Coupled::EightBand) => MultibandModel::EightBand,
        None => named.unwrap_or(MultibandModel::SixBand),
    };
    let apart = input.structure.valence.is_some() && named.is_none();
    if apart {
        let words = format!(
            "the file solves its holes apart from one another; the dispersion is that of the {} model",
            model.name()
        );
        show(&Diagnostic::warning(words), &input.name, &input.text);
    }
    let wanted = wanted(&input.structure, model, states.map(usize::from));
    let (direction, name) = match along {
        Along::Axis => (Direction::ALONG_100, "[100]"),
        Along::Diagonal => (Direction::ALONG_110, "[110]"),
    };
    let operator = MultibandOperator::new(&input.stack, model, direction)
        .map_err(|(layer, reason)| input.unsuitable(layer, &reason.into()))?;
    input.flat_only("the dispersion is that of");
    let k_per_nm: Vec<f64> = (0..points)
        .map(|step| furthest * f64::from(step) / f64::from(points - 1))
        .collect();
    let centre = solve_multiband(&operator, 0.0, wanted, TOLERANCE_EV);
    let masses_m0 = zone_centre_masses(&operator, &centre);
    let followed = follow_multiband(&operator, &k_per_nm, wanted, TOLERANCE_EV);
    let report = Dispersion::new(
        (&input.structure, &input.stack),
        model,
        name,
        &centre,
        &masses_m0,
        &k_per_nm,
        &followed,
    );
    match output.output.as_deref() {
        Some(path)
            if path
                .extension()
                .is_some_and(|e| e.eq_ignore_ascii_case("svg")) =>
        {
            write(path, &report.svg(Width::Page), file)
        }
        path => deliver(&report, output.format, path, file),
    }
}

/// How many subbands of each band: those that the command line asks for, or the file for this model.
fn wanted(structure: &Structure, model: MultibandModel, states: Option<usize>) -> Wanted {
    let asked = Band::of(structure).into_iter();
    let of_file = |sign: f64| {
        asked
            .clone()
            .find(|(band, _)| band.coupled() == Some(model) && band.sign() == sign)
            .map(|(_, count)| count.min(MOST_STATES))
    };
    let count = |sign| states.or_else(|| of_file(sign)).unwrap_or(DEFAULT_STATES);
    Wanted {
        conduction: match model {
            MultibandModel::SixBand => 0,
            MultibandModel::EightBand => count(1.0),
        },
        valence: count(-1.0),
    }
}
