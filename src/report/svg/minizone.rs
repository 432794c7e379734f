//! Minibands against the wave vector along growth, and beside them the density of states on the same scale of energy.

use super::Width;
use super::axes::{BOTTOM_ROOM, Scale, bottom_axis, left_axis, left_room};
use super::page::{ASCENT, Anchor, MARGIN_PT, Page, SMALL_PT, Style};
use super::palette::{self, BODY, GUIDE, INK, Stroke};

/// A picture of minibands.
#[derive(Clone, Debug)]
pub struct MinizoneCurves {
    pub title: String,
    pub caption: String,
    /// One for each band.
    pub panels: Vec<MinizonePanel>,
}

/// The minibands of one band.
#[derive(Clone, Debug)]
pub struct MinizonePanel {
    pub word: &'static str,
    /// q d/π, ascending from 0 to 1.
    pub phases_over_pi: Vec<f64>,
    /// The energies of each miniband at these phases, in eV.
    pub minibands_ev: Vec<Vec<f64>>,
    pub edge_ev: f64,
    /// Energy in eV and states per eV and cm² of one period.
    pub density: Vec<[f64; 2]>,
}

const PANEL_PT: f64 = 215.0;
const GAP_PT: f64 = 14.0;
const LINE_PT: f64 = 1.1;
/// Between the two panels.
const APART_PT: f64 = 20.0;
/// Of the width of both panels that of the dispersion.
const DISPERSION_SHARE: f64 = 0.56;

impl MinizoneCurves {
    /// The picture.
    pub fn svg(&self, width: Width) -> String {
        let mut page = Page::new(width);
        let mut top = page.title(&self.title) + 6.0;
        let mut bottom = top;
        let mut names = Vec::new();
        for panel in &self.panels {
            bottom = top + PANEL_PT;
            panel.draw(&mut page, [top, bottom]);
            names.extend(
                panel
                    .minibands_ev
                    .iter()
                    .enumerate()
                    .map(|(index, energies)| {
                        let first = energies.first().copied().unwrap_or(0.0);
                        let last = energies.last().copied().unwrap_or(0.0);
                        format!(
                            "{} {} from {:.5} eV at q = 0 to {:.5} eV at π/d",
                            panel.word,
                            index + 1,
                            first,
                            last
                        )
                    }),
            );
            top = bottom + BOTTOM_ROOM + GAP_PT;
        }
        let y = page.caption(&self.caption, bottom + BOTTOM_ROOM);
        page.finish(y + 4.0, &self.title, &names.join("; "))
    }
}

impl MinizonePanel {
    fn draw(&self, page: &mut Page, [top, bottom]: [f64; 2]) {
        let from_edge = |ev: f64| 1e3 * (ev - self.edge_ev);
        let energies = || self.minibands_ev.iter().flatten().map(|ev| from_edge(*ev));
        let low = energies().fold(0.0, f64::min);
        let high = energies().fold(0.0, f64::max);
        let spare = 0.04 * (high - low).max(1e-3);
        let vertical = Scale {
            domain: [
                if low < 0.0 { low - spare } else { 0.0 },
                if high > 0.0 { high + spare } else { 0.0 },
            ],
            range: [bottom, top],
        };
        let left = MARGIN_PT + left_room(vertical);
        let right = page.width - MARGIN_PT - 6.0;
        let middle = left + DISPERSION_SHARE * (right - left - APART_PT);
        let across = Scale {
            domain: [0.0, 1.0],
            range: [left, middle],
        };
        let densest = self.density.iter().map(|p| p[1]).fold(0.0, f64::max);
        let power = 10f64.powf(densest.max(1.0).log10().floor());
        let density = Scale {
            domain: [0.0, 1.06 * (densest / power).max(1e-3)],
            range: [middle + APART_PT, right],
        };
        page.group("spans", |page| {
            for energies_ev in &self.minibands_ev {
                let ys = energies_ev.iter().map(|ev| vertical.at(from_edge(*ev)));
                let (upper, lower) = ys.fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), y| {
                    (a.min(y), b.max(y))
                });
                page.rectangle(
                    [left, upper],
                    [right - left, (lower - upper).max(0.4)],
                    BODY,
                );
            }
        });
        left_axis(
            page,
            vertical,
            left,
            &format!("Energy from the {} edge (meV)", self.word),
        );
        page.group("minibands", |page| {
            for (index, energies_ev) in self.minibands_ev.iter().enumerate() {
                let points: Vec<[f64; 2]> = self
                    .phases_over_pi
                    .iter()
                    .zip(energies_ev)
                    .map(|(x, ev)| [across.at(*x), vertical.at(from_edge(*ev))])
                    .collect();
                page.polyline(&points, palette::state(index, LINE_PT));
                if let Some([x, y]) = points.last() {
                    let style = Style {
                        halo: true,
                        ..Style::new(SMALL_PT, Anchor::End)
                    };
                    let label = (index + 1).to_string();
                    page.text([x - 3.0, y + 0.5 * ASCENT * SMALL_PT], style, &label);
                }
            }
        });
        page.group("density", |page| {
            let mut points: Vec<[f64; 2]> = self
                .density
                .iter()
                .map(|[ev, d]| [density.at(d / power), vertical.at(from_edge(*ev))])
                .collect();
            // Beyond the last miniband the next one would add to it: the line ends there.
            points.dedup();
            page.polyline(&points, Stroke::solid(INK, LINE_PT));
            let zero = density.range[0];
            page.line([zero, bottom], [zero, top], Stroke::solid(GUIDE, 0.4));
        });
        bottom_axis(page, across, bottom, "q d/π");
        let unit = format!(
            "States (10{} /eV cm²)",
            superscript(power.log10().round() as i32)
        );
        bottom_axis(page, density, bottom, &unit);
    }
}

/// A power of ten's exponent in raised digits.
fn superscript(exponent: i32) -> String {
    let digits = ['⁰', '¹', '²', '³', '⁴', '⁵', '⁶', '⁷', '⁸', '⁹'];
    exponent
        .to_string()
        .chars()
        .filter_map(|c| Some(digits[c.to_digit(10)? as usize]))
        .collect()
}
