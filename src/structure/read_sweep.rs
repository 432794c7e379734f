//! The `sweep` part of a structure file.

use super::document::Node;
use super::fields::{Checker, Fields, Limits, between};
use super::file::{BandName, LayerEntry, Level, Varied};
use super::read::TEMPERATURE_LIMITS;
use super::read_aims::{is_lower_first, level};
use super::read_layers::DOPING_LIMITS;
use super::read_tune;
use super::sweeps::{Doping, Steps, Sweep, Swept};
use crate::diagnostics::Diagnostic;
use crate::units::Dimension;

/// Points between the ends of a range are asked for as often as not; this many draw a smooth line.
const DEFAULT_POINTS: usize = 61;
/// More points than this are no sweep but a mistake.
pub const MOST_POINTS: u32 = 100_000;
const MOST_SHOWN: usize = 100;

const POINTS_LIMITS: Limits = between(2.0, MOST_POINTS as f64, "from 2 to 100000");

/// Reads `sweep`; `entries` and `solved` are as for `tune`.
pub(super) fn sweep(
    checker: &mut Checker,
    node: &Node,
    entries: &[(Option<String>, Option<LayerEntry>)],
    solved: &[BandName],
) -> Option<Sweep> {
    let fields = checker.fields(node, "`sweep`", &["vary", "points", "steps", "show"])?;
    checker.missing(
        &fields,
        "`sweep`",
        "vary",
        "{layer: well, width: [3 nm, 9 nm]}",
    );
    let vary = fields
        .get("vary")
        .and_then(|node| swept(checker, node, entries));
    let points = match fields.get("points") {
        Some(node) => points(checker, node),
        None => Some(DEFAULT_POINTS),
    };
    let steps = match fields.get("steps") {
        Some(node) => match checker.word(node, &["even", "logarithmic"]) {
            Some("logarithmic") => Some(Steps::Logarithmic),
            Some(_) => Some(Steps::Even),
            None => None,
        },
        None => Some(Steps::Even),
    };
    if let (Some(vary), Some(Steps::Logarithmic)) = (&vary, steps)
        && vary.lowest() <= 0.0
    {
        let place = fields.get("steps").map(|node| node.span.clone());
        checker.report(
            Diagnostic::error("a range that begins at or below zero has no logarithmic steps")
                .at(place.unwrap_or(fields.head.clone()))
                .expected("`even`, or a range above zero"),
        );
        return None;
    }
    let show = match fields.get("show") {
        Some(node) => shown(checker, node, solved),
        None => Some(Vec::new()),
    };
    Some(Sweep {
        vary: vary?,
        span: checker.head(&fields.get("vary")?.span),
        points: points?,
        steps: steps?,
        show: show?,
    })
}

fn points(checker: &mut Checker, node: &Node) -> Option<usize> {
    let number = checker.number(node, POINTS_LIMITS)?;
    if number.fract() != 0.0 {
        checker.report(
            Diagnostic::error(format!("`{number}` is no whole number"))
                .at(node.span.clone())
                .expected("a number of points"),
        );
        return None;
    }
    Some(number as usize)
}

impl Swept {
    /// The lower end of the range: its sign is that of the inner value.
    fn lowest(&self) -> f64 {
        match self {
            Swept::Knob(Varied::Width { bounds, .. }) => bounds[0].value(),
            Swept::Knob(Varied::Fraction { bounds, .. }) => bounds[0],
            Swept::Knob(Varied::Field { bounds_v_per_nm }) => bounds_v_per_nm[0],
            Swept::Knob(Varied::FractionOfCells { .. }) => 0.0,
            Swept::Temperature { bounds_k } => bounds_k[0],
            Swept::Doping { bounds_cm3, .. } => bounds_cm3[0],
        }
    }
}

const EXAMPLES: &str = "one of `{layer: well, width: [3 nm, 9 nm]}`, `{layer: cap, fraction: Al, between: [0.18, 0.35]}`, \
                        `{layer: well, donors: [1e16 cm^-3, 1e18 cm^-3]}`, `{field: [0 kV/cm, 60 kV/cm]}`, \
                        `{temperature: [4 K, 300 K]}`";

fn swept(
    checker: &mut Checker,
    node: &Node,
    entries: &[(Option<String>, Option<LayerEntry>)],
) -> Option<Swept> {
    let fields = checker.fields(
        node,
        "`vary`",
        &[
            "layer",
            "width",
            "fraction",
            "between",
            "donors",
            "acceptors",
            "field",
            "temperature",
        ],
    )?;
    let kinds: Vec<&str> = ["width", "donors", "acceptors", "field", "temperature"]
        .into_iter()
        .filter(|key| fields.has(key))
        .chain((fields.has("fraction") || fields.has("between")).then_some("fraction"))
        .collect();
    let [kind] = kinds[..] else {
        let message = match kinds[..] {
            [] => "this does not say what to sweep".to_owned(),
            [first, second, ..] => format!("`{first}` and `{second}` cannot be swept at once"),
            [_] => String::new(),
        };
        checker.report(
            Diagnostic::error(message)
                .at(fields.head.clone())
                .expected(format!("expected {EXAMPLES}")),
        );
        return None;
    };
    match kind {
        "temperature" if !fields.has("layer") => {
            let [low, high] = read_tune::quantities(
                checker,
                fields.get("temperature")?,
                "[4 K, 300 K]",
                &[Dimension::Temperature],
                TEMPERATURE_LIMITS,
            )?;
            Some(Swept::Temperature {
                bounds_k: [low.value(), high.value()],
            })
        }
        "temperature" => {
            checker.report(
                Diagnostic::error("all layers have the same temperature")
                    .at(fields.head.clone())
                    .expected("`{temperature: [4 K, 300 K]}` without a layer"),
            );
            None
        }
        "donors" => doping(checker, &fields, entries, Doping::Donors),
        "acceptors" => doping(checker, &fields, entries, Doping::Acceptors),
        _ => match read_tune::varied(checker, &fields, entries)? {
            Varied::FractionOfCells { .. } => {
                checker.report(
                    Diagnostic::error("the cells give single fractions, not a range to sweep")
                        .at(fields.head.clone())
                        .expected("`between` with two fractions, as in `[0.18, 0.35]`"),
                );
                None
            }
            varied => Some(Swept::Knob(varied)),
        },
    }
}

fn doping(
    checker: &mut Checker,
    fields: &Fields,
    entries: &[(Option<String>, Option<LayerEntry>)],
    dopant: Doping,
) -> Option<Swept> {
    checker.missing(fields, "`vary`", "layer", "well");
    let entry = fields
        .get("layer")
        .and_then(|node| read_tune::layer(checker, node, entries));
    let [low, high] = read_tune::quantities(
        checker,
        fields.get(dopant.word())?,
        "[1e16 cm^-3, 1e18 cm^-3]",
        &[Dimension::VolumeDensity],
        DOPING_LIMITS,
    )?;
    Some(Swept::Doping {
        entry: entry?,
        dopant,
        bounds_cm3: [low.value(), high.value()],
    })
}

/// The transitions of `show`, each once.
fn shown(checker: &mut Checker, node: &Node, solved: &[BandName]) -> Option<Vec<(Level, Level)>> {
    let items = checker.list(
        node,
        "a list of transitions, as in `[{from: conduction 1, to: conduction 2}]`",
    )?;
    if items.is_empty() || items.len() > MOST_SHOWN {
        checker.report(
            Diagnostic::error(format!("{} transitions stand here", items.len()))
                .at(checker.head(&node.span))
                .expected(format!("expected 1 to {MOST_SHOWN}")),
        );
        return None;
    }
    let mut found = Vec::new();
    let mut complete = true;
    for item in items {
        match transition(checker, item, solved) {
            Some(pair) if found.contains(&pair) => {
                checker.report(
                    Diagnostic::error(format!("{} to {} is there already", pair.0, pair.1))
                        .at(checker.head(&item.span))
                        .expected("each transition once"),
                );
                complete = false;
            }
            Some(pair) => found.push(pair),
            None => complete = false,
        }
    }
    complete.then_some(found)
}

fn transition(checker: &mut Checker, item: &Node, solved: &[BandName]) -> Option<(Level, Level)> {
    let what = "this transition";
    let fields = checker.fields(item, "a transition", &["from", "to"])?;
    checker.missing(&fields, what, "from", "conduction 1");
    checker.missing(&fields, what, "to", "conduction 2");
    let from = fields
        .get("from")
        .and_then(|node| level(checker, node, solved));
    let to = fields
        .get("to")
        .and_then(|node| level(checker, node, solved));
    let (from, to) = (from?, to?);
    if from == to {
        checker.report(
            Diagnostic::error("this transition goes from a level to itself")
                .at(fields.get("to")?.span.clone())
                .expected("another level than `from`"),
        );
        return None;
    }
    Some(if is_lower_first(from, to) {
        (from, to)
    } else {
        (to, from)
    })
}
