//! Text for pictures: escaped, measured and wrapped.

/// Widths of the printable ASCII characters from the space on, in thousandths of the size: those of Helvetica (Adobe
/// Font Metrics), which Arial and Liberation Sans share.
const WIDTHS: [u16; 95] = [
    278, 278, 355, 556, 556, 889, 667, 191, 333, 333, 389, 584, 278, 333, 278, 278, 556, 556, 556,
    556, 556, 556, 556, 556, 556, 556, 278, 278, 584, 584, 584, 556, 1015, 667, 667, 722, 722, 667,
    611, 778, 722, 278, 500, 667, 556, 833, 722, 778, 667, 778, 722, 667, 611, 722, 667, 944, 667,
    667, 611, 278, 278, 278, 469, 556, 333, 556, 556, 500, 556, 556, 278, 556, 556, 222, 222, 500,
    222, 833, 556, 556, 556, 556, 333, 500, 278, 556, 500, 722, 500, 500, 500, 334, 260, 334, 584,
];
/// Room for fonts that run wider, and for bold letters.
const ROOM: f64 = 1.1;
/// Size of an index below the line against that of the text.
pub(super) const INDEX_SIZE: f64 = 0.75;

/// The width of a text in points, rather too wide than too narrow.
pub fn width_pt(text: &str, size_pt: f64) -> f64 {
    text.chars().map(width_of).sum::<f64>() * size_pt * ROOM
}

/// In parts of the size.
fn width_of(c: char) -> f64 {
    match c {
        ' '..='~' => f64::from(WIDTHS[c as usize - 32]) * 1e-3,
        '…' | '—' => 1.0,
        // Letters of other alphabets that are written left to right with about the width of Latin ones.
        '\u{a0}'..='\u{24f}' | '\u{370}'..='\u{52f}' | '\u{2000}'..='\u{22ff}' => 0.7,
        _ => 1.1,
    }
}

/// A text with the signs of XML written out, and without those that XML 1.0 does not allow (section 2.2).
pub(super) fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\'' => out.push_str("&#39;"),
            '\t' | '\n' | '\r' => out.push(' '),
            '\0'..='\u{1f}' | '\u{7f}'..='\u{9f}' | '\u{fffe}' | '\u{ffff}' => out.push('\u{fffd}'),
            other => out.push(other),
        }
    }
    out
}

/// The text cut to a width, with an ellipsis where something is missing.
pub(super) fn shortened(text: &str, size_pt: f64, width: f64) -> String {
    if width_pt(text, size_pt) <= width {
        return text.to_owned();
    }
    let mut room = width - width_pt("…", size_pt);
    let mut kept = String::new();
    for c in text.chars() {
        room -= width_of(c) * size_pt * ROOM;
        if room < 0.0 {
            break;
        }
        kept.push(c);
    }
    kept.trim_end().to_owned() + "…"
}

/// Lines no wider than `width`, at most `lines` of them; the last one ends in an ellipsis when something is missing.
pub(super) fn wrapped(text: &str, size_pt: f64, width: f64, lines: usize) -> Vec<String> {
    let mut done: Vec<String> = Vec::new();
    let mut line = String::new();
    for word in text.split_whitespace() {
        let candidate = if line.is_empty() {
            word.to_owned()
        } else {
            format!("{line} {word}")
        };
        if width_pt(&candidate, size_pt) <= width {
            line = candidate;
            continue;
        }
        if !line.is_empty() {
            done.push(std::mem::take(&mut line));
        }
        for c in word.chars() {
            line.push(c);
            if width_pt(&line, size_pt) > width {
                line.pop();
                done.push(std::mem::replace(&mut line, c.to_string()));
            }
        }
    }
    if !line.is_empty() {
        done.push(line);
    }
    if done.len() > lines {
        done.truncate(lines);
        if let Some(last) = done.last_mut() {
            *last = shortened(&format!("{last} …………"), size_pt, width)
                .trim_end_matches([' ', '…'])
                .to_owned()
                + "…";
        }
    }
    done
}

/// A number for a caption: up to `digits` significant digits without trailing zeros, with a true minus sign.
pub(super) fn short(value: f64, digits: usize) -> String {
    let text = crate::report::table::significant(value, digits);
    let text = if text.contains('.') && !text.contains('e') {
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        text
    };
    minus(&text)
}

/// The hyphen of a number as a minus sign.
pub(super) fn minus(number: &str) -> String {
    number.replace('-', "−")
}

/// A piece of text on the line or, as an index, below it.
#[derive(Clone, Debug)]
pub(super) struct Run {
    pub text: String,
    pub index: bool,
}

pub(super) fn plain(text: impl Into<String>) -> Vec<Run> {
    vec![Run {
        text: text.into(),
        index: false,
    }]
}

/// A chemical formula with its amounts as indices, to three decimals.
pub(super) fn formula(formula: &str) -> Vec<Run> {
    let mut runs: Vec<Run> = Vec::new();
    for c in formula.chars() {
        let index = c.is_ascii_digit() || c == '.';
        match runs.last_mut() {
            Some(run) if run.index == index => run.text.push(c),
            _ => runs.push(Run {
                text: c.to_string(),
                index,
            }),
        }
    }
    for run in &mut runs {
        if let (true, Ok(amount)) = (run.index && run.text.len() > 5, run.text.parse::<f64>()) {
            run.text = format!("{amount:.3}");
        }
    }
    runs
}

pub(super) fn runs_width_pt(runs: &[Run], size_pt: f64) -> f64 {
    let size = |run: &Run| {
        if run.index {
            INDEX_SIZE * size_pt
        } else {
            size_pt
        }
    };
    runs.iter().map(|run| width_pt(&run.text, size(run))).sum()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn wraps_cuts_and_escapes() {
        let lines = wrapped(&"word ".repeat(100), 7.0, 100.0, 3);
        assert_eq!(lines.len(), 3);
        assert!(
            lines.iter().all(|line| width_pt(line, 7.0) <= 100.0) && lines[2].ends_with('…'),
            "{lines:?}"
        );
        let long = wrapped(&"x".repeat(100), 7.0, 50.0, 100);
        assert_eq!(long.concat(), "x".repeat(100));
        assert_eq!(escaped("a<b&\"c'\u{7}"), "a&lt;b&amp;&quot;c&#39;\u{fffd}");
    }

    #[test]
    fn numbers_lose_idle_zeros_only() {
        assert_eq!(short(77.0, 4), "77");
        assert_eq!(short(-12.5, 4), "−12.5");
        assert_eq!(short(1200.0, 4), "1200");
    }
}
