//! Energies of subbands against the in-plane wave vector, conduction and valence subbands in panels of their own.

use super::Width;
use super::axes::{BOTTOM_ROOM, Scale, bottom_axis, left_axis, left_room};
use super::page::{ASCENT, Anchor, MARGIN_PT, Page, SMALL_PT, Style};
use super::palette;
use super::spread::spread;
use super::text::width_pt;

/// A picture of subbands through k∥.
#[derive(Clone, Debug)]
pub struct DispersionCurves {
    pub title: String,
    pub caption: String,
    /// Ascending.
    pub k_per_nm: Vec<f64>,
    /// Name, whether it is a valence subband, and the energies of both members in eV at every wave vector.
    pub bands: Vec<(String, bool, Vec<[f64; 2]>)>,
}

const PANEL_PT: f64 = 190.0;
const GAP_PT: f64 = 14.0;
const LINE_PT: f64 = 1.1;

impl DispersionCurves {
    /// The picture.
    pub fn svg(&self, width: Width) -> String {
        let mut page = Page::new(width);
        let mut top = page.title(&self.title) + 6.0;
        let widest = self
            .bands
            .iter()
            .map(|(name, ..)| width_pt(name, SMALL_PT))
            .fold(0.0, f64::max);
        let right = page.width - MARGIN_PT - widest - 14.0;
        let furthest = self.k_per_nm.last().copied().unwrap_or(1.0).max(1e-9);
        let mut bottom = top;
        for valence in [false, true] {
            let own: Vec<_> = self.bands.iter().filter(|band| band.1 == valence).collect();
            let energies = || {
                own.iter()
                    .flat_map(|band| &band.2)
                    .flatten()
                    .map(|ev| 1e3 * ev)
            };
            let (low, high) = (
                energies().fold(f64::INFINITY, f64::min),
                energies().fold(f64::NEG_INFINITY, f64::max),
            );
            if own.is_empty() || !low.is_finite() || !high.is_finite() {
                continue;
            }
            let spare = 0.06 * (high - low).max(1.0);
            bottom = top + PANEL_PT;
            let vertical = Scale {
                domain: [low - spare, high + spare],
                range: [bottom, top],
            };
            let left = MARGIN_PT + left_room(vertical);
            let across = Scale {
                domain: [0.0, furthest],
                range: [left, right],
            };
            left_axis(&mut page, vertical, left, "Energy (meV)");
            for (index, (.., energies_ev)) in own.iter().enumerate() {
                for member in [0, 1] {
                    let points: Vec<[f64; 2]> = self
                        .k_per_nm
                        .iter()
                        .zip(energies_ev)
                        .map(|(k, ev)| [across.at(*k), vertical.at(1e3 * ev[member])])
                        .collect();
                    page.polyline(&points, palette::state(index, LINE_PT));
                }
            }
            let mut labels: Vec<(f64, &str)> = own
                .iter()
                .map(|(name, _, energies_ev)| {
                    let last = energies_ev.last().map_or(0.0, |e| 500.0 * (e[0] + e[1]));
                    (vertical.at(last), &**name)
                })
                .collect();
            labels.sort_by(|a, b| a.0.total_cmp(&b.0));
            let ends: Vec<f64> = labels.iter().map(|(y, _)| *y).collect();
            let sizes = vec![SMALL_PT * 1.25; ends.len()];
            for ((end, name), y) in labels.iter().zip(spread(&ends, &sizes, top, bottom)) {
                page.line(
                    [right + 1.0, *end],
                    [right + 9.0, y],
                    palette::Stroke::solid(palette::GUIDE, 0.4),
                );
                page.text(
                    [right + 11.0, y + 0.5 * ASCENT * SMALL_PT],
                    Style::new(SMALL_PT, Anchor::Start),
                    name,
                );
            }
            bottom_axis(&mut page, across, bottom, "k∥ (1/nm)");
            top = bottom + BOTTOM_ROOM + GAP_PT;
        }
        let y = page.caption(&self.caption, bottom + BOTTOM_ROOM);
        let names: Vec<&str> = self.bands.iter().map(|(name, ..)| &**name).collect();
        page.finish(y + 4.0, &self.title, &names.join("; "))
    }
}
