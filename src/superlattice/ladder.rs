//! The ladder of levels of a cascade: states come in families, one of each in every module, and a period along growth
//! changes the energy by e F d exactly (Wannier, Phys. Rev. 117, 432 (1960)).
//!
//! One module in a window of modules stands for all. A state belongs to the module that its centre lies in. It is taken
//! for a state of the ladder when the module before holds the same envelope at the energy that the ladder demands; what
//! the window's ends make, and what spreads over the continuum, has no such partner.

use super::anticrossing::{Anticrossing, anticrossing};
use super::window::{Neighbours, Window};
use crate::models::BandOperator;
use crate::numerics::eigenpairs::{Eigenpair, improvements};
use crate::optics::transitions;
use crate::subbands::{Accuracy, Subbands, amplitudes};
use std::collections::BTreeMap;

/// Orders of the elements, and by how much the order is raised to tell the error.
const ORDERS: [usize; 2] = [8, 12];
const ORDER_STEP: usize = 2;
const MOST_HALVINGS: usize = 2;
/// Modules before the one that counts: the one before needs a neighbour on either side as well.
const UPSTREAM: usize = 2;
/// Modules behind it that are tried. A state that can leave meets states there that depend on where the window ends; where
/// it happens to meet one at its own energy it is split in two, and missed. Another end moves them.
const DOWNSTREAM: [usize; 3] = [1, 2, 3];
/// Neighbours on either side that are tried where the states spread beyond a window: in a weak field, or a superlattice.
const SPREAD: [usize; 3] = [5, 10, 20];
/// They reach no further than this: beyond, the time goes into states that nobody asked for.
const FARTHEST_EV: f64 = 1.0;
const FARTHEST_NM: f64 = 1000.0;
/// States that spread over more than this part of a module may need them …
const WIDE_STATE: f64 = 0.5;
/// … when two more modules move a level by more than this, in eV …
const UNSETTLED_EV: f64 = 1e-8;
/// … and are of use when they bring that down to this part.
const BETTER: f64 = 0.1;
/// Sums of energies differ by more than this, in eV, where a state is missed.
const MISSED_EV: f64 = 1e-3;
/// A state of the ladder finds itself in the module before with more than this overlap, as more than half of it …
const SAME: f64 = 0.707;
/// … and at most this far from e F d higher, in eV …
const OFF_LADDER_EV: f64 = 3e-3;
/// … and in parts of e F d, so that no state is taken for its own partner.
const OFF_LADDER: f64 = 0.3;
/// Levels nearer than this are followed to where they come nearest, in eV.
const ALIGNED_EV: f64 = 1e-2;

/// A module's stack in the field.
#[derive(Clone, Copy, Debug)]
pub struct Module<'s> {
    /// Of the layers of one module.
    pub operator: &'s BandOperator<'s>,
    pub field_v_per_nm: f64,
}

/// One state of a module.
#[derive(Clone, Debug, PartialEq)]
pub struct LadderState {
    /// The field's energy is zero at the lower face of the module.
    pub energy_ev: f64,
    pub from_edge_ev: f64,
    pub error_ev: f64,
    pub in_plane_mass_m0: f64,
    /// Above the lower face of the module.
    pub centre_nm: f64,
    pub extent_nm: f64,
    /// The layer of the module, or of a neighbour, that holds most of the state.
    pub layer: usize,
    pub layer_share: f64,
    /// The part of the state inside of its module.
    pub module_share: f64,
    /// How far the same state of the module before is from where the ladder demands.
    pub ladder_residual_ev: f64,
    /// How far two more modules in the window move the level: what leaves downstream makes it depend on them.
    pub window_shift_ev: f64,
}

/// Light between two states, in one module or from one module down to the next.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LadderTransition {
    /// Numbers of the states, from 0: the lower level first.
    pub from: usize,
    pub to: usize,
    /// Whether `from` belongs to the next module downstream.
    pub to_next_module: bool,
    pub energy_ev: f64,
    pub dipole_nm: f64,
    pub oscillator_strength: f64,
    pub overlap: f64,
}

impl LadderTransition {
    pub fn wavelength_um(&self) -> f64 {
        crate::constants::HC_EV_UM / self.energy_ev
    }
}

/// Two levels of the ladder that come near each other.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Alignment {
    /// A state of a module, and one of the same or of the next module downstream; from 0.
    pub upstream: usize,
    pub downstream: usize,
    pub next_module: bool,
    /// The first level less the second, in the field of the file.
    pub detuning_ev: f64,
    pub dipole_nm: f64,
    pub overlap: f64,
    /// `None` where they come nearest too far from the field of the file.
    pub anticrossing: Option<Anticrossing>,
}

/// The levels of a cascade's module.
#[derive(Clone, Debug)]
pub struct Ladder {
    pub period_nm: f64,
    pub field_v_per_nm: f64,
    /// What an electron loses from module to module: positive.
    pub drop_ev: f64,
    /// Whether electrons lose it along the growth direction.
    pub along_growth: bool,
    pub states: Vec<LadderState>,
    pub transitions: Vec<LadderTransition>,
    pub alignments: Vec<Alignment>,
    /// States centred in the module, below its highest edge, that are not on the ladder.
    pub left_out: usize,
    /// Modules in the window.
    pub modules: usize,
    /// Squared envelopes of the states and the band edge: height above the module's lower face in nm, 1/nm or eV.
    pub envelopes: Vec<Vec<[f64; 2]>>,
    pub edge: Vec<[f64; 2]>,
}

/// What a window says of its module.
struct Solved {
    subbands: Subbands,
    /// States of the module, and the same in the one before: numbers of pairs of `subbands`.
    families: Vec<[usize; 2]>,
    left_out: usize,
}

/// The `count` lowest states of a module, or as many as there are on the ladder: from the narrowest window that misses
/// none that another one shows.
pub fn ladder(module: Module, count: usize, accuracy: Accuracy) -> Ladder {
    let tried = DOWNSTREAM.map(|downstream| {
        let neighbours = Neighbours {
            upstream: UPSTREAM,
            downstream,
        };
        (neighbours, accurate(module, neighbours, count, accuracy))
    });
    let most = tried.iter().map(|(_, t)| t.solved.families.len()).max();
    let sum_ev = |tried: &Tried| {
        let own = tried.solved.families.iter();
        own.map(|[own, _]| tried.solved.subbands.pairs[*own].value)
            .sum::<f64>()
    };
    let full = || {
        let full = tried.iter();
        full.filter(|(_, t)| Some(t.solved.families.len()) == most)
    };
    let least_ev = full().map(|(_, t)| sum_ev(t)).fold(f64::INFINITY, f64::min);
    let best = full()
        .find(|(_, t)| sum_ev(t) < least_ev + MISSED_EV)
        .unwrap_or(&tried[0]);
    let mut found = described(module, best.0, &best.1);
    for each_side in SPREAD {
        let spread = |s: &LadderState| s.extent_nm > WIDE_STATE * found.period_nm;
        // In a weak field; else there is a state or two that leave.
        let all_spread = found.states.iter().all(spread);
        let settled = found.worst_shift_ev(count) < UNSETTLED_EV && !found.states.is_empty();
        let away = each_side as f64;
        let in_reach = away * found.drop_ev < FARTHEST_EV && away * found.period_nm < FARTHEST_NM;
        let needed = all_spread || found.states.iter().any(spread);
        if settled || !needed || !in_reach {
            break;
        }
        let neighbours = Neighbours {
            upstream: each_side,
            downstream: each_side,
        };
        let wider = ladder_in(module, neighbours, count, accuracy);
        let common = found.states.len().min(wider.states.len());
        let better =
            common > 0 && wider.worst_shift_ev(common) <= BETTER * found.worst_shift_ev(common);
        let complete = all_spread || common == found.states.len();
        if found.states.is_empty() || (better && complete) {
            found = wider;
        } else if !all_spread {
            break;
        }
    }
    found
}

impl Ladder {
    /// The most that two more modules in the window move one of the lowest levels.
    fn worst_shift_ev(&self, lowest: usize) -> f64 {
        let lowest = self.states.iter().take(lowest);
        lowest.map(|s| s.window_shift_ev).fold(0.0, f64::max)
    }
}

/// As [`ladder`], with so many neighbours in the window; at least two before the module and one behind it.
pub fn ladder_in(
    module: Module,
    neighbours: Neighbours,
    count: usize,
    accuracy: Accuracy,
) -> Ladder {
    let tried = accurate(module, neighbours, count, accuracy);
    described(module, neighbours, &tried)
}

/// How far two more modules move each level.
fn window_shifts(module: Module, neighbours: Neighbours, tried: &Tried) -> Vec<f64> {
    let wider = Neighbours {
        upstream: neighbours.upstream + 1,
        downstream: neighbours.downstream + 1,
    };
    let wide = Window::new(module.operator, wider, module.field_v_per_nm);
    let pencil = wide.pencil(module.field_v_per_nm, tried.order);
    let families = tried.solved.families.iter();
    families
        .map(|[own, _]| {
            let level_ev = tried.solved.subbands.pairs[*own].value;
            let near = wide.states(&pencil, [level_ev - SEARCHED_EV, level_ev + SEARCHED_EV]);
            let distances = near.iter().map(|pair| (pair.value - level_ev).abs());
            distances.fold(SEARCHED_EV, f64::min)
        })
        .collect()
}

/// How far a level is looked for in the wide window, in eV.
const SEARCHED_EV: f64 = 3e-3;

/// A window that was solved on elements that are fine enough.
struct Tried<'s> {
    window: Window<'s>,
    order: usize,
    solved: Solved,
}

fn accurate<'s>(
    module: Module<'s>,
    neighbours: Neighbours,
    count: usize,
    accuracy: Accuracy,
) -> Tried<'s> {
    let mut window = Window::new(module.operator, neighbours, module.field_v_per_nm);
    let mut halvings = 0;
    loop {
        for order in ORDERS {
            let solved = solve(module, &window, count, order);
            let errors = solved.subbands.errors_ev.iter().copied();
            let last = halvings == MOST_HALVINGS && order == ORDERS[1];
            if errors.fold(0.0, f64::max) <= accuracy.tolerance_ev || last {
                return Tried {
                    window,
                    order,
                    solved,
                };
            }
        }
        window.halve();
        halvings += 1;
    }
}

/// One period downstream, in periods along growth.
fn downstream(field_v_per_nm: f64) -> isize {
    if field_v_per_nm < 0.0 { 1 } else { -1 }
}

fn solve(module: Module, window: &Window, count: usize, order: usize) -> Solved {
    let field = module.field_v_per_nm;
    let drop_ev = field.abs() * window.period_nm;
    let pencil = window.pencil(field, order);
    let [low_ev, high_ev] = window.middle_edges_ev(&pencil);
    let states = window.states(&pencil, [low_ev, high_ev + drop_ev]);
    let in_plane = window.in_plane(&pencil);
    let all = Subbands::of_conduction(module.operator.band(), pencil, states, Vec::new(), in_plane);
    let own: Vec<usize> = (0..all.pairs.len())
        .filter(|index| all.pairs[*index].value <= high_ev && centred(window, &all, *index))
        .collect();
    let mut chosen = matched(window, &all, &own, drop_ev, -downstream(field));
    chosen.truncate(count);
    let top = chosen.last().map_or(0, |family| family[0]);
    let left_out = own.iter().filter(|index| **index < top).count() + 1 - chosen.len().max(1);
    // Only what counts is kept.
    let mut numbers: BTreeMap<usize, usize> = BTreeMap::new();
    for index in chosen.iter().flatten() {
        numbers.insert(*index, 0);
    }
    for (place, number) in numbers.values_mut().enumerate() {
        *number = place;
    }
    let pairs: Vec<Eigenpair> = numbers.keys().map(|k| all.pairs[*k].clone()).collect();
    let finer = window.pencil(field, order + ORDER_STEP);
    let in_plane = window.in_plane(&all.pencil);
    let errors = improvements(&all.pencil, &pairs, &finer);
    let errors_ev = errors.into_iter().map(f64::abs).collect();
    Solved {
        subbands: Subbands::of_conduction(all.band, all.pencil, pairs, errors_ev, in_plane),
        families: chosen.iter().map(|f| f.map(|k| numbers[&k])).collect(),
        left_out,
    }
}

/// Whether a state's centre lies in the module. A border belongs to the module above it.
fn centred(window: &Window, all: &Subbands, index: usize) -> bool {
    let pair = &all.pairs[index];
    let z_nm = crate::numerics::sensitivity::moment(&all.pencil, pair, pair) + window.bottom_nm();
    (0.0..window.period_nm).contains(&z_nm)
}

/// The states of a module with the same ones of the module before, `upstream` periods along growth, in the order of energy.
/// The likest find each other first, and none is taken twice: of a state that is split in two only one half counts.
fn matched(
    window: &Window,
    all: &Subbands,
    own: &[usize],
    drop_ev: f64,
    upstream: isize,
) -> Vec<[usize; 2]> {
    let mut likenesses: Vec<(f64, [usize; 2])> = Vec::new();
    let furthest_ev = OFF_LADDER_EV.min(OFF_LADDER * drop_ev);
    for &index in own {
        let wanted_ev = all.pairs[index].value + drop_ev;
        for (before, pair) in all.pairs.iter().enumerate() {
            if (pair.value - wanted_ev).abs() < furthest_ev {
                let state = &all.pairs[index];
                let overlap = window.overlap_moved(&all.pencil, state, pair, upstream);
                likenesses.push((overlap.abs(), [index, before]));
            }
        }
    }
    likenesses.retain(|(overlap, _)| *overlap > SAME);
    likenesses.sort_by(|a, b| b.0.total_cmp(&a.0));
    let mut found: Vec<[usize; 2]> = Vec::new();
    for (_, family) in likenesses {
        if found.iter().all(|f| f[0] != family[0] && f[1] != family[1]) {
            found.push(family);
        }
    }
    found.sort();
    found
}

fn described(module: Module, neighbours: Neighbours, tried: &Tried) -> Ladder {
    let Tried {
        window,
        order,
        solved,
    } = tried;
    let order = *order;
    let shifts = window_shifts(module, neighbours, tried);
    let Solved {
        subbands,
        families,
        left_out,
    } = solved;
    let field = module.field_v_per_nm;
    let drop_ev = field.abs() * window.period_nm;
    let bottom_nm = window.bottom_nm();
    let [low_ev, _] = window.middle_edges_ev(&subbands.pencil);
    let known = subbands.states();
    let amplitudes = amplitudes(subbands);
    let nodes = order + 1;
    let states = families.iter().zip(&shifts).map(|([own, before], shift)| {
        let state = &known[*own];
        let inside = subbands.pencil.mesh.elements.iter().enumerate();
        let module_share = inside
            .filter(|(_, element)| window.module_of(element.segment) == Some(0))
            .flat_map(|(e, _)| &amplitudes[*own][e * nodes..(e + 1) * nodes])
            .map(|a| a * a)
            .sum();
        LadderState {
            energy_ev: state.energy_ev,
            from_edge_ev: state.energy_ev - low_ev,
            error_ev: state.error_ev,
            in_plane_mass_m0: state.in_plane_mass_m0,
            centre_nm: state.centre_nm + bottom_nm,
            extent_nm: state.extent_nm,
            layer: window.layer_of(state.layer),
            layer_share: state.layer_share,
            module_share,
            ladder_residual_ev: known[*before].energy_ev - state.energy_ev - drop_ev,
            window_shift_ev: *shift,
        }
    });
    let states: Vec<LadderState> = states.collect();
    let transitions = transitions(subbands);
    let between = |a: usize, b: usize| {
        let ends = [a.min(b), a.max(b)];
        transitions.iter().find(|t| [t.from, t.to] == ends)
    };
    let mut list = Vec::new();
    let mut alignments = Vec::new();
    let start = (&subbands.pencil, field);
    let mut align = |upstream: usize, downstream: usize, next_module: bool| {
        let [a, b] = [
            families[upstream][usize::from(next_module)],
            families[downstream][0],
        ];
        let (first, second) = (&subbands.pairs[a], &subbands.pairs[b]);
        let detuning_ev = first.value - second.value;
        if detuning_ev.abs() < ALIGNED_EV && a != b {
            let joint = between(a, b);
            alignments.push(Alignment {
                upstream,
                downstream,
                next_module,
                detuning_ev,
                dipole_nm: joint.map_or(0.0, |t| t.dipole_nm),
                overlap: joint.map_or(0.0, |t| t.overlap),
                anticrossing: anticrossing(window, order, start, [first, second]),
            });
        }
    };
    for upper in 0..families.len() {
        for lower in 0..families.len() {
            if lower > upper {
                align(upper, lower, false);
            }
            if lower != upper {
                align(upper, lower, true);
            }
            for next in [false, true] {
                let [a, b] = [families[upper][usize::from(next)], families[lower][0]];
                let falls = subbands.pairs[a].value > subbands.pairs[b].value;
                if let Some(t) = between(a, b).filter(|_| falls) {
                    list.push(LadderTransition {
                        from: lower,
                        to: upper,
                        to_next_module: next,
                        energy_ev: t.energy_ev,
                        dipole_nm: t.dipole_nm,
                        oscillator_strength: t.oscillator_strength,
                        overlap: t.overlap,
                    });
                }
            }
        }
    }
    list.sort_by_key(|t| (t.to_next_module, t.from, t.to));
    Ladder {
        period_nm: window.period_nm,
        field_v_per_nm: field,
        drop_ev,
        along_growth: downstream(field) > 0,
        states,
        transitions: list,
        alignments,
        left_out: *left_out,
        modules: window.modules,
        envelopes: families
            .iter()
            .map(|[own, _]| envelope(subbands, *own, bottom_nm))
            .collect(),
        edge: edge(window, subbands, bottom_nm),
    }
}

/// Points at which an element is sampled, per polynomial order.
const SAMPLES_PER_ORDER: usize = 3;

/// The squared envelope of the conduction band, in 1/nm.
fn envelope(subbands: &Subbands, index: usize, bottom_nm: f64) -> Vec<[f64; 2]> {
    let mesh = &subbands.pencil.mesh;
    let samples = SAMPLES_PER_ORDER * mesh.order();
    let shares: Vec<f64> = (0..=samples).map(|k| k as f64 / samples as f64).collect();
    let places: Vec<f64> = shares.iter().map(|share| 2.0 * share - 1.0).collect();
    let matrix = mesh.reference.interpolation(&places);
    let mut points = Vec::new();
    for (e, element) in mesh.elements.iter().enumerate() {
        let values = mesh.local(e, &subbands.pairs[index].vector);
        for (row, share) in matrix.chunks_exact(values.len()).zip(&shares) {
            let value: f64 = row.iter().zip(values).map(|(m, v)| m * v).sum();
            let z_nm = bottom_nm + element.start + share * element.length;
            points.push([z_nm, value * value]);
        }
    }
    points
}

/// The band edge of the module, in eV.
fn edge(window: &Window, subbands: &Subbands, bottom_nm: f64) -> Vec<[f64; 2]> {
    let pencil = &subbands.pencil;
    let middle = window.middle();
    let own = pencil.mesh.elements.iter().enumerate();
    own.filter(|(_, element)| middle.contains(&element.segment))
        .flat_map(|(e, element)| {
            let nodes = pencil.at(e).iter().enumerate();
            nodes.map(move |(q, c)| [bottom_nm + pencil.mesh.position(element, q), c.constant])
        })
        .collect()
}
