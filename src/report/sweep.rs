//! Levels and transitions against a swept number.

use super::svg::{SweepLine, SweepPanel, SweepPicture, Width};
use super::table::{given, significant, table};
use super::{Report, rounded};
use crate::models::model_name;
use crate::structure::{BandName, Level, Stack, Steps, Structure};
use crate::sweep::{
    Anticrossing, Axis, Follows, Found, LevelAt, Outcome, Point, Strength, TransitionAt,
};
use serde::Serialize;
use std::collections::BTreeMap;

const STRENGTH_DEFINITION: &str = "2 m0 E |z|²/ħ² with the free-electron mass";
const FOLLOWS_DEFINITION: &str = "the level, by its number at the lower end of the range, whose character the state has; characters change places where a gap is least";
const MIDDLE_DEFINITION: &str =
    "from the lowest band edge without field, the field zero at the middle of the stack";

/// Rows of a text table: more are in the other forms.
const MOST_ROWS: usize = 26;
/// Columns of levels side by side.
const MOST_COLUMNS: usize = 8;
/// Anticrossings in a picture's caption.
const MOST_NAMED: usize = 6;

/// A sweep, or a slice of one.
#[derive(Debug, Serialize)]
pub struct Sweeps {
    title: Option<String>,
    model: &'static str,
    #[serde(rename = "temperature_K", skip_serializing_if = "Option::is_none")]
    temperature_k: Option<f64>,
    #[serde(rename = "field_kV_cm", skip_serializing_if = "Option::is_none")]
    field_kv_cm: Option<f64>,
    swept: SweptRow,
    anticrossings: Vec<AnticrossingRow>,
    points: Vec<PointRow>,
    oscillator_strength_definition: &'static str,
    follows_definition: &'static str,
    from_middle_definition: &'static str,
    #[serde(skip)]
    outcome: Outcome,
    #[serde(skip)]
    with_header: bool,
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
struct AnticrossingRow {
    /// The two states by their names.
    one: String,
    other: String,
    /// The levels between which the gap is, by energy.
    levels: [String; 2],
    at: f64,
    gap_meV: f64,
    settled: bool,
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

fn name(follows: Follows) -> String {
    match follows {
        Follows::Level(level) => level.to_string(),
        Follows::FromOn(level) => format!("{level}+"),
    }
}

/// As [`name`], without the band.
fn number(follows: Follows) -> String {
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
fn level(outcome: &Outcome, band: usize, state: usize) -> Level {
    Level {
        band: outcome.bands[band].0,
        index: state + 1,
    }
}

/// A value of the swept number, without idle zeros.
fn figure(value: f64) -> String {
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
fn with_unit(axis: &Axis, value: f64) -> String {
    unit_after(axis, figure(value))
}

/// The place of a least gap with its unit, to a ten-thousandth of the range: it is flat there.
fn place_of(axis: &Axis, value: f64) -> String {
    let digits = match axis.steps {
        Steps::Even => (1e4 * value.abs() / (axis.high - axis.low)).log10().ceil(),
        Steps::Logarithmic => 4.0,
    };
    unit_after(axis, significant(value, digits.clamp(1.0, 8.0) as usize))
}

fn unit_after(axis: &Axis, number: String) -> String {
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

    fn heading(&self) -> String {
        let axis = &self.outcome.axis;
        let mut text = format!("{} model", self.model);
        if let Some(temperature_k) = self.temperature_k {
            text += &format!(", {} K", given(temperature_k, 4));
        }
        if let Some(field_kv_cm) = self.field_kv_cm {
            text += &format!(", field {} kV/cm", given(field_kv_cm, 4));
        }
        let (low, high) = (figure(axis.low), with_unit(axis, axis.high));
        let points = self.points.len();
        format!(
            "{text}; {} from {low} to {high}, {points} points",
            axis.name
        )
    }

    /// The points that a text table shows: evenly spaced ones and the last.
    fn rows(&self) -> Vec<&Point> {
        let points = &self.outcome.points;
        let every = points.len().saturating_sub(1).div_ceil(MOST_ROWS - 1);
        let mut rows: Vec<&Point> = points.iter().step_by(every.max(1)).collect();
        if !points.len().saturating_sub(1).is_multiple_of(every.max(1)) {
            rows.extend(points.last());
        }
        rows
    }

    fn value_header(&self) -> String {
        let axis = &self.outcome.axis;
        match (axis.column, axis.unit) {
            ("fraction", _) => "fraction".to_owned(),
            (_, unit) => unit.to_owned(),
        }
    }

    fn level_tables(&self) -> String {
        let mut text = String::new();
        let columns: Vec<(usize, usize)> = (0..self.outcome.bands.len())
            .flat_map(|band| (0..self.outcome.bands[band].1).map(move |state| (band, state)))
            .collect();
        for columns in columns.chunks(MOST_COLUMNS) {
            let names = columns
                .iter()
                .map(|&(band, state)| level(&self.outcome, band, state).to_string());
            let header: Vec<String> = std::iter::once(self.value_header()).chain(names).collect();
            let rows = self.rows().into_iter().map(|point| {
                let cell = |&(band, state): &(usize, usize)| {
                    let found = point.found.as_ref().ok();
                    let at = found.and_then(|found| found.levels[band].get(state));
                    at.map_or("-".to_owned(), |at| {
                        let energy = format!("{:.3}", 1e3 * at.from_edge_ev);
                        let loose = if at.bound { "" } else { "†" };
                        match at.follows {
                            Follows::Level(level) if level == at.level => {
                                format!("{energy}{loose}")
                            }
                            other => format!("({}) {energy}{loose}", number(other)),
                        }
                    })
                };
                let mut row = vec![figure(point.value)];
                row.extend(columns.iter().map(cell));
                row
            });
            let header: Vec<&str> = header.iter().map(|name| &**name).collect();
            text += &format!("\n{}", table(&header, &[], rows.collect()));
        }
        let any =
            |test: &dyn Fn(&LevelAt) -> bool| self.rows().into_iter().flat_map(levels).any(test);
        if any(&|at| at.follows != Follows::Level(at.level)) {
            text += "(n) the state has the character of level n at the lower end of the range; n+, of level n or one beyond.\n";
        }
        if any(&|at| !at.bound) {
            text += "† only the walls hold it.\n";
        }
        text
    }

    fn transition_table(&self, which: usize) -> String {
        let (from, to) = self.outcome.transitions[which];
        let across = (from.band == BandName::Conduction) != (to.band == BandName::Conduction);
        let strengths: &[&str] = match (across, from.band == to.band) {
            (true, _) => &["overlap", "TE", "TM"],
            (false, true) => &["dipole nm", "osc. strength"],
            (false, false) => &[],
        };
        let value = self.value_header();
        let mut header = vec![&*value, "energy meV", "wavelength µm"];
        header.extend(strengths);
        let states = header.len();
        header.push("states");
        let rows = self.rows().into_iter().map(|point| {
            let mut row = vec![figure(point.value)];
            match transitions(point).nth(which).flatten() {
                None => row.extend(vec!["-".to_owned(); header.len() - 1]),
                Some(at) => {
                    row.push(format!("{:.3}", 1e3 * at.energy_ev));
                    row.push(
                        at.wavelength_um()
                            .map_or("-".to_owned(), |um| significant(um, 5)),
                    );
                    match at.strength {
                        Strength::Dipole {
                            dipole_nm,
                            oscillator_strength,
                        } => {
                            row.push(format!("{dipole_nm:.4}"));
                            row.push(significant(oscillator_strength, 4));
                        }
                        Strength::Momentum { overlap, te, tm } => {
                            row.extend([overlap, te, tm].map(|v| format!("{v:.3}")));
                        }
                        Strength::Apart => {}
                    }
                    row.push(format!(
                        "{} to {}",
                        name(at.from_follows),
                        name(at.to_follows)
                    ));
                }
            }
            row
        });
        format!(
            "\n{from} to {to}\n{}",
            table(&header, &[states], rows.collect())
        )
    }

    fn anticrossing_table(&self) -> String {
        if self.anticrossings.is_empty() {
            return "\nNo anticrossing: all states keep their order.\n".to_owned();
        }
        let rows = self.anticrossings.iter().map(|row| {
            vec![
                row.one.clone(),
                row.other.clone(),
                format!("{} and {}", row.levels[0], row.levels[1]),
                place_of(&self.outcome.axis, row.at),
                gap(row.gap_meV) + if row.settled { "" } else { " (did not settle)" },
            ]
        });
        format!(
            "\nAnticrossings\n{}",
            table(
                &["state", "state", "levels", "at", "gap meV"],
                &[0, 1, 2],
                rows.collect()
            )
        )
    }

    /// The levels, each line following a state.
    pub fn levels_svg(&self, width: Width) -> String {
        let outcome = &self.outcome;
        let mut panels = Vec::new();
        for (axis, holes) in [("Energy (meV)", false), ("Energy of holes (meV)", true)] {
            let mut lines: BTreeMap<(usize, String), Vec<Vec<[f64; 2]>>> = BTreeMap::new();
            let mut gaps = Vec::new();
            let sign = if holes { -1e3 } else { 1e3 };
            for (band, &(of, count)) in outcome.bands.iter().enumerate() {
                if (of != BandName::Conduction) != holes {
                    continue;
                }
                for state in 0..count {
                    for (follows, piece) in self.pieces(band, state, sign) {
                        // Light holes begin their styles after the heavy ones.
                        let first = if of == BandName::LightHole { 8 } else { 0 };
                        let style = first + follows.level().index - 1;
                        lines.entry((style, name(follows))).or_default().push(piece);
                    }
                }
                let own = outcome.anticrossings.iter().filter(|c| c.band == band);
                gaps.extend(own.map(|crossing| {
                    let at = self.place(outcome.axis.value(crossing.part));
                    (at, crossing.from_middle_ev.map(|ev| sign * ev))
                }));
            }
            if !lines.is_empty() {
                let lines = lines.into_iter().map(|((style, name), pieces)| SweepLine {
                    style,
                    name,
                    pieces,
                });
                panels.push(SweepPanel {
                    axis: axis.to_owned(),
                    lines: lines.collect(),
                    gaps,
                });
            }
        }
        let mut caption = format!(
            "{}. Energies count {MIDDLE_DEFINITION}. A line follows a state, named as at the lower end of the range; states \
             change places where a gap is least (strokes).",
            self.heading()
        );
        for row in self.anticrossings.iter().take(MOST_NAMED) {
            caption += &format!(
                " {} and {}: {} meV at {}.",
                row.one,
                row.other,
                gap(row.gap_meV),
                place_of(&outcome.axis, row.at)
            );
        }
        if let more @ 1.. = self.anticrossings.len().saturating_sub(MOST_NAMED) {
            caption += &format!(" {more} more anticrossings are in the table.");
        }
        self.picture(panels, caption).svg(width)
    }

    /// The energies of the transitions.
    pub fn transitions_svg(&self, width: Width) -> String {
        let outcome = &self.outcome;
        let mut panels: Vec<SweepPanel> = Vec::new();
        for across in [false, true] {
            let mut lines = Vec::new();
            for (which, (from, to)) in outcome.transitions.iter().enumerate() {
                let electron = |level: &Level| level.band == BandName::Conduction;
                if (electron(from) != electron(to)) != across {
                    continue;
                }
                let mut line = vec![Vec::new()];
                for point in &outcome.points {
                    match (transitions(point).nth(which).flatten(), line.last_mut()) {
                        (Some(at), Some(piece)) => {
                            piece.push([self.place(point.value), 1e3 * at.energy_ev]);
                        }
                        _ => line.push(Vec::new()),
                    }
                }
                line.retain(|piece| !piece.is_empty());
                lines.push(SweepLine {
                    style: lines.len(),
                    name: format!("{from}\nto {to}"),
                    pieces: line,
                });
            }
            if !lines.is_empty() {
                panels.push(SweepPanel {
                    axis: "Transition energy (meV)".to_owned(),
                    lines,
                    gaps: Vec::new(),
                });
            }
        }
        let caption = format!("{}. Levels are counted by energy.", self.heading());
        self.picture(panels, caption).svg(width)
    }

    fn picture(&self, panels: Vec<SweepPanel>, caption: String) -> SweepPicture {
        let axis = &self.outcome.axis;
        let mut name = axis.name.clone();
        if let Some(first) = name.get(..1) {
            name = first.to_uppercase() + &name[1..];
        }
        let unit = axis.unit.replace("^-3", "⁻³");
        SweepPicture {
            title: self.title.clone().unwrap_or_else(|| "Sweep".to_owned()),
            caption: caption.replace(" -", " −"),
            axis: match (axis.steps, &*unit) {
                (Steps::Even, "") => name,
                (Steps::Even, unit) => format!("{name} ({unit})"),
                (Steps::Logarithmic, "") => format!("log₁₀ of {}", axis.name),
                (Steps::Logarithmic, unit) => format!("log₁₀ of {} ({unit})", axis.name),
            },
            range: [self.place(axis.low), self.place(axis.high)],
            panels,
        }
    }

    /// The place of a value on the picture's axis.
    fn place(&self, value: f64) -> f64 {
        match self.outcome.axis.steps {
            Steps::Even => value,
            Steps::Logarithmic => value.log10(),
        }
    }

    /// The curve of a level in stretches, each with the state that it follows: it breaks where there is no level, and
    /// passes through the least gaps.
    fn pieces(&self, band: usize, state: usize, sign: f64) -> Vec<(Follows, Vec<[f64; 2]>)> {
        let outcome = &self.outcome;
        let mut list: Vec<(Follows, Vec<[f64; 2]>)> = Vec::new();
        let mut broken = true;
        let side = |crossing: &Anticrossing| state.checked_sub(crossing.level).filter(|s| *s < 2);
        let own = outcome.anticrossings.iter().filter(|c| c.band == band);
        let mut turns = own.filter_map(|c| Some((c, side(c)?))).peekable();
        for point in &outcome.points {
            while let Some((crossing, side)) = turns.next_if(|(c, _)| c.part < point.part) {
                let x = self.place(outcome.axis.value(crossing.part));
                let turn = [x, sign * crossing.from_middle_ev[side]];
                if let (false, Some((_, piece))) = (broken, list.last_mut()) {
                    piece.push(turn);
                }
                list.push((crossing.follows[1 - side], vec![turn]));
                broken = false;
            }
            let found = point.found.as_ref().ok();
            let Some(at) = found.and_then(|found| found.levels[band].get(state)) else {
                broken = true;
                continue;
            };
            let here = [self.place(point.value), sign * at.from_middle_ev];
            match list.last_mut() {
                Some((_, piece)) if !broken => piece.push(here),
                _ => list.push((at.follows, vec![here])),
            }
            broken = false;
        }
        list
    }
}

/// A gap in meV with the digits that its error leaves.
fn gap(mev: f64) -> String {
    if mev < 1e-5 {
        "<0.00001".to_owned()
    } else {
        significant(mev, 4)
    }
}

fn levels(point: &Point) -> impl Iterator<Item = &LevelAt> {
    let found = point.found.as_ref().ok();
    found
        .into_iter()
        .flat_map(|found| found.levels.iter().flatten())
}

fn transitions(point: &Point) -> impl Iterator<Item = Option<&TransitionAt>> {
    let found = point.found.as_ref().ok();
    found
        .into_iter()
        .flat_map(|found| found.transitions.iter().map(Option::as_ref))
}

/// A name as part of the name of a column.
fn column(level: Level) -> String {
    level.to_string().replace([' ', '-'], "_")
}

const LEVEL_COLUMNS: [&str; 5] = [
    "energy_eV",
    "from_edge_meV",
    "from_middle_meV",
    "follows",
    "bound",
];
const TRANSITION_COLUMNS: [&str; 4] = ["energy_meV", "wavelength_um", "from_follows", "to_follows"];

impl Sweeps {
    /// The columns of strength that a transition has.
    fn strength_columns(&self, (from, to): (Level, Level)) -> &'static [&'static str] {
        if from.band == to.band {
            &["dipole_nm", "oscillator_strength"]
        } else if from.band == BandName::Conduction || to.band == BandName::Conduction {
            &["overlap", "te_Ep", "tm_Ep"]
        } else {
            &[]
        }
    }

    fn csv_header(&self) -> Vec<String> {
        let outcome = &self.outcome;
        let mut header = vec![outcome.axis.column.to_owned()];
        for (band, &(_, count)) in outcome.bands.iter().enumerate() {
            for state in 0..count {
                let level = column(level(outcome, band, state));
                header.extend(LEVEL_COLUMNS.map(|what| format!("{level}_{what}")));
            }
        }
        for &(from, to) in &outcome.transitions {
            let pair = format!("{}_to_{}", column(from), column(to));
            let strengths = self.strength_columns((from, to)).iter();
            let all = TRANSITION_COLUMNS.iter().chain(strengths);
            header.extend(all.map(|what| format!("{pair}_{what}")));
        }
        header.push("not_solved".to_owned());
        header
    }

    fn csv_row(&self, point: &Point, columns: usize) -> Vec<String> {
        let digits = |value: f64| rounded(value).to_string();
        let mut row = vec![digits(point.value)];
        match &point.found {
            Ok(found) => {
                self.csv_cells(found, &mut row);
                row.push(String::new());
            }
            Err(reason) => {
                row.resize(columns - 1, String::new());
                row.push(reason.to_string());
            }
        }
        row
    }

    fn csv_cells(&self, found: &Found, row: &mut Vec<String>) {
        let digits = |value: f64| rounded(value).to_string();
        for (levels, &(_, count)) in found.levels.iter().zip(&self.outcome.bands) {
            for state in 0..count {
                match levels.get(state) {
                    Some(at) => row.extend([
                        digits(at.energy_ev),
                        digits(1e3 * at.from_edge_ev),
                        digits(1e3 * at.from_middle_ev),
                        number(at.follows),
                        at.bound.to_string(),
                    ]),
                    None => row.extend(LEVEL_COLUMNS.map(|_| String::new())),
                }
            }
        }
        for (at, &pair) in found.transitions.iter().zip(&self.outcome.transitions) {
            let strengths = self.strength_columns(pair).len();
            let Some(at) = at else {
                row.extend(vec![String::new(); TRANSITION_COLUMNS.len() + strengths]);
                continue;
            };
            row.extend([
                digits(1e3 * at.energy_ev),
                at.wavelength_um().map_or(String::new(), digits),
                name(at.from_follows),
                name(at.to_follows),
            ]);
            match at.strength {
                Strength::Dipole {
                    dipole_nm,
                    oscillator_strength,
                } => row.extend([dipole_nm, oscillator_strength].map(digits)),
                Strength::Momentum { overlap, te, tm } => row.extend([overlap, te, tm].map(digits)),
                Strength::Apart => {}
            }
        }
    }
}

impl Report for Sweeps {
    fn text(&self) -> String {
        let title = self
            .title
            .as_ref()
            .map_or(String::new(), |t| format!("{t}\n"));
        let mut text = format!(
            "{title}{}\n\nLevels, meV from the band edge{}",
            self.heading(),
            self.level_tables()
        );
        for which in 0..self.outcome.transitions.len() {
            text += &self.transition_table(which);
        }
        text += &self.anticrossing_table();
        let refused: Vec<&Point> = self
            .outcome
            .points
            .iter()
            .filter(|p| p.found.is_err())
            .collect();
        if let Some(Point {
            value,
            found: Err(reason),
            ..
        }) = refused.first()
        {
            text += &format!(
                "\n{} of {} points cannot be solved (-), the first at {}: {reason}.\n",
                refused.len(),
                self.points.len(),
                with_unit(&self.outcome.axis, *value)
            );
        }
        if self.points.len() > MOST_ROWS {
            text += &format!(
                "\n{} of {} points are shown; CSV and JSON hold all.\n",
                self.rows().len(),
                self.points.len()
            );
        }
        text
    }

    fn csv(&self) -> Result<String, csv::Error> {
        let header = self.csv_header();
        let mut writer = csv::Writer::from_writer(Vec::new());
        if self.with_header {
            writer.write_record(&header)?;
        }
        for point in &self.outcome.points {
            writer.write_record(self.csv_row(point, header.len()))?;
        }
        let bytes = writer
            .into_inner()
            .map_err(|error| csv::Error::from(error.into_error()))?;
        Ok(String::from_utf8_lossy(&bytes).into_owned())
    }
}
