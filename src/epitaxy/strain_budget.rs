//! Thickness against critical thickness: of each layer, and of all strained layers together.

use super::critical_thickness::{Glide, matthews_blakeslee_nm, people_bean_nm};
use super::layers::first_copies;
use super::mean::{LayerMean, layer_mean};
use super::periods::periods;
use super::strain_balance::Sum;
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
    let mean_of = |layer: usize| *means.get(stack.layers.get(layer)?.entry)?;
    let is_strained =
        |&layer: &usize| mean_of(layer).is_some_and(|mean| mean.misfit.abs() > MATCHED);
    let lowest = (0..stack.layers.len()).find(is_strained)?;
    let highest = (0..stack.layers.len()).rev().find(is_strained)?;
    let mut sum = Sum::default();
    for layer in lowest..=highest {
        sum.add(stack.layers[layer].width_nm, mean_of(layer)?);
    }
    let all = sum.balance(stack.substrate_lattice_nm()?)?;
    let glide = if highest + 1 == stack.layers.len() {
        Glide::FreeLayer
    } else {
        Glide::Buried
    };
    let LayerMean {
        lattice_nm,
        misfit,
        poisson,
        ..
    } = all.mean;
    Some(WholeThickness {
        layers: (lowest, highest),
        width_nm: all.thickness_nm,
        misfit,
        glide,
        matthews_blakeslee_nm: matthews_blakeslee_nm(lattice_nm, misfit, poisson, glide),
        people_bean_nm: people_bean_nm(lattice_nm, misfit, poisson),
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
