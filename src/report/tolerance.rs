//! How far transitions move, and the sampled yield.

use super::table::{given, significant, table};
use super::{Report, csv_table};
use crate::constants::HC_EV_UM;
use crate::models::model_name;
use crate::structure::{BandName, Charge, Level, Stack, Structure, Target, ValenceModel, Window};
use crate::tolerance::{Distributed, Outcome, Ring, Share, Statistics};
use serde::Serialize;

/// What the numbers mean; printed with them.
const DEFINITIONS: [&str; 4] = [
    "Spreads are one standard deviation, normal and independent of each other; every wafer is solved in full.",
    "Linear: the spread that the shifts above foretell; contributors are their shares of its variance.",
    "Flux: thickness and composition of all layers that hold the element move together. Repeats move together.",
    "Shares of wafers carry Wilson's 95 % interval.",
];
/// The same with holes.
const HOLES: &str = "`valence` counts the highest hole levels of each wafer, of either kind; holes are solved apart, excitons left out.";
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
    #[serde(skip_serializing_if = "Option::is_none")]
    valence_model: Option<&'static str>,
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
    shown: Vec<(Level, Level)>,
    /// Wafers in which the walls alone hold a level.
    #[serde(skip)]
    unbound: Vec<(Level, usize)>,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct TransitionRow {
    from: String,
    to: String,
    energy_meV: f64,
    wavelength_um: Option<f64>,
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
    wavelength_um: Option<f64>,
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
    mean_wavelength_um: Option<f64>,
    deviation_wavelength_um: Option<f64>,
    linear_deviation_wavelength_um: Option<f64>,
    wavelength_5_percent_um: Option<f64>,
    wavelength_50_percent_um: Option<f64>,
    wavelength_95_percent_um: Option<f64>,
    /// Wafers in which the walls alone hold one of the two levels.
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
    wavelength_um: Option<f64>,
    /// Whether it lies in the file's window, if there is one for this transition.
    inside: Option<bool>,
}

/// The vacuum wavelength; none where the lower level lies above the upper one, as holes do in a broken gap.
fn wavelength_um(energy_ev: f64) -> Option<f64> {
    (energy_ev > 0.0).then(|| HC_EV_UM / energy_ev)
}

/// A level's name after another one of the same band: its number.
fn after<'n>(from: &str, to: &'n str) -> &'n str {
    match (from.split_once(' '), to.split_once(' ')) {
        (Some((one, _)), Some((other, number))) if one == other => number,
        _ => to,
    }
}

impl Tolerances {
    pub fn new(structure: &Structure, stack: &Stack, outcome: &Outcome) -> Tolerances {
        let name = |level: usize| outcome.levels[level].to_string();
        let energy_ev = |levels: &[f64], from: usize, to: usize| levels[to] - levels[from];
        let pairs = &outcome.pairs;
        let windows = structure
            .tolerance
            .as_ref()
            .map_or(&[][..], |tolerance| &tolerance.windows);
        let mut sensitivities = Vec::new();
        for &(from, to) in pairs {
            let ev = energy_ev(&outcome.levels_ev, from, to);
            for found in &outcome.sensitivities {
                let shift_ev = energy_ev(&found.level_shifts_ev, from, to);
                sensitivities.push(SensitivityRow {
                    quantity: found.name.clone(),
                    step: found.step,
                    from: name(from),
                    to: name(to),
                    energy_meV: 1e3 * shift_ev,
                    wavelength_um: wavelength_um(ev).map(|um| -um * shift_ev / ev),
                });
            }
        }
        let sampled = outcome.sampled.as_ref();
        Tolerances {
            title: structure.title.clone(),
            model: model_name(structure.conduction.model),
            // Coupled holes have no part in it.
            valence_model: structure
                .valence
                .filter(|valence| valence.model == ValenceModel::Decoupled)
                .map(|_| "decoupled"),
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
                        wavelength_um: wavelength_um(ev),
                        abrupt_energy_meV: 1e3 * energy_ev(&outcome.abrupt_levels_ev, from, to),
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
                    distribution_row(t, ev, [name(t.from), name(t.to)])
                };
                sampled.transitions.iter().map(row).collect()
            }),
            windows: sampled.map_or(Vec::new(), |sampled| {
                sampled
                    .windows
                    .iter()
                    .map(|w| {
                        let place = |level| outcome.levels.iter().position(|own| *own == level);
                        let ends = place(w.window.from).zip(place(w.window.to));
                        let design = ends.map(|(from, to)| energy_ev(&outcome.levels_ev, from, to));
                        window_row(&w.window, design, w.share)
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
                .map(|(ring, pair)| radial_row(ring, pair, &outcome.levels, windows))
                .collect(),
            definitions: DEFINITIONS
                .into_iter()
                .chain([match structure.charge {
                    Charge::Flat => FLAT_DEFINITION,
                    Charge::Bent(_) => CHARGE_DEFINITION,
                }])
                .chain(structure.valence.map(|_| HOLES))
                .collect(),
            shown: shown(structure, windows, outcome),
            unbound: sampled.map_or(Vec::new(), |s| {
                let counts = s.unbound.iter().copied();
                outcome.levels.iter().copied().zip(counts).collect()
            }),
        }
    }

    fn is_shown(&self, from: &str, to: &str) -> bool {
        self.shown
            .iter()
            .any(|(a, b)| a.to_string() == from && b.to_string() == to)
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
                        s.wavelength_um
                            .map_or("-".to_owned(), |um| signed(um, s.energy_meV)),
                    ]
                })
                .collect();
            let abrupt = match self.grading_nm {
                Some(_) => format!("; {:.2} meV with abrupt interfaces", row.abrupt_energy_meV),
                None => String::new(),
            };
            text += &format!(
                "Shift of {} to {} ({:.2} meV, {}{abrupt})\n{}\n",
                row.from,
                after(&row.from, &row.to),
                row.energy_meV,
                match row.wavelength_um {
                    Some(um) => significant(um, digits(&row.from, &row.to)) + " µm",
                    None => "no light".to_owned(),
                },
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
        // With one band only its levels need no name.
        let electrons = |name: &str| name.trim_start_matches("conduction ").to_owned();
        let level = |name: &str| match self.valence_model {
            Some(_) => name.to_owned(),
            None => electrons(name),
        };
        let left: &[usize] = match self.valence_model {
            Some(_) => &[0, 1],
            None => &[],
        };
        let energies = table(
            &[
                "from", "to", "mean meV", "spread", "linear", "5 %", "50 %", "95 %",
            ],
            left,
            shown()
                .map(|d| {
                    vec![
                        level(&d.spread.from),
                        level(&d.spread.to),
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
            left,
            shown()
                .map(|d| {
                    let s = &d.spread;
                    let length = |um: Option<f64>, digits: usize| {
                        um.map_or("-".to_owned(), |um| significant(um, digits))
                    };
                    let fine = digits(&s.from, &s.to);
                    vec![
                        level(&s.from),
                        level(&s.to),
                        length(s.mean_wavelength_um, fine),
                        length(s.deviation_wavelength_um, 3),
                        length(s.linear_deviation_wavelength_um, 3),
                        length(s.wavelength_5_percent_um, fine),
                        length(s.wavelength_50_percent_um, fine),
                        length(s.wavelength_95_percent_um, fine),
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
                after(&d.spread.from, &d.spread.to),
                named.join(", ")
            );
        }
        for (level, wafers) in self.unbound.iter().filter(|(_, wafers)| *wafers > 0) {
            let told = |(from, to): &(Level, Level)| match (from.band, to.band) {
                // Of two levels of the band the upper one is the looser.
                (BandName::Conduction, BandName::Conduction) => to == level,
                _ => from == level || to == level,
            };
            if !self.shown.iter().any(told) {
                continue;
            }
            text += &format!(
                "In {} of the wafers {level} lies {} outer barrier edge: only the walls hold it.\n",
                percent(*wafers as f64 / samples as f64, 1),
                match level.band {
                    BandName::Conduction => "above the lower",
                    _ => "below the higher",
                }
            );
        }
        for w in &self.windows {
            text += &format!(
                "{} to {} from {} to {} {}: {}.\n",
                w.from,
                after(&w.from, &w.to),
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
                    match self.valence_model {
                        Some(_) => r.from.clone(),
                        None => r.from.trim_start_matches("conduction ").to_owned(),
                    },
                    after(&r.from, &r.to).to_owned(),
                    format!("{:.2}", r.energy_meV),
                    match r.wavelength_um {
                        Some(um) => significant(um, digits(&r.from, &r.to)),
                        None => "-".to_owned(),
                    },
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

/// Digits of a wavelength: between bands one more, as everywhere.
fn digits(from: &str, to: &str) -> usize {
    match after(from, to) == to {
        true => 5,
        false => 4,
    }
}

/// The transitions that windows speak of, or else the aims of tuning, or else those inside the conduction band and, with
/// holes, that of the gap.
fn shown(structure: &Structure, windows: &[Window], outcome: &Outcome) -> Vec<(Level, Level)> {
    let all = outcome
        .pairs
        .iter()
        .map(|&(from, to)| (outcome.levels[from], outcome.levels[to]));
    let of_windows = windows.iter().map(|w| (w.from, w.to));
    let mut named: Vec<(Level, Level)> = of_windows.collect();
    if named.is_empty() {
        let aims = structure.tune.iter().flat_map(|tune| &tune.aims);
        named = aims
            .filter(|aim| matches!(aim.target, Target::EnergyEv(_) | Target::WavelengthUm(_)))
            .map(|aim| (aim.from, aim.to))
            .collect();
    }
    // An aim by character may go down.
    let is_named =
        |pair: &(Level, Level)| named.contains(pair) || named.contains(&(pair.1, pair.0));
    let found: Vec<(Level, Level)> = all.clone().filter(is_named).collect();
    if !found.is_empty() {
        return found;
    }
    let gap = all
        .clone()
        .filter(|(from, to)| from.band != to.band && to.index == 1)
        .min_by(|a, b| {
            let ev = |level: &Level| {
                let place = outcome.levels.iter().position(|own| own == level);
                place.map_or(f64::NEG_INFINITY, |place| outcome.levels_ev[place])
            };
            ev(&b.0).total_cmp(&ev(&a.0))
        });
    all.filter(|(from, _)| from.band == BandName::Conduction)
        .chain(gap)
        .collect()
}

fn distribution_row(t: &Distributed, design_ev: f64, [from, to]: [String; 2]) -> DistributionRow {
    let [low, middle, high] = t.energy_ev.quantiles.map(|ev| 1e3 * ev);
    let um = |of: fn(&Statistics) -> f64| t.wavelength_um.as_ref().map(of);
    let spread = SpreadRow {
        from,
        to,
        mean_energy_meV: 1e3 * t.energy_ev.mean,
        deviation_energy_meV: 1e3 * t.energy_ev.deviation,
        linear_deviation_energy_meV: 1e3 * t.linear_deviation_ev,
        energy_5_percent_meV: low,
        energy_50_percent_meV: middle,
        energy_95_percent_meV: high,
        mean_wavelength_um: um(|s| s.mean),
        deviation_wavelength_um: um(|s| s.deviation),
        linear_deviation_wavelength_um: wavelength_um(design_ev)
            .map(|um| um * t.linear_deviation_ev / design_ev),
        wavelength_5_percent_um: um(|s| s.quantiles[0]),
        wavelength_50_percent_um: um(|s| s.quantiles[1]),
        wavelength_95_percent_um: um(|s| s.quantiles[2]),
        unbound: t.unbound,
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

fn window_row(window: &Window, design_ev: Option<f64>, share: Share) -> WindowRow {
    let [low_ev, high_ev] = window.energies_ev;
    let (unit, low, high) = if window.as_wavelength {
        ("µm", HC_EV_UM / high_ev, HC_EV_UM / low_ev)
    } else {
        ("meV", 1e3 * low_ev, 1e3 * high_ev)
    };
    WindowRow {
        from: window.from.to_string(),
        to: window.to.to_string(),
        unit,
        low,
        high,
        design_inside: design_ev.is_some_and(|ev| (low_ev..=high_ev).contains(&ev)),
        inside: share.inside,
        of: share.of,
        share: share.share,
        share_low: share.interval[0],
        share_high: share.interval[1],
    }
}

fn radial_row(
    ring: &Ring,
    (from, to): (usize, usize),
    levels: &[Level],
    windows: &[Window],
) -> RadialRow {
    let ev = ring.levels_ev[to] - ring.levels_ev[from];
    let window = windows
        .iter()
        .find(|w| (w.from, w.to) == (levels[from], levels[to]));
    RadialRow {
        radius_mm: ring.radius_mm,
        thickness: 1.0 - ring.drop,
        from: levels[from].to_string(),
        to: levels[to].to_string(),
        energy_meV: 1e3 * ev,
        wavelength_um: wavelength_um(ev),
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
            "{title}{} K, field {} kV/cm, {} mass{}{interfaces}\n\n{}{}{}{}\n",
            given(self.temperature_k, 4),
            given(self.field_kv_cm, 4),
            self.model,
            match self.valence_model {
                Some(model) => format!(", {model} holes"),
                None => String::new(),
            },
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
