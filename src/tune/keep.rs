//! Bounds on strain as residuals that vanish inside them.

use crate::epitaxy::{
    Glide, balance, glides, net_strain_slope, periods, thickness_ratio, whole_thickness_ratio,
};
use crate::structure::{Knob, Stack, StrainBound, Structure};

/// One bound.
#[derive(Clone, Debug, PartialEq)]
pub struct Keep {
    pub rule: Rule,
    /// How messages call it: `strain of layer 1 to layer 4`.
    pub name: String,
}

/// What is bounded.
#[derive(Clone, Debug, PartialEq)]
pub enum Rule {
    /// The net strain of these entries stays between −within and within.
    Balanced { entries: Vec<usize>, within: f64 },
    /// The width of this entry over its critical thickness stays below 1.
    BelowCritical { entry: usize, glide: Glide },
    /// The same of all strained layers as one.
    StackBelowCritical,
}

/// The residual begins at this part of the bound, so that a search that comes to rest on it lies inside.
const BALANCE_MARGIN: f64 = 0.5;
const THICKNESS_MARGIN: f64 = 0.95;

impl Keep {
    /// The net strain, or the width in critical thicknesses.
    pub fn value(&self, stack: &Stack) -> f64 {
        match &self.rule {
            Rule::Balanced { entries, .. } => balance(stack, entries).map_or(0.0, |b| b.net_strain),
            Rule::BelowCritical { entry, glide } => {
                thickness_ratio(stack, *entry, *glide, None).value
            }
            Rule::StackBelowCritical => whole_thickness_ratio(stack, None).value,
        }
    }

    /// The derivative of the value, per inner unit of the knob.
    pub fn slope(&self, stack: &Stack, knob: Knob) -> f64 {
        match &self.rule {
            Rule::Balanced { entries, .. } => net_strain_slope(stack, entries, knob),
            Rule::BelowCritical { entry, glide } => {
                thickness_ratio(stack, *entry, *glide, Some(knob)).slope
            }
            Rule::StackBelowCritical => whole_thickness_ratio(stack, Some(knob)).slope,
        }
    }

    /// The largest size of the value that is allowed.
    pub fn limit(&self) -> f64 {
        match self.rule {
            Rule::Balanced { within, .. } => within,
            Rule::BelowCritical { .. } | Rule::StackBelowCritical => 1.0,
        }
    }

    pub fn is_met(&self, value: f64) -> bool {
        value.abs() <= self.limit()
    }

    /// The residual, 1 at the limit and 0 up to a margin before it, and its slope.
    pub fn residual(&self, value: f64) -> (f64, f64) {
        let margin = match self.rule {
            Rule::Balanced { .. } => BALANCE_MARGIN,
            Rule::BelowCritical { .. } | Rule::StackBelowCritical => THICKNESS_MARGIN,
        };
        let (start, unit) = (margin * self.limit(), (1.0 - margin) * self.limit());
        let excess = value.abs() - start;
        if excess <= 0.0 {
            return (0.0, 0.0);
        }
        (value.signum() * excess / unit, 1.0 / unit)
    }
}

/// The bounds of a structure's `keep`; one about every layer becomes one for each strained layer.
pub fn keeps(structure: &Structure, stack: &Stack) -> Vec<Keep> {
    let wishes = structure.tune.iter().flat_map(|tune| &tune.keep);
    let label = |entry: usize| structure.entries.get(entry).map_or("", |e| &*e.label);
    let glides = glides(structure, stack);
    let thickness = |entry: usize| Keep {
        name: format!("{} in critical thicknesses", label(entry)),
        rule: Rule::BelowCritical {
            entry,
            glide: glides.get(entry).copied().unwrap_or(Glide::Buried),
        },
    };
    wishes
        .flat_map(|wish| match wish.bound {
            StrainBound::Balanced { range, within } => {
                let entries = balanced_entries(structure, stack, range);
                let name = match (entries.first(), entries.last()) {
                    (Some(first), Some(last)) => {
                        format!("net strain of {} to {}", label(*first), label(*last))
                    }
                    _ => "net strain".to_owned(),
                };
                vec![Keep {
                    rule: Rule::Balanced { entries, within },
                    name,
                }]
            }
            StrainBound::StackBelowCritical => vec![Keep {
                name: "strained layers together in critical thicknesses".to_owned(),
                rule: Rule::StackBelowCritical,
            }],
            StrainBound::BelowCritical { entry: Some(entry) } => vec![thickness(entry)],
            StrainBound::BelowCritical { entry: None } => {
                (0..structure.entries.len()).map(thickness).collect()
            }
        })
        .collect()
}

fn balanced_entries(
    structure: &Structure,
    stack: &Stack,
    range: Option<(usize, usize)>,
) -> Vec<usize> {
    let all: Vec<usize> = stack.layers.iter().map(|layer| layer.entry).collect();
    if let Some((from, to)) = range {
        let first = all.iter().position(|entry| *entry == from).unwrap_or(0);
        let rest = all.get(first..).unwrap_or_default();
        let length = rest.iter().position(|entry| *entry == to);
        return rest
            .iter()
            .take(length.map_or(0, |l| l + 1))
            .copied()
            .collect();
    }
    match &periods(structure)[..] {
        [only] => only.entries.clone(),
        _ => all,
    }
}
