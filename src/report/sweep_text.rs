//! The text tables of a sweep.

use super::sweep::{
    Sweeps, figure, gap, level, levels, name, number, place_of, transitions, with_unit,
};
use super::table::{significant, table};
use crate::structure::BandName;
use crate::sweep::{Follows, LevelAt, Point, Strength};

/// Rows of a text table: more are in the other forms.
const MOST_ROWS: usize = 26;
/// Columns of levels side by side.
const MOST_COLUMNS: usize = 8;
/// Weaker transitions are forbidden: what is left is rounding.
const LEAST_STRENGTH: f64 = 1e-12;

impl Sweeps {
    /// All tables.
    pub(super) fn tables(&self) -> String {
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
                self.outcome.points.len(),
                with_unit(&self.outcome.axis, *value)
            );
        }
        if self.outcome.points.len() > MOST_ROWS {
            text += &format!(
                "\n{} of {} points are shown; CSV and JSON hold all.\n",
                self.rows().len(),
                self.outcome.points.len()
            );
        }
        text
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
            (false, true) => &["dipole nm", "strength"],
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
                            row.push(match oscillator_strength < LEAST_STRENGTH {
                                true => "0".to_owned(),
                                false => significant(oscillator_strength, 4),
                            });
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
}
