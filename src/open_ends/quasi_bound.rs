//! Quasi-bound states: complex energies E − iΓ/2 of outgoing waves (Gamow 1928, Siegert 1939).

use super::line::{
    Line, MAX_HALVINGS, Outside, PATH_ANGLE, Plan, falling_is_upper, is_tilted, lead, leads_ev,
};
use super::moment::integrate;
use super::search::{Wanted, upward};
use crate::constants::{H_EV_PER_THZ, HBAR2_OVER_2M0};
use crate::models::BandOperator;
use crate::numerics::complex_banded::C64;
use crate::numerics::mesh::Mesh;
use crate::numerics::outgoing::{Outgoing, Region, Work, refine};
use crate::numerics::pencil::Pencil;
use crate::subbands;

/// A wave that leaves within ħ over this, 7 fs, was never held: no level.
pub const WIDEST_EV: f64 = 0.1;
/// Nor is one that leaves this many times within the time in which an electron of the highest edge's energy crosses the
/// stack. Inside such a wave grows towards the ends by e to half of this power, and more where it is slow: for much more
/// there are no digits.
const FASTEST_OF_CROSSING: f64 = 3.0;
/// Levels are looked for up to this far above the highest band edge of the stack.
const ABOVE_EDGES_EV: f64 = 0.1;
/// A narrower width is not told from none.
pub const NARROWEST_EV: f64 = 1e-60;
/// States are looked for this far above the real axis, where none can be: the border of the search passes there.
const CLEAR_EV: f64 = 5e-3;
/// Borders of the search keep this distance from band edges of leads, where k vanishes.
const FROM_EDGE_EV: f64 = 1e-9;
/// The order of the elements; the error estimate takes the higher one.
const ORDERS: [usize; 2] = [12, 14];
/// The path leaves the real line where a wave has fallen by e to this power, at the latest.
const DEEPEST: f64 = 350.0;
/// An energy is exact to this, a tenth of the last digit that is printed of walls' levels.
const ENERGY_TOLERANCE_EV: f64 = 1e-9;
/// A width is exact to this part of it.
const WIDTH_TOLERANCE: f64 = 1e-6;

/// A search ends when it has factored this many rows: some ten seconds.
const MOST_ROWS: usize = 30_000_000;
/// Elements half as long take this many times the work, with a margin.
const FINER: usize = 3;

/// One state that may leave.
#[derive(Clone, Debug)]
pub struct QuasiBound {
    pub energy_ev: f64,
    /// Estimated discretisation error of the energy.
    pub error_ev: f64,
    /// ħ times the rate at which the state leaves; 0 for a bound state.
    pub width_ev: f64,
    /// Estimated discretisation error of the width, as a part of it.
    pub width_error: f64,
    /// The part of the width that is due to each end: through the bottom, and through the top.
    pub partial_widths_ev: [f64; 2],
    /// Whether the state lies below both flat ends and cannot leave at all.
    pub bound: bool,
    /// As of a state between walls, of the part inside the stack.
    pub in_plane_mass_m0: f64,
    pub centre_nm: f64,
    pub extent_nm: f64,
    pub layer: usize,
    pub layer_share: f64,
}

impl QuasiBound {
    /// ħ/Γ in ps. `None` for a state that cannot leave, or so slowly that nothing is told of it.
    pub fn lifetime_ps(&self) -> Option<f64> {
        (self.width_ev > NARROWEST_EV)
            .then(|| H_EV_PER_THZ / (2.0 * std::f64::consts::PI * self.width_ev))
    }
}

/// The quasi-bound states of a stack.
#[derive(Clone, Debug)]
pub struct QuasiBoundStates {
    /// Ascending in energy.
    pub states: Vec<QuasiBound>,
    /// The same as outgoing waves on one line.
    pub outgoing: Vec<Outgoing>,
    pub line: Line,
    /// The lowest band edge of the stack, the field included.
    pub floor_ev: f64,
    /// The energy up to which states were looked for.
    pub top_ev: f64,
    /// States up to this width were looked for.
    pub widest_ev: f64,
    /// The edges of flat leads below and above; `None` where the field goes on.
    pub leads_ev: Option<[f64; 2]>,
    /// States that the argument principle counts, and those found; with some above those listed.
    pub counted: usize,
    pub found: usize,
    /// False when the search ended early, at `top_ev`, because it would have taken too long.
    pub complete: bool,
    /// The worst disagreement of the widths as flux and as −2 Im E, relative, where both have digits.
    pub width_deviation: f64,
}

/// The states wanted that are no wider than [`QuasiBoundStates::widest_ev`], up to a little above the highest band edge;
/// in a field up to the edge of the end that it raises.
pub fn quasi_bound(operator: &BandOperator, outside: Outside, wanted: &Wanted) -> QuasiBoundStates {
    on_path(operator, outside, wanted, PATH_ANGLE)
}

/// As [`quasi_bound`], with the angle by which the path outside leaves the real line.
pub fn on_path(
    operator: &BandOperator,
    outside: Outside,
    wanted: &Wanted,
    angle: f64,
) -> QuasiBoundStates {
    let tilted = is_tilted(operator, outside);
    let [floor_ev, ceiling_ev] = edges_ev(operator);
    let ends_ev = leads_ev(operator);
    let mut top_ev = (ceiling_ev + ABOVE_EDGES_EV).min(wanted.range_ev[1]);
    if tilted {
        // Above the raised end a wave runs up the slope outside and comes back: no state of the stack.
        top_ev = top_ev.min(ends_ev[usize::from(!falling_is_upper(operator))]);
    }
    let mut plan = Plan::new(operator, outside, [floor_ev, top_ev], [0.0; 2], angle);
    let widest_ev = widest_ev(operator, [floor_ev, ceiling_ev]);
    let bottom_ev = (floor_ev - CLEAR_EV).max(wanted.range_ev[0]);
    let regions = regions([bottom_ev, top_ev], widest_ev, (!tilted).then_some(ends_ev));
    let mut halvings = 0;
    let mut worst_before = f64::INFINITY;
    let mut work = Work { left: MOST_ROWS };
    loop {
        let before = work.left;
        let line = plan.line(ORDERS[0]);
        let walls = between_walls(operator, &plan);
        let mut searched = upward(&line, &walls, &regions, wanted.states, &mut work);
        let found = searched.states.len();
        searched.states.truncate(wanted.states);
        let describe = |outgoing: &Outgoing| {
            let bound = !tilted && outgoing.value.re < ends_ev[0].min(ends_ev[1]);
            one(operator, (&plan, &line), outgoing, bound, (outside, angle))
        };
        let described: Vec<(QuasiBound, f64)> = searched.states.iter().map(describe).collect();
        // How far the worst state is from what is asked of it.
        let worst = described
            .iter()
            .map(|(state, _)| {
                (state.error_ev / ENERGY_TOLERANCE_EV).max(state.width_error / WIDTH_TOLERANCE)
            })
            .fold(0.0, f64::max);
        let affordable = work.left > FINER * (before - work.left);
        // What more elements do not mend is rounding.
        if worst < 1.0 || worst > 0.5 * worst_before || halvings == MAX_HALVINGS || !affordable {
            let deviations = described.iter().map(|(_, deviation)| *deviation);
            return QuasiBoundStates {
                width_deviation: deviations.fold(0.0, f64::max),
                states: described.into_iter().map(|(state, _)| state).collect(),
                found,
                outgoing: searched.states,
                line,
                floor_ev,
                top_ev: searched.top_ev,
                widest_ev,
                leads_ev: (!tilted).then_some(ends_ev),
                counted: searched.counted,
                complete: searched.complete,
            };
        }
        worst_before = worst;
        plan = plan.finer();
        halvings += 1;
    }
}

/// The lowest and the highest band edge of the stack, the field included, at faces and inside of grades.
pub fn edges_ev(operator: &BandOperator) -> [f64; 2] {
    let stack = operator.stack();
    let faces = stack.faces_nm();
    let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
    for (layer, bottom) in faces.iter().enumerate().take(stack.layers.len()) {
        for step in 0..=8 {
            let t = f64::from(step) / 8.0;
            let edge = operator
                .at(layer, t, bottom + t * stack.layers[layer].width_nm)
                .constant;
            (low, high) = (low.min(edge), high.max(edge));
        }
    }
    [low, high]
}

/// The width beyond which a state is none.
fn widest_ev(operator: &BandOperator, [floor_ev, ceiling_ev]: [f64; 2]) -> f64 {
    let a = operator.at(0, 0.0, 0.0).a(ceiling_ev);
    let speed_ev_nm = 2.0 * (a * (ceiling_ev - floor_ev)).sqrt();
    let crossing_ev = FASTEST_OF_CROSSING * speed_ev_nm / operator.stack().total_width_nm();
    // Where all is flat nothing is held, whatever the limit.
    if crossing_ev > 0.0 {
        WIDEST_EV.min(crossing_ev)
    } else {
        WIDEST_EV
    }
}

/// The parts of the complex plane to search: between the edges of the leads, where other ends are open.
fn regions(
    [bottom_ev, top_ev]: [f64; 2],
    widest_ev: f64,
    leads_ev: Option<[f64; 2]>,
) -> Vec<Region> {
    let part = |low: f64, high: f64, depth: f64| Region {
        low,
        high,
        bottom: -depth,
        top: CLEAR_EV,
    };
    let Some([a, b]) = leads_ev else {
        return vec![part(bottom_ev, top_ev, 0.5 * widest_ev)];
    };
    let (first, second) = (a.min(b), a.max(b));
    let mut list = Vec::new();
    let borders = [
        (bottom_ev, first, CLEAR_EV),
        (first, second, 0.5 * widest_ev),
        (second, top_ev, 0.5 * widest_ev),
    ];
    for (low, high, depth) in borders {
        let (low, high) = (low.max(bottom_ev), high.min(top_ev));
        if high - low > 4.0 * FROM_EDGE_EV {
            list.push(part(low + FROM_EDGE_EV, high - FROM_EDGE_EV, depth));
        }
    }
    list
}

/// The stack between walls at its ends, whose levels are the first guesses.
fn between_walls(operator: &BandOperator, plan: &Plan) -> Pencil {
    let layers = &operator.stack().layers;
    let lengths: Vec<f64> = layers.iter().map(|layer| layer.width_nm).collect();
    let mesh = Mesh::new(&lengths, &plan.layer_pieces(), ORDERS[0]);
    subbands::on_mesh(operator, mesh, 1).pencil
}

/// How far the real line must go on at the end that the field lowers for a state to run free there.
fn free_from_nm(operator: &BandOperator, energy_ev: f64) -> f64 {
    let end = lead(operator, falling_is_upper(operator));
    let a = end.a(energy_ev);
    let slope = operator.stack().field_v_per_nm.abs() / a;
    let square = (end.constant - energy_ev) / a;
    if square <= 0.0 {
        return 0.0;
    }
    let cube = square.powf(1.5) - 1.5 * DEEPEST * slope;
    let left = if cube > 0.0 {
        cube.powf(2.0 / 3.0)
    } else {
        -slope.powf(2.0 / 3.0)
    };
    (square - left) / slope
}

/// A state in full, and by how much its width as flux and as −2 Im E disagree.
fn one(
    operator: &BandOperator,
    (plan, line): (&Plan, &Line),
    outgoing: &Outgoing,
    bound: bool,
    (outside, angle): (Outside, f64),
) -> (QuasiBound, f64) {
    let energy_ev = outgoing.value.re;
    let reach_nm = if is_tilted(operator, outside) && outgoing.value.im > -1e-3 {
        free_from_nm(operator, energy_ev)
    } else {
        0.0
    };
    let own;
    let plan = if reach_nm > 0.0 {
        let mut reach = [0.0; 2];
        reach[usize::from(falling_is_upper(operator))] = reach_nm;
        own = plan.reaching(reach, energy_ev, (outside, angle));
        &own
    } else {
        plan
    };
    let solved = ORDERS.map(|order| {
        let line_here = plan.line(order);
        let start = line_here.carry(line, &outgoing.vector);
        let state = refine(&line_here.pencil, outgoing.value, Some(&start))
            .filter(|state| (state.value - outgoing.value).norm() < 1e-4);
        state.map(|state| {
            let rates = line_here
                .pencil
                .escape_rates(state.value, &state.vector, line_here.real);
            let partial = rates.map(|rate| (2.0 * rate).max(0.0));
            (line_here, state, partial)
        })
    });
    let [Some((own_line, state, partial)), finer] = solved else {
        let fallback = line
            .pencil
            .escape_rates(outgoing.value, &outgoing.vector, line.real);
        let partial = fallback.map(|rate| (2.0 * rate).max(0.0));
        let described = describe(
            line,
            outgoing,
            (bound, partial),
            (f64::INFINITY, f64::INFINITY),
        );
        return (described, 0.0);
    };
    let width = |partial: [f64; 2]| partial[0] + partial[1];
    let errors = finer.map_or((f64::INFINITY, f64::INFINITY), |(_, other, fine)| {
        (
            (other.value.re - state.value.re).abs(),
            if width(partial) > NARROWEST_EV {
                (width(fine) / width(partial) - 1.0).abs()
            } else {
                0.0
            },
        )
    });
    let flux = width(partial);
    // −2 Im E has digits where it is far above the rounding of E.
    let deviation = if !bound && flux > 1e-6 {
        (-2.0 * state.value.im / flux - 1.0).abs()
    } else {
        0.0
    };
    (
        describe(&own_line, &state, (bound, partial), errors),
        deviation,
    )
}

/// What is known of a state on a line that reaches to where its flux is taken.
fn describe(
    line: &Line,
    state: &Outgoing,
    (bound, partial): (bool, [f64; 2]),
    (error_ev, width_error): (f64, f64),
) -> QuasiBound {
    let pencil = &line.pencil;
    let p = pencil.mesh.order();
    let value = state.value;
    let count = pencil.mesh.elements.len();
    let mut density = vec![0.0; count * (p + 1)];
    for e in line.stack[0]..line.stack[1] {
        let slopes = pencil.slopes(e, &state.vector);
        for (q, node) in pencil.at(e).iter().enumerate() {
            let along = node.divided(value, value.conj()).re * slopes[q].norm_sqr();
            density[e * (p + 1) + q] = state.vector[e * p + q].norm_sqr() + along;
        }
    }
    let inside = |f: &dyn Fn(usize, usize) -> f64| integrate(pencil, line.stack, f);
    let norm = inside(&|e, q| density[e * (p + 1) + q]);
    let z = |e: usize, q: usize| line.position_nm(e, q).re;
    let centre_nm = inside(&|e, q| density[e * (p + 1) + q] * z(e, q)) / norm;
    let variance = inside(&|e, q| density[e * (p + 1) + q] * (z(e, q) - centre_nm).powi(2)) / norm;
    let kinetic = inside(&|e, q| {
        pencil.at(e)[q].a(C64::from(value.re)).re * state.vector[e * p + q].norm_sqr()
    }) / norm;
    let first = pencil.mesh.elements[line.stack[0]].segment;
    let last = pencil.mesh.elements[line.stack[1] - 1].segment;
    let mut shares = vec![0.0; last + 1 - first];
    for e in line.stack[0]..line.stack[1] {
        shares[pencil.mesh.elements[e].segment - first] +=
            integrate(pencil, [e, e + 1], |e, q| density[e * (p + 1) + q]) / norm;
    }
    let (layer, layer_share) = shares
        .iter()
        .copied()
        .enumerate()
        .max_by(|a, b| a.1.total_cmp(&b.1))
        .unwrap_or((0, 0.0));
    let partial = if bound { [0.0; 2] } else { partial };
    QuasiBound {
        energy_ev: value.re,
        error_ev,
        width_ev: partial[0] + partial[1],
        width_error: if bound { 0.0 } else { width_error },
        partial_widths_ev: partial,
        bound,
        in_plane_mass_m0: HBAR2_OVER_2M0 / kinetic,
        centre_nm,
        extent_nm: variance.max(0.0).sqrt(),
        layer,
        layer_share,
    }
}
