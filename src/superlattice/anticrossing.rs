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

const MOST_STEPS: usize = 30;
/// A step that moves the levels against one another by less than this, in eV, ends the search.
const LAST_STEP_EV: f64 = 1e-9;
/// The field is followed as far as this part of the design's.
const FURTHEST: f64 = 0.4;
/// A single step goes no further than this part of the design's field.
const LONGEST_STEP: f64 = 0.1;
/// Room above and below the two levels in which they are looked for again, in eV.
const ROOM_EV: f64 = 2e-3;
/// Two states are taken for those of the step before when they hold this much of them, of 2.
const SAME: f64 = 1.2;

/// Follows two states of a window from a field; `None` where they come nearest too far from it, or are lost.
pub(super) fn anticrossing(
    window: &Window,
    order: usize,
    start: (&Pencil, f64),
    pair: [&Eigenpair; 2],
) -> Option<Anticrossing> {
    let design = start.1;
    let mut field = design;
    let mut pencil = start.0.clone();
    let mut pair = pair.map(Clone::clone);
    for _ in 0..MOST_STEPS {
        let z = |i: usize, j: usize| moment(&pencil, &pair[i], &pair[j]);
        let bottom_nm = window.bottom_nm();
        let heights_nm = [z(0, 0) + bottom_nm, z(1, 1) + bottom_nm];
        let apart_nm = heights_nm[0] - heights_nm[1];
        let mixed_nm = 2.0 * z(0, 1);
        let gap_ev = pair[0].value - pair[1].value;
        let reach_nm2 = apart_nm * apart_nm + mixed_nm * mixed_nm;
        let step = -gap_ev * apart_nm / reach_nm2;
        if !step.is_finite() {
            return None;
        }
        if step.abs() * reach_nm2.sqrt() < LAST_STEP_EV {
            return Some(Anticrossing {
                field_v_per_nm: field,
                gap_ev: gap_ev.abs(),
            });
        }
        let longest = LONGEST_STEP * design.abs();
        let step = step.clamp(-longest, longest);
        field += step;
        if (field - design).abs() > FURTHEST * design.abs() {
            return None;
        }
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
