//! The growth sheet as text for a terminal.

use super::sheet::{GROWER_ENTRIES, RowKind, Sheet, SheetRow, clock};
use super::table::{significant, table};

pub fn sheet_text(sheet: &Sheet) -> String {
    let mut text = String::new();
    if let Some(title) = &sheet.title {
        text.push_str(&format!("{title}\n"));
    }
    for (name, value) in sheet.head() {
        text.push_str(&format!("{name:<14}{value}\n"));
    }
    text.push_str("\nLayers in growth order, the lowest first\n");
    text.push_str(&table(
        &[
            "no",
            "layer",
            "material",
            "nm",
            "Å",
            "ML",
            "doping cm^-3",
            "open cells",
            "s",
            "sum nm",
            "sum h:m:s",
        ],
        &[1, 2, 6, 7],
        sheet.rows.iter().map(cells).collect(),
    ));
    text.push_str("\nShutters\n");
    text.push_str(&table(
        &[
            "cell",
            "calibrated",
            "ML/s",
            "open s",
            "open h:m:s",
            "openings",
        ],
        &[0, 1],
        sheet
            .shutters
            .iter()
            .map(|s| {
                vec![
                    s.cell.clone(),
                    s.calibrated.clone(),
                    s.rate_ML_s
                        .map_or(String::new(), |rate| format!("{rate:.4}")),
                    format!("{:.2}", s.open_s),
                    clock(s.open_s),
                    s.openings.to_string(),
                ]
            })
            .collect(),
    ));
    text.push_str("\nMaterial of the layers as designed\n");
    text.push_str(&table(
        &["element", "ML", "atoms/cm²"],
        &[0],
        sheet
            .materials
            .iter()
            .map(|m| {
                vec![
                    m.element.clone(),
                    m.monolayers.map_or(String::new(), |ml| format!("{ml:.1}")),
                    significant(m.atoms_per_cm2, 3),
                ]
            })
            .collect(),
    ));
    if !sheet.flux_targets.is_empty() {
        text.push_str("\nGroup-V fractions, to be calibrated by flux ratio: group-III rates do not fix them\n");
        for target in &sheet.flux_targets {
            text.push_str(&format!("  {}  in {}\n", target.ratio, target.layers));
        }
    }
    for table in sheet.more_tables() {
        text.push('\n');
        text.push_str(&table.text());
    }
    if !sheet.compositions.is_empty() {
        text.push_str("\nCompositions that the cells do not give; a digital alloy is written as it takes the layer's place in the file\n");
        for composition in &sheet.compositions {
            text.push_str(&format!("- {}.\n", composition.sentence));
            if let Some(digital) = &composition.digital_alloy {
                text.push_str(&format!("  {}.\n", digital.sentence));
                for line in digital.structure.lines() {
                    text.push_str(&format!("      {line}\n"));
                }
            }
        }
    }
    if !sheet.warnings.is_empty() {
        text.push_str("\nWarnings\n");
        for warning in &sheet.warnings {
            text.push_str(&format!("- {warning}.\n"));
        }
    }
    if !sheet.grades.is_empty() {
        text.push_str("\nGraded layers as digital alloys, each written as it takes the layer's place in the file\n");
        for grade in &sheet.grades {
            text.push_str(&format!("- {}.\n", grade.sentence));
            for line in grade.structure.lines() {
                text.push_str(&format!("      {line}\n"));
            }
        }
    }
    text.push_str("\nFor the grower\n");
    for entry in GROWER_ENTRIES {
        text.push_str(&format!("{entry:<16}{}\n", "_".repeat(50)));
    }
    text.push_str("\nCautions\n");
    for caution in &sheet.cautions {
        text.push_str(&format!("- {}. {}\n", caution.title, caution.text));
        for limit in &caution.limits {
            text.push_str(&format!("    {limit}\n"));
        }
    }
    text
}

fn cells(row: &SheetRow) -> Vec<String> {
    let number = |value: Option<f64>, decimals: usize| {
        value.map_or(String::new(), |value| format!("{value:.decimals$}"))
    };
    let indent = "  ".repeat(row.depth);
    let name = match row.kind {
        RowKind::Layer | RowKind::Plane => format!("{indent}{}", row.name),
        RowKind::LoopBegins => format!("{indent}{} times:", row.repeat.unwrap_or(1)),
        RowKind::LoopEnds => format!("{indent}end of {} times", row.repeat.unwrap_or(1)),
    };
    let material = match (&row.kind, &row.to) {
        (RowKind::LoopEnds, _) => "one pass".to_owned(),
        (_, Some(to)) => format!("{} to {to}", row.material),
        _ => row.material.clone(),
    };
    vec![
        row.number.map_or(String::new(), |n| n.to_string()),
        name,
        material,
        number(row.thickness_nm, 3),
        number(row.thickness_A, 2),
        number(row.monolayers, 2),
        row.doping.join(", "),
        row.open_cells.clone(),
        number(row.time_s, 2),
        number(row.cumulative_nm, 3),
        row.cumulative_s.map_or(String::new(), clock),
    ]
}
