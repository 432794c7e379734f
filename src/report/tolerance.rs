//! How far transitions move, and the sampled yield.

use super::table::{given, significant, table};
use super::{Report, csv_table};
use crate::constants::HC_EV_UM;
use crate::models::model_name;
use crate::structure::{BandName, Charge, Stack, Structure, Target, Window};
use crate::tolerance::{Distributed, Outcome, Ring, Sampled, Share};
use serde::Serialize;

/// What the numbers mean; printed with them.
const DEFINITIONS: [&str; 4] = [
    "Spreads are one standard deviation, normal and independent of each other; every wafer is solved in full.",
    "Linear: the spread that the shifts above foretell; contributors are their shares of its variance.",
    "Flux: thickness and composition of all layers that hold the element move together. Repeats move together.",
    "Shares of wafers carry Wilson's 95 % interval.",
];
/// Contributors that are named in the table.
const NAMED: usize = 3;
/// A smaller share of the variance is not named.
const LEAST_SHARE: f64 = 0.005;

/// How charge enters.
const CHARGE_DEFINITION: &str = "Charge answers to every change: sensitivities and radii are self-consistent. Sampled wafers take the potential along with their layers, and the charge's answer is that of the sensitivities, to first order.";
const FLAT_DEFINITION: &str =
    "Doping has no entry: the bands stay flat, whatever the charge of dopants and carriers.";

/// The tolerances of a design.
#[derive(Debug, Serialize)]
pub struct Tolerances {
    title: Option<String>,
    model: &'static str,
    #[serde(rename = "temperature_K")]
    temperature_k: f64,
    #[serde(rename = "field_kV_cm")]
    field_kv_cm: f64,
    /// The length over which interfaces are graded.
    grading_nm: Option<f64>,
    transitions: Vec<TransitionRow>,
    sensitivities: Vec<SensitivityRow>,
    samples: Option<usize>,
    seed: Option<u64>,
    /// Wafers that cannot be; they count as outside of the windows.
    not_grown: Option<usize>,
    distributions: Vec<DistributionRow>,
    windows: Vec<WindowRow>,
    all_windows: Option<ShareRow>,
    radial: Vec<RadialRow>,
    definitions: Vec<&'static str>,
    /// The pairs of levels that the text is about; the other forms hold all.
    #[serde(skip)]
    shown: Vec<(usize, usize)>,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct TransitionRow {
    from: String,
    to: String,
    energy_meV: f64,
    wavelength_um: f64,
    /// The same with abrupt interfaces.
    abrupt_energy_meV: f64,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct SensitivityRow {
    quantity: String,
    step: &'static str,
    from: String,
    to: String,
    energy_meV: f64,
    wavelength_um: f64,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct SpreadRow {
    from: String,
    to: String,
    mean_energy_meV: f64,
    deviation_energy_meV: f64,
    linear_deviation_energy_meV: f64,
    energy_5_percent_meV: f64,
    energy_50_percent_meV: f64,
    energy_95_percent_meV: f64,
    mean_wavelength_um: f64,
    deviation_wavelength_um: f64,
    linear_deviation_wavelength_um: f64,
    wavelength_5_percent_um: f64,
    wavelength_50_percent_um: f64,
    wavelength_95_percent_um: f64,
    /// Wafers in which the upper level lies above the lower outer barrier edge.
    unbound: usize,
}

/// A sampled transition: its spread, and what makes it.
#[derive(Debug, Serialize)]
struct DistributionRow {
    #[serde(flatten)]
    spread: SpreadRow,
    contributors: Vec<ContributorRow>,
    histogram: HistogramRow,
}

#[derive(Debug, Serialize)]
struct ContributorRow {
    quantity: String,
    variance_share: f64,
}

#[derive(Debug, Default, Serialize)]
#[allow(non_snake_case)]
struct HistogramRow {
    edges_meV: Vec<f64>,
    counts: Vec<usize>,
}

#[derive(Debug, Serialize)]
struct WindowRow {
    from: String,
    to: String,
    unit: &'static str,
    low: f64,
    high: f64,
    design_inside: bool,
    inside: usize,
    of: usize,
    share: f64,
    share_low: f64,
    share_high: f64,
}

#[derive(Debug, Serialize)]
struct ShareRow {
    inside: usize,
    of: usize,
    share: f64,
    share_low: f64,
    share_high: f64,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct RadialRow {
    radius_mm: f64,
    thickness: f64,
    from: String,
    to: String,
    energy_meV: f64,
    wavelength_um: f64,
    /// Whether it lies in the file's window, if there is one for this transition.
    inside: Option<bool>,
}

fn name(level: usize) -> String {
    format!("conduction {}", level + 1)
}

fn number(name: &str) -> &str {
    name.trim_start_matches("conduction ")
}

impl Tolerances {
    pub fn new(structure: &Structure, stack: &Stack, outcome: &Outcome) -> Tolerances {
        let levels = outcome.levels_ev.len();
        let energy_ev = |levels: &[f64], from: usize, to: usize| levels[to] - levels[from];
        let abrupt_ev: Vec<f64> = outcome.abrupt.pairs.iter().map(|p| p.value).collect();
        let pairs: Vec<(usize, usize)> = (0..levels)
            .flat_map(|from| (from + 1..levels).map(move |to| (from, to)))
            .collect();
        let windows = structure
            .tolerance
            .as_ref()
            .map_or(&[][..], |tolerance| &tolerance.windows);
        let mut sensitivities = Vec::new();
        for &(from, to) in &pairs {
            let ev = energy_ev(&outcome.levels_ev, from, to);
            for found in &outcome.sensitivities {
                let shift_ev = energy_ev(&found.level_shifts_ev, from, to);
                sensitivities.push(SensitivityRow {
                    quantity: found.name.clone(),
                    step: found.step,
                    from: name(from),
                    to: name(to),
                    energy_meV: 1e3 * shift_ev,
                    wavelength_um: -HC_EV_UM / ev * shift_ev / ev,
                });
            }
        }
        let sampled = outcome.sampled.as_ref();
        Tolerances {
            title: structure.title.clone(),
            model: model_name(structure.conduction.model),
            temperature_k: structure.temperature_k,
            field_kv_cm: 1e4 * stack.field_v_per_nm,
            grading_nm: structure
                .tolerance
                .as_ref()
                .and_then(|tolerance| tolerance.grading.as_ref())
                .map(|grading| grading.length_nm),
            transitions: pairs
                .iter()
                .map(|&(from, to)| {
                    let ev = energy_ev(&outcome.levels_ev, from, to);
                    TransitionRow {
                        from: name(from),
                        to: name(to),
                        energy_meV: 1e3 * ev,
                        wavelength_um: HC_EV_UM / ev,
                        abrupt_energy_meV: 1e3 * energy_ev(&abrupt_ev, from, to),
                    }
                })
                .collect(),
            sensitivities,
            samples: sampled.map(|s| s.samples),
            seed: sampled.map(|s| s.seed),
            not_grown: sampled.map(|s| s.not_grown),
            distributions: sampled.map_or(Vec::new(), |sampled| {
                let row = |t: &Distributed| {
                    let ev = energy_ev(&outcome.levels_ev, t.from, t.to);
                    distribution_row(t, ev, sampled)
                };
                sampled.transitions.iter().map(row).collect()
            }),
            windows: sampled.map_or(Vec::new(), |sampled| {
                sampled
                    .windows
                    .iter()
                    .map(|w| {
                        let (from, to) = (w.window.from.index - 1, w.window.to.index - 1);
                        window_row(&w.window, energy_ev(&outcome.levels_ev, from, to), w.share)
                    })
                    .collect()
            }),
            all_windows: sampled.and_then(|s| s.all_windows).map(|share| ShareRow {
                inside: share.inside,
                of: share.of,
                share: share.share,
                share_low: share.interval[0],
                share_high: share.interval[1],
            }),
            radial: outcome
                .rings
                .iter()
                .flat_map(|ring| pairs.iter().map(move |&pair| (ring, pair)))
                .map(|(ring, pair)| radial_row(ring, pair, windows))
                .collect(),
            definitions: match structure.charge {
                Charge::Flat => [&DEFINITIONS[..], &[FLAT_DEFINITION]].concat(),
                Charge::Bent(_) => [&DEFINITIONS[..], &[CHARGE_DEFINITION]].concat(),
            },
            shown: shown(structure, windows, pairs),
        }
    }

    fn is_shown(&self, from: &str, to: &str) -> bool {
        self.shown
            .iter()
            .any(|&(a, b)| name(a) == from && name(b) == to)
    }

    fn shifts(&self) -> String {
        let mut text = String::new();
        for row in &self.transitions {
            if !self.is_shown(&row.from, &row.to) {
                continue;
            }
            let rows = self
                .sensitivities
                .iter()
                .filter(|s| s.from == row.from && s.to == row.to)
                .map(|s| {
                    vec![
                        s.quantity.clone(),
                        s.step.to_owned(),
                        signed(s.energy_meV, s.energy_meV),
                        signed(s.wavelength_um, s.energy_meV),
                    ]
                })
                .collect();
            let abrupt = match self.grading_nm {
                Some(_) => format!("; {:.2} meV with abrupt interfaces", row.abrupt_energy_meV),
                None => String::new(),
            };
            text += &format!(
                "Shift of {} to {} ({:.2} meV, {} µm{abrupt})\n{}\n",
                row.from,
                number(&row.to),
                row.energy_meV,
                significant(row.wavelength_um, 4),
                table(&["with", "by", "meV", "µm"], &[0, 1], rows),
            );
        }
        text
    }

    fn wafers(&self) -> String {
        let (Some(samples), Some(not_grown)) = (self.samples, self.not_grown) else {
            return String::new();
        };
        let shown = || {
            self.distributions
                .iter()
                .filter(|d| self.is_shown(&d.spread.from, &d.spread.to))
        };
        let energies = table(
            &[
                "from", "to", "mean meV", "spread", "linear", "5 %", "50 %", "95 %",
            ],
            &[],
            shown()
                .map(|d| {
                    vec![
                        number(&d.spread.from).to_owned(),
                        number(&d.spread.to).to_owned(),
                        format!("{:.2}", d.spread.mean_energy_meV),
                        significant(d.spread.deviation_energy_meV, 3),
                        significant(d.spread.linear_deviation_energy_meV, 3),
                        format!("{:.2}", d.spread.energy_5_percent_meV),
                        format!("{:.2}", d.spread.energy_50_percent_meV),
                        format!("{:.2}", d.spread.energy_95_percent_meV),
                    ]
                })
                .collect(),
        );
        let wavelengths = table(
            &[
                "from", "to", "mean µm", "spread", "linear", "5 %", "50 %", "95 %",
            ],
            &[],
            shown()
                .map(|d| {
                    vec![
                        number(&d.spread.from).to_owned(),
                        number(&d.spread.to).to_owned(),
                        significant(d.spread.mean_wavelength_um, 4),
                        significant(d.spread.deviation_wavelength_um, 3),
                        significant(d.spread.linear_deviation_wavelength_um, 3),
                        significant(d.spread.wavelength_5_percent_um, 4),
                        significant(d.spread.wavelength_50_percent_um, 4),
                        significant(d.spread.wavelength_95_percent_um, 4),
                    ]
                })
                .collect(),
        );
        let mut text = format!("{samples} wafers\n{energies}\n{wavelengths}\n");
        for d in shown() {
            let named: Vec<String> = d
                .contributors
                .iter()
                .filter(|c| c.variance_share >= LEAST_SHARE)
                .take(NAMED)
                .map(|c| format!("{} {}", c.quantity, percent(c.variance_share, 0)))
                .collect();
            text += &format!(
                "{} to {} varies by {}.\n",
                d.spread.from,
                number(&d.spread.to),
                named.join(", ")
            );
        }
        let mut told: Vec<&str> = Vec::new();
        for d in shown().filter(|d| d.spread.unbound > 0) {
            if told.contains(&d.spread.to.as_str()) {
                continue;
            }
            told.push(&d.spread.to);
            text += &format!(
                "In {} of the wafers {} lies above the lower outer barrier edge: only the walls hold it.\n",
                percent(d.spread.unbound as f64 / samples as f64, 1),
                d.spread.to
            );
        }
        for w in &self.windows {
            text += &format!(
                "{} to {} from {} to {} {}: {}.\n",
                w.from,
                number(&w.to),
                bound(w.low),
                bound(w.high),
                w.unit,
                share_in_words(w.share, w.share_low, w.share_high)
            );
            if !w.design_inside {
                text += "The design itself lies outside of this window: tune it first.\n";
            }
        }
        if let Some(all) = &self.all_windows {
            text += &format!(
                "All windows at once: {}.\n",
                share_in_words(all.share, all.share_low, all.share_high)
            );
        }
        if not_grown > 0 {
            text += &format!(
                "{not_grown} wafers cannot be (a layer gone, a fraction below zero); they count as outside.\n"
            );
        }
        text + "\n"
    }

    fn across(&self) -> String {
        if self.radial.is_empty() {
            return String::new();
        }
        let rows = self
            .radial
            .iter()
            .filter(|r| self.is_shown(&r.from, &r.to))
            .map(|r| {
                vec![
                    format!("{:.1}", r.radius_mm),
                    format!("{:.2}", 1e2 * r.thickness),
                    number(&r.from).to_owned(),
                    number(&r.to).to_owned(),
                    format!("{:.2}", r.energy_meV),
                    significant(r.wavelength_um, 4),
                    match r.inside {
                        Some(true) => "inside".to_owned(),
                        Some(false) => "outside".to_owned(),
                        None => String::new(),
                    },
                ]
            })
            .collect();
        let rows = table(
            &[
                "radius mm",
                "thickness %",
                "from",
                "to",
                "meV",
                "µm",
                "window",
            ],
            &[6],
            rows,
        );
        format!("Across the wafer\n{rows}\n")
    }
}

/// The transitions that windows speak of, or else the aims of tuning, or else all.
fn shown(
    structure: &Structure,
    windows: &[Window],
    all: Vec<(usize, usize)>,
) -> Vec<(usize, usize)> {
    let of_windows = windows.iter().map(|w| (w.from.index - 1, w.to.index - 1));
    let mut named: Vec<(usize, usize)> = of_windows.collect();
    if named.is_empty() {
        let aims = structure.tune.iter().flat_map(|tune| &tune.aims);
        named = aims
            .filter(|aim| matches!(aim.target, Target::EnergyEv(_) | Target::WavelengthUm(_)))
            .filter(|aim| {
                [aim.from, aim.to]
                    .iter()
                    .all(|l| l.band == BandName::Conduction)
            })
            .map(|aim| {
                let (a, b) = (aim.from.index - 1, aim.to.index - 1);
                (a.min(b), a.max(b))
            })
            .collect();
    }
    named.retain(|pair| all.contains(pair));
    if named.is_empty() { all } else { named }
}

fn distribution_row(t: &Distributed, design_ev: f64, sampled: &Sampled) -> DistributionRow {
    let [low, middle, high] = t.energy_ev.quantiles.map(|ev| 1e3 * ev);
    let [short, centre, long] = t.wavelength_um.quantiles;
    let spread = SpreadRow {
        from: name(t.from),
        to: name(t.to),
        mean_energy_meV: 1e3 * t.energy_ev.mean,
        deviation_energy_meV: 1e3 * t.energy_ev.deviation,
        linear_deviation_energy_meV: 1e3 * t.linear_deviation_ev,
        energy_5_percent_meV: low,
        energy_50_percent_meV: middle,
        energy_95_percent_meV: high,
        mean_wavelength_um: t.wavelength_um.mean,
        deviation_wavelength_um: t.wavelength_um.deviation,
        linear_deviation_wavelength_um: HC_EV_UM / design_ev * t.linear_deviation_ev / design_ev,
        wavelength_5_percent_um: short,
        wavelength_50_percent_um: centre,
        wavelength_95_percent_um: long,
        unbound: sampled.unbound.get(t.to).copied().unwrap_or(0),
    };
    DistributionRow {
        spread,
        contributors: t
            .contributors
            .iter()
            .map(|(quantity, share)| ContributorRow {
                quantity: quantity.clone(),
                variance_share: *share,
            })
            .collect(),
        histogram: t
            .histogram
            .as_ref()
            .map_or_else(HistogramRow::default, |h| HistogramRow {
                edges_meV: h.edges.iter().map(|ev| 1e3 * ev).collect(),
                counts: h.counts.clone(),
            }),
    }
}

fn window_row(window: &Window, design_ev: f64, share: Share) -> WindowRow {
    let [low_ev, high_ev] = window.energies_ev;
    let (unit, low, high) = if window.as_wavelength {
        ("µm", HC_EV_UM / high_ev, HC_EV_UM / low_ev)
    } else {
        ("meV", 1e3 * low_ev, 1e3 * high_ev)
    };
    WindowRow {
        from: name(window.from.index - 1),
        to: name(window.to.index - 1),
        unit,
        low,
        high,
        design_inside: (low_ev..=high_ev).contains(&design_ev),
        inside: share.inside,
        of: share.of,
        share: share.share,
        share_low: share.interval[0],
        share_high: share.interval[1],
    }
}

fn radial_row(ring: &Ring, (from, to): (usize, usize), windows: &[Window]) -> RadialRow {
    let ev = ring.levels_ev[to] - ring.levels_ev[from];
    let window = windows
        .iter()
        .find(|w| (w.from.index - 1, w.to.index - 1) == (from, to));
    RadialRow {
        radius_mm: ring.radius_mm,
        thickness: 1.0 - ring.drop,
        from: name(from),
        to: name(to),
        energy_meV: 1e3 * ev,
        wavelength_um: HC_EV_UM / ev,
        inside: window.map(|w| (w.energies_ev[0]..=w.energies_ev[1]).contains(&ev)),
    }
}

/// A shift; one of so small an energy that nobody can measure it is none.
fn signed(value: f64, shift_mev: f64) -> String {
    const LEAST_MEV: f64 = 1e-4;
    if shift_mev.abs() < LEAST_MEV {
        return "0".to_owned();
    }
    let text = significant(value, 3);
    if value > 0.0 {
        format!("+{text}")
    } else {
        text
    }
}

/// A bound that the user wrote: as short as it can be within six digits.
fn bound(value: f64) -> String {
    let text = significant(value, 6);
    match text.contains(['.']) && !text.contains('e') {
        true => text.trim_end_matches('0').trim_end_matches('.').to_owned(),
        false => text,
    }
}

fn percent(part: f64, decimals: usize) -> String {
    format!("{:.decimals$} %", 1e2 * part)
}

fn share_in_words(share: f64, low: f64, high: f64) -> String {
    format!(
        "{} of wafers ({} to {})",
        percent(share, 1),
        percent(low, 1),
        percent(high, 1)
    )
}

impl Report for Tolerances {
    fn text(&self) -> String {
        let title = self
            .title
            .as_ref()
            .map(|t| format!("{t}\n"))
            .unwrap_or_default();
        let interfaces = match self.grading_nm {
            Some(nm) => format!(", interfaces graded over {} nm", significant(nm, 3)),
            None => String::new(),
        };
        format!(
            "{title}{} K, field {} kV/cm, {} mass{interfaces}\n\n{}{}{}{}\n",
            given(self.temperature_k, 4),
            given(self.field_kv_cm, 4),
            self.model,
            self.shifts(),
            self.wafers(),
            self.across(),
            self.definitions.join("\n"),
        )
    }

    fn csv(&self) -> Result<String, csv::Error> {
        #[derive(Serialize)]
        struct Contribution<'r> {
            from: &'r str,
            to: &'r str,
            quantity: &'r str,
            variance_share: f64,
        }
        #[derive(Serialize)]
        #[allow(non_snake_case)]
        struct Bin<'r> {
            from: &'r str,
            to: &'r str,
            low_meV: f64,
            high_meV: f64,
            count: usize,
        }
        let spreads: Vec<&SpreadRow> = self.distributions.iter().map(|d| &d.spread).collect();
        let contributions: Vec<Contribution> = self
            .distributions
            .iter()
            .flat_map(|d| {
                d.contributors.iter().map(|c| Contribution {
                    from: &d.spread.from,
                    to: &d.spread.to,
                    quantity: &c.quantity,
                    variance_share: c.variance_share,
                })
            })
            .collect();
        let bins: Vec<Bin> = self
            .distributions
            .iter()
            .flat_map(|d| {
                let edges = d.histogram.edges_meV.windows(2);
                edges.zip(&d.histogram.counts).map(|(edges, count)| Bin {
                    from: &d.spread.from,
                    to: &d.spread.to,
                    low_meV: edges[0],
                    high_meV: edges[1],
                    count: *count,
                })
            })
            .collect();
        let mut tables = vec![
            csv_table(&self.transitions)?,
            csv_table(&self.sensitivities)?,
        ];
        if self.samples.is_some() {
            tables.extend([
                csv_table(&spreads)?,
                csv_table(&contributions)?,
                csv_table(&bins)?,
            ]);
        }
        if !self.windows.is_empty() {
            tables.push(csv_table(&self.windows)?);
        }
        if !self.radial.is_empty() {
            tables.push(csv_table(&self.radial)?);
        }
        Ok(tables.join("\n"))
    }
}
