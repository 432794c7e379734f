//! The growth sheet as CSV tables, one after the other with an empty line between.

use super::csv_table;
use super::sheet::Sheet;
use serde::Serialize;

#[derive(Serialize)]
struct Line<'a> {
    kind: &'a str,
    text: &'a str,
}

pub fn sheet_csv(sheet: &Sheet) -> Result<String, csv::Error> {
    let head = sheet.head();
    let title = sheet.title.as_deref().map(|text| Line {
        kind: "Title",
        text,
    });
    let head: Vec<Line> = title
        .into_iter()
        .chain(head.iter().map(|(kind, text)| Line { kind, text }))
        .collect();
    let sentences: Vec<Line> = sheet
        .compositions
        .iter()
        .flat_map(|composition| {
            let digital = composition.digital_alloy.as_ref();
            [Some(&composition.sentence), digital.map(|d| &d.sentence)]
        })
        .flatten()
        .map(|text| Line {
            kind: "composition",
            text,
        })
        .chain(sheet.grades.iter().map(|grade| Line {
            kind: "grade",
            text: &grade.sentence,
        }))
        .chain(sheet.warnings.iter().map(|text| Line {
            kind: "warning",
            text,
        }))
        .collect();
    let cautions: Vec<Line> = sheet
        .cautions
        .iter()
        .flat_map(|caution| {
            let limits = caution.limits.iter().map(String::as_str);
            std::iter::once(caution.text.as_str())
                .chain(limits)
                .map(|text| Line {
                    kind: &caution.title,
                    text,
                })
        })
        .collect();
    let mut tables = vec![
        csv_table(&head)?,
        csv_table(&sheet.rows)?,
        csv_table(&sheet.shutters)?,
        csv_table(&sheet.materials)?,
    ];
    if !sheet.flux_targets.is_empty() {
        tables.push(csv_table(&sheet.flux_targets)?);
    }
    if !sheet.photoluminescence.is_empty() {
        tables.push(csv_table(&sheet.photoluminescence)?);
    }
    if !sentences.is_empty() {
        tables.push(csv_table(&sentences)?);
    }
    tables.push(csv_table(&cautions)?);
    Ok(tables.join("\n"))
}
