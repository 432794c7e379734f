//! The field at which two levels come nearest, and how near: the anticrossing gap.
//!
//! Two states that only the field moves against one another obey H₀ + F Z, with Z the 2 × 2 matrix of z in them. Then
//! g² = (E_a − E_b + δ D)² + 4 δ² z_ab² with D = z_aa − z_bb (Hellmann and Feynman's slopes), which is least for
//! δ = −(E_a − E_b) D/(D² + 4 z_ab²). The other states bend this a little, so the step is taken again until it vanishes;
//! there D = 0, the exact condition for the gap's minimum.

use super::window::Window;
use crate::numerics::eigenpairs::Eigenpair;
use crate::numerics::pencil::Pencil;
use crate::numerics::sensitivity::moment;

/// Where two levels come nearest.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Anticrossing {
    pub field_v_per_nm: f64,
    /// The whole smallest distance, 2ħΩ of a two-level system.
    pub gap_ev: f64,
}

const MOST_STEPS: usize = 40;
/// A step that moves the levels against one another by less than this, in eV, ends the search.
const LAST_STEP_EV: f64 = 1e-9;
/// Levels that come nearest further away than this part of the design's field are not followed.
const FURTHEST: f64 = 0.2;
/// A single step goes no further than this part of the design's field.
const LONGEST_STEP: f64 = 0.05;
/// Room above and below the two levels in which they are looked for again, in eV.
const ROOM_EV: f64 = 2e-3;
/// Two states are taken for two others when they hold this much of them, of 2.
const SAME: f64 = 1.2;

/// A field with the slope of half the squared distance, which rises through zero where the levels are nearest.
#[derive(Clone, Copy)]
struct Tried {
    field: f64,
    slope: f64,
}

/// Follows two states of a window from a field; `None` where they come nearest too far from it, or are lost.
pub(super) fn anticrossing(
    window: &Window,
    order: usize,
    start: (&Pencil, f64),
    design_pair: [&Eigenpair; 2],
) -> Option<Anticrossing> {
    let design = start.1;
    let furthest = FURTHEST * design.abs();
    let mut field = design;
    let mut pencil = start.0.clone();
    let mut pair = design_pair.map(Clone::clone);
    // The nearest fields on either side, and the one before.
    let (mut below, mut above): (Option<Tried>, Option<Tried>) = (None, None);
    let mut last: Option<Tried> = None;
    for _ in 0..MOST_STEPS {
        let z = |i: usize, j: usize| moment(&pencil, &pair[i], &pair[j]);
        let bottom_nm = window.bottom_nm();
        let heights_nm = [z(0, 0) + bottom_nm, z(1, 1) + bottom_nm];
        let apart_nm = heights_nm[0] - heights_nm[1];
        let mixed_nm = 2.0 * z(0, 1);
        let gap_ev = pair[0].value - pair[1].value;
        let reach_nm2 = apart_nm * apart_nm + mixed_nm * mixed_nm;
        let here = Tried {
            field,
            slope: gap_ev * apart_nm,
        };
        let two_levels = -here.slope / reach_nm2;
        if here.slope < 0.0 {
            below = Some(here);
        } else {
            above = Some(here);
        }
        let step = match (below, above, last) {
            (Some(low), Some(high), Some(last)) => {
                let secant =
                    here.field - here.slope * (here.field - last.field) / (here.slope - last.slope);
                let inside = secant > low.field && secant < high.field;
                let next = match inside {
                    true => secant,
                    false => 0.5 * (low.field + high.field),
                };
                next - field
            }
            _ => two_levels,
        };
        last = Some(here);
        if !step.is_finite() || (field + step - design).abs() > furthest {
            return None;
        }
        if two_levels.abs().min(step.abs()) * reach_nm2.sqrt() < LAST_STEP_EV {
            return same(window, &pencil, design_pair, &pair).then_some(Anticrossing {
                field_v_per_nm: field,
                gap_ev: gap_ev.abs(),
            });
        }
        let longest = LONGEST_STEP * design.abs();
        let step = step.clamp(-longest, longest);
        field += step;
        pencil = window.pencil(field, order);
        let middle_ev =
            0.5 * (pair[0].value + pair[1].value) + 0.5 * step * (heights_nm[0] + heights_nm[1]);
        let half_ev = 0.5 * gap_ev.abs() + 0.5 * (step * apart_nm).abs() + ROOM_EV;
        pair = [1.0, 4.0].iter().find_map(|wider| {
            let half_ev = wider * half_ev;
            let found = window.states(&pencil, [middle_ev - half_ev, middle_ev + half_ev]);
            likest(window, &pencil, &pair, found)
        })?;
    }
    None
}

/// Whether two states still hold most of two others.
fn same(window: &Window, pencil: &Pencil, design: [&Eigenpair; 2], pair: &[Eigenpair; 2]) -> bool {
    let parts = pair.iter().flat_map(|state| {
        design.map(|other| window.overlap_moved(pencil, other, state, 0).powi(2))
    });
    parts.sum::<f64>() > SAME
}

/// The two states that hold most of the space of two others.
fn likest(
    window: &Window,
    pencil: &Pencil,
    pair: &[Eigenpair; 2],
    found: Vec<Eigenpair>,
) -> Option<[Eigenpair; 2]> {
    let mut held: Vec<(f64, Eigenpair)> = found
        .into_iter()
        .map(|state| {
            let parts = pair
                .iter()
                .map(|p| window.overlap_moved(pencil, p, &state, 0));
            (parts.map(|part| part * part).sum(), state)
        })
        .collect();
    held.sort_by(|a, b| b.0.total_cmp(&a.0));
    let mut held = held.into_iter();
    let (first, second) = (held.next()?, held.next()?);
    (first.0 + second.0 > SAME).then_some([first.1, second.1])
}
