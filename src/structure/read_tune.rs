//! The `tune` part of a structure file.

use super::document::{Node, Value, line_of};
use super::fields::{Checker, Fields, Limits, between, one_of};
use super::file::{BandName, LayerEntry, Tune, Variable, Varied};
use super::read_aims;
use super::read_keep;
use super::read_layers::{FIELD_LIMITS, WIDTH_LIMITS};
use crate::diagnostics::{Diagnostic, probably_meant};
use crate::materials::{Element, MaterialError, Sublattice, Substance};
use crate::units::{self, Dimension, Quantity};

/// The highest level that can be asked for; far more than any well holds.
pub(super) const MAX_LEVELS: u32 = 200;
/// The same for coupled bands, whose levels lie amid all others.
pub(super) const MAX_COUPLED_LEVELS: u32 = 50;

/// More variables or aims are no design task.
const MAX_ITEMS: usize = 100;

const FRACTION_LIMITS: Limits = between(0.0, 1.0, "from 0 to 1");

/// Reads `tune`; `entries` holds `None` for a layer that is itself mistaken, `solved` the bands that aims may name.
pub(super) fn tune(
    checker: &mut Checker,
    node: &Node,
    entries: &[(Option<String>, Option<LayerEntry>)],
    solved: &[BandName],
) -> Option<Tune> {
    let fields = checker.fields(node, "`tune`", &["vary", "aims", "keep", "snap"])?;
    checker.missing(
        &fields,
        "`tune`",
        "vary",
        "[{layer: well, width: [3 nm, 9 nm]}]",
    );
    checker.missing(
        &fields,
        "`tune`",
        "aims",
        "[{from: conduction 1, to: conduction 2, wavelength: 8.6 µm}]",
    );
    let vary = fields.get("vary").and_then(|node| {
        let items = filled_list(
            checker,
            node,
            "nothing to vary",
            "layer widths, fractions or the field",
        )?;
        Some(variables(checker, items, entries))
    });
    let aims = fields.get("aims").and_then(|node| {
        let items = filled_list(
            checker,
            node,
            "no aim",
            "energies, wavelengths or dipoles of transitions",
        )?;
        Some(read_aims::aims(checker, items, solved))
    });
    let keep = match fields.get("keep") {
        Some(node) => {
            let items = filled_list(
                checker,
                node,
                "nothing to keep to",
                "bounds such as `strain: balanced`",
            )?;
            read_keep::keep(checker, items, entries)
        }
        None => Vec::new(),
    };
    let snap_to_monolayers = match fields.get("snap") {
        Some(node) => checker.word(node, &["monolayer"]).is_some(),
        None => false,
    };
    Some(Tune {
        vary: vary?,
        aims: aims?,
        keep,
        snap_to_monolayers,
    })
}

fn filled_list<'n>(
    checker: &mut Checker,
    node: &'n Node,
    empty: &str,
    expected: &str,
) -> Option<&'n [Node]> {
    let expected = format!("a list of {expected}");
    let items = checker.list(node, &expected)?;
    if items.is_empty() {
        checker.report(
            Diagnostic::error(format!("there is {empty}"))
                .at(node.span.clone())
                .expected(format!("expected {expected}")),
        );
        return None;
    }
    if items.len() > MAX_ITEMS {
        checker.report(
            Diagnostic::error(format!("there are {} entries", items.len()))
                .at(checker.head(&node.span))
                .expected(format!("at most {MAX_ITEMS}")),
        );
        return None;
    }
    Some(items)
}

fn variables(
    checker: &mut Checker,
    items: &[Node],
    entries: &[(Option<String>, Option<LayerEntry>)],
) -> Vec<Variable> {
    let mut found: Vec<Variable> = Vec::new();
    for item in items {
        let keys = &["layer", "width", "fraction", "between", "field"];
        let Some(quantity) = checker
            .fields(item, "an entry of `vary`", keys)
            .and_then(|fields| varied(checker, &fields, entries))
        else {
            continue;
        };
        let span = checker.head(&item.span);
        if let Some(first) = found
            .iter()
            .find(|other| same_variable(&other.quantity, &quantity))
        {
            let line = line_of(checker.text, first.span.start);
            checker.report(
                Diagnostic::error(format!("line {line} varies the same"))
                    .at(span)
                    .expected("each width, fraction or field once"),
            );
            continue;
        }
        found.push(Variable { quantity, span });
    }
    found
}

fn same_variable(one: &Varied, other: &Varied) -> bool {
    match (one, other) {
        (Varied::Width { entry: a, .. }, Varied::Width { entry: b, .. }) => a == b,
        (
            Varied::Fraction {
                entry: a,
                element: x,
                ..
            }
            | Varied::FractionOfCells {
                entry: a,
                element: x,
            },
            Varied::Fraction {
                entry: b,
                element: y,
                ..
            }
            | Varied::FractionOfCells {
                entry: b,
                element: y,
            },
        ) => a == b && x == y,
        (Varied::Field { .. }, Varied::Field { .. }) => true,
        _ => false,
    }
}

/// What an entry of `vary` names: the width or a fraction of a layer, or the field.
pub(super) fn varied(
    checker: &mut Checker,
    fields: &Fields,
    entries: &[(Option<String>, Option<LayerEntry>)],
) -> Option<Varied> {
    let of_field = fields.get("field");
    if let Some(node) = of_field {
        if ["layer", "width", "fraction", "between"]
            .iter()
            .any(|key| fields.has(key))
        {
            checker.report(
                Diagnostic::error("this entry varies the field and something of a layer")
                    .at(fields.head.clone())
                    .expected("one of them per entry"),
            );
            return None;
        }
        let [low, high] = quantities(
            checker,
            node,
            "[0 kV/cm, 60 kV/cm]",
            &[Dimension::Field],
            FIELD_LIMITS,
        )?;
        return Some(Varied::Field {
            bounds_v_per_nm: [low.value(), high.value()],
        });
    }
    if fields.has("field") {
        return None;
    }
    let example = "one of `{layer: well, width: [3 nm, 9 nm]}`, `{layer: cap, fraction: Al, between: [0.18, 0.35]}`, \
                   `{field: [0 kV/cm, 60 kV/cm]}`";
    if !fields.has("layer") {
        checker.report(
            Diagnostic::error("this entry does not say what to vary")
                .at(fields.head.clone())
                .expected(format!("expected {example}")),
        );
        return None;
    }
    let entry = fields
        .get("layer")
        .and_then(|node| layer(checker, node, entries));
    match (
        fields.has("width"),
        fields.has("fraction") || fields.has("between"),
    ) {
        (true, false) => {
            let bounds = quantities(
                checker,
                fields.get("width")?,
                "[3 nm, 9 nm]",
                &[Dimension::Length, Dimension::Monolayers],
                WIDTH_LIMITS,
            );
            Some(Varied::Width {
                entry: entry?,
                bounds: bounds?,
            })
        }
        (false, true) => fraction(checker, fields, entry, entries),
        _ => {
            checker.report(
                Diagnostic::error(
                    "an entry of `vary` holds either a width or a fraction of its layer",
                )
                .at(fields.head.clone())
                .expected(format!("expected {example}")),
            );
            None
        }
    }
}

/// The layer of that name.
pub(super) fn layer(
    checker: &mut Checker,
    node: &Node,
    entries: &[(Option<String>, Option<LayerEntry>)],
) -> Option<usize> {
    let name = checker.scalar(node, "the name of a layer")?;
    let found = entries
        .iter()
        .position(|(known, _)| known.as_deref() == Some(name));
    if found.is_none() {
        let names: Vec<&str> = entries
            .iter()
            .filter_map(|(name, _)| name.as_deref())
            .collect();
        let problem =
            Diagnostic::error(format!("no layer is named `{name}`")).at(node.span.clone());
        checker.report(match probably_meant(name, names.iter().copied()) {
            Some(meant) => problem.hint(format!("did you mean `{meant}`?")),
            None if names.is_empty() => problem.hint(format!(
                "give the layer that is meant a name: `name: {name}`"
            )),
            None => problem.expected("the name that a layer has under `name:`"),
        });
    }
    found
}

fn fraction(
    checker: &mut Checker,
    fields: &Fields,
    entry: Option<usize>,
    entries: &[(Option<String>, Option<LayerEntry>)],
) -> Option<Varied> {
    checker.missing(fields, "this entry of `vary`", "fraction", "Al");
    checker.missing(fields, "this entry of `vary`", "between", "[0.18, 0.35]");
    let of_cells = fields
        .get("between")
        .is_some_and(|node| node.text() == Some("cells"));
    let bounds = fields
        .get("between")
        .filter(|_| !of_cells)
        .and_then(|node| {
            checker
                .pair(
                    node,
                    "[0.18, 0.35]",
                    |checker, node| checker.number(node, FRACTION_LIMITS),
                    |value| *value,
                )
                .map(|bounds| (bounds, node.span.clone()))
        });
    let element = fields
        .get("fraction")
        .and_then(|node| Some((element(checker, node, &Element::ALL)?, node)));
    let (element, node) = element?;
    let entry = entry?;
    let layer = entries.get(entry).and_then(|(_, layer)| layer.as_ref())?;
    let room = match room_of(layer, element) {
        Ok(room) => room,
        Err((message, expected)) => {
            checker.report(
                Diagnostic::error(message)
                    .at(node.span.clone())
                    .expected(expected),
            );
            return None;
        }
    };
    if of_cells {
        if !is_pair_of_group_three(layer, element) {
            checker.report(
                Diagnostic::error(format!(
                    "layer `{}` is no alloy of two group-III elements, whose cells could be chosen",
                    layer.label
                ))
                .at(node.span.clone())
                .expected("the fraction of Al, Ga or In in a layer that holds two of them"),
            );
            return None;
        }
        return Some(Varied::FractionOfCells { entry, element });
    }
    let (bounds, span) = bounds?;
    // Formulas are written to 1e-5.
    if bounds[1] > room.highest + 1e-5 {
        checker.report(
            Diagnostic::error(format!(
                "the fraction of {} in layer `{}` cannot rise above {}",
                element.symbol(),
                layer.label,
                room.highest
            ))
            .at(span)
            .expected(format!(
                "{} gives way to it, and the rest stays",
                room.host.symbol()
            )),
        );
        return None;
    }
    Some(Varied::Fraction {
        entry,
        element,
        bounds,
    })
}

/// Whether the element is one of exactly two on the group-III sublattice of the layer.
fn is_pair_of_group_three(layer: &LayerEntry, element: Element) -> bool {
    let Substance::Alloy(composition) = &layer.material.value else {
        return false;
    };
    let three = |element: &Element| element.sublattice() == Sublattice::GroupThree;
    let count = composition.elements().iter().filter(|e| three(e)).count();
    three(&element) && count == 2 && layer.to.is_none()
}

/// An element by its symbol; `expected` are those that a message names.
pub(super) fn element(checker: &mut Checker, node: &Node, expected: &[Element]) -> Option<Element> {
    let symbol = checker.scalar(node, "the symbol of an element, such as `Al`")?;
    let element = Element::from_symbol(symbol);
    if element.is_none() {
        let symbols: Vec<&str> = expected.iter().map(|element| element.symbol()).collect();
        let problem = Diagnostic::error(format!("`{symbol}` is no element of the library"))
            .at(node.span.clone())
            .expected(format!("expected {}", one_of(&symbols)));
        checker.report(match probably_meant(symbol, symbols.iter().copied()) {
            Some(meant) if meant.eq_ignore_ascii_case(symbol) => {
                problem.hint(format!("did you mean `{meant}`?"))
            }
            _ => problem,
        });
    }
    element
}

/// How far the fraction of an element can go, and at whose cost.
struct Room {
    host: Element,
    highest: f64,
}

/// The room of an element in the layer's composition, or why there is none and what was expected.
fn room_of(layer: &LayerEntry, element: Element) -> Result<Room, (String, &'static str)> {
    let composition = match &layer.material.value {
        Substance::Alloy(composition) => composition,
        Substance::Family(family) => {
            return Err((
                format!(
                    "the fractions of `{}` in layer `{}` follow from the substrate",
                    family.formula(),
                    layer.label
                ),
                "a layer whose formula gives its fractions",
            ));
        }
        Substance::Named(name) => {
            return Err((
                format!(
                    "`{name}` in layer `{}` is a material of this file, whose fractions are fixed",
                    layer.label
                ),
                "a layer whose material is a formula such as `Al0.26Ga0.74As`",
            ));
        }
    };
    let host = composition.host(element).map_err(|error| {
        let expected = match error {
            MaterialError::NoSuchElement { .. } => "an element of the layer's formula",
            _ => "an element that shares its group with another one",
        };
        (format!("layer `{}`: {error}", layer.label), expected)
    })?;
    Ok(Room {
        host,
        highest: composition.fraction(element) + composition.fraction(host),
    })
}

/// The two ends of a range of quantities, the lower first.
pub(super) fn quantities(
    checker: &mut Checker,
    node: &Node,
    example: &str,
    dimensions: &[Dimension],
    limits: Limits,
) -> Option<[Quantity; 2]> {
    // Lengths and monolayers cannot be compared before the material is known, so both bounds take the first one's kind.
    let kind = match &node.value {
        Value::List(items) => items
            .first()
            .and_then(|item| units::parse(item.text()?, dimensions).ok())
            .map(|quantity| quantity.unit.dimension),
        _ => None,
    };
    let dimensions: &[Dimension] = match &kind {
        Some(kind) => std::slice::from_ref(kind),
        None => dimensions,
    };
    checker.pair(
        node,
        example,
        |checker, node| {
            checker
                .quantity(node, dimensions, limits)
                .map(|found| found.value)
        },
        Quantity::value,
    )
}
