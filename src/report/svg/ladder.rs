//! The ladder of levels beside a band diagram: an arrow for each transition between the lines of its two states.

use super::page::{ASCENT, Anchor, Page, SMALL_PT, Style, text_width};
use super::palette::{GUIDE, INK, Stroke};
use super::spread::spread;

/// Height of a label of two lines.
const LABEL_HEIGHT_PT: f64 = 2.0 * LINE_PT + 1.0;
const LINE_PT: f64 = 1.2 * SMALL_PT;
/// From a column's left border to its arrow, and from there to the label.
const ARROW_PT: f64 = 4.0;
const LABEL_PT: f64 = 5.0;
const GAP_PT: f64 = 4.0;
/// Room above and below an arrow with two heads.
const HEADS_PT: f64 = 8.0;

/// A transition to be drawn; y points down, so the upper state has the smaller one.
#[derive(Clone, Debug)]
pub(super) struct Rung {
    pub upper_y: f64,
    pub lower_y: f64,
    pub lines: [String; 2],
    /// The two states, in words.
    pub states: String,
}

impl Rung {
    /// Both lines where they fit between the levels, else the first.
    fn lines(&self) -> &[String] {
        let fits = self.lower_y - self.upper_y > LABEL_HEIGHT_PT;
        &self.lines[..if fits { 2 } else { 1 }]
    }

    fn label_height(&self) -> f64 {
        LINE_PT * self.lines().len() as f64 + 1.0
    }

    fn middle(&self) -> f64 {
        0.5 * (self.upper_y + self.lower_y)
    }
}

/// Columns of arrows that do not cross one another.
pub(super) struct Ladder {
    columns: Vec<Vec<Rung>>,
}

impl Ladder {
    /// Sorts transitions into columns; gives back with the ladder those that had no room in `most` columns.
    pub fn new(mut rungs: Vec<Rung>, most: usize, height: f64) -> (Ladder, Vec<Rung>) {
        rungs.sort_by(|a, b| a.middle().total_cmp(&b.middle()));
        let mut columns: Vec<Vec<Rung>> = Vec::new();
        let mut left_out = Vec::new();
        for rung in rungs {
            let free = |column: &Vec<Rung>| {
                let apart = |other: &Rung| {
                    other.lower_y <= rung.upper_y + 0.01 || rung.lower_y <= other.upper_y + 0.01
                };
                column.iter().all(apart) && (column.len() + 1) as f64 * LABEL_HEIGHT_PT <= height
            };
            match columns.iter().position(free) {
                Some(place) => columns[place].push(rung),
                None if columns.len() < most => columns.push(vec![rung]),
                None => left_out.push(rung),
            }
        }
        (Ladder { columns }, left_out)
    }

    fn column_width(column: &[Rung]) -> f64 {
        let lines = column.iter().flat_map(Rung::lines);
        let widest = lines
            .map(|line| text_width(line, SMALL_PT))
            .fold(0.0, f64::max);
        ARROW_PT + LABEL_PT + widest + GAP_PT
    }

    pub fn width(&self) -> f64 {
        self.columns
            .iter()
            .map(|column| Self::column_width(column))
            .sum()
    }

    /// Draws the arrows from `left` on, with `top` at y = 0 of the rungs and the labels kept above `bottom`.
    pub fn draw(&self, page: &mut Page, left: f64, top: f64, bottom: f64) {
        let mut x = left;
        page.group("transitions", |page| {
            for column in &self.columns {
                let lowered = |rung: &Rung| Rung {
                    upper_y: rung.upper_y + top,
                    lower_y: rung.lower_y + top,
                    ..rung.clone()
                };
                let rungs: Vec<Rung> = column.iter().map(lowered).collect();
                let arrow = x + ARROW_PT;
                let wanted: Vec<f64> = rungs.iter().map(Rung::middle).collect();
                let sizes: Vec<f64> = rungs.iter().map(Rung::label_height).collect();
                let places = spread(&wanted, &sizes, top, bottom);
                for (rung, place) in rungs.iter().zip(places) {
                    draw_arrow(page, arrow, rung);
                    let label = arrow + LABEL_PT;
                    if (place - rung.middle()).abs() > 0.5 * LINE_PT {
                        let guide = Stroke::solid(GUIDE, 0.4);
                        page.line([arrow + 1.0, rung.middle()], [label - 0.5, place], guide);
                    }
                    let style = Style {
                        halo: true,
                        ..Style::new(SMALL_PT, Anchor::Start)
                    };
                    let lines = rung.lines();
                    let mut line =
                        place - 0.5 * LINE_PT * (lines.len() - 1) as f64 + 0.5 * ASCENT * SMALL_PT;
                    for (k, text) in lines.iter().enumerate() {
                        let bold = k == 0;
                        page.text([label, line], Style { bold, ..style }, text);
                        line += LINE_PT;
                    }
                }
                x += Self::column_width(column);
            }
        });
    }
}

/// An energy difference has no direction: absorption goes up, emission down. Short arrows are bars with feet.
fn draw_arrow(page: &mut Page, x: f64, rung: &Rung) {
    let stroke = Stroke::solid(INK, 0.8);
    if rung.lower_y - rung.upper_y > HEADS_PT {
        page.line([x, rung.upper_y + 2.0], [x, rung.lower_y - 2.0], stroke);
        page.arrow_head([x, rung.upper_y + 0.4], -1.0, INK);
        page.arrow_head([x, rung.lower_y - 0.4], 1.0, INK);
    } else {
        page.line([x, rung.upper_y], [x, rung.lower_y], stroke);
        for y in [rung.upper_y, rung.lower_y] {
            page.line([x - 1.4, y], [x + 1.4, y], stroke);
        }
    }
}
