//! Levels and transitions against a swept number.

use super::Report;
use super::table::{given, significant};
use crate::models::{model_name, valence_model_name};
use crate::structure::{Level, Stack, Steps, Structure};
use crate::sweep::{Axis, Follows, LevelAt, Outcome, Point, Strength, TransitionAt};
use serde::Serialize;

const STRENGTH_DEFINITION: &str = "2 m0 E |z|²/ħ² with the free-electron mass";
const FOLLOWS_DEFINITION: &str = "the level, by its number at the lower end of the range, whose character the state has; characters change places where a gap is least";
pub(super) const MIDDLE_DEFINITION: &str =
    "from the lowest band edge without field, the field zero at the middle of the stack";

/// A sweep, or a slice of one.
#[derive(Debug, Serialize)]
pub struct Sweeps {
    pub(super) title: Option<String>,
    model: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    valence_model: Option<&'static str>,
    #[serde(rename = "temperature_K", skip_serializing_if = "Option::is_none")]
    temperature_k: Option<f64>,
    #[serde(rename = "field_kV_cm", skip_serializing_if = "Option::is_none")]
    field_kv_cm: Option<f64>,
    swept: SweptRow,
    pub(super) anticrossings: Vec<AnticrossingRow>,
    points: Vec<PointRow>,
    oscillator_strength_definition: &'static str,
    follows_definition: &'static str,
    from_middle_definition: &'static str,
    #[serde(skip)]
    pub(super) outcome: Outcome,
    #[serde(skip)]
    pub(super) with_header: bool,
}

#[derive(Debug, Serialize)]
struct SweptRow {
    name: String,
    unit: &'static str,
    from: f64,
    to: f64,
    steps: &'static str,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
pub(super) struct AnticrossingRow {
    /// The two states by their names.
    pub(super) one: String,
    pub(super) other: String,
    /// The levels between which the gap is, by energy.
    pub(super) levels: [String; 2],
    pub(super) at: f64,
    pub(super) gap_meV: f64,
    pub(super) settled: bool,
}

#[derive(Debug, Serialize)]
struct PointRow {
    at: f64,
    #[serde(skip_serializing_if = "Option::is_none")]
    not_solved: Option<String>,
    levels: Vec<LevelRow>,
    transitions: Vec<TransitionRow>,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct LevelRow {
    level: String,
    follows: String,
    energy_eV: f64,
    from_edge_meV: f64,
    from_middle_meV: f64,
    error_meV: f64,
    bound: bool,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct TransitionRow {
    from: String,
    to: String,
    from_follows: String,
    to_follows: String,
    energy_meV: f64,
    wavelength_um: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    dipole_nm: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    oscillator_strength: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    overlap: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    te_Ep: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    tm_Ep: Option<f64>,
}

pub(super) fn name(follows: Follows) -> String {
    match follows {
        Follows::Level(level) => level.to_string(),
        Follows::FromOn(level) => format!("{level}+"),
    }
}

/// As [`name`], without the band.
pub(super) fn number(follows: Follows) -> String {
    match follows {
        Follows::Level(level) => level.index.to_string(),
        Follows::FromOn(level) => format!("{}+", level.index),
    }
}

impl LevelRow {
    fn new(at: &LevelAt) -> LevelRow {
        LevelRow {
            level: at.level.to_string(),
            follows: name(at.follows),
            energy_eV: at.energy_ev,
            from_edge_meV: 1e3 * at.from_edge_ev,
            from_middle_meV: 1e3 * at.from_middle_ev,
            error_meV: 1e3 * at.error_ev,
            bound: at.bound,
        }
    }
}

impl TransitionRow {
    fn new(at: &TransitionAt) -> TransitionRow {
        let (mut dipole, mut momentum) = (None, None);
        match at.strength {
            Strength::Dipole {
                dipole_nm,
                oscillator_strength,
            } => dipole = Some((dipole_nm, oscillator_strength)),
            Strength::Momentum { overlap, te, tm } => momentum = Some((overlap, te, tm)),
            Strength::Apart => {}
        }
        TransitionRow {
            from: at.from.to_string(),
            to: at.to.to_string(),
            from_follows: name(at.from_follows),
            to_follows: name(at.to_follows),
            energy_meV: 1e3 * at.energy_ev,
            wavelength_um: at.wavelength_um(),
            dipole_nm: dipole.map(|d| d.0),
            oscillator_strength: dipole.map(|d| d.1),
            overlap: momentum.map(|m| m.0),
            te_Ep: momentum.map(|m| m.1),
            tm_Ep: momentum.map(|m| m.2),
        }
    }
}

/// The number of a level of the lower end, in its band.
pub(super) fn level(outcome: &Outcome, band: usize, state: usize) -> Level {
    Level {
        band: outcome.bands[band].0,
        index: state + 1,
    }
}

/// A value of the swept number, without idle zeros.
pub(super) fn figure(value: f64) -> String {
    match given(value, 6).split_once('e') {
        None => given(value, 6),
        Some((digits, power)) => {
            format!(
                "{}e{power}",
                digits.trim_end_matches('0').trim_end_matches('.')
            )
        }
    }
}

/// A value of the swept number with its unit.
pub(super) fn with_unit(axis: &Axis, value: f64) -> String {
    unit_after(axis, figure(value))
}

/// The place of a least gap with its unit, to a ten-thousandth of the range: it is flat there.
pub(super) fn place_of(axis: &Axis, value: f64) -> String {
    let digits = match axis.steps {
        Steps::Even => (1e4 * value.abs() / (axis.high - axis.low)).log10().ceil(),
        Steps::Logarithmic => 4.0,
    };
    unit_after(axis, significant(value, digits.clamp(1.0, 8.0) as usize))
}

pub(super) fn unit_after(axis: &Axis, number: String) -> String {
    if axis.unit.is_empty() {
        number
    } else {
        format!("{number} {}", axis.unit)
    }
}

impl Sweeps {
    /// `with_header` says whether the CSV begins with the names of its columns.
    pub fn new(
        structure: &Structure,
        stack: &Stack,
        outcome: Outcome,
        with_header: bool,
    ) -> Sweeps {
        let axis = &outcome.axis;
        let anticrossings = outcome.anticrossings.iter().map(|crossing| {
            let named = |state| level(&outcome, crossing.band, state).to_string();
            let mut states = crossing.follows;
            states.sort_by_key(|state| state.level().index);
            AnticrossingRow {
                one: name(states[0]),
                other: name(states[1]),
                levels: [named(crossing.level), named(crossing.level + 1)],
                at: axis.value(crossing.part),
                gap_meV: 1e3 * crossing.gap_ev,
                settled: crossing.settled,
            }
        });
        let points = outcome.points.iter().map(|point| PointRow {
            at: point.value,
            not_solved: point.found.as_ref().err().map(|reason| reason.to_string()),
            levels: levels(point).map(LevelRow::new).collect(),
            transitions: transitions(point)
                .flatten()
                .map(TransitionRow::new)
                .collect(),
        });
        let not_swept = |column: &str| axis.column != column;
        Sweeps {
            title: structure.title.clone(),
            model: model_name(structure.conduction.model),
            valence_model: structure
                .valence
                .map(|valence| valence_model_name(valence.model)),
            temperature_k: not_swept("temperature_K").then_some(structure.temperature_k),
            field_kv_cm: not_swept("field_kV_cm").then_some(1e4 * stack.field_v_per_nm),
            swept: SweptRow {
                name: axis.name.clone(),
                unit: axis.unit,
                from: axis.low,
                to: axis.high,
                steps: match axis.steps {
                    Steps::Even => "even",
                    Steps::Logarithmic => "logarithmic",
                },
            },
            anticrossings: anticrossings.collect(),
            points: points.collect(),
            oscillator_strength_definition: STRENGTH_DEFINITION,
            follows_definition: FOLLOWS_DEFINITION,
            from_middle_definition: MIDDLE_DEFINITION,
            outcome,
            with_header,
        }
    }

    pub(super) fn heading(&self) -> String {
        let axis = &self.outcome.axis;
        let mut text = format!("{} model", self.model);
        if let Some(holes) = self.valence_model.filter(|holes| *holes != self.model) {
            text += &format!(", {holes} holes");
        }
        if let Some(temperature_k) = self.temperature_k {
            text += &format!(", {} K", given(temperature_k, 4));
        }
        if let Some(field_kv_cm) = self.field_kv_cm {
            text += &format!(", field {} kV/cm", given(field_kv_cm, 4));
        }
        let (low, high) = (figure(axis.low), with_unit(axis, axis.high));
        let points = self.outcome.points.len();
        format!(
            "{text}; {} from {low} to {high}, {points} points",
            axis.name
        )
    }
}

/// A gap in meV with the digits that its error leaves.
pub(super) fn gap(mev: f64) -> String {
    if mev < 1e-5 {
        "<0.00001".to_owned()
    } else {
        significant(mev, 4)
    }
}

pub(super) fn levels(point: &Point) -> impl Iterator<Item = &LevelAt> {
    let found = point.found.as_ref().ok();
    found
        .into_iter()
        .flat_map(|found| found.levels.iter().flatten())
}

pub(super) fn transitions(point: &Point) -> impl Iterator<Item = Option<&TransitionAt>> {
    let found = point.found.as_ref().ok();
    found
        .into_iter()
        .flat_map(|found| found.transitions.iter().map(Option::as_ref))
}

impl Report for Sweeps {
    fn text(&self) -> String {
        self.tables()
    }

    fn csv(&self) -> Result<String, csv::Error> {
        self.rows_of_points()
    }
}
