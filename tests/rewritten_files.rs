//! Tuned values written back: only those bytes change, and the result reads as what was written.

use approx::assert_relative_eq;
use wellwright::materials::{Composition, Element};
use wellwright::structure::{self, Edits, NewWidth, Structure, rewrite};

#[track_caller]
fn read(text: &str) -> Structure {
    let (structure, problems) = structure::read(text);
    structure.unwrap_or_else(|| panic!("{problems:#?}"))
}

#[track_caller]
fn rewritten(text: &str, edits: &Edits) -> String {
    rewrite(text, &read(text), edits).unwrap()
}

#[test]
fn comments_order_units_and_quotes_stay() {
    let text = "\
# the wafer of May
field: 30 kV/cm   # from the mesa
layers:
  - {material: Al0.26Ga0.74As, width: 30 nm}   # lower barrier
  - width: '52 Å'
    material: \"Ga0.9Al0.1As\"
    name: well
  - {name: cap, width: 18 ML, material: Al0.26Ga0.74As, }
title: order kept
";
    let mut barrier = Composition::parse("Al0.26Ga0.74As").unwrap();
    barrier.set_fraction(Element::Al, 0.123456789).unwrap();
    let mut well = Composition::parse("Ga0.9Al0.1As").unwrap();
    well.set_fraction(Element::Al, 0.0).unwrap();
    let edits = Edits {
        widths: vec![
            (2, NewWidth::Monolayers(21.0)),
            (0, NewWidth::Length(28.123456)),
            (1, NewWidth::Length(4.98765)),
        ],
        compositions: vec![(1, well), (0, barrier)],
        field_v_per_nm: Some(-12.34567e-4),
    };
    let expected = "\
# the wafer of May
field: -12.3457 kV/cm   # from the mesa
layers:
  - {material: Al0.12346Ga0.87654As, width: 28.1235 nm}   # lower barrier
  - width: '49.877 Å'
    material: \"Ga1Al0As\"
    name: well
  - {name: cap, width: 21 ML, material: Al0.26Ga0.74As, }
title: order kept
";
    let new = rewritten(text, &edits);
    assert_eq!(new, expected);
    let again = read(&new);
    let stack = again.stack().unwrap();
    assert_relative_eq!(stack.layers[0].width_nm, 28.123456, epsilon = 5e-5);
    assert_relative_eq!(stack.layers[1].width_nm, 4.98765, epsilon = 5e-5);
    assert_relative_eq!(stack.field_v_per_nm, -12.34567e-4, epsilon = 5e-9);
    assert_relative_eq!(
        stack.composition(0).unwrap().fraction(Element::Al),
        0.123456789,
        epsilon = 5e-6
    );
    assert_eq!(stack.composition(1).unwrap().fraction(Element::Al), 0.0);
    // A second writing of the same changes nothing.
    assert_eq!(rewritten(&new, &edits), new);
}

#[test]
fn quaternaries_add_up_after_rounding() {
    let text = "layers: [{material: In0.7Ga0.3As0.6P0.4, width: 5 nm}, {material: Al0.2Ga0.3In0.5As, width: 5 nm}]\n";
    let mut first = Composition::parse("In0.7Ga0.3As0.6P0.4").unwrap();
    first.set_fraction(Element::P, 1.0 / 3.0).unwrap();
    let mut second = Composition::parse("Al0.2Ga0.3In0.5As").unwrap();
    second.set_fraction(Element::Al, 1.0 / 7.0).unwrap();
    let edits = Edits {
        compositions: vec![(0, first), (1, second)],
        ..Edits::default()
    };
    assert_eq!(
        rewritten(text, &edits),
        "layers: [{material: In0.7Ga0.3As0.66667P0.33333, width: 5 nm}, {material: Al0.14286Ga0.3In0.55714As, width: 5 nm}]\n"
    );
}

#[test]
fn a_field_is_added_where_there_was_none() {
    let edits = Edits {
        field_v_per_nm: Some(4.5e-3),
        ..Edits::default()
    };
    let layers = "layers: [{material: GaAs, width: 5 nm}]\n";
    for (before, after) in [
        (
            format!("title: x  # y\ntemperature: 77 K # cold\n{layers}"),
            format!("title: x  # y\ntemperature: 77 K # cold\nfield: 45 kV/cm\n{layers}"),
        ),
        (
            format!("# only layers\n{layers}"),
            format!("# only layers\nfield: 45 kV/cm\n{layers}"),
        ),
        (
            format!("title: x\r\n{}", layers.replace('\n', "\r\n")),
            format!(
                "title: x\r\nfield: 45 kV/cm\r\n{}",
                layers.replace('\n', "\r\n")
            ),
        ),
        (
            format!("{layers}substrate: GaAs"),
            format!("{layers}substrate: GaAs\nfield: 45 kV/cm\n"),
        ),
        (
            format!("title: |\n  two\n  lines\n{layers}"),
            format!("title: |\n  two\n  lines\nfield: 45 kV/cm\n{layers}"),
        ),
        (
            format!("  title: x\n  {layers}"),
            format!("  title: x\n  field: 45 kV/cm\n  {layers}"),
        ),
        (
            format!("\u{feff}{layers}"),
            format!("\u{feff}field: 45 kV/cm\n{layers}"),
        ),
        (
            format!("---\n{layers}"),
            format!("---\nfield: 45 kV/cm\n{layers}"),
        ),
    ] {
        let new = rewritten(&before, &edits);
        assert_eq!(new, after);
        assert_relative_eq!(read(&new).stack().unwrap().field_v_per_nm, 4.5e-3);
    }
}

#[test]
fn what_stands_for_several_places_is_not_written() {
    let text = "\
layers:
  - &b {name: lower, material: Al0.26Ga0.74As, width: &w 30 nm}
  - {name: well, material: GaAs, width: 5 nm}
  - {<<: *b, name: upper}
  - {material: GaAs, width: *w}
";
    let structure = read(text);
    for entry in [0, 2, 3] {
        let edits = Edits {
            widths: vec![(entry, NewWidth::Length(20.0)), (1, NewWidth::Length(6.0))],
            ..Edits::default()
        };
        let problems = rewrite(text, &structure, &edits).unwrap_err();
        assert_eq!(problems.len(), 1);
        assert!(
            problems[0]
                .message
                .contains("`20 nm` cannot be written here"),
            "{problems:?}"
        );
        assert!(problems[0].span.is_some());
    }
    let edits = Edits {
        widths: vec![(1, NewWidth::Length(6.0))],
        ..Edits::default()
    };
    assert_eq!(
        rewrite(text, &structure, &edits).unwrap(),
        text.replace("width: 5 nm", "width: 6 nm")
    );
    let flow = "{layers: [{material: GaAs, width: 5 nm}]}";
    let edits = Edits {
        field_v_per_nm: Some(1e-3),
        ..Edits::default()
    };
    let problems = rewrite(flow, &read(flow), &edits).unwrap_err();
    assert!(
        problems[0]
            .hint
            .as_deref()
            .unwrap()
            .contains("field: 10 kV/cm")
    );
}
