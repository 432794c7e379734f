//! Whether layers of opposite strain pull at the substrate or not.

use super::layers::first_copies;
use super::mean::{LayerMean, layer_mean};
use crate::structure::Stack;

/// The balance of a sequence of layers.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Balance {
    pub thickness_nm: f64,
    /// The lattice constant of a substrate on which the layers together would exert no in-plane force, in nm:
    /// a₀ = Σ(A t/a) / Σ(A t/a²), A = c₁₁ + c₁₂ − 2c₁₂²/c₁₁ (N. J. Ekins-Daukes, K. Kawaguchi and J. Zhang, Cryst. Growth
    /// Des. 2, 287 (2002), their zero-stress condition, from memory, written for any number of layers).
    pub zero_stress_lattice_nm: f64,
    /// The in-plane strain that is left on this substrate, (a_substrate − a₀)/a₀: Σ(A t ε∥/a) / Σ(A t/a). Negative means
    /// compressed; 0 means balanced.
    pub net_strain: f64,
    /// Means over the thickness.
    pub mean: LayerMean,
}

/// The balance of layer entries, each counted as often as it stands in `entries`; `None` when there is none, without a
/// substrate, or when a layer's lattice or elastic constants are unknown.
pub fn balance(stack: &Stack, entries: &[usize]) -> Option<Balance> {
    let substrate_nm = stack.substrate_lattice_nm()?;
    let mut means = vec![None; stack.layers.len() + 1];
    for (layer, entry, _) in first_copies(stack) {
        if let Some(place) = means.get_mut(entry) {
            *place = Some((stack.layers[layer].width_nm, layer_mean(stack, layer)));
        }
    }
    let mut sum = Sum::default();
    for entry in entries {
        let (width_nm, mean) = (*means.get(*entry)?)?;
        sum.add(width_nm, mean?);
    }
    sum.balance(substrate_nm)
}

/// Sums over layers, weighted by thickness.
#[derive(Default)]
struct Sum {
    thickness_nm: f64,
    weighted: Option<LayerMean>,
}

impl Sum {
    fn add(&mut self, width_nm: f64, mean: LayerMean) {
        self.thickness_nm += width_nm;
        let here = mean.map(|value| value * width_nm);
        self.weighted = Some(match self.weighted {
            None => here,
            Some(sum) => sum.plus(here),
        });
    }

    fn balance(self, substrate_nm: f64) -> Option<Balance> {
        let sum = self.weighted?;
        // Σ A t/a² from ε∥ = (a_s − a)/a: A ε∥/a = A a_s/a² − A/a.
        let net_strain = sum.tension / sum.stiffness;
        Some(Balance {
            thickness_nm: self.thickness_nm,
            zero_stress_lattice_nm: substrate_nm / (1.0 + net_strain),
            net_strain,
            mean: sum.map(|value| value / self.thickness_nm),
        })
    }
}
