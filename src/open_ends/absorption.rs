//! Absorption from one level into all others and into the continuum, as the oscillator strength per energy.
//!
//! df/d(ħω) = (2 m₀ ħω/ħ²) (1/π) Im ⟨0| z (H − E₀ − ħω − iγ)⁻¹ z |0⟩, with z along growth and the free-electron mass: the
//! resolvent with outgoing waves takes bound and continuum states together (for molecules: Rescigno & McKoy, Phys. Rev.
//! A 12, 522 (1975)). γ turns each energy into a Lorentzian of full width 2γ.
//!
//! As a function of ħω the resolvent is analytic above the real axis: the strength between two energies is an integral
//! along an arc there, however narrow the lines on the axis are.

use super::line::{Line, Outside, PATH_ANGLE, Plan, falling_is_upper, lead};
use super::moment::{integrate, moment, wave_number};
use super::quasi_bound::{NARROWEST_EV, QuasiBoundStates, WIDEST_EV, quasi_bound};
use super::search::Wanted;
use crate::constants::{HBAR2_OVER_2M0, HC_EV_UM};
use crate::models::BandOperator;
use crate::numerics::complex_banded::{C64, ZERO};
use crate::numerics::open_pencil::product;
use crate::numerics::outgoing::{Outgoing, refine};
use crate::numerics::quadrature::Reference;

/// A transition to a bound or quasi-bound state.
#[derive(Clone, Copy, Debug)]
pub struct AbsorptionLine {
    /// Number of the upper state, from 1.
    pub to: usize,
    pub energy_ev: f64,
    /// Of the upper state; 0 for a bound one.
    pub width_ev: f64,
    /// 2 m₀ E |z|²/ħ² with the bilinear element: the residue of the resolvent. For a wide state it may be negative: then
    /// the line is no peak but a dip in the continuum (Fano, Phys. Rev. 124, 1866 (1961)).
    pub strength: f64,
    pub bound: bool,
}

/// A spectrum.
#[derive(Clone, Debug)]
pub struct Absorption {
    /// Photon energy in eV, and df/d(ħω) in 1/eV.
    pub points: Vec<[f64; 2]>,
    pub lines: Vec<AbsorptionLine>,
    pub from_energy_ev: f64,
    pub from_width_ev: f64,
    /// The peak of the spectrum in the range; `None` when it lies at an end of it.
    pub peak: Option<[f64; 2]>,
    /// Energies below and above the peak at which half of it is reached.
    pub half_ev: [Option<f64>; 2],
    /// The strength of transitions to bound states.
    pub to_bound: f64,
    /// All strength up to [`SUM_TO_EV`].
    pub total: f64,
    /// The strength that ½⟨[z, [H, z]]⟩ gives: the mean of m₀/m(z) in the state.
    pub sum_rule: f64,
    pub states: QuasiBoundStates,
}

/// Strength is added up to this photon energy.
pub const SUM_TO_EV: f64 = 100.0;
const ORDER: usize = 12;
/// Points of the arc on which strength is added up.
const ARC_PIECES: usize = 24;
/// A bound state is followed outside until it has fallen by e to this power.
const TAIL: f64 = 18.0;
/// It is not followed further than this, in nm.
const FURTHEST_NM: f64 = 400.0;

/// Why there is no spectrum.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum NoSpectrum {
    #[error("conduction {asked} is not there: {found} bound or quasi-bound states were found")]
    NoState { asked: usize, found: usize },
    #[error("conduction {asked} is {width_mev:.1} meV wide: electrons do not stay in it")]
    TooWide { asked: usize, width_mev: f64 },
}

/// Levels nearer than this, of wells far apart, are one: strength is added up from above them.
const CLUSTER_EV: f64 = 1e-6;
/// No more lines are told one by one; the spectrum holds them all.
pub const MOST_LINES: usize = 40;
/// A level wider than this holds no electrons that could absorb.
const WIDEST_FROM_EV: f64 = 0.1 * WIDEST_EV;

/// The spectrum from state number `from` (from 1) over photon energies, with a full width `broadening_ev`.
pub fn absorption(
    operator: &BandOperator,
    from: usize,
    energies_ev: &[f64],
    broadening_ev: f64,
) -> Result<Absorption, NoSpectrum> {
    let wanted = Wanted::lowest(from + MOST_LINES);
    let states = quasi_bound(operator, Outside::Field, &wanted);
    let Some(initial) = from.checked_sub(1).and_then(|k| states.states.get(k)) else {
        return Err(NoSpectrum::NoState {
            asked: from,
            found: states.states.len(),
        });
    };
    if initial.width_ev > WIDEST_FROM_EV {
        return Err(NoSpectrum::TooWide {
            asked: from,
            width_mev: 1e3 * initial.width_ev,
        });
    }
    let furthest_ev = energies_ev.iter().copied().fold(0.5, f64::max);
    let response = Response::new(operator, &states, from - 1, furthest_ev);
    let points: Vec<[f64; 2]> = energies_ev
        .iter()
        .map(|e| [*e, response.strength_ev(C64::new(*e, 0.5 * broadening_ev))])
        .collect();
    let lines: Vec<AbsorptionLine> = (from..states.states.len())
        .map(|k| {
            let state = &states.states[k];
            let energy_ev = state.energy_ev - initial.energy_ev;
            let z = moment(
                &states.line,
                &states.outgoing[from - 1],
                &states.outgoing[k],
                initial.centre_nm,
            );
            AbsorptionLine {
                to: k + 1,
                energy_ev,
                width_ev: state.width_ev,
                strength: energy_ev * (z * z).re / HBAR2_OVER_2M0,
                bound: state.bound || state.width_ev <= NARROWEST_EV,
            }
        })
        .collect();
    let (peak, half_ev) = peak_of(&points);
    let first = lines.iter().find(|line| line.energy_ev > CLUSTER_EV);
    let start_ev = first.map_or(0.01, |line| 0.5 * line.energy_ev);
    Ok(Absorption {
        // An empty sum is -0.
        to_bound: 0.0
            + lines
                .iter()
                .filter(|l| l.bound)
                .map(|l| l.strength)
                .sum::<f64>(),
        total: response.between(start_ev, SUM_TO_EV),
        sum_rule: response.sum_rule(),
        from_energy_ev: initial.energy_ev,
        from_width_ev: initial.width_ev,
        points,
        lines,
        peak,
        half_ev,
        states,
    })
}

impl Absorption {
    /// Vacuum wavelength of the peak, in µm.
    pub fn peak_um(&self) -> Option<f64> {
        self.peak.map(|[energy_ev, _]| HC_EV_UM / energy_ev)
    }

    /// The longer wavelength at which half of the peak is reached, in µm.
    pub fn cut_off_um(&self) -> Option<f64> {
        self.half_ev[0].map(|energy_ev| HC_EV_UM / energy_ev)
    }
}

/// The highest point by a parabola through three, and the energies at half of it by straight lines.
fn peak_of(points: &[[f64; 2]]) -> (Option<[f64; 2]>, [Option<f64>; 2]) {
    let highest = (0..points.len()).max_by(|a, b| points[*a][1].total_cmp(&points[*b][1]));
    let Some(k) = highest.filter(|k| *k > 0 && *k + 1 < points.len()) else {
        return (None, [None; 2]);
    };
    let [[x0, y0], [x1, y1], [x2, y2]] = [points[k - 1], points[k], points[k + 1]];
    let (left, right) = ((y1 - y0) / (x1 - x0), (y2 - y1) / (x2 - x1));
    let bend = (right - left) / (x2 - x0);
    let peak = if bend < 0.0 {
        let x = 0.5 * (x0 + x1) - 0.5 * left / bend;
        [x, y0 + left * (x - x0) + bend * (x - x0) * (x - x1)]
    } else {
        points[k]
    };
    let half = 0.5 * peak[1];
    let crossing = |[a, b]: [[f64; 2]; 2]| {
        ((a[1] - half) * (b[1] - half) <= 0.0 && a[1] != b[1])
            .then(|| a[0] + (half - a[1]) / (b[1] - a[1]) * (b[0] - a[0]))
    };
    let below = (0..k)
        .rev()
        .find_map(|j| crossing([points[j], points[j + 1]]));
    let above = (k..points.len() - 1).find_map(|j| crossing([points[j], points[j + 1]]));
    (Some(peak), [below, above])
}

/// One state and what answers to light on it.
struct Response {
    line: Line,
    state: Outgoing,
    /// From which z is taken, so that the state itself is no final state.
    origin: C64,
    mean_softness: f64,
}

impl Response {
    fn new(
        operator: &BandOperator,
        states: &QuasiBoundStates,
        index: usize,
        furthest_ev: f64,
    ) -> Response {
        let start = &states.outgoing[index];
        let energy_ev = start.value.re;
        let tilted = states.leads_ev.is_none();
        let reach_nm = [false, true].map(|upper| {
            let end = lead(operator, upper);
            if tilted && upper == falling_is_upper(operator) {
                return 0.0;
            }
            let fall = wave_number(&end, C64::from(energy_ev)).im;
            if fall > 0.0 {
                (TAIL / fall).min(FURTHEST_NM)
            } else {
                0.0
            }
        });
        let energies_ev = [states.floor_ev, energy_ev + furthest_ev];
        let plan = Plan::new(operator, Outside::Field, energies_ev, reach_nm, PATH_ANGLE);
        let line = plan.line(ORDER);
        // The elements of the two lines may differ; the state is refined from its energy.
        let state = refine(&line.pencil, start.value, None)
            .filter(|state| (state.value - start.value).norm() < 1e-6)
            .unwrap_or_else(|| Outgoing {
                value: start.value,
                vector: line.carry(&states.line, &start.vector),
                residual: f64::INFINITY,
            });
        let origin = moment(&line, &state, &state, 0.0);
        let p = line.pencil.mesh.order();
        let mut softness = 0.0;
        let mut norm = 0.0;
        for e in line.real[0]..line.real[1] {
            let slopes = line.pencil.slopes(e, &state.vector);
            softness += integrate(&line.pencil, [e, e + 1], |e, q| {
                line.pencil.at(e)[q].a(C64::from(energy_ev)).re * state.vector[e * p + q].norm_sqr()
            });
            norm += integrate(&line.pencil, [e, e + 1], |e, q| {
                let node = &line.pencil.at(e)[q];
                let along = node.divided(state.value, state.value).re * slopes[q].norm_sqr();
                state.vector[e * p + q].norm_sqr() + along
            });
        }
        Response {
            line,
            state,
            origin,
            mean_softness: softness / norm,
        }
    }

    /// ⟨0| z (H − E₀ − x)⁻¹ z |0⟩ in nm²/eV, all components of the state included.
    fn resolvent(&self, photon: C64) -> C64 {
        let pencil = &self.line.pencil;
        let (value, energy) = (self.state.value, self.state.value + photon);
        let from_origin = |e: usize, q: usize| self.line.position_nm(e, q) - self.origin;
        let source = pencil.weighted(value, energy, &self.state.vector, from_origin);
        let mut answer = source.clone();
        pencil.factor(energy).solve(&mut answer);
        let mut sum = product(&source, &answer);
        // What the eliminated components give by themselves.
        for e in 0..pencil.mesh.elements.len() {
            if !pencil.at(e)[0].own.has_poles() {
                continue;
            }
            let half = pencil.stretches[e] * (0.5 * pencil.mesh.elements[e].length);
            let slopes = pencil.slopes(e, &self.state.vector);
            for (q, (node, slope)) in pencil.at(e).iter().zip(&slopes).enumerate() {
                let own = (node.divided(value, value) - node.divided(value, energy)) / photon;
                let lifted = from_origin(e, q) * slope;
                sum -= half * pencil.mesh.reference.weights[q] * lifted * lifted * own;
            }
        }
        sum
    }

    /// df/d(ħω) in 1/eV at a photon energy, its imaginary part being half the broadening.
    fn strength_ev(&self, photon: C64) -> f64 {
        photon.re * self.resolvent(photon).im / (std::f64::consts::PI * HBAR2_OVER_2M0)
    }

    /// The strength between two photon energies, along an arc above the real axis.
    fn between(&self, low_ev: f64, high_ev: f64) -> f64 {
        let points = Reference::of_order(ORDER);
        let pi = std::f64::consts::PI;
        // x = low exp(s) exp(i h sin(π s/S)): equal steps of ln x, since the strength lies at the low end.
        let span = (high_ev / low_ev).ln();
        let mut sum = ZERO;
        for piece in 0..ARC_PIECES {
            for (node, w) in points.nodes.iter().zip(&points.weights) {
                let t = (piece as f64 + 0.5 * (1.0 + node)) / ARC_PIECES as f64;
                let phase = (pi * t).sin();
                let x = low_ev * C64::new(span * t, phase).exp();
                let dx = x * C64::new(span, pi * (pi * t).cos());
                sum += 0.5 * w / ARC_PIECES as f64 * x * self.resolvent(x) * dx;
            }
        }
        sum.im / (pi * HBAR2_OVER_2M0)
    }

    fn sum_rule(&self) -> f64 {
        self.mean_softness / HBAR2_OVER_2M0
    }
}
