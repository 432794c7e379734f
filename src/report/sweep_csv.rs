//! A sweep as CSV: one row for each point, so that slices join.

use super::rounded;
use super::sweep::{Sweeps, level, name, number};
use crate::structure::{BandName, Level};
use crate::sweep::{Found, Point, Strength};

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

    /// The rows, below the names of the columns if they are asked for.
    pub(super) fn rows_of_points(&self) -> Result<String, csv::Error> {
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
