//! The `keep` of tuning: bounds on strain.

use super::document::Node;
use super::fields::Checker;
use super::file::{Keep, LayerEntry, StrainBound};
use super::read_tune::layer;
use crate::diagnostics::Diagnostic;
use crate::units;

/// The net strain that counts as balanced unless the file says `within`.
const BALANCED_WITHIN: f64 = 2e-4;

/// The bounds of `keep`, those without mistakes.
pub(super) fn keep(
    checker: &mut Checker,
    items: &[Node],
    entries: &[(Option<String>, Option<LayerEntry>)],
) -> Vec<Keep> {
    items
        .iter()
        .filter_map(|item| {
            Some(Keep {
                bound: bound(checker, item, entries)?,
                span: checker.head(&item.span),
            })
        })
        .collect()
}

fn bound(
    checker: &mut Checker,
    item: &Node,
    entries: &[(Option<String>, Option<LayerEntry>)],
) -> Option<StrainBound> {
    let what = "an entry of `keep`";
    let fields = checker.fields(
        item,
        what,
        &["strain", "from", "to", "within", "thickness", "layer", "of"],
    )?;
    let example = "one of `{strain: balanced, from: first well, to: last barrier, within: 0.02 %}`, \
                   `{thickness: below critical, layer: well}`, `{thickness: below critical, of: stack}`";
    let wrong = |message: &str| {
        Diagnostic::error(message)
            .at(fields.head.clone())
            .expected(format!("expected {example}"))
    };
    let has = |keys: &[&str]| keys.iter().any(|key| fields.has(key));
    match (fields.has("strain"), fields.has("thickness")) {
        (true, false) if !has(&["layer", "of"]) => {
            let word = fields
                .get("strain")
                .and_then(|node| checker.word(node, &["balanced"]));
            let within = match fields.get("within") {
                Some(node) => part(checker, node),
                None => Some(BALANCED_WITHIN),
            };
            if fields.has("from") != fields.has("to") {
                checker.report(wrong("`from` and `to` go together"));
                return None;
            }
            let range = if fields.has("from") {
                let end = |checker: &mut Checker, key| {
                    let node = fields.get(key)?;
                    layer(checker, node, entries)
                };
                let (from, to) = (end(checker, "from"), end(checker, "to"));
                let (from, to) = (from?, to?);
                if from > to {
                    checker.report(wrong("`from` lies above `to`"));
                    return None;
                }
                Some((from, to))
            } else {
                None
            };
            word?;
            Some(StrainBound::Balanced {
                range,
                within: within?,
            })
        }
        (false, true) if !has(&["from", "to", "within"]) => {
            let word = fields
                .get("thickness")
                .and_then(|node| checker.word(node, &["below critical"]));
            let whole = match fields.get("of") {
                Some(node) => {
                    checker.word(node, &["stack"])?;
                    true
                }
                None => false,
            };
            if whole && fields.has("layer") {
                checker.report(wrong("`layer` is one layer and `of: stack` is all of them"));
                return None;
            }
            let entry = match fields.get("layer") {
                Some(node) => Some(layer(checker, node, entries)?),
                None => None,
            };
            word?;
            Some(if whole {
                StrainBound::StackBelowCritical
            } else {
                StrainBound::BelowCritical { entry }
            })
        }
        _ => {
            checker.report(wrong(
                "an entry of `keep` is about the strain of layers or about the thickness of one",
            ));
            None
        }
    }
}

/// A part such as `0.02 %`.
fn part(checker: &mut Checker, node: &Node) -> Option<f64> {
    let expected = "a part such as `0.02 %`";
    let text = checker.scalar(node, expected)?;
    match units::split_number(text) {
        Some((number, "%")) if number > 0.0 && number <= 10.0 => Some(number * 1e-2),
        _ => {
            checker.report(
                Diagnostic::error(format!("`{text}` is no net strain"))
                    .at(node.span.clone())
                    .expected(format!("{expected}, more than 0 and at most 10 %")),
            );
            None
        }
    }
}
