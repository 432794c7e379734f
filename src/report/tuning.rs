//! What a tuning reached: aims before and after, the new values of the variables, and the levels of the result.

use super::charge::ChargeReport;
use super::levels::Levels;
use super::table::{significant, table};
use super::{Report, csv_table};
use crate::charge::Solution;
use crate::constants::HC_EV_UM;
use crate::structure::{BandName, Knob, Structure, Target};
use crate::tune::{Aim, Design, Goal, Limit, Outcome, Variable};
use serde::Serialize;

/// A tuning's report.
#[derive(Debug, Serialize)]
pub struct Tuning {
    reached: bool,
    aims: Vec<AimRow>,
    kept: Vec<KeptRow>,
    variables: Vec<VariableRow>,
    limits: Vec<String>,
    notes: Vec<String>,
    /// The levels of the tuned stack.
    result: Levels,
    /// The tuned structure file.
    structure: String,
}

#[derive(Debug, Serialize)]
struct AimRow {
    from: String,
    to: String,
    aim: &'static str,
    unit: &'static str,
    target: Option<f64>,
    before: f64,
    /// The continuous optimum, where the result is in whole monolayers.
    continuous: Option<f64>,
    after: f64,
    within: Option<f64>,
    met: bool,
}

/// A bound on strain: a net strain, or a width in critical thicknesses.
#[derive(Debug, Serialize)]
struct KeptRow {
    bound: String,
    limit: f64,
    before: f64,
    after: f64,
    met: bool,
}

#[derive(Debug, Serialize)]
struct VariableRow {
    variable: String,
    unit: &'static str,
    lower_bound: f64,
    upper_bound: f64,
    before: Option<f64>,
    after: f64,
    monolayers: Option<f64>,
}

/// A variable's value in the unit that it is shown in.
fn shown(variable: &Variable, value: f64) -> (f64, &'static str) {
    match variable.knob {
        Knob::Width { .. } => (value, "nm"),
        Knob::Fraction { .. } => (value, ""),
        Knob::Field => (value * 1e4, "kV/cm"),
    }
}

impl Tuning {
    /// The states of each band that are listed: those that the file asks for and those that the aims speak of.
    pub fn listed(structure: &Structure, outcome: &Outcome) -> Vec<usize> {
        let mut listed = outcome.after.bands.asked_for(structure);
        for &(from, to) in &outcome.after.states {
            for place in [from, to] {
                listed[place.band] = listed[place.band].max(place.state + 1);
            }
        }
        listed
    }

    /// Gathers the report; `text` is the tuned structure file.
    pub fn new(structure: &Structure, outcome: &Outcome, text: String) -> Tuning {
        let Outcome {
            task,
            before,
            after,
            continuous,
            ..
        } = outcome;
        let wavelength_aims: Vec<bool> = structure
            .tune
            .iter()
            .flat_map(|t| &t.aims)
            .map(|a| matches!(a.target, Target::WavelengthUm(_)))
            .collect();
        let aims = (0..task.aims.len())
            .map(|a| {
                let aim = &task.aims[a];
                let wavelength = wavelength_aims.get(a).copied().unwrap_or(false);
                let show = |design: &Design| match aim.goal {
                    Goal::Energy { .. } if wavelength => HC_EV_UM / design.values[a],
                    Goal::Energy { .. } => 1e3 * design.values[a],
                    _ => design.values[a],
                };
                let (kind, unit, target, within) = match aim.goal {
                    Goal::Energy {
                        target_ev,
                        within_ev,
                    } if wavelength => {
                        let um = HC_EV_UM / target_ev;
                        (
                            "wavelength",
                            "µm",
                            Some(um),
                            Some(um * within_ev / target_ev),
                        )
                    }
                    Goal::Energy {
                        target_ev,
                        within_ev,
                    } => (
                        "energy",
                        "meV",
                        Some(1e3 * target_ev),
                        Some(1e3 * within_ev),
                    ),
                    Goal::Dipole {
                        target_nm,
                        within_nm,
                    } => ("dipole", "nm", Some(target_nm), Some(within_nm)),
                    Goal::LargestDipole => ("largest dipole", "nm", None, None),
                };
                AimRow {
                    from: aim.from.to_string(),
                    to: aim.to.to_string(),
                    aim: kind,
                    unit,
                    target,
                    before: show(before),
                    continuous: continuous.as_ref().map(show),
                    after: show(after),
                    within,
                    met: outcome.met[a],
                }
            })
            .collect();
        let variables = task
            .variables
            .iter()
            .map(|v| {
                let at = |design: &Design| v.knob.value(&design.stack);
                let after_value = at(after).unwrap_or(v.low);
                let monolayers = match v.knob {
                    Knob::Width { entry } => after
                        .stack
                        .entry_monolayer_nm(entry)
                        .map(|one| after_value / one),
                    _ => None,
                };
                VariableRow {
                    variable: v.name.clone(),
                    unit: shown(v, 0.0).1,
                    lower_bound: shown(v, v.low).0,
                    upper_bound: shown(v, v.high).0,
                    before: at(before).map(|value| shown(v, value).0),
                    after: shown(v, after_value).0,
                    monolayers,
                }
            })
            .collect();
        let solution = Solution {
            stack: after.stack.clone(),
            bands: after.bands.clone(),
            equilibrium: after.equilibrium.clone(),
        };
        let listed = Tuning::listed(structure, outcome);
        let charge = ChargeReport::new(&solution, &listed, &structure.charge);
        Tuning {
            reached: outcome.is_reached(),
            aims,
            kept: kept(outcome),
            variables,
            limits: limit_sentences(outcome),
            notes: notes(outcome),
            result: Levels::new(
                structure,
                &after.stack,
                &after.bands,
                &Tuning::listed(structure, outcome),
            )
            .with_charge(charge),
            structure: text,
        }
    }
}

/// A transition in a sentence: `1-2`, or `heavy-hole 1 - conduction 1`.
fn pair(aim: &Aim) -> String {
    match (aim.from.band, aim.to.band) {
        (BandName::Conduction, BandName::Conduction) => {
            format!("{}-{}", aim.from.index, aim.to.index)
        }
        _ => format!("{} - {}", aim.from, aim.to),
    }
}

fn kept(outcome: &Outcome) -> Vec<KeptRow> {
    let rows = outcome.task.keeps.iter().enumerate();
    rows.map(|(k, keep)| KeptRow {
        bound: keep.name.clone(),
        limit: keep.limit(),
        before: outcome.before.kept[k],
        after: outcome.after.kept[k],
        met: outcome.kept[k],
    })
    .collect()
}

fn limit_sentences(outcome: &Outcome) -> Vec<String> {
    let task = &outcome.task;
    let pair = |a: usize| pair(&task.aims[a]);
    let mut sentences: Vec<String> = outcome
        .limits
        .iter()
        .map(|limit| match limit {
            Limit::Bound { variable, at_high } => {
                let v = &task.variables[*variable];
                let (bound, unit) = shown(v, if *at_high { v.high } else { v.low });
                let (which, way) = if *at_high { ("upper", "higher") } else { ("lower", "lower") };
                format!("The {} rests on its {which} bound, {} {unit}; a {way} bound would bring the aims nearer.", v.name, significant(bound, 4)).replace(" ;", ";")
            }
            Limit::Unmoved { aim } => format!("None of the variables moves the transition {}.", pair(*aim)),
            Limit::Conflict { aims } => {
                let list: Vec<String> = aims.iter().map(|a| pair(*a)).collect();
                format!("The variables cannot move the transitions {} independently; vary something else as well, or give the aims weights.", list.join(" and "))
            }
            Limit::NoDesignFound => "No design inside the bounds comes nearer; change the bounds, or vary something else as well.".to_owned(),
        })
        .collect();
    if let (Some(half_step), Some(_)) = (&outcome.half_step, &outcome.continuous) {
        for (a, met) in outcome.met.iter().enumerate() {
            if !met && outcome.limits.is_empty() {
                let size = match task.aims[a].goal {
                    Goal::Energy { .. } => format!("{} meV", significant(2e3 * half_step[a], 2)),
                    _ => format!("{} nm", significant(2.0 * half_step[a], 2)),
                };
                sentences.push(format!(
                    "Whole monolayers: one monolayer moves the transition {} by up to {size}.",
                    pair(a)
                ));
            }
        }
    }
    sentences
}

fn notes(outcome: &Outcome) -> Vec<String> {
    let task = &outcome.task;
    let mut notes = Vec::new();
    for choice in &outcome.choices {
        let values: Vec<String> = choice.values.iter().map(|v| significant(*v, 4)).collect();
        notes.push(format!(
            "The {} is one of those that the cells give: {}.",
            choice.name,
            values.join(", ")
        ));
    }
    for &k in &outcome.started_outside {
        notes.push(format!(
            "The {} of the file lies outside its bounds; the search began at the nearer bound.",
            task.variables[k].name
        ));
    }
    if outcome.starts > 1 {
        notes.push(format!("The descent from the file's design did not reach the aims; {} designs were tried as starts.", outcome.starts - 1));
    }
    for (aim, &(from, to)) in task.aims.iter().zip(&outcome.after.states) {
        for (wanted, now) in [(aim.from, from), (aim.to, to)] {
            let now = outcome.after.bands.level(now);
            if aim.by_character && wanted != now {
                notes.push(format!(
                    "The state with the character of the file's {wanted} is now {now}."
                ));
            }
        }
    }
    notes.dedup();
    if outcome.continuous.is_some() {
        for (a, aim) in task.aims.iter().enumerate() {
            if let Some((miss, within)) = aim.goal.miss(outcome.after.values[a])
                && outcome.met[a]
                && miss.abs() > within
            {
                let part = 100.0 * miss / (outcome.after.values[a] - miss);
                notes.push(format!(
                    "Transition {}: the continuous design meets the aim; whole monolayers leave {part:+.2} %, less than half a monolayer's step.",
                    pair(aim)
                ));
            }
        }
    }
    notes
}

impl Tuning {
    fn kept_text(&self) -> String {
        let value = |v: f64| {
            if v == 0.0 {
                "0".to_owned()
            } else {
                significant(v, 3)
            }
        };
        let rows = self.kept.iter().map(|row| {
            vec![
                row.bound.clone(),
                value(row.limit),
                value(row.before),
                value(row.after),
                if row.met { "yes" } else { "no" }.to_owned(),
            ]
        });
        table(
            &["kept", "limit", "before", "after", "met"],
            &[0, 4],
            rows.collect(),
        )
    }
}

impl Report for Tuning {
    fn text(&self) -> String {
        let digits = |value: f64| significant(value, 5);
        let electrons_only = self.aims.iter().all(|a| {
            [&a.from, &a.to]
                .iter()
                .all(|name| name.starts_with("conduction "))
        });
        let snapped = self.aims.iter().any(|a| a.continuous.is_some());
        let mut header = vec!["from", "to", "aim", "target", "before"];
        if snapped {
            header.push("continuous");
        }
        header.extend(["after", "unit", "met"]);
        let aims = table(
            &header,
            &[2, header.len() - 2],
            self.aims
                .iter()
                .map(|a| {
                    let number = |name: &str| match electrons_only {
                        true => name.trim_start_matches("conduction ").to_owned(),
                        false => name.to_owned(),
                    };
                    let mut row = vec![
                        number(&a.from),
                        number(&a.to),
                        a.aim.to_owned(),
                        a.target.map_or("-".to_owned(), digits),
                        digits(a.before),
                    ];
                    if snapped {
                        row.push(a.continuous.map_or("-".to_owned(), digits));
                    }
                    let met = if a.target.is_none() {
                        "-"
                    } else if a.met {
                        "yes"
                    } else {
                        "no"
                    };
                    row.extend([digits(a.after), a.unit.to_owned(), met.to_owned()]);
                    row
                })
                .collect(),
        );
        let variables = table(
            &[
                "variable",
                "lower bound",
                "upper bound",
                "before",
                "after",
                "unit",
                "monolayers",
            ],
            &[0, 5],
            self.variables
                .iter()
                .map(|v| {
                    vec![
                        v.variable.clone(),
                        significant(v.lower_bound, 4),
                        significant(v.upper_bound, 4),
                        v.before
                            .map_or("-".to_owned(), |value| significant(value, 5)),
                        significant(v.after, 5),
                        v.unit.to_owned(),
                        v.monolayers.map_or("-".to_owned(), |n| format!("{n:.2}")),
                    ]
                })
                .collect(),
        );
        let mut text = String::new();
        text.push_str(if self.reached {
            "All aims are met.\n\n"
        } else if self.aims.iter().all(|aim| aim.met) {
            "All aims are met, but not within the bounds that were to be kept; this is the nearest design.\n\n"
        } else {
            "Not all aims can be met; this is the nearest design.\n\n"
        });
        text.push_str(&aims);
        text.push('\n');
        text.push_str(&variables);
        if !self.kept.is_empty() {
            text.push('\n');
            text.push_str(&self.kept_text());
        }
        for sentence in self.limits.iter().chain(&self.notes) {
            text.push('\n');
            text.push_str(sentence);
        }
        if !self.limits.is_empty() || !self.notes.is_empty() {
            text.push('\n');
        }
        format!("{text}\nThe tuned stack\n{}", self.result.text())
    }

    fn csv(&self) -> Result<String, csv::Error> {
        let mut tables = vec![csv_table(&self.aims)?];
        if !self.kept.is_empty() {
            tables.push(csv_table(&self.kept)?);
        }
        tables.extend([csv_table(&self.variables)?, self.result.csv()?]);
        Ok(tables.join("\n"))
    }
}
