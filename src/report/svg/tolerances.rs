//! Tolerances as pictures: bars of sensitivities and the distribution of a sampled transition.

use super::{Gaussian, SensitivityBar, SensitivityBars, Window, YieldHistogram};
use crate::constants::HC_EV_UM;
use crate::structure::{BandName, Level, Structure, Target};
use crate::tolerance::{Outcome, WindowYield};

/// The transition that the pictures are about, as places in the list of levels: the first window's, else the first aim's,
/// else that of the first two levels listed. `None` where it was not solved for.
fn transition(structure: &Structure, outcome: &Outcome) -> Option<(usize, usize)> {
    let window = structure.tolerance.iter().flat_map(|t| &t.windows).next();
    let aim = structure.tune.iter().flat_map(|tune| &tune.aims).next();
    let named = match (window, aim) {
        (Some(window), _) => Some([window.from, window.to]),
        (None, Some(aim)) => Some([aim.from, aim.to]),
        (None, None) => None,
    };
    let Some(named) = named else {
        return outcome.pairs.first().copied();
    };
    outcome.pairs.iter().copied().find(|&(from, to)| {
        let levels = [outcome.levels[from], outcome.levels[to]];
        named == levels || named == [levels[1], levels[0]]
    })
}

/// `1 to 2` inside the conduction band, else both with their bands.
fn words(from: Level, to: Level) -> String {
    match [from.band, to.band] == [BandName::Conduction; 2] {
        true => format!("{} to {}", from.index, to.index),
        false => format!("{from} to {to}"),
    }
}

fn title(structure: &Structure, what: &str) -> String {
    match &structure.title {
        Some(title) => format!("{title}: {what}"),
        None => what.to_owned(),
    }
}

/// How far the transition moves with each cause. `None` when there is no such transition.
pub fn sensitivity_bars(structure: &Structure, outcome: &Outcome) -> Option<SensitivityBars> {
    let (from, to) = transition(structure, outcome)?;
    let energy_ev = outcome.levels_ev[to] - outcome.levels_ev[from];
    let bars = outcome.sensitivities.iter().map(|cause| SensitivityBar {
        name: cause.name.clone(),
        unit: cause.step.to_owned(),
        change_mev: 1e3 * (cause.level_shifts_ev[to] - cause.level_shifts_ev[from]),
    });
    Some(SensitivityBars {
        title: title(structure, "sensitivities"),
        quantity: format!(
            "transition {}",
            words(outcome.levels[from], outcome.levels[to])
        ),
        caption: format!(
            "First-order changes of the transition at {:.2} meV{}, each for the step beside its name.",
            1e3 * energy_ev,
            match energy_ev > 0.0 {
                true => format!(" ({:.4} µm)", HC_EV_UM / energy_ev),
                false => String::new(),
            }
        ),
        bars: bars.collect(),
    })
}

/// The sampled distribution of the transition. `None` when nothing was sampled, or nothing varies.
pub fn yield_histogram(structure: &Structure, outcome: &Outcome) -> Option<YieldHistogram> {
    let (from, to) = transition(structure, outcome)?;
    let sampled = outcome.sampled.as_ref()?;
    let own = sampled
        .transitions
        .iter()
        .find(|t| (t.from, t.to) == (from, to))?;
    let bins = own.histogram.as_ref()?;
    let window = sampled
        .windows
        .iter()
        .find(|w| (w.window.from, w.window.to) == (outcome.levels[from], outcome.levels[to]));
    let first_aim = structure.tune.iter().flat_map(|tune| &tune.aims).next();
    let as_wavelength = match (window, first_aim) {
        (Some(w), _) => w.window.as_wavelength,
        (None, aim) => aim.is_some_and(|aim| matches!(aim.target, Target::WavelengthUm(_))),
    };
    let as_wavelength = as_wavelength && own.wavelength_um.is_some();
    let energy_ev = outcome.levels_ev[to] - outcome.levels_ev[from];
    let caption = format!(
        "{} wafers, each solved in full. Dashed: the normal distribution that the sensitivities foretell.",
        sampled.samples
    );
    let counts = bins.counts.iter().map(|count| *count as u64);
    let shared = YieldHistogram {
        title: title(
            structure,
            &format!(
                "transition {}",
                words(outcome.levels[from], outcome.levels[to])
            ),
        ),
        quantity: "Energy".to_owned(),
        unit: "meV".to_owned(),
        caption,
        borders: Vec::new(),
        counts: Vec::new(),
        linear: None,
        window: None,
    };
    let picture = |limits: &WindowYield, between: [f64; 2]| Window {
        between,
        share: limits.share.share,
        share_interval: limits.share.interval,
    };
    Some(if as_wavelength {
        // A wavelength falls as the energy rises: bins and limits change their order.
        let um = |ev: f64| HC_EV_UM / ev;
        YieldHistogram {
            quantity: "Wavelength".to_owned(),
            unit: "µm".to_owned(),
            borders: bins.edges.iter().rev().map(|ev| um(*ev)).collect(),
            counts: counts.rev().collect(),
            linear: normal(
                um(energy_ev),
                own.linear_deviation_ev * um(energy_ev) / energy_ev,
            ),
            window: window.map(|w| {
                let [low, high] = w.window.energies_ev;
                picture(w, [um(high), um(low)])
            }),
            ..shared
        }
    } else {
        YieldHistogram {
            borders: bins.edges.iter().map(|ev| 1e3 * ev).collect(),
            counts: counts.collect(),
            linear: normal(1e3 * energy_ev, 1e3 * own.linear_deviation_ev),
            window: window.map(|w| picture(w, w.window.energies_ev.map(|ev| 1e3 * ev))),
            ..shared
        }
    })
}

fn normal(mean: f64, standard_deviation: f64) -> Option<Gaussian> {
    (standard_deviation > 0.0).then_some(Gaussian {
        mean,
        standard_deviation,
    })
}
