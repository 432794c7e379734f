//! Pictures of a sweep.

use super::svg::{SweepLine, SweepPanel, SweepPicture, Width};
use super::sweep::{MIDDLE_DEFINITION, Sweeps, gap, name, place_of, transitions};
use crate::structure::{BandName, Level, Steps};
use crate::sweep::{Anticrossing, Follows};
use std::collections::BTreeMap;

/// Anticrossings in a picture's caption.
const MOST_NAMED: usize = 6;

impl Sweeps {
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
