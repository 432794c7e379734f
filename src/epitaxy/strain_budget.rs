//! Thickness against critical thickness: of each layer, and of all strained layers together.

use super::critical_thickness::{Glide, matthews_blakeslee_nm, people_bean_nm};
use super::layers::first_copies;
use super::mean::{LayerMean, layer_mean};
use super::periods::periods;
use crate::materials::Number;
use crate::structure::{Stack, Structure};

/// Layers with less misfit than this count as matched when it is asked which layers are strained.
const MATCHED: f64 = 1e-4;

/// A layer beside its critical thicknesses.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LayerThickness {
    /// Index of the file's layer entry.
    pub entry: usize,
    pub width_nm: f64,
    /// Mean of (a − a_substrate)/a_substrate over the layer.
    pub misfit: f64,
    pub glide: Glide,
    /// Infinite for a matched layer.
    pub matthews_blakeslee_nm: f64,
    pub people_bean_nm: f64,
}

/// All strained layers and what lies between them, taken as one layer with their mean misfit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct WholeThickness {
    /// Indices of the lowest and the highest strained layer in the stack.
    pub layers: (usize, usize),
    pub width_nm: f64,
    /// Mean over the thickness.
    pub misfit: f64,
    /// As one free layer, or buried when a matched layer covers it.
    pub glide: Glide,
    pub matthews_blakeslee_nm: f64,
    pub people_bean_nm: f64,
}

/// See the two kinds of rows.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct StrainBudget {
    /// Each entry of the file once; entries whose lattice or elastic constants are unknown are left out.
    pub layers: Vec<LayerThickness>,
    /// `None` when no layer is strained, or when a layer in between has unknown constants.
    pub whole: Option<WholeThickness>,
}

/// The budget of a stack; empty without a substrate.
pub fn strain_budget(structure: &Structure, stack: &Stack) -> StrainBudget {
    let firsts = first_copies(stack);
    let glides = glides(structure, stack);
    let means: Vec<Option<LayerMean>> = {
        let mut means = vec![None; structure.entries.len()];
        for &(layer, entry, _) in &firsts {
            if let Some(place) = means.get_mut(entry) {
                *place = layer_mean(stack, layer);
            }
        }
        means
    };
    let layers = firsts
        .iter()
        .filter_map(|&(layer, entry, _)| {
            let (mean, glide) = ((*means.get(entry)?)?, *glides.get(entry)?);
            Some(LayerThickness {
                entry,
                width_nm: stack.layers[layer].width_nm,
                misfit: mean.misfit,
                glide,
                matthews_blakeslee_nm: matthews_blakeslee_nm(
                    mean.lattice_nm,
                    mean.misfit,
                    mean.poisson,
                    glide,
                ),
                people_bean_nm: people_bean_nm(mean.lattice_nm, mean.misfit, mean.poisson),
            })
        })
        .collect();
    StrainBudget {
        layers,
        whole: whole(stack, &means),
    }
}

fn whole(stack: &Stack, means: &[Option<LayerMean>]) -> Option<WholeThickness> {
    let one = as_one(stack, means, |layer| stack.layers[layer].width_nm)?;
    let LayerMean {
        lattice_nm,
        misfit,
        poisson,
        ..
    } = one.mean;
    Some(WholeThickness {
        layers: one.layers,
        width_nm: one.width_nm,
        misfit,
        glide: one.glide,
        matthews_blakeslee_nm: matthews_blakeslee_nm(lattice_nm, misfit, poisson, one.glide),
        people_bean_nm: people_bean_nm(lattice_nm, misfit, poisson),
    })
}

/// All strained layers and what lies between them as one layer.
pub(super) struct One<T> {
    pub layers: (usize, usize),
    pub width_nm: T,
    /// Over the thickness.
    pub mean: LayerMean<T>,
    pub glide: Glide,
}

/// Joins the strained layers of a stack, of whose entries the means are given. `None` when no layer is strained, or when one in
/// between has unknown constants.
pub(super) fn as_one<T: Number>(
    stack: &Stack,
    means: &[Option<LayerMean<T>>],
    width_nm: impl Fn(usize) -> T,
) -> Option<One<T>> {
    let mean_of = |layer: usize| *means.get(stack.layers.get(layer)?.entry)?;
    let is_strained =
        |&layer: &usize| mean_of(layer).is_some_and(|mean| mean.misfit.value().abs() > MATCHED);
    let lowest = (0..stack.layers.len()).find(is_strained)?;
    let highest = (0..stack.layers.len()).rev().find(is_strained)?;
    let mut whole_nm = width_nm(lowest);
    let mut sum = mean_of(lowest)?.map(|value| value * whole_nm);
    for layer in lowest + 1..=highest {
        let own_nm = width_nm(layer);
        sum = sum.plus(mean_of(layer)?.map(|value| value * own_nm));
        whole_nm = whole_nm + own_nm;
    }
    Some(One {
        layers: (lowest, highest),
        width_nm: whole_nm,
        mean: sum.map(|value| value / whole_nm),
        glide: if highest + 1 == stack.layers.len() {
            Glide::FreeLayer
        } else {
            Glide::Buried
        },
    })
}

/// How dislocations can form in each entry of the file: the topmost layer is free, one of a repeat that holds compressed and
/// stretched layers belongs to a superlattice, and all others are buried.
pub fn glides(structure: &Structure, stack: &Stack) -> Vec<Glide> {
    let mut glides = vec![Glide::Buried; structure.entries.len()];
    let mut misfits = vec![0.0; structure.entries.len()];
    for (layer, entry, _) in first_copies(stack) {
        if let (Some(place), Some(mean)) = (misfits.get_mut(entry), layer_mean(stack, layer)) {
            *place = mean.misfit;
        }
    }
    for period in periods(structure) {
        let has = |wanted: f64| {
            let misfit = |entry: &usize| misfits.get(*entry).copied().unwrap_or(0.0);
            period.entries.iter().any(|e| wanted * misfit(e) > MATCHED)
        };
        if has(1.0) && has(-1.0) {
            for entry in &period.entries {
                if let Some(place) = glides.get_mut(*entry) {
                    *place = Glide::Superlattice;
                }
            }
        }
    }
    if let Some(top) = stack.layers.last()
        && let Some(place) = glides.get_mut(top.entry)
        && *place == Glide::Buried
    {
        *place = Glide::FreeLayer;
    }
    glides
}
