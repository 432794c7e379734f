//! The λ of an [`OpenPencil`] inside a part of the complex plane, none missed.
//!
//! Each is refined from a guess by inverse iteration with the bilinear quotient of the complex symmetric problem. Then
//! det T(λ) is followed round the border: the turns of its phase count the λ inside (the argument principle), so that
//! one without a guess shows. From each step along the border the growth of a wave between turning points is taken off
//! first (Wentzel, Z. Phys. 38, 518 (1926)), and put back: what is left turns little. The part is then halved until the missing one is alone; the first moment of d ln det along
//! the border tells where it is (Delves & Lyness, Math. Comp. 21, 543 (1967)).

use super::complex_banded::{C64, Determinant, I, ZERO};
use super::open_pencil::{OpenPencil, product};

/// An outgoing state; the bilinear norm x · N(λ, λ) x is 1.
#[derive(Clone, Debug)]
pub struct Outgoing {
    pub value: C64,
    pub vector: Vec<C64>,
    /// The last step of the refinement.
    pub residual: f64,
}

/// A rectangle of the complex plane.
#[derive(Clone, Copy, Debug)]
pub struct Region {
    pub low: f64,
    pub high: f64,
    /// Imaginary parts.
    pub bottom: f64,
    pub top: f64,
}

/// What a search found.
#[derive(Clone, Debug)]
pub struct Found {
    /// Ascending in the real part.
    pub states: Vec<Outgoing>,
    /// How many the argument principle counts.
    pub counted: usize,
}

/// What a search may still cost, in rows of matrices to factor: counted, not timed, so that the same search ends at the
/// same place everywhere.
#[derive(Clone, Copy, Debug)]
pub struct Work {
    pub left: usize,
}

impl Work {
    /// Takes the cost of some factorisations; false, and nothing left, when there is not enough.
    pub fn spend(&mut self, pencil: &OpenPencil, factorisations: usize) -> bool {
        let cost = factorisations * pencil.size();
        let enough = cost <= self.left;
        self.left = self.left.saturating_sub(cost);
        enough
    }
}

/// Steps of refinement; from a fair guess some five are needed.
const MAX_STEPS: usize = 40;
/// A step smaller than this part of |λ| + 1 is rounding.
const ROUNDING: f64 = 1e-15;
/// A state whose last step is larger than this part of |λ| + 1 is none.
const SETTLED: f64 = 1e-10;
/// Two states nearer than this part of |λ| + 1 are one when their vectors agree.
const SAME: f64 = 1e-9;
/// Pieces into which each side of a rectangle is cut to begin with, or as many as there are guesses: a piece of the lower
/// and upper side must not hide a whole turn.
const PIECES: usize = 8;
/// Halvings of a piece along which the phase turns fast.
const MAX_DEPTH: usize = 40;
/// The longest step of ln det that is taken as seen, in radians; two halves must agree with the whole to the same.
const LONGEST: f64 = 1.0;
/// Parts of one region that are looked at; what is then still missing is said to be.
const MOST_PARTS: usize = 200;
/// A part is not halved below this size: two states that near are told apart by their vectors only.
const SMALLEST: f64 = 1e-9;

impl Region {
    pub fn holds(&self, value: C64) -> bool {
        value.re >= self.low
            && value.re <= self.high
            && value.im >= self.bottom
            && value.im <= self.top
    }

    /// Whether a value lies in here or no further away than the region is large.
    fn is_near(&self, value: C64) -> bool {
        let (width, height) = (self.high - self.low, self.top - self.bottom);
        value.re > self.low - width
            && value.re < self.high + width
            && value.im > self.bottom - height
            && value.im < self.top + height
    }

    fn middle(&self) -> C64 {
        C64::new(0.5 * (self.low + self.high), 0.5 * (self.bottom + self.top))
    }

    /// Two halves along the longer side, parted where no known state is near.
    fn halves(&self, known: &[Outgoing]) -> [Region; 2] {
        let upright = self.top - self.bottom > self.high - self.low;
        let (a, b) = if upright {
            (self.bottom, self.top)
        } else {
            (self.low, self.high)
        };
        let clear = |at: f64| {
            let distances = known.iter().map(|state| {
                let part = if upright {
                    state.value.im
                } else {
                    state.value.re
                };
                (part - at).abs()
            });
            distances.fold(f64::INFINITY, f64::min)
        };
        let at = [0.5, 0.45, 0.55, 0.4, 0.6, 0.35, 0.65]
            .map(|part| a + part * (b - a))
            .into_iter()
            .max_by(|x, y| {
                clear(*x)
                    .min(0.02 * (b - a))
                    .total_cmp(&clear(*y).min(0.02 * (b - a)))
            })
            .unwrap_or(0.5 * (a + b));
        if upright {
            [
                Region { top: at, ..*self },
                Region {
                    bottom: at,
                    ..*self
                },
            ]
        } else {
            [Region { high: at, ..*self }, Region { low: at, ..*self }]
        }
    }
}

/// Refines a guess. `None` when it does not settle.
pub fn refine(pencil: &OpenPencil, guess: C64, vector: Option<&[C64]>) -> Option<Outgoing> {
    let mut unlimited = Work { left: usize::MAX };
    refine_while(pencil, guess, vector, &mut unlimited, |_| true)
}

/// As [`refine`]; given up where `holds` is false of a value.
fn refine_while(
    pencil: &OpenPencil,
    guess: C64,
    vector: Option<&[C64]>,
    work: &mut Work,
    holds: impl Fn(C64) -> bool,
) -> Option<Outgoing> {
    let mut value = guess;
    let mut x = match vector {
        Some(vector) => vector.to_vec(),
        None => irregular(pencil.size()),
    };
    let mut residual = f64::INFINITY;
    for step in 0..MAX_STEPS {
        if !work.spend(pencil, 1) {
            return None;
        }
        let right = pencil.weight(value, &x);
        let mut next = right.clone();
        pencil.factor(value).solve(&mut next);
        let size = next.iter().fold(0.0_f64, |most, v| most.max(v.norm()));
        if !size.is_finite() || size == 0.0 {
            return None;
        }
        // y solves T y = N x, so y · T y = y · N x without any cancellation; T falls by N per unit of λ.
        let change = product(&next, &right) / product(&next, &pencil.weight(value, &next));
        x = next.into_iter().map(|v| v / size).collect();
        let before = residual;
        residual = change.norm();
        if !residual.is_finite() || residual > 10.0 {
            return None;
        }
        // The first step from an irregular vector turns it; a value taken from it may jump to a far state.
        if step >= 1 || vector.is_some() {
            value += change;
        }
        if !holds(value) {
            return None;
        }
        let scale = value.norm() + 1.0;
        let stalled = residual >= before && before < SETTLED * scale;
        if step >= 3 && (residual < ROUNDING * scale || stalled) {
            break;
        }
    }
    if residual > SETTLED * (value.norm() + 1.0) {
        return None;
    }
    let norm = product(&x, &pencil.weight(value, &x)).sqrt();
    Some(Outgoing {
        value,
        vector: x.into_iter().map(|v| v / norm).collect(),
        residual,
    })
}

/// A vector that favours no state, the same every time.
fn irregular(size: usize) -> Vec<C64> {
    (0..size)
        .map(|k| {
            let t = k as f64;
            C64::new(
                1.0 + 0.7 * (1.618 * t + 0.3).sin() + 0.5 * (0.037 * t).cos(),
                0.1 * (0.71 * t).sin(),
            )
        })
        .collect()
}

/// All states of a region, from guesses that may be incomplete. `None` when the work does not suffice.
pub fn all_in(
    pencil: &OpenPencil,
    region: &Region,
    guesses: &[(C64, Vec<C64>)],
    work: &mut Work,
) -> Option<Found> {
    let mut states: Vec<Outgoing> = Vec::new();
    for (value, vector) in guesses {
        let state = refine_while(pencil, *value, Some(vector), work, |v| region.is_near(v));
        if let Some(state) = state.filter(|state| region.holds(state.value)) {
            add(pencil, &mut states, state);
        }
    }
    let pieces = PIECES.max(guesses.len());
    let (counted, sum) = count(pencil, region, pieces, work)?;
    let mut parts = MOST_PARTS;
    complete(
        pencil,
        region,
        (counted, sum, pieces),
        &mut states,
        &mut parts,
        work,
    )?;
    states.sort_by(|a, b| a.value.re.total_cmp(&b.value.re));
    Some(Found { states, counted })
}

/// Adds a state unless it is known; says whether it was new.
fn add(pencil: &OpenPencil, states: &mut Vec<Outgoing>, state: Outgoing) -> bool {
    let known = states.iter().any(|other| {
        (other.value - state.value).norm() < SAME * (state.value.norm() + 1.0) && {
            let overlap = product(&other.vector, &pencil.weight(state.value, &state.vector));
            overlap.norm() > 0.5
        }
    });
    if !known {
        states.push(state);
    }
    !known
}

/// Looks for the states that are counted in a region and not known. `None` when the work does not suffice.
fn complete(
    pencil: &OpenPencil,
    region: &Region,
    (count, sum, pieces): (usize, C64, usize),
    states: &mut Vec<Outgoing>,
    parts: &mut usize,
    work: &mut Work,
) -> Option<()> {
    let inside: Vec<C64> = states
        .iter()
        .map(|state| state.value)
        .filter(|value| region.holds(*value))
        .collect();
    if count <= inside.len() {
        return Some(());
    }
    if count == inside.len() + 1 {
        let known: C64 = inside.iter().sum();
        for guess in [sum - known, region.middle()] {
            if let Some(state) = refine_while(pencil, guess, None, work, |_| true)
                && region.holds(state.value)
                && add(pencil, states, state)
            {
                return Some(());
            }
        }
    }
    if (region.high - region.low).max(region.top - region.bottom) < SMALLEST {
        return Some(());
    }
    for half in region.halves(states) {
        if *parts == 0 {
            return Some(());
        }
        *parts -= 1;
        let (count, sum) = self::count(pencil, &half, pieces, work)?;
        complete(pencil, &half, (count, sum, pieces), states, parts, work)?;
    }
    Some(())
}

/// How many states lie in a region, and the sum of their values. The lower and the upper side are cut into `pieces` to
/// begin with. `None` when the work does not suffice.
fn count(
    pencil: &OpenPencil,
    region: &Region,
    pieces: usize,
    work: &mut Work,
) -> Option<(usize, C64)> {
    let corners = [
        C64::new(region.low, region.bottom),
        C64::new(region.high, region.bottom),
        C64::new(region.high, region.top),
        C64::new(region.low, region.top),
    ];
    let mut turns = 0.0;
    let mut moment = ZERO;
    for side in 0..4 {
        let (from, to) = (corners[side], corners[(side + 1) % 4]);
        let along = side % 2 == 0;
        let pieces = if along { pieces } else { PIECES };
        let mut seen_at = |at: C64| {
            let determinant = work
                .spend(pencil, 1)
                .then(|| pencil.factor(at).determinant)?;
            // On the way across the real axis the growth jumps.
            let growth = if along { pencil.growth(at) } else { ZERO };
            Some((determinant, growth))
        };
        let (mut start, mut known) = (from, seen_at(from)?);
        for piece in 1..=pieces {
            let end = from + (to - from) * (piece as f64 / pieces as f64);
            let last = seen_at(end)?;
            let mut stack = vec![(start, known, end, last, 0)];
            while let Some((a, at_a, b, at_b, depth)) = stack.pop() {
                let middle = 0.5 * (a + b);
                let at_middle = seen_at(middle)?;
                let (one, two) = (left_over(&at_a, &at_middle), left_over(&at_middle, &at_b));
                let whole = left_over(&at_a, &at_b);
                let seen = one.norm() < LONGEST
                    && two.norm() < LONGEST
                    && (one + two - whole).norm() < LONGEST
                    && (one - two).norm() < LONGEST;
                if seen || depth == MAX_DEPTH {
                    let (one, two) = (one + at_middle.1 - at_a.1, two + at_b.1 - at_middle.1);
                    turns += one.im + two.im;
                    moment += one * 0.5 * (a + middle) + two * 0.5 * (middle + b);
                } else {
                    stack.push((middle, at_middle, b, at_b, depth + 1));
                    stack.push((a, at_a, middle, at_middle, depth + 1));
                }
            }
            (start, known) = (end, last);
        }
    }
    let full = 2.0 * std::f64::consts::PI;
    let count = (turns / full).round().max(0.0) as usize;
    Some((count, moment / (I * full)))
}

/// The step of ln det beside the step of the growth, its phase between −π and π.
fn left_over(from: &(Determinant, C64), to: &(Determinant, C64)) -> C64 {
    let growth = to.1 - from.1;
    let full = 2.0 * std::f64::consts::PI;
    let step = from.0.step_to(&to.0) - growth;
    C64::new(step.re, step.im - full * (step.im / full).round())
}
