//! The `growth` part of a structure file, and what it must have for the file's stack.

use super::document::{Node, Value, line_of};
use super::fields::{Checker, Limits, between, one_of};
use super::file::{LayerEntry, PlaneEntry, Spanned, Structure, Tune, Varied};
use super::growth::{Cell, DOPANTS, Dopant, Growth};
use super::read_layers::{self, Known};
use super::stack::Stack;
use crate::diagnostics::{Diagnostic, probably_meant};
use crate::materials::{
    Composition, Element, Library, Sublattice, Substance, monolayer_nm, strain,
};
use crate::units::{Dimension, Quantity};
use std::ops::Range;

/// Slower than any layer is grown, and faster.
const RATE_LIMITS: Limits = between(
    1e-4,
    100.0,
    "a rate above 0: from 0.0001 to 100 ML/s or nm/s",
);
/// More group-III cells are on no machine; every combination of them is looked at.
const MAX_CELLS: usize = 8;
/// Rates are measured on the wafer once it has cooled down.
const CALIBRATION_TEMPERATURE_K: f64 = 300.0;
/// A film strained more than this relaxes before its thickness can be measured; common practice.
const DOUBTFUL_STRAIN: f64 = 0.02;
/// A fraction below this is the rounding of another one.
const NO_FRACTION: f64 = 1e-6;
const GROUP_THREE: [&str; 3] = ["Al", "Ga", "In"];

/// What rates are read against.
pub(super) struct Chamber<'c> {
    pub known: &'c Known<'c>,
    pub substrate: Option<&'c Spanned<Substance>>,
    pub entries: &'c [(Option<String>, Option<LayerEntry>)],
}

/// Reads `growth`.
pub(super) fn growth(checker: &mut Checker, node: &Node, chamber: &Chamber) -> Option<Growth> {
    let fields = checker.fields(node, "`growth`", &["rates", "cells", "dopants"])?;
    let cells = match (fields.get("rates"), fields.get("cells")) {
        (Some(_), Some(node)) => {
            checker.report(
                Diagnostic::error("`growth` has both `rates` and `cells`")
                    .at(checker.head(&node.span))
                    .expected("one of them; `cells` where an element has several"),
            );
            None
        }
        (Some(node), None) => simple(checker, node, chamber),
        (None, Some(node)) => full(checker, node, chamber),
        (None, None) => {
            if !fields.has("cells") {
                checker.missing(
                    &fields,
                    "`growth`",
                    "rates",
                    "{Ga: 0.70 ML/s, Al: 0.25 ML/s}",
                );
            }
            None
        }
    };
    let (donors, acceptors) = match fields.get("dopants") {
        Some(node) => dopants(checker, node)?,
        None => (None, None),
    };
    Some(Growth {
        cells: cells?,
        donors,
        acceptors,
        span: fields.head,
    })
}

/// `rates: {Ga: 0.70 ML/s}`: one cell per element, named like it.
fn simple(checker: &mut Checker, node: &Node, chamber: &Chamber) -> Option<Vec<Cell>> {
    let Value::Map(entries) = &node.value else {
        checker.wrong_kind(
            node,
            "the rate of each group-III cell, as in `{Ga: 0.70 ML/s}`",
        );
        return None;
    };
    if entries.is_empty() {
        no_cell(checker, node);
        return None;
    }
    checker.fields(node, "`rates`", &GROUP_THREE)?;
    let known = entries.iter().filter_map(|(key, value)| {
        let symbol = key.text().filter(|text| GROUP_THREE.contains(text))?;
        Some((Element::from_symbol(symbol)?, key, value))
    });
    let cells: Vec<Option<Cell>> = known
        .map(|(element, key, value)| {
            let calibrated = rate(checker, value)?;
            calibrated_cell(
                checker,
                chamber,
                RawCell {
                    name: element.symbol().to_owned(),
                    element,
                    calibrated,
                    of: None,
                    on: None,
                    span: key.span.clone(),
                },
            )
        })
        .collect();
    cells.into_iter().collect()
}

/// `cells: [{name: Ga 1, element: Ga, rate: 0.70 ML/s}]`.
fn full(checker: &mut Checker, node: &Node, chamber: &Chamber) -> Option<Vec<Cell>> {
    let items = checker.list(node, "a list of group-III cells")?;
    if items.is_empty() {
        no_cell(checker, node);
        return None;
    }
    if items.len() > MAX_CELLS {
        checker.report(
            Diagnostic::error(format!("there are {} cells", items.len()))
                .at(checker.head(&node.span))
                .expected(format!("at most {MAX_CELLS}")),
        );
        return None;
    }
    let mut names: Vec<(String, usize)> = Vec::new();
    let mut cells = Vec::new();
    for item in items {
        let raw = raw_cell(checker, item, chamber.known);
        if let Some(raw) = &raw {
            if let Some((_, first)) = names.iter().find(|(name, _)| *name == raw.name) {
                let line = line_of(checker.text, *first);
                checker.report(
                    Diagnostic::error(format!("two cells are named `{}`", raw.name))
                        .at(raw.span.clone())
                        .expected(format!(
                            "another name; the first `{}` is on line {line}",
                            raw.name
                        )),
                );
            }
            names.push((raw.name.clone(), raw.span.start));
        }
        cells.push(raw.and_then(|raw| calibrated_cell(checker, chamber, raw)));
    }
    cells.into_iter().collect()
}

fn no_cell(checker: &mut Checker, node: &Node) {
    checker.report(
        Diagnostic::error("there is no cell")
            .at(node.span.clone())
            .expected("the rate of at least one group-III cell"),
    );
}

/// A cell before its flux is known.
struct RawCell {
    name: String,
    element: Element,
    calibrated: Quantity,
    of: Option<Composition>,
    on: Option<Spanned<Substance>>,
    span: Range<usize>,
}

fn raw_cell(checker: &mut Checker, node: &Node, known: &Known) -> Option<RawCell> {
    let fields = checker.fields(node, "a cell", &["name", "element", "rate", "of", "on"])?;
    checker.missing(&fields, "this cell", "element", "Ga");
    checker.missing(&fields, "this cell", "rate", "0.70 ML/s");
    let element = fields.get("element").and_then(|node| {
        let symbol = checker.word(node, &GROUP_THREE)?;
        Element::from_symbol(symbol)
    });
    let calibrated = fields.get("rate").and_then(|node| rate(checker, node));
    let name = match fields.get("name") {
        Some(node) => checker
            .scalar(node, "a name such as `Ga 1`")
            .map(|name| (name.to_owned(), node.span.clone())),
        None => element.map(|element| (element.symbol().to_owned(), fields.head.clone())),
    };
    let of = match fields.get("of") {
        Some(node) => binary(checker, node, element?).map(Some),
        None => Some(None),
    };
    let on = match fields.get("on") {
        Some(node) => read_layers::substance(checker, node, known, false).map(Some),
        None => Some(None),
    };
    let (name, span) = name?;
    Some(RawCell {
        name,
        element: element?,
        calibrated: calibrated?,
        of: of?,
        on: on?,
        span,
    })
}

fn rate(checker: &mut Checker, node: &Node) -> Option<Quantity> {
    checker
        .quantity(
            node,
            &[Dimension::MonolayerRate, Dimension::LengthRate],
            RATE_LIMITS,
        )
        .map(|found| found.value)
}

/// The binaries of a group-III element.
fn binaries(element: Element) -> Vec<String> {
    Element::ALL
        .into_iter()
        .filter(|five| five.sublattice() == Sublattice::GroupFive)
        .map(|five| format!("{}{}", element.symbol(), five.symbol()))
        .collect()
}

fn binary(checker: &mut Checker, node: &Node, element: Element) -> Option<Composition> {
    let names = binaries(element);
    let names: Vec<&str> = names.iter().map(String::as_str).collect();
    let expected = one_of(&names);
    let text = checker.scalar(node, &expected)?;
    if names.contains(&text) {
        return Composition::parse(text).ok();
    }
    let problem = Diagnostic::error(format!("`{text}` is no binary of {}", element.symbol()))
        .at(node.span.clone())
        .expected(format!("expected {expected}"));
    checker.report(match probably_meant(text, names.iter().copied()) {
        Some(meant) => problem.hint(format!("did you mean `{meant}`?")),
        None => problem,
    });
    None
}

/// The group-V element that most layers of the file hold, or else that of the substrate.
fn commonest_group_five(chamber: &Chamber) -> Element {
    let library = chamber.known.library;
    let holds = |substance: &Substance, element: Element| match substance {
        Substance::Family(family) => family.elements().contains(&element),
        other => library
            .composition(other)
            .is_some_and(|composition| composition.fraction(element) > NO_FRACTION),
    };
    let layers = chamber
        .entries
        .iter()
        .filter_map(|(_, entry)| entry.as_ref())
        .map(|entry| &entry.material.value);
    let all: Vec<&Substance> = layers
        .chain(chamber.substrate.map(|substrate| &substrate.value))
        .collect();
    // Of equally common ones the first, arsenic.
    [Element::As, Element::P, Element::Sb]
        .into_iter()
        .rev()
        .max_by_key(|element| all.iter().filter(|s| holds(s, *element)).count())
        .unwrap_or(Element::As)
}

/// The cell with its flux on the file's substrate.
///
/// A rate in monolayers counts 2/a² atoms per monolayer and area, a being the lattice constant of the crystal that it was
/// measured on. A rate in a length is that of the binary grown coherently on this crystal.
fn calibrated_cell(checker: &mut Checker, chamber: &Chamber, raw: RawCell) -> Option<Cell> {
    let library = chamber.known.library;
    let of = raw.of.or_else(|| {
        let five = commonest_group_five(chamber).symbol();
        Composition::parse(&format!("{}{five}", raw.element.symbol())).ok()
    })?;
    let substrate_nm = chamber
        .substrate
        .and_then(|substrate| lattice_nm(library, &substrate.value));
    let on_nm = match &raw.on {
        Some(on) => {
            let found = lattice_nm(library, &on.value);
            if found.is_none() {
                checker.report(
                    Diagnostic::error("the lattice constant of this crystal is not known")
                        .at(on.span.clone())
                        .expected("a crystal such as `GaAs`"),
                );
            }
            found
        }
        None => substrate_nm,
    };
    let per_s = raw.calibrated.value();
    let measured_ml_per_s = match raw.calibrated.unit.dimension {
        Dimension::MonolayerRate => per_s,
        _ => {
            let binary = library.resolve(&of, CALIBRATION_TEMPERATURE_K).ok()?;
            if let Some(lattice_nm) = on_nm
                && let Some(found) = strain(&binary, lattice_nm)
                && found.in_plane.abs() > DOUBTFUL_STRAIN
            {
                checker.report(
                    Diagnostic::warning(format!(
                        "a rate of {} as a length means {} strained by {:+.1} % on its substrate",
                        of.formula(),
                        of.formula(),
                        1e2 * found.in_plane
                    ))
                    .at(raw.span.clone())
                    .hint(format!(
                        "give the rate in ML/s, or under `cells` add `on: {}` if it was measured on relaxed {}",
                        of.formula(),
                        of.formula()
                    )),
                );
            }
            per_s / monolayer_nm(&binary, on_nm)?
        }
    };
    // A mistaken or missing substrate is reported elsewhere.
    let (substrate_nm, on_nm) = (substrate_nm?, on_nm?);
    Some(Cell {
        name: raw.name,
        element: raw.element,
        calibrated: raw.calibrated,
        of: of.formula(),
        rate_ml_per_s: measured_ml_per_s * (substrate_nm / on_nm).powi(2),
        span: raw.span,
    })
}

fn lattice_nm(library: &Library, substance: &Substance) -> Option<f64> {
    library
        .material(substance, CALIBRATION_TEMPERATURE_K)
        .ok()?
        .lattice_constant_nm
}

type Species = Option<Spanned<Dopant>>;

/// `dopants: {donors: Si, acceptors: Be}`.
fn dopants(checker: &mut Checker, node: &Node) -> Option<(Species, Species)> {
    let fields = checker.fields(node, "`dopants`", &["donors", "acceptors"])?;
    let mut species = |key: &str, donors: bool| match fields.get(key) {
        Some(node) => dopant(checker, node, donors).map(Some),
        None => Some(None),
    };
    let (donors, acceptors) = (species("donors", true), species("acceptors", false));
    Some((donors?, acceptors?))
}

fn dopant(checker: &mut Checker, node: &Node, donors: bool) -> Option<Spanned<Dopant>> {
    let fits = |dopant: &Dopant| {
        if donors {
            dopant.donor
        } else {
            dopant.acceptor
        }
    };
    let names: Vec<&str> = DOPANTS
        .iter()
        .filter(|dopant| fits(dopant))
        .map(|dopant| dopant.symbol)
        .collect();
    let expected = one_of(&names);
    let text = checker.scalar(node, &expected)?;
    let known = DOPANTS.iter().find(|dopant| dopant.symbol == text);
    let problem = match known {
        Some(dopant) if fits(dopant) => return Some(Spanned::new(*dopant, node)),
        Some(_) if donors => Diagnostic::error(format!("`{text}` is an acceptor")),
        Some(_) => Diagnostic::error(format!("`{text}` is a donor")),
        None => Diagnostic::error(format!("`{text}` is no dopant known here")),
    };
    let problem = problem
        .at(node.span.clone())
        .expected(format!("expected {expected}"));
    let meant = probably_meant(text, names.iter().copied()).filter(|_| known.is_none());
    checker.report(match meant {
        Some(meant) => problem.hint(format!("did you mean `{meant}`?")),
        None => problem,
    });
    None
}

/// Says which variables of tuning are chosen among the cells' compositions in a file that has no cells.
pub(super) fn needed_by(checker: &mut Checker, tune: &Tune) {
    for variable in &tune.vary {
        if let Varied::FractionOfCells { .. } = variable.quantity {
            checker.report(
                Diagnostic::error("`between: cells` needs a `growth` block with the cells' rates")
                    .at(variable.span.clone())
                    .expected("`growth: {rates: {Ga: 0.70 ML/s, Al: 0.25 ML/s}}` in the file, or bounds such as `[0.18, 0.35]`"),
            );
        }
    }
}

/// What the stack needs of the chamber: errors where the sheet could not be made, warnings where it would say less.
pub(super) fn of_stack(growth: &Growth, structure: &Structure, stack: &Stack) -> Vec<Diagnostic> {
    let mut found = Vec::new();
    let mut lacking: Vec<Element> = Vec::new();
    for (index, entry) in structure.entries.iter().enumerate() {
        let Some(layer) = stack.layers.iter().position(|layer| layer.entry == index) else {
            continue;
        };
        let name = entry.in_words();
        for (t, material) in [(0.0, Some(&entry.material)), (1.0, entry.to.as_ref())] {
            let Some(material) = material else { continue };
            let Some(composition) = stack.composition_at(layer, t) else {
                found.push(
                    Diagnostic::error(format!(
                        "the material of {name} names no formula, so `growth` cannot tell its cells"
                    ))
                    .at(material.span.clone())
                    .expected("a formula, or a material `like:` one"),
                );
                continue;
            };
            for element in composition.elements() {
                let open = growth.cells.iter().any(|cell| cell.element == *element);
                if element.sublattice() == Sublattice::GroupThree
                    && composition.fraction(*element) > NO_FRACTION
                    && !open
                    && !lacking.contains(element)
                {
                    lacking.push(*element);
                    let symbol = element.symbol();
                    found.push(
                        Diagnostic::error(format!(
                            "{name} holds {symbol}, but `growth` mounts no {symbol} cell"
                        ))
                        .at(material.span.clone())
                        .expected(format!(
                            "the rate of a cell, such as `{symbol}: 0.25 ML/s`, under `growth`"
                        )),
                    );
                }
            }
        }
        if let Some(species) = &growth.donors
            && species.value.acceptor
            && entry.has_donors()
            && stack
                .composition_at(layer, 0.0)
                .is_some_and(|c| is_antimonide(&c))
        {
            let symbol = species.value.symbol;
            found.push(
                Diagnostic::warning(format!(
                    "{symbol} is to be the donor of {name}, but acts as an acceptor in GaSb and AlSb"
                ))
                .at(species.span.clone())
                .hint("the usual donor there is Te"),
            );
        }
        if stack.monolayer_nm(layer).is_none() {
            found.push(
                Diagnostic::error(format!(
                    "the monolayer of {name} is unknown, because its material lacks `lattice_constant` or `elastic`"
                ))
                .at(entry.material.span.clone())
                .expected("a material with both, for `growth`"),
            );
        }
    }
    for (species, key, symbol, doped) in [
        (
            &growth.donors,
            "donors",
            "Si",
            doped(structure, LayerEntry::has_donors, |p| p.donors_cm2),
        ),
        (
            &growth.acceptors,
            "acceptors",
            "Be",
            doped(structure, LayerEntry::has_acceptors, |p| p.acceptors_cm2),
        ),
    ] {
        if let (None, Some(name)) = (species, doped) {
            found.push(
                Diagnostic::warning(format!(
                    "{name} has {key}, but `growth` names no species for them"
                ))
                .at(growth.span.clone())
                .hint(format!("add `dopants: {{{key}: {symbol}}}`")),
            );
        }
    }
    found
}

/// Whether Si and Ge sit on the antimony sublattice; common practice for GaSb and AlSb, not for InAs and InSb.
fn is_antimonide(composition: &Composition) -> bool {
    composition.fraction(Element::Sb) > 0.5 && composition.fraction(Element::In) < 0.5
}

/// The first layer, or else the first plane, with doping of one kind, in words.
fn doped(
    structure: &Structure,
    layer: impl Fn(&LayerEntry) -> bool,
    plane: impl Fn(&PlaneEntry) -> f64,
) -> Option<String> {
    let doped = structure.entries.iter().find(|entry| layer(entry));
    let planes = || structure.planes.iter().find(|entry| plane(entry) > 0.0);
    doped
        .map(LayerEntry::in_words)
        .or_else(|| planes().map(|plane| format!("`{}`", plane.label)))
}
