//! The growth sheet as one HTML page that holds everything, in black on white, and prints on A4.

use super::sheet::{GROWER_ENTRIES, RowKind, Sheet, SheetRow, clock};
use super::table::{TitledTable, significant};

static STYLE: &str = include_str!("sheet.css");

/// Text as it may stand in HTML, also inside quoted attributes.
pub fn escape(text: &str) -> String {
    let mut safe = String::with_capacity(text.len());
    for character in text.chars() {
        match character {
            '&' => safe.push_str("&amp;"),
            '<' => safe.push_str("&lt;"),
            '>' => safe.push_str("&gt;"),
            '"' => safe.push_str("&quot;"),
            '\'' => safe.push_str("&#39;"),
            other => safe.push(other),
        }
    }
    safe
}

/// A table with its title and its note.
fn titled(table: &TitledTable) -> String {
    let class = |column: usize| {
        if table.left.contains(&column) {
            " class=\"w\""
        } else {
            ""
        }
    };
    let cells = |tag: &str, cells: &mut dyn Iterator<Item = &str>| -> String {
        cells
            .enumerate()
            .map(|(column, text)| format!("<{tag}{}>{}</{tag}>", class(column), escape(text)))
            .collect()
    };
    let head = cells("th", &mut table.header.iter().copied());
    let rows: String = table
        .rows
        .iter()
        .map(|row| format!("<tr>{}</tr>", cells("td", &mut row.iter().map(|c| &**c))))
        .collect();
    let note = if table.note.is_empty() {
        String::new()
    } else {
        format!("<p>{}</p>", escape(table.note))
    };
    format!(
        "<h2>{}</h2>\n<table><thead><tr>{head}</tr></thead><tbody>{rows}</tbody></table>{note}\n",
        escape(&table.title)
    )
}

impl Sheet {
    /// The page. `pictures` are titles with SVG elements, which are taken over as they are.
    pub fn html(&self, pictures: &[(String, String)]) -> String {
        let title = self.title.as_deref().unwrap_or("Untitled stack");
        let id = escape(&self.content_id);
        let mut page = format!(
            "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n\
             <meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n\
             <title>{} – growth sheet {id}</title>\n<style>\n{STYLE}\
             @page {{ @bottom-left {{ content: \"growth sheet {id}\"; font: 8pt Arial, sans-serif; }} \
             @bottom-right {{ content: counter(page) \" of \" counter(pages); font: 8pt Arial, sans-serif; }} }}\n\
             </style>\n</head>\n<body>\n\
             <header><div><p class=\"kind\">Growth sheet</p><h1>{}</h1></div>\
             <div class=\"id\"><small>content id</small>{id}</div></header>\n",
            escape(title),
            escape(title)
        );
        page.push_str("<dl class=\"facts\">");
        for (name, value) in self.head().iter().skip(1) {
            page.push_str(&format!("<dt>{name}</dt><dd>{}</dd>", escape(value)));
        }
        page.push_str("</dl>\n");
        page.push_str(&self.entries());
        page.push_str(&self.heed());
        page.push_str(&self.layers());
        page.push_str(&self.uses());
        for table in self.more_tables() {
            page.push_str(&titled(&table));
        }
        for (caption, svg) in pictures {
            page.push_str(&format!(
                "<figure><figcaption>{}</figcaption>{svg}</figure>\n",
                escape(caption)
            ));
        }
        page.push_str(&self.cautions());
        page.push_str(&format!(
            "<footer>{}. The content id is a hash of the resolved layers and parameters: the same id is the same stack.</footer>\n</body>\n</html>\n",
            escape(self.program)
        ));
        page
    }

    /// Ruled fields for the grower.
    fn entries(&self) -> String {
        let mut text = String::from("<div class=\"entries\">");
        for entry in GROWER_ENTRIES {
            let (class, label) = match entry {
                "Measured rates" => {
                    let cells: Vec<String> = self
                        .shutters
                        .iter()
                        .filter(|shutter| shutter.rate_ML_s.is_some())
                        .map(|shutter| escape(&shutter.cell))
                        .collect();
                    ("rates", format!("{entry} of {}", cells.join(", ")))
                }
                "Remarks" => ("remarks", entry.to_owned()),
                _ => ("", entry.to_owned()),
            };
            text.push_str(&format!("<div class=\"{class}\">{label}</div>"));
        }
        text.push_str("</div>\n");
        text
    }

    /// What must be decided before the growth.
    fn heed(&self) -> String {
        if self.compositions.is_empty() && self.warnings.is_empty() {
            return String::new();
        }
        let mut text = String::from("<div class=\"heed\"><h2>To settle before growth</h2><ul>");
        for composition in &self.compositions {
            text.push_str(&format!("<li>{}.", escape(&composition.sentence)));
            if let Some(digital) = &composition.digital_alloy {
                text.push_str(&format!(
                    "<br>{}.<pre>{}</pre>",
                    escape(&digital.sentence),
                    escape(digital.structure.trim_end())
                ));
            }
            text.push_str("</li>");
        }
        for warning in &self.warnings {
            text.push_str(&format!("<li>{}.</li>", escape(warning)));
        }
        for grade in &self.grades {
            text.push_str(&format!(
                "<li>{}.<pre>{}</pre></li>",
                escape(&grade.sentence),
                escape(grade.structure.trim_end())
            ));
        }
        text.push_str("</ul></div>\n");
        text
    }

    fn layers(&self) -> String {
        let mut text = String::from(
            "<h2>Layers in growth order, the lowest first</h2>\n<table class=\"layers\"><thead><tr>\
             <th>no</th><th class=\"w n\">layer</th><th>nm</th><th>Å</th><th>ML</th>\
             <th class=\"w\">doping<br>cm⁻³</th><th class=\"w\">open cells</th><th>time s</th>\
             <th>height nm</th><th>clock h:m:s</th><th>done</th></tr></thead>\n<tbody>\n",
        );
        for row in &self.rows {
            text.push_str(&layer_row(row));
        }
        text.push_str(&format!(
            "</tbody><tfoot><tr><td></td><td class=\"w\">{} layers</td><td>{:.3}</td><td>{:.2}</td><td>{:.2}</td>\
             <td></td><td></td><td>{:.2}</td><td></td><td>{}</td><td></td></tr></tfoot></table>\n",
            self.total.layers,
            self.total.thickness_nm,
            10.0 * self.total.thickness_nm,
            self.total.monolayers,
            self.total.time_s,
            self.total.time
        ));
        if self.rows.iter().any(|row| row.kind == RowKind::LoopBegins) {
            text.push_str("<p>Inside a loop, height and clock are those of its first pass.</p>\n");
        }
        text
    }

    fn uses(&self) -> String {
        let mut text = String::from(
            "<div class=\"pair\"><div><h2>Shutters</h2><table><thead><tr><th class=\"w\">cell</th>\
             <th class=\"w\">calibrated</th><th>ML/s</th><th>open h:m:s</th><th>openings</th></tr></thead><tbody>",
        );
        for shutter in &self.shutters {
            text.push_str(&format!(
                "<tr><td class=\"w\">{}</td><td class=\"w\">{}</td><td>{}</td><td>{}</td><td>{}</td></tr>",
                escape(&shutter.cell),
                escape(&shutter.calibrated),
                shutter
                    .rate_ML_s
                    .map_or(String::new(), |rate| format!("{rate:.4}")),
                clock(shutter.open_s),
                shutter.openings
            ));
        }
        text.push_str(
            "</tbody></table></div><div><h2>Material as designed</h2><table><thead><tr>\
             <th class=\"w\">element</th><th>ML</th><th>atoms/cm²</th></tr></thead><tbody>",
        );
        for material in &self.materials {
            text.push_str(&format!(
                "<tr><td class=\"w\">{}</td><td>{}</td><td>{}</td></tr>",
                escape(&material.element),
                material
                    .monolayers
                    .map_or(String::new(), |ml| format!("{ml:.1}")),
                significant(material.atoms_per_cm2, 3)
            ));
        }
        text.push_str("</tbody></table></div></div>\n");
        if !self.flux_targets.is_empty() {
            text.push_str(
                "<h2>Group-V fractions, to be calibrated by flux ratio: group-III rates do not fix them</h2>\
                 <table><thead><tr><th class=\"w\">fractions in the crystal</th><th class=\"w\">layers</th></tr></thead><tbody>",
            );
            for target in &self.flux_targets {
                text.push_str(&format!(
                    "<tr><td class=\"w\">{}</td><td class=\"w\">{}</td></tr>",
                    escape(&target.ratio),
                    escape(&target.layers)
                ));
            }
            text.push_str("</tbody></table>\n");
        }
        text
    }

    fn cautions(&self) -> String {
        let mut text = String::from("<h2>Cautions</h2>\n<div class=\"cautions\">");
        for caution in &self.cautions {
            text.push_str(&format!(
                "<section><h3>{}</h3><p>{}</p>",
                escape(&caution.title),
                escape(&caution.text)
            ));
            if !caution.limits.is_empty() {
                text.push_str("<ul>");
                for limit in &caution.limits {
                    text.push_str(&format!("<li>{}</li>", escape(limit)));
                }
                text.push_str("</ul>");
            }
            text.push_str("</section>");
        }
        text.push_str("</div>\n");
        text
    }
}

fn layer_row(row: &SheetRow) -> String {
    let number = |value: Option<f64>, decimals: usize| {
        value.map_or(String::new(), |value| format!("{value:.decimals$}"))
    };
    let is_loop = matches!(row.kind, RowKind::LoopBegins | RowKind::LoopEnds);
    let depth = row.depth + usize::from(is_loop);
    let inside = if depth > 0 {
        format!(" in\" style=\"padding-left:{}mm", 2 * depth)
    } else {
        String::new()
    };
    let repeat = row.repeat.unwrap_or(1);
    match row.kind {
        RowKind::LoopBegins => format!(
            "<tr class=\"loop\"><td></td><td class=\"w{inside}\" colspan=\"10\"><b>{repeat} times:</b></td></tr>\n"
        ),
        RowKind::LoopEnds => format!(
            "<tr class=\"loop ends\"><td></td><td class=\"w{inside}\"><b>end of {repeat} times</b><span class=\"m\">one pass</span></td>\
             <td>{}</td><td>{}</td><td>{}</td><td></td><td></td><td>{}</td><td>{}</td><td>{}</td>\
             <td><span class=\"box\"></span></td></tr>\n",
            number(row.thickness_nm, 3),
            number(row.thickness_A, 2),
            number(row.monolayers, 2),
            number(row.time_s, 2),
            number(row.cumulative_nm, 3),
            row.cumulative_s.map_or(String::new(), clock)
        ),
        RowKind::Layer | RowKind::Plane => {
            let doping: Vec<String> = row.doping.iter().map(|d| escape(d)).collect();
            let to = row
                .to
                .as_ref()
                .map(|to| format!(" to {}", escape(to)))
                .unwrap_or_default();
            format!(
                "<tr><td>{}</td><td class=\"w{inside}\">{}<span class=\"m\">{}{to}</span></td><td>{}</td><td>{}</td><td>{}</td>\
                 <td style=\"text-align:left\">{}</td><td class=\"w\">{}</td><td>{}</td><td>{}</td><td>{}</td>\
                 <td><span class=\"box\"></span></td></tr>\n",
                row.number.map_or(String::new(), |n| n.to_string()),
                escape(&row.name),
                escape(&row.material),
                number(row.thickness_nm, 3),
                number(row.thickness_A, 2),
                number(row.monolayers, 2),
                doping.join("<br>"),
                escape(&row.open_cells),
                number(row.time_s, 2),
                number(row.cumulative_nm, 3),
                row.cumulative_s.map_or(String::new(), clock)
            )
        }
    }
}

#[cfg(test)]
mod tests {
    use super::escape;

    #[test]
    fn the_five_characters_of_html_are_escaped() {
        assert_eq!(
            escape("<b a=\"x\" c='y'>&amp;µ"),
            "&lt;b a=&quot;x&quot; c=&#39;y&#39;&gt;&amp;amp;µ"
        );
    }
}
