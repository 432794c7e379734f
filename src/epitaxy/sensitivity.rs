//! How strain balance and thickness against critical thickness answer to widths and fractions.

use super::critical_thickness::{Glide, matthews_blakeslee_nm};
use super::layers::first_copies;
use super::mean::{LayerMean, layer_mean, layer_mean_slope};
use super::strain_balance::balance;
use super::strain_budget::as_one;
use crate::materials::Dual;
use crate::structure::{Knob, Stack};

/// The derivative of the net strain of entries, see [`balance`], with respect to a knob, per its inner unit; 0 where the
/// balance is not known.
pub fn net_strain_slope(stack: &Stack, entries: &[usize], knob: Knob) -> f64 {
    let (Knob::Width { entry } | Knob::Fraction { entry, .. }) = knob else {
        return 0.0;
    };
    let copies = entries.iter().filter(|other| **other == entry).count() as f64;
    let slope = || {
        let all = balance(stack, entries)?;
        let (layer, ..) = first_copies(stack)
            .into_iter()
            .find(|(_, own, _)| *own == entry)?;
        let width_nm = stack.layers[layer].width_nm;
        // S = N/D: dS = (dN − S dD)/D.
        let (tension, stiffness) = match knob {
            Knob::Fraction { element, .. } => {
                let mean = layer_mean_slope(stack, layer, element)?;
                (
                    width_nm * mean.tension.slope,
                    width_nm * mean.stiffness.slope,
                )
            }
            _ => {
                let mean = layer_mean(stack, layer)?;
                (mean.tension, mean.stiffness)
            }
        };
        let whole = all.thickness_nm * all.mean.stiffness;
        Some(copies * (tension - all.net_strain * stiffness) / whole)
    };
    if copies == 0.0 {
        return 0.0;
    }
    slope().unwrap_or(0.0)
}

/// The width of a layer entry over its critical thickness by Matthews and Blakeslee, with its derivative with respect to a
/// knob; 0 for a matched layer and for one whose constants are not known.
pub fn thickness_ratio(stack: &Stack, entry: usize, glide: Glide, knob: Option<Knob>) -> Dual {
    let ratio = || {
        let (layer, ..) = first_copies(stack)
            .into_iter()
            .find(|(_, own, _)| *own == entry)?;
        let mut width = Dual {
            value: stack.layers[layer].width_nm,
            slope: 0.0,
        };
        let mean = match knob {
            Some(Knob::Fraction {
                entry: own,
                element,
            }) if own == entry => layer_mean_slope(stack, layer, element)?,
            _ => layer_mean(stack, layer)?.map(|value| Dual { value, slope: 0.0 }),
        };
        if knob == Some(Knob::Width { entry }) {
            width.slope = 1.0;
        }
        in_critical(width, mean, glide)
    };
    ratio().unwrap_or(NONE)
}

/// The same of all strained layers and what lies between them, as one layer with their mean misfit.
pub fn whole_thickness_ratio(stack: &Stack, knob: Option<Knob>) -> Dual {
    let firsts = first_copies(stack);
    let entries = firsts.iter().map(|(_, entry, _)| entry + 1).max();
    let mut means = vec![None; entries.unwrap_or(0)];
    for (layer, entry, _) in firsts {
        means[entry] = match knob {
            Some(Knob::Fraction {
                entry: own,
                element,
            }) if own == entry => layer_mean_slope(stack, layer, element),
            _ => layer_mean(stack, layer).map(|mean| mean.map(|value| Dual { value, slope: 0.0 })),
        };
    }
    let width = |layer: usize| {
        let own = &stack.layers[layer];
        let varies = knob == Some(Knob::Width { entry: own.entry });
        Dual {
            value: own.width_nm,
            slope: f64::from(u8::from(varies)),
        }
    };
    as_one(stack, &means, width)
        .and_then(|one| in_critical(one.width_nm, one.mean, one.glide))
        .unwrap_or(NONE)
}

/// A width over the critical thickness by Matthews and Blakeslee; `None` for a matched layer.
fn in_critical(width: Dual, mean: LayerMean<Dual>, glide: Glide) -> Option<Dual> {
    let critical = matthews_blakeslee_nm(mean.lattice_nm, mean.misfit, mean.poisson, glide);
    if critical.value.is_infinite() {
        return None;
    }
    // Where no thickness is stable, a tenth of a nanometre stands for none.
    if critical.value < LEAST_NM {
        return Some(Dual {
            value: width.value / LEAST_NM,
            slope: width.slope / LEAST_NM,
        });
    }
    Some(width / critical)
}

const NONE: Dual = Dual {
    value: 0.0,
    slope: 0.0,
};
const LEAST_NM: f64 = 0.1;
