//! From a structure and its stack to the lines of the sheet.

use super::digital::{COMPOSITION_TOLERANCE, Digital, digital, strain_on};
use super::digital_grade::{DigitalGrade, digital_grade};
use super::identity::content_id;
use super::openings::{Opening, group_three, miss, nearest, openings};
use super::ramp::ramp;
use super::rows::{Filling, LayerRow, PlaneRow, Row, Sums};
use super::totals::{MaterialTotal, ShutterUse, by_entry, materials, shutters};
use crate::diagnostics::Diagnostic;
use crate::materials::{Composition, Element, Sublattice, Substance};
use crate::structure::{Growth, Item, Profile, Stack, Structure};

/// Decimals of a fraction on the sheet; a cell is calibrated to no more.
const FRACTION_DECIMALS: usize = 4;
/// A width this near to whole monolayers, in monolayers, prints as whole.
const WHOLE: f64 = 0.005;

/// A growth, ready to be printed.
#[derive(Clone, Debug)]
pub struct Plan {
    /// The formula of the substrate.
    pub substrate: String,
    pub rows: Vec<Row>,
    pub total: Sums,
    pub shutters: Vec<ShutterUse>,
    pub materials: Vec<MaterialTotal>,
    /// What the grower has to decide.
    pub flags: Vec<Flag>,
    pub flux_targets: Vec<FluxTarget>,
    pub content_id: String,
}

/// Something that cannot be grown as it is designed.
#[derive(Clone, Debug, PartialEq)]
pub enum Flag {
    /// The width is no whole number of monolayers.
    Remainder {
        label: String,
        monolayers: f64,
        monolayer_nm: f64,
    },
    /// The cells do not give the composition.
    Composition(Box<NotGiven>),
    /// A graded layer, for which rates have to change during growth.
    Ramped {
        label: String,
        profile: Profile,
        /// What takes its place where rates stay.
        digital: Option<Box<DigitalGrade>>,
    },
    /// A plane of dopants, for which growth stops.
    Stop { label: String },
}

/// A composition that the cells do not give.
#[derive(Clone, Debug, PartialEq)]
pub struct NotGiven {
    pub label: String,
    pub wanted: Composition,
    /// What the nearest cells give.
    pub given: Composition,
    /// Their indices.
    pub cells: Vec<usize>,
    pub digital: Option<Digital>,
}

/// The group-V elements of a mixed layer; the ratio of their fluxes is to be calibrated, since group-III rates do not
/// fix it.
#[derive(Clone, Debug, PartialEq)]
pub struct FluxTarget {
    /// The layers that share it, by label.
    pub labels: Vec<String>,
    /// The fractions in the crystal, at the lower face of a graded layer.
    pub fractions: Vec<(Element, f64)>,
}

/// Plans the growth of a stack that was laid out from the structure, tuned or not.
///
/// # Errors
/// One message when the file has no `growth` block, or a layer no composition or monolayer.
pub fn plan(structure: &Structure, stack: &Stack) -> Result<Plan, Diagnostic> {
    let (Some(growth), Some(substrate)) = (&structure.growth, &structure.substrate) else {
        return Err(
            Diagnostic::error("there is no `growth` block in the file").expected(
                "`growth` with the rates of the cells, such as `growth: {rates: {Ga: 0.70 ML/s}}`",
            ),
        );
    };
    let mut planner = Planner {
        structure,
        stack,
        growth,
        openings: openings(growth),
        first: first_layers(structure, stack),
        rows: Vec::new(),
    };
    let total = planner.items(&structure.sequence, 0, Sums::default())?;
    let Planner { openings, rows, .. } = planner;
    let of_layers = by_entry(&rows)
        .into_iter()
        .flat_map(|row| flags(structure, stack, &openings, row));
    let planes = rows.iter().filter_map(|row| match row {
        Row::Plane(plane) => Some(Flag::Stop {
            label: plane.label.clone(),
        }),
        _ => None,
    });
    let flags = of_layers.chain(planes).collect();
    Ok(Plan {
        substrate: structure.library.composition(&substrate.value).map_or_else(
            || name_of(&substrate.value),
            |c| c.formula_to(FRACTION_DECIMALS),
        ),
        total,
        shutters: shutters(growth, &rows, stack),
        materials: materials(growth, &rows, stack),
        flags,
        flux_targets: flux_targets(&rows),
        content_id: content_id(structure, stack),
        rows,
    })
}

/// The first layer of the stack that each entry became.
fn first_layers(structure: &Structure, stack: &Stack) -> Vec<Option<usize>> {
    let mut first = vec![None; structure.entries.len()];
    for (index, layer) in stack.layers.iter().enumerate() {
        if let Some(place) = first.get_mut(layer.entry) {
            place.get_or_insert(index);
        }
    }
    first
}

fn name_of(substance: &Substance) -> String {
    match substance {
        Substance::Named(name) => name.clone(),
        Substance::Alloy(composition) => composition.formula_to(FRACTION_DECIMALS),
        Substance::Family(family) => family.formula(),
    }
}

struct Planner<'p> {
    structure: &'p Structure,
    stack: &'p Stack,
    growth: &'p Growth,
    openings: Vec<Opening>,
    /// By entry.
    first: Vec<Option<usize>>,
    rows: Vec<Row>,
}

impl Planner<'_> {
    /// Appends the rows of a sequence that begins at `before`, and returns what one pass of it takes.
    fn items(&mut self, items: &[Item], depth: usize, before: Sums) -> Result<Sums, Diagnostic> {
        let mut pass = Sums::default();
        for item in items {
            match item {
                Item::Layer(entry) => {
                    let mut row = self.layer(*entry, depth)?;
                    pass = pass.plus(row.own);
                    row.after = before.plus(pass);
                    self.rows.push(Row::Layer(row));
                }
                Item::Plane(entry) => {
                    if let Some(plane) = self.structure.planes.get(*entry) {
                        self.rows.push(Row::Plane(PlaneRow {
                            depth,
                            label: plane.label.clone(),
                            donors_cm2: plane.donors_cm2,
                            acceptors_cm2: plane.acceptors_cm2,
                            after: before.plus(pass),
                        }));
                    }
                }
                Item::Repeat { count, items } => {
                    let count = *count;
                    self.rows.push(Row::LoopBegins { count, depth });
                    let inner = self.items(items, depth + 1, before.plus(pass))?;
                    pass = pass.plus(inner.times(count));
                    self.rows.push(Row::LoopEnds {
                        count,
                        depth,
                        pass: inner,
                        after: before.plus(pass),
                    });
                }
            }
        }
        Ok(pass)
    }

    fn layer(&self, entry: usize, depth: usize) -> Result<LayerRow, Diagnostic> {
        let Self {
            structure, stack, ..
        } = self;
        let unknown = || Diagnostic::error(format!("layer {} cannot be planned", entry + 1));
        let source = structure.entries.get(entry).ok_or_else(unknown)?;
        let not_grown = || {
            Diagnostic::error(format!(
                "the composition or the monolayer of `{}` is not known",
                source.label
            ))
            .at(source.material.span.clone())
        };
        let layer = self
            .first
            .get(entry)
            .copied()
            .flatten()
            .ok_or_else(unknown)?;
        let composition = stack.composition_at(layer, 0.0).ok_or_else(not_grown)?;
        let monolayer_nm = stack.monolayer_nm(layer).ok_or_else(not_grown)?;
        let Some(grown) = stack.layers.get(layer) else {
            return Err(unknown());
        };
        let monolayers = grown.width_nm / monolayer_nm;
        let (filling, time_s) = if stack.is_uniform(layer) {
            let opening =
                nearest(&self.openings, group_three(&composition)).ok_or_else(not_grown)?;
            let filling = Filling::Open {
                cells: opening.cells.clone(),
                rate_ml_per_s: opening.rate_ml_per_s,
            };
            (filling, monolayers / opening.rate_ml_per_s)
        } else {
            let ramp = ramp(self.growth, &self.openings, stack, layer).ok_or_else(not_grown)?;
            let time_s = monolayers * ramp.seconds_per_monolayer;
            (Filling::Ramped(ramp), time_s)
        };
        let written = |substance: &Substance, composition: &Composition| {
            let formula = composition.formula_to(FRACTION_DECIMALS);
            match substance {
                Substance::Named(name) => format!("{name} ({formula})"),
                _ => formula,
            }
        };
        let to = source.to.as_ref().and_then(|to| {
            // A composition along the grade has its elements in the order of the lower material.
            let own = structure.library.composition(&to.value);
            let composition = own.or_else(|| stack.composition_at(layer, 1.0))?;
            Some(written(&to.value, &composition))
        });
        let fives = composition.elements().iter().filter(|element| {
            element.sublattice() == Sublattice::GroupFive && composition.fraction(**element) > 0.0
        });
        let group_five: Vec<(Element, f64)> = fives
            .map(|element| (*element, composition.fraction(*element)))
            .collect();
        Ok(LayerRow {
            number: entry + 1,
            depth,
            entry,
            label: source.label.clone(),
            material: written(&source.material.value, &composition),
            to,
            own: Sums::of_layer(grown.width_nm, monolayers, time_s),
            after: Sums::default(),
            monolayers,
            monolayer_nm,
            donors_cm3: grown.all_donors_cm3(),
            acceptors_cm3: grown.all_acceptors_cm3(),
            filling,
            group_five: if group_five.len() > 1 {
                group_five
            } else {
                Vec::new()
            },
        })
    }
}

fn flags(structure: &Structure, stack: &Stack, openings: &[Opening], row: &LayerRow) -> Vec<Flag> {
    let mut found = Vec::new();
    if (row.monolayers - row.monolayers.round()).abs() > WHOLE {
        found.push(Flag::Remainder {
            label: row.label.clone(),
            monolayers: row.monolayers,
            monolayer_nm: row.monolayer_nm,
        });
    }
    match &row.filling {
        Filling::Ramped(_) => found.push(Flag::Ramped {
            label: row.label.clone(),
            profile: structure
                .entries
                .get(row.entry)
                .map_or(Profile::Linear, |entry| entry.profile),
            digital: stack
                .layers
                .iter()
                .position(|layer| layer.entry == row.entry)
                .and_then(|layer| digital_grade(openings, stack, layer, row.monolayers))
                .map(Box::new),
        }),
        Filling::Open { cells, .. } => {
            let layer = stack.layers.iter().position(|l| l.entry == row.entry);
            let Some(wanted) = layer.and_then(|layer| stack.composition_at(layer, 0.0)) else {
                return found;
            };
            let fractions = group_three(&wanted);
            let Some(given) = openings.iter().find(|opening| opening.cells == *cells) else {
                return found;
            };
            if miss(given.fractions, fractions) > COMPOSITION_TOLERANCE {
                let strain_of = |fractions: [f64; 3]| {
                    strain_on(
                        &structure.library,
                        stack.temperature_k(),
                        stack.substrate_lattice_nm(),
                        &wanted.with_group_three(fractions),
                    )
                };
                found.push(Flag::Composition(Box::new(NotGiven {
                    label: row.label.clone(),
                    given: wanted.with_group_three(given.fractions),
                    cells: cells.clone(),
                    digital: digital(openings, &wanted, fractions, row.monolayers, strain_of),
                    wanted,
                })));
            }
        }
    }
    found
}

/// The mixed group-V ratios, each once with the layers that share it.
fn flux_targets(rows: &[Row]) -> Vec<FluxTarget> {
    let mut targets: Vec<FluxTarget> = Vec::new();
    for row in by_entry(rows) {
        if row.group_five.is_empty() {
            continue;
        }
        match targets.iter_mut().find(|t| t.fractions == row.group_five) {
            Some(target) => target.labels.push(row.label.clone()),
            None => targets.push(FluxTarget {
                labels: vec![row.label.clone()],
                fractions: row.group_five.clone(),
            }),
        }
    }
    targets
}
