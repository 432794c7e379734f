//! Writing tuned values back into the text they came from, with every other byte kept.

use super::file::{Spanned, Structure};
use crate::diagnostics::Diagnostic;
use crate::materials::{Composition, Element, Substance};
use crate::units::{self, Dimension, Quantity, UNITS};
use std::ops::Range;

/// The smallest differences that are written: fine enough that levels move by a few µeV at most.
const WIDTH_STEP_NM: f64 = 1e-4;
const FIELD_STEP_V_PER_NM: f64 = 1e-8;
/// Parts of which a written fraction is a whole number: 1e-5.
const FRACTION_PARTS: f64 = 1e5;
const MONOLAYER_DECIMALS: usize = 4;

/// New values for a structure's text; what is not named stays.
#[derive(Clone, Debug, Default)]
pub struct Edits {
    /// By index into [`Structure::entries`].
    pub widths: Vec<(usize, NewWidth)>,
    /// The new amounts of `material`, by index into [`Structure::entries`].
    pub compositions: Vec<(usize, Composition)>,
    pub field_v_per_nm: Option<f64>,
}

/// A width to write.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum NewWidth {
    /// In nm; written in the unit of length that the user chose, else in nm.
    Length(f64),
    /// As a number of monolayers, whatever the user's unit was.
    Monolayers(f64),
}

/// The text with the new values in place of the old ones: comments, order, quotation marks and units stay.
///
/// `text` must be the one that `structure` was read from. Widths are written to 1e-4 nm, fractions to 1e-5, the field to
/// 1e-4 kV/cm. When the file has no `field`, a line for it is added after its title, substrate and temperature.
///
/// # Errors
/// One message per value that cannot be written: it stands behind an alias, or a `field` line cannot be added to a file
/// that is one `{…}`.
pub fn rewrite(
    text: &str,
    structure: &Structure,
    edits: &Edits,
) -> Result<String, Vec<Diagnostic>> {
    let mut problems = Vec::new();
    let mut replacements: Vec<(Range<usize>, String)> = Vec::new();
    for (entry, width) in &edits.widths {
        let Some(layer) = structure.entries.get(*entry) else {
            continue;
        };
        let new = match *width {
            NewWidth::Monolayers(number) => format!("{} ML", decimal(number, MONOLAYER_DECIMALS)),
            NewWidth::Length(nm) => {
                in_unit_of(&layer.width.value, Dimension::Length, nm, WIDTH_STEP_NM)
            }
        };
        replace(text, &layer.width, new, &mut replacements, &mut problems);
    }
    for (entry, composition) in &edits.compositions {
        let Some(layer) = structure.entries.get(*entry) else {
            continue;
        };
        if let Substance::Alloy(_) = layer.material.value {
            let new = formula_like(scalar_text(text, &layer.material.span), composition);
            replace(text, &layer.material, new, &mut replacements, &mut problems);
        }
    }
    if let Some(new) = edits.field_v_per_nm {
        match &structure.field {
            Some(field) => {
                let new = in_unit_of(&field.value, Dimension::Field, new, FIELD_STEP_V_PER_NM);
                replace(text, field, new, &mut replacements, &mut problems);
            }
            None => match new_line(text, structure.field_line.as_ref(), new) {
                Ok(insertion) => replacements.push(insertion),
                Err(problem) => problems.push(problem),
            },
        }
    }
    if !problems.is_empty() {
        return Err(problems);
    }
    replacements.sort_by_key(|(span, _)| span.start);
    let mut result = String::with_capacity(text.len() + 64);
    let mut done = 0;
    for (span, new) in replacements {
        result.push_str(text.get(done..span.start).unwrap_or_default());
        result.push_str(&new);
        done = span.end;
    }
    result.push_str(text.get(done..).unwrap_or_default());
    Ok(result)
}

/// Where a top-level key can be added.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct FreeLine {
    /// The byte at which the new line begins.
    pub at: usize,
    pub indentation: String,
}

fn new_line(
    text: &str,
    line: Option<&FreeLine>,
    field_v_per_nm: f64,
) -> Result<(Range<usize>, String), Diagnostic> {
    let value = in_unit("kV/cm", field_v_per_nm, FIELD_STEP_V_PER_NM);
    let Some(line) = line else {
        return Err(
            Diagnostic::error("the file has no line that a field can be written to")
                .hint(format!("add `field: {value}` to it")),
        );
    };
    let end = if text.contains("\r\n") { "\r\n" } else { "\n" };
    let before = if line.at > 0 && !text[..line.at].ends_with(['\n', '\u{feff}']) {
        end
    } else {
        ""
    };
    Ok((
        line.at..line.at,
        format!("{before}{}field: {value}{end}", line.indentation),
    ))
}

/// Plans the replacement of a scalar, within its quotation marks if it has some.
fn replace<T>(
    text: &str,
    old: &Spanned<T>,
    new: String,
    replacements: &mut Vec<(Range<usize>, String)>,
    problems: &mut Vec<Diagnostic>,
) {
    if old.shared {
        problems.push(
            Diagnostic::error(format!("`{new}` cannot be written here"))
                .at(old.span.clone())
                .expected("an alias makes this value stand for other places too")
                .hint("write the value out where it is to change"),
        );
        return;
    }
    let inner = scalar_span(text, &old.span);
    replacements.push((inner, new));
}

/// The bytes of a scalar without quotation marks and without the line end of a block.
fn scalar_span(text: &str, span: &Range<usize>) -> Range<usize> {
    let whole = text.get(span.clone()).unwrap_or_default();
    for mark in ['"', '\''] {
        if whole.len() >= 2 && whole.starts_with(mark) && whole.ends_with(mark) {
            return span.start + 1..span.end - 1;
        }
    }
    span.start..span.start + whole.trim_end().len()
}

fn scalar_text<'t>(text: &'t str, span: &Range<usize>) -> &'t str {
    text.get(scalar_span(text, span)).unwrap_or_default()
}

/// A value in the unit that the user wrote, or in the dimension's usual one when that was another kind of unit.
fn in_unit_of(old: &Quantity, dimension: Dimension, value: f64, step: f64) -> String {
    let unit = if old.unit.dimension == dimension {
        old.unit.symbol
    } else {
        units::split_number(dimension.example()).map_or("", |(_, unit)| unit)
    };
    in_unit(unit, value, step)
}

fn in_unit(symbol: &str, value: f64, step: f64) -> String {
    let factor = UNITS
        .iter()
        .find(|unit| unit.symbol == symbol)
        .map_or(1.0, |unit| unit.factor);
    let decimals = (factor / step).log10().round().max(0.0) as usize;
    format!("{} {symbol}", decimal(value / factor, decimals))
}

/// A number with at most so many decimals, trailing zeros left out.
fn decimal(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    let text = match text.contains('.') {
        true => text.trim_end_matches('0').trim_end_matches('.'),
        false => &text,
    };
    if text == "-0" {
        "0".to_owned()
    } else {
        text.to_owned()
    }
}

/// A composition in the order of elements of the old formula, an element that has vanished included, so that what the
/// file says about it elsewhere stays true. The largest fraction of each group takes up what rounding leaves.
fn formula_like(old: &str, new: &Composition) -> String {
    let mut order: Vec<Element> = new.elements().to_vec();
    order.sort_by_key(|element| old.find(element.symbol()));
    let mut parts: Vec<(Element, i64)> = order
        .into_iter()
        .map(|element| {
            let fraction = new.fraction(element);
            (element, (fraction * FRACTION_PARTS).round() as i64)
        })
        .collect();
    let groups: Vec<_> = parts
        .iter()
        .map(|(element, _)| element.sublattice())
        .collect();
    for group in &groups {
        let of_group = |element: &Element| element.sublattice() == *group;
        let sum: i64 = parts
            .iter()
            .filter(|(e, _)| of_group(e))
            .map(|(_, n)| n)
            .sum();
        if let Some((_, largest)) = parts
            .iter_mut()
            .filter(|(e, _)| of_group(e))
            .max_by_key(|(_, n)| *n)
        {
            *largest += FRACTION_PARTS as i64 - sum;
        }
    }
    let alone = |element: &Element| {
        groups
            .iter()
            .filter(|group| **group == element.sublattice())
            .count()
            == 1
    };
    parts
        .iter()
        .map(|(element, number)| match alone(element) {
            true => element.symbol().to_owned(),
            false => format!("{}{}", element.symbol(), *number as f64 / FRACTION_PARTS),
        })
        .collect()
}
