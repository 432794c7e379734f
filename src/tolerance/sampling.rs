//! The sampled yield: many wafers, each grown off by its own draws and solved in full, against what the slopes foretell.

use super::charged::Slopes;
use super::followed::Followed;
use super::statistics::{Histogram, Share, Statistics, histogram, share, statistics};
use crate::constants::HC_EV_UM;
use crate::models::BandOperator;
use crate::structure::{Cause, Design, Level, NotGrown, Stack, Structure, Tolerance, Window};
use crate::subbands::{Place, lower_outer_edge_ev};
use crate::units::Dimension;
use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use rayon::prelude::*;
use std::sync::atomic::{AtomicUsize, Ordering};

/// Receives the number of wafers done.
pub type Watch<'w> = &'w (dyn Fn(usize) + Sync);

/// Each wafer's energies are this near to those of its mesh, in eV.
const TOLERANCE_EV: f64 = 1e-7;
/// Wafers between two calls of the watch.
const WATCHED: usize = 256;

/// Something that makes wafers differ.
#[derive(Clone, Debug, PartialEq)]
pub struct Source {
    /// `width of well`, which the copies of a repeat share though each is off on its own.
    pub name: String,
    pub cause: Cause,
    /// Standard deviation in the cause's unit.
    pub deviation: f64,
    /// The slope of each followed level, eV per unit of the cause.
    pub level_slopes_ev: Vec<f64>,
    /// The slopes of each solved level.
    slopes: Slopes,
}

/// What the sampled wafers say.
#[derive(Clone, Debug, PartialEq)]
pub struct Sampled {
    pub samples: usize,
    pub seed: u64,
    /// Wafers that cannot be: a draw took a whole layer away or drove a fraction below zero. They count as outside of
    /// every window and enter no distribution.
    pub not_grown: usize,
    /// Of each followed level, the wafers in which it lies beyond the outer barrier edge that is nearer to the gap, held by
    /// the walls only.
    pub unbound: Vec<usize>,
    pub transitions: Vec<Distributed>,
    pub windows: Vec<WindowYield>,
    /// Wafers inside all windows at once, when there are several.
    pub all_windows: Option<Share>,
}

/// One transition over all wafers; places in the list of followed levels.
#[derive(Clone, Debug, PartialEq)]
pub struct Distributed {
    pub from: usize,
    pub to: usize,
    pub energy_ev: Statistics,
    /// `None` where some wafer has no light to give: its lower level lies above the upper one.
    pub wavelength_um: Option<Statistics>,
    /// Wafers in which the walls alone hold one of the two levels.
    pub unbound: usize,
    /// The standard deviation that the slopes at the design give.
    pub linear_deviation_ev: f64,
    /// What it comes from, with the shares of that variance, the largest first.
    pub contributors: Vec<(String, f64)>,
    /// Of the energy in eV.
    pub histogram: Option<Histogram>,
}

/// The share of wafers inside a window.
#[derive(Clone, Debug, PartialEq)]
pub struct WindowYield {
    pub window: Window,
    pub share: Share,
}

/// What makes wafers differ, by the file's `tolerance` block.
pub fn sources(
    structure: &Structure,
    stack: &Stack,
    tolerance: &Tolerance,
    design: &Design,
    followed: &Followed,
) -> Vec<Source> {
    let mut found: Vec<(String, Cause, f64)> = Vec::new();
    let mut add = |name: String, cause: Cause, deviation: f64| found.push((name, cause, deviation));
    if let Some(part) = tolerance.rate {
        add("all growth rates".to_owned(), Cause::Rate, part);
    }
    for flux in &tolerance.flux {
        let (element, part) = flux.value;
        add(
            format!("{} flux", element.symbol()),
            Cause::Flux(element),
            part,
        );
    }
    if let Some(jitter) = &tolerance.jitter {
        for (index, layer) in stack.layers.iter().enumerate() {
            let deviation_nm = match jitter.value.unit.dimension {
                Dimension::Percentage => Some(jitter.value.value() * layer.width_nm),
                // That monolayers are known was found out when the file was read.
                _ => stack.length_nm(layer.entry, &jitter.value),
            };
            let label = structure
                .entries
                .get(layer.entry)
                .map_or(layer.label.as_str(), |entry| entry.label.as_str());
            add(
                format!("width of {label}"),
                Cause::Layer(index),
                deviation_nm.unwrap_or(0.0),
            );
        }
    }
    if let Some(deviation) = &tolerance.composition {
        for cause in design.alloy_fractions() {
            if let Cause::Alloy { alloy, element, .. } = &cause {
                let formula: String = alloy.iter().map(|element| element.symbol()).collect();
                add(
                    format!("{} in {formula}", element.symbol()),
                    cause.clone(),
                    deviation.value,
                );
            }
        }
    }
    if let Some(grading) = &tolerance.grading {
        add(
            "length of interfaces".to_owned(),
            Cause::Grading,
            grading.spread_nm,
        );
    }
    if let Some(part) = tolerance.doping {
        add("doping".to_owned(), Cause::Doping, part);
    }
    if let Some(deviation) = tolerance.field_v_per_nm {
        add("field".to_owned(), Cause::Field, deviation);
    }
    if let Some(deviation) = tolerance.temperature_k {
        add("temperature".to_owned(), Cause::Temperature, deviation);
    }
    found
        .into_par_iter()
        .filter(|(_, _, deviation)| *deviation > 0.0)
        .filter_map(|(name, cause, deviation)| {
            let slopes = followed.band_slopes(&structure.charge, design, &cause)?;
            Some(Source {
                level_slopes_ev: followed.named(&slopes.whole)?,
                slopes,
                name,
                cause,
                deviation,
            })
        })
        .collect()
}

/// Grows and solves the wafers. The same seed gives the same wafers, whatever the number of threads: each has a stream
/// of its own. `pairs` are the transitions to follow, as places in the list of followed levels.
pub fn sample(
    design: &Design,
    followed: &Followed,
    pairs: &[(usize, usize)],
    sources: &[Source],
    windows: &[Window],
    (samples, seed): (usize, u64),
    watch: Watch,
) -> Sampled {
    let causes: Vec<Cause> = sources.iter().map(|source| source.cause.clone()).collect();
    let done = AtomicUsize::new(0);
    let generator = ChaCha8Rng::seed_from_u64(seed);
    let solved: Vec<Option<Wafer>> = (0..samples)
        .into_par_iter()
        .map_init(
            || design.stack().clone(),
            |stack, number| {
                let mut generator = generator.clone();
                generator.set_stream(number as u64);
                let amounts: Vec<f64> = sources
                    .iter()
                    .map(|source| {
                        let normal: f64 = StandardNormal.sample(&mut generator);
                        source.deviation * normal
                    })
                    .collect();
                let wafer = wafer(design, followed, sources, (&causes, &amounts), stack);
                let count = done.fetch_add(1, Ordering::Relaxed) + 1;
                if count.is_multiple_of(WATCHED) {
                    watch(count);
                }
                wafer.ok()
            },
        )
        .collect();
    let grown: Vec<&Wafer> = solved.iter().flatten().collect();
    let unbound = (0..followed.names.len())
        .map(|level| grown.iter().filter(|w| !w.held[level]).count())
        .collect();
    let transitions = pairs
        .iter()
        .filter_map(|&(from, to)| distributed(&grown, sources, from, to))
        .collect();
    let place = |level: Level| followed.names.iter().position(|name| *name == level);
    let inside = |wafer: &Wafer, window: &Window| {
        let (Some(from), Some(to)) = (place(window.from), place(window.to)) else {
            return false;
        };
        let energy_ev = wafer.energy_ev(from, to);
        (window.energies_ev[0]..=window.energies_ev[1]).contains(&energy_ev)
    };
    let windows: Vec<WindowYield> = windows
        .iter()
        .map(|window| WindowYield {
            window: window.clone(),
            share: share(grown.iter().filter(|w| inside(w, window)).count(), samples),
        })
        .collect();
    let all_windows = (windows.len() > 1).then(|| {
        let in_all = |w: &&&Wafer| windows.iter().all(|window| inside(w, &window.window));
        share(grown.iter().filter(in_all).count(), samples)
    });
    Sampled {
        samples,
        seed,
        not_grown: samples - grown.len(),
        unbound,
        transitions,
        windows,
        all_windows,
    }
}

/// The followed levels of a solved wafer.
struct Wafer {
    energies_ev: Vec<f64>,
    /// Whether barriers hold the level, not the walls alone.
    held: Vec<bool>,
}

impl Wafer {
    fn energy_ev(&self, from: usize, to: usize) -> f64 {
        self.energies_ev[to] - self.energies_ev[from]
    }
}

fn wafer(
    design: &Design,
    followed: &Followed,
    sources: &[Source],
    (causes, amounts): (&[Cause], &[f64]),
    stack: &mut Stack,
) -> Result<Wafer, NotGrown> {
    design.grow(stack, causes, amounts)?;
    let mut energies_ev = Vec::new();
    let mut held = Vec::new();
    for (band, nearby) in followed.nearby().iter().enumerate() {
        let sign = nearby.solved().band.sign();
        let operator = BandOperator::new(stack, nearby.solved().band).map_err(|_| NotGrown)?;
        let pencil = nearby.pencil(&operator);
        let pairs = &nearby.solved().pairs;
        let mut guesses_ev: Vec<f64> = pairs.iter().map(|pair| pair.value).collect();
        let mut answers_ev = vec![0.0; guesses_ev.len()];
        for (source, amount) in sources.iter().zip(amounts) {
            let (whole, of_charge) = (&source.slopes.whole[band], &source.slopes.of_charge[band]);
            for (state, guess) in guesses_ev.iter_mut().enumerate() {
                *guess += amount * sign * (whole[state] - of_charge[state]);
                answers_ev[state] += amount * sign * of_charge[state];
            }
        }
        // The layers take their potential along; to first order the charge's answer adds its slopes.
        let mut values = nearby.energies_ev(&pencil, &guesses_ev, TOLERANCE_EV);
        for (value, answer_ev) in values.iter_mut().zip(&answers_ev) {
            *value += answer_ev;
        }
        let edge_ev = lower_outer_edge_ev(&pencil);
        held.push(values.partition_point(|value| *value <= edge_ev));
        energies_ev.push(values.into_iter().map(|value| sign * value).collect());
    }
    let places = followed.places_on(&energies_ev).ok_or(NotGrown)?;
    let energy = |place: &Place| energies_ev[place.band][place.state];
    Ok(Wafer {
        energies_ev: places.iter().map(energy).collect(),
        held: places.iter().map(|p| p.state < held[p.band]).collect(),
    })
}

/// `None` for fewer than two wafers.
fn distributed(
    wafers: &[&Wafer],
    sources: &[Source],
    from: usize,
    to: usize,
) -> Option<Distributed> {
    let energies_ev: Vec<f64> = wafers.iter().map(|w| w.energy_ev(from, to)).collect();
    let light = energies_ev.iter().all(|ev| *ev > 0.0);
    let wavelengths_um: Vec<f64> = energies_ev.iter().map(|ev| HC_EV_UM / ev).collect();
    let loose = |w: &&&Wafer| !(w.held[from] && w.held[to]);
    let mut variances: Vec<(String, f64)> = Vec::new();
    for source in sources {
        let slope = source.level_slopes_ev[to] - source.level_slopes_ev[from];
        let variance = (slope * source.deviation).powi(2);
        match variances.iter_mut().find(|(name, _)| *name == source.name) {
            Some((_, sum)) => *sum += variance,
            None => variances.push((source.name.clone(), variance)),
        }
    }
    let whole: f64 = variances.iter().map(|(_, variance)| variance).sum();
    variances.sort_by(|a, b| b.1.total_cmp(&a.1));
    let contributors = variances
        .into_iter()
        .filter(|(_, variance)| *variance > 0.0)
        .map(|(name, variance)| (name, variance / whole))
        .collect();
    Some(Distributed {
        from,
        to,
        energy_ev: statistics(&energies_ev)?,
        wavelength_um: statistics(&wavelengths_um).filter(|_| light),
        unbound: wafers.iter().filter(loose).count(),
        linear_deviation_ev: whole.sqrt(),
        contributors,
        histogram: histogram(&energies_ev),
    })
}
