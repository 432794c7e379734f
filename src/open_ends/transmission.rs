//! The part of an electron stream that crosses a stack between flat leads.
//!
//! A wave of unit amplitude comes in from below; with the leads as boundary terms T(E) ψ = −2 i A k at the lowest node,
//! and the part that crosses is |ψ(top)|² (A k)_top/(A k)_bottom, that which comes back |ψ(bottom) − 1|² (quantum
//! transmitting boundaries: Lent & Kirkner, J. Appl. Phys. 67, 6353 (1990)). Both directions give the same.

use super::line::{Line, MAX_HALVINGS, Outside, PATH_ANGLE, Plan, lead, leads_ev};
use super::quasi_bound::{QuasiBound, QuasiBoundStates, edges_ev, quasi_bound};
use super::search::Wanted;
use crate::models::BandOperator;
use crate::numerics::complex_banded::{C64, I, ONE, ZERO};
use crate::numerics::open_pencil::conductance;
use crate::numerics::pencil::Coefficient;

/// What happens to a stream of one energy.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Point {
    pub energy_ev: f64,
    /// The part that crosses; 0 where a lead has no states.
    pub crossing: f64,
    /// The part that comes back.
    pub returning: f64,
}

/// A peak of the transmission.
#[derive(Clone, Debug)]
pub struct Resonance {
    pub state: QuasiBound,
    /// The highest part that crosses within its width.
    pub peak: f64,
}

/// A whole curve.
#[derive(Clone, Debug)]
pub struct Transmission {
    /// Ascending in energy.
    pub points: Vec<Point>,
    /// Quasi-bound states inside the range that show as a peak, ascending in energy.
    pub resonances: Vec<Resonance>,
    /// Edges of the lower and of the upper lead.
    pub leads_ev: [f64; 2],
    /// The worst |T + R − 1| of the points.
    pub lost: f64,
    /// The worst difference of ln T to a finer discretisation, at energies across the range.
    pub error: f64,
    pub counted: usize,
    pub found: usize,
    /// The energy up to which resonances were looked for, where the range goes on above it.
    pub searched_ev: Option<f64>,
}

/// No more resonances are looked for in one curve.
const MOST_RESONANCES: usize = 100;
/// Points laid around each resonance, at both sides together.
const AROUND: i32 = 24;
/// Energies at which the discretisation is compared with a finer one.
const PROBES: usize = 24;
const ORDERS: [usize; 2] = [12, 14];
/// ln T is exact to this.
const TOLERANCE: f64 = 1e-9;
/// A peak narrower than this has its height from its two partial widths (Breit & Wigner, Phys. Rev. 49, 519 (1936)).
const NARROW_EV: f64 = 1e-9;

/// A peak rises by this part at least over the ends of its width; one that stands alone rises to twice them.
const PEAK: f64 = 0.01;

/// What crosses at given energies.
pub fn crossing(operator: &BandOperator, energies_ev: &[f64]) -> Vec<Point> {
    let [low_ev, high_ev] = range(energies_ev);
    let stack = Stream::settled(operator, [low_ev, high_ev]);
    energies_ev.iter().map(|e| stack.at(*e)).collect()
}

/// The curve from `low_ev` to `high_ev` at `count` equal steps and more around each resonance.
pub fn transmission(
    operator: &BandOperator,
    [low_ev, high_ev]: [f64; 2],
    count: usize,
) -> Transmission {
    let leads_ev = leads_ev(operator);
    let open_ev = leads_ev[0].max(leads_ev[1]);
    let wanted = Wanted {
        states: MOST_RESONANCES,
        range_ev: [low_ev.max(open_ev), high_ev],
    };
    let QuasiBoundStates {
        states,
        counted,
        found,
        complete,
        top_ev,
        ..
    } = quasi_bound(operator, Outside::Flat, &wanted);
    let stream = Stream::settled(operator, [low_ev, high_ev]);
    let inside: Vec<QuasiBound> = states
        .into_iter()
        .filter(|s| s.energy_ev > low_ev.max(open_ev) && s.energy_ev < high_ev)
        .collect();
    let mut energies_ev: Vec<f64> = (0..count)
        .map(|k| low_ev + (high_ev - low_ev) * k as f64 / (count - 1) as f64)
        .collect();
    for state in &inside {
        energies_ev.extend((-AROUND / 2..=AROUND / 2).map(|k| {
            let turn = std::f64::consts::PI * f64::from(k) / f64::from(AROUND + 2);
            state.energy_ev + 0.5 * state.width_ev * turn.tan()
        }));
    }
    energies_ev.retain(|e| *e >= low_ev && *e <= high_ev);
    energies_ev.sort_by(f64::total_cmp);
    energies_ev.dedup();
    let points: Vec<Point> = energies_ev.iter().map(|e| stream.at(*e)).collect();
    let lost = points
        .iter()
        .filter(|p| p.energy_ev > open_ev)
        .map(|p| (p.crossing + p.returning - 1.0).abs())
        .fold(0.0, f64::max);
    let resonances = inside
        .into_iter()
        .filter_map(|state| {
            let peak = stream.peak(&state)?;
            Some(Resonance { state, peak })
        })
        .collect();
    Transmission {
        points,
        resonances,
        leads_ev,
        lost,
        error: stream.error,
        counted,
        found,
        searched_ev: (!complete || found >= MOST_RESONANCES).then_some(top_ev),
    }
}

fn range(energies_ev: &[f64]) -> [f64; 2] {
    let low = energies_ev.iter().copied().fold(f64::INFINITY, f64::min);
    let high = energies_ev
        .iter()
        .copied()
        .fold(f64::NEG_INFINITY, f64::max);
    [low, high]
}

/// A stack between its leads, on elements that suit a range of energies.
struct Stream {
    line: Line,
    leads: [Coefficient; 2],
    error: f64,
}

impl Stream {
    fn settled(operator: &BandOperator, [low_ev, high_ev]: [f64; 2]) -> Stream {
        let leads = [false, true].map(|upper| lead(operator, upper));
        let open_ev = low_ev.max(leads[0].constant).max(leads[1].constant);
        let [floor_ev, _] = edges_ev(operator);
        let energies_ev = [floor_ev, high_ev];
        let mut plan = Plan::new(operator, Outside::Flat, energies_ev, [0.0; 2], PATH_ANGLE);
        let mut halvings = 0;
        loop {
            let [mut own, finer] = ORDERS.map(|order| Stream {
                line: plan.line(order),
                leads,
                error: 0.0,
            });
            own.error = (0..PROBES)
                .map(|k| open_ev + (high_ev - open_ev) * (k as f64 + 0.5) / PROBES as f64)
                .map(|e| (own.at(e).crossing / finer.at(e).crossing).ln().abs())
                .filter(|difference| difference.is_finite())
                .fold(0.0, f64::max);
            if own.error < TOLERANCE || halvings == MAX_HALVINGS {
                return own;
            }
            plan = plan.finer();
            halvings += 1;
        }
    }

    fn at(&self, energy_ev: f64) -> Point {
        let energy = C64::from(energy_ev);
        let [from, to] = self.leads.map(|lead| conductance(&lead, energy).0);
        let open = |lead: usize| energy_ev > self.leads[lead].constant;
        if !open(0) || !open(1) {
            return Point {
                energy_ev,
                crossing: 0.0,
                returning: 1.0,
            };
        }
        let mut psi = vec![ZERO; self.line.pencil.size()];
        psi[0] = -2.0 * I * from;
        self.line.pencil.factor(energy).solve(&mut psi);
        Point {
            energy_ev,
            crossing: psi[psi.len() - 1].norm_sqr() * to.re / from.re,
            returning: (psi[0] - ONE).norm_sqr(),
        }
    }

    /// The highest part that crosses within a width, by golden section. `None` when T only rises or falls there: a wide
    /// state that couples to one lead alone is background.
    fn peak(&self, state: &QuasiBound) -> Option<f64> {
        let [down, up] = state.partial_widths_ev;
        if state.width_ev < NARROW_EV {
            return Some(4.0 * down * up / state.width_ev.powi(2));
        }
        let golden = 0.5 * (5.0_f64.sqrt() - 1.0);
        let ends = [-0.5, 0.5].map(|part| state.energy_ev + part * state.width_ev);
        let [mut low, mut high] = ends;
        let mut best = self.at(state.energy_ev).crossing;
        for _ in 0..32 {
            let step = golden * (high - low);
            let (a, b) = (self.at(high - step).crossing, self.at(low + step).crossing);
            best = best.max(a).max(b);
            if a > b {
                high = low + step;
            } else {
                low = high - step;
            }
        }
        let highest_end = ends
            .map(|e| self.at(e).crossing)
            .into_iter()
            .fold(0.0, f64::max);
        (best > highest_end * (1.0 + PEAK)).then_some(best)
    }
}
