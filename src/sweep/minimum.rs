//! The place where the gap between two levels is least.
//!
//! Two levels that come near each other follow g² = Δ² + s²(x − x₀)² (two-level model; von Neumann and Wigner, Phys. Z. 30,
//! 467 (1929)): the square of the gap is a parabola, so that steps to the vertex of the parabola through three points
//! settle in a few solves. Where the vertex is of no use, golden section takes its place (Brent, Algorithms for
//! Minimization without Derivatives (1973), chapter 5).

/// 1 − 1/φ.
const GOLDEN: f64 = 0.381_966_011_250_105_1;
const MOST_STEPS: usize = 60;
/// The gap is found when a step can lower it by less than this, in eV: less than a level's own error.
const SETTLED_EV: f64 = 1e-9;
/// The bracket is not made smaller than this part of the range: rounding of the levels decides below.
const LEAST_BRACKET: f64 = 1e-9;

/// A least gap.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Least {
    pub part: f64,
    pub gap_ev: f64,
    pub settled: bool,
}

/// Looks for the least gap inside a bracket: three places, each with its gap, the middle one not above the others.
/// `None` when a gap cannot be found on the way.
pub fn least_gap(
    [mut below, mut middle, mut above]: [(f64, f64); 3],
    gap_ev: impl Fn(f64) -> Option<f64>,
) -> Option<Least> {
    let square = |(part, gap): (f64, f64)| (part, gap * gap);
    let mut idle = 0;
    for step in 0..MOST_STEPS {
        let found = |settled| Least {
            part: middle.0,
            gap_ev: middle.1,
            settled,
        };
        if above.0 - below.0 < LEAST_BRACKET || middle.1 < SETTLED_EV {
            return Some(found(true));
        }
        let vertex = vertex(square(below), square(middle), square(above));
        // Twice in a row, since one parabola may happen to have its vertex at its middle point.
        let gains = |(_, lowest): &(f64, f64)| middle.1 - lowest.max(0.0).sqrt() >= SETTLED_EV;
        idle = match vertex.as_ref().is_some_and(|vertex| !gains(vertex)) {
            true => idle + 1,
            false => 0,
        };
        if idle == 2 {
            return Some(found(true));
        }
        // Every third step cuts the larger side, so that the bracket closes whatever the shape.
        let next = match vertex {
            Some((part, _)) if step % 3 != 2 && part != middle.0 => part,
            _ if above.0 - middle.0 > middle.0 - below.0 => {
                middle.0 + GOLDEN * (above.0 - middle.0)
            }
            _ => middle.0 - GOLDEN * (middle.0 - below.0),
        };
        if next <= below.0 || next >= above.0 || next == middle.0 {
            return Some(found(true));
        }
        let tried = (next, gap_ev(next)?);
        let lower = tried.1 < middle.1;
        match (tried.0 < middle.0, lower) {
            (true, true) => (above, middle) = (middle, tried),
            (true, false) => below = tried,
            (false, true) => (below, middle) = (middle, tried),
            (false, false) => above = tried,
        }
    }
    Some(Least {
        part: middle.0,
        gap_ev: middle.1,
        settled: false,
    })
}

/// Vertex of the parabola through three points, if it opens upwards.
fn vertex((x0, f0): (f64, f64), (x1, f1): (f64, f64), (x2, f2): (f64, f64)) -> Option<(f64, f64)> {
    let (first, second) = ((f1 - f0) / (x1 - x0), (f2 - f1) / (x2 - x1));
    let curvature = (second - first) / (x2 - x0);
    if curvature.is_nan() || curvature <= 0.0 {
        return None;
    }
    let x = 0.5 * (x0 + x1 - first / curvature);
    let slope = first + curvature * (x1 - x0);
    let away = x - x1;
    Some((x, f1 + slope * away + curvature * away * away))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The two-level model itself is the closed form: minimum Δ at x₀, whatever the slope.
    #[test]
    fn the_two_level_gap_is_found_with_few_solves() {
        for (delta, slope) in [(3e-3, 0.05), (1e-6, 2.0), (0.0, 1.0)] {
            let count = std::cell::Cell::new(0);
            let gap = |x: f64| {
                count.set(count.get() + 1);
                f64::hypot(delta, slope * (x - 0.412))
            };
            let bracket = [0.3, 0.4, 0.5].map(|x| (x, gap(x)));
            let least = least_gap(bracket, |x| Some(gap(x))).unwrap();
            assert!(least.settled);
            assert!((least.gap_ev - delta).abs() < 2e-9, "{least:?}");
            assert!(count.get() < 16, "{}", count.get());
        }
    }

    #[test]
    fn a_gap_that_is_no_parabola_is_found_too() {
        let gap = |x: f64| 1e-3 + (x - 0.37).abs().powi(3) + 0.5 * (x - 0.37).powi(4);
        let bracket = [0.0, 0.2, 1.0].map(|x| (x, gap(x)));
        let least = least_gap(bracket, |x| Some(gap(x))).unwrap();
        assert!(
            least.settled && (least.gap_ev - 1e-3).abs() < 1e-8,
            "{least:?}"
        );
        assert!(least_gap(bracket, |_| None).is_none());
    }
}
