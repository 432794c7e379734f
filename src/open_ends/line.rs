//! The line that a stack with open ends is solved on: its layers, and what lies outside of them.

use crate::models::BandOperator;
use crate::numerics::complex_banded::{C64, ONE, ZERO};
use crate::numerics::mesh::Mesh;
use crate::numerics::open_pencil::{End, OpenPencil, Raised};
use crate::numerics::pencil::Coefficient;

/// What lies outside. The materials of the two outermost faces go on in either case.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Outside {
    /// The field goes on: a Stark resonance. With no field to speak of this is the same as flat.
    Field,
    /// No field outside: leads at the potential of each end, as contacts are taken; common practice.
    Flat,
}

/// The angle θ by which the path outside leaves the real line where the field goes on. Any from 0 to 60° gives the same
/// states; this one is the middle of the range in which they change by rounding only.
pub const PATH_ANGLE: f64 = std::f64::consts::FRAC_PI_4;

/// Below 0.1 kV/cm an electron 10 meV under an edge would have a micrometre to tunnel: the outside is taken as flat.
const WEAKEST_V_PER_NM: f64 = 1e-5;
/// An outgoing wave is followed until it has fallen by e to this power.
const FALL: f64 = 40.0;
/// Largest phase, or decay exponent, that one element follows.
const MAX_PHASE: f64 = 5.0;
const MAX_PIECES: usize = 4000;
/// Elements are cut finer by this many halvings at most.
pub(super) const MAX_HALVINGS: u32 = 2;

/// A part of the line.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Part {
    Layer(usize),
    /// The material of the lowest or the highest face going on, along the real line or on the path that leaves it.
    Beyond {
        upper: bool,
        turned: bool,
    },
}

/// The parts with their lengths and numbers of elements, from which pencils of any order are made.
#[derive(Clone, Debug)]
pub struct Plan<'o> {
    operator: &'o BandOperator<'o>,
    parts: Vec<(Part, f64)>,
    pieces: Vec<usize>,
    /// How often the elements were doubled, as a factor.
    refinement: usize,
    outside: Outside,
    angle: f64,
}

/// A pencil with the elements that belong to the stack and to the real line.
#[derive(Clone, Debug)]
pub struct Line {
    pub pencil: OpenPencil,
    /// First element, and the one after the last.
    pub stack: [usize; 2],
    pub real: [usize; 2],
    /// The position of the mesh's start.
    start_nm: f64,
    /// Positions at which the path leaves the real line, with e^{iθ}.
    turn: C64,
    turns_nm: [f64; 2],
}

/// The coefficients just outside the lower and the upper end, at the potential there.
pub fn lead(operator: &BandOperator, upper: bool) -> Coefficient {
    let stack = operator.stack();
    if upper {
        let last = stack.layers.len() - 1;
        operator.at(last, 1.0, stack.total_width_nm())
    } else {
        operator.at(0, 0.0, 0.0)
    }
}

/// The band edges just outside the lower and the upper end, in eV.
pub fn leads_ev(operator: &BandOperator) -> [f64; 2] {
    [false, true].map(|upper| lead(operator, upper).constant)
}

/// The coefficients of the two outermost faces at zero potential.
fn bare(operator: &BandOperator, upper: bool) -> Coefficient {
    let last = operator.stack().layers.len() - 1;
    if upper {
        operator.at(last, 1.0, 0.0)
    } else {
        operator.at(0, 0.0, 0.0)
    }
}

/// Whether the field goes on outside, being strong enough to matter there.
pub fn is_tilted(operator: &BandOperator, outside: Outside) -> bool {
    outside == Outside::Field && operator.stack().field_v_per_nm.abs() >= WEAKEST_V_PER_NM
}

/// The end that the field lowers.
pub fn falling_is_upper(operator: &BandOperator) -> bool {
    operator.stack().field_v_per_nm < 0.0
}

impl<'o> Plan<'o> {
    /// For energies from `low_ev` to `top_ev`, with the real line going on for `reach_nm` below and above the stack.
    pub fn new(
        operator: &'o BandOperator<'o>,
        outside: Outside,
        [low_ev, top_ev]: [f64; 2],
        reach_nm: [f64; 2],
        angle: f64,
    ) -> Plan<'o> {
        let field = operator.stack().field_v_per_nm;
        let tilted = is_tilted(operator, outside);
        let mut parts = Vec::new();
        let layers = operator.stack().layers.iter().enumerate();
        let layers = layers.map(|(index, layer)| (Part::Layer(index), layer.width_nm));
        let mut beyond = [Vec::new(), Vec::new()];
        for upper in [false, true] {
            let reach = reach_nm[usize::from(upper)];
            let side = &mut beyond[usize::from(upper)];
            // (2/3) √(F/A) s^{3/2} is the phase, or the decay, from a turning point on.
            let slope = field.abs() / lead(operator, upper).a(top_ev);
            let falling = upper == falling_is_upper(operator);
            let decay_nm = |sine: f64| (1.5 * FALL / (slope.sqrt() * sine)).powf(2.0 / 3.0);
            let turned = false;
            if tilted && !falling {
                side.push((Part::Beyond { upper, turned }, reach + decay_nm(1.0)));
            } else if reach > 0.0 {
                side.push((Part::Beyond { upper, turned }, reach));
            }
            if tilted && falling {
                let turned = true;
                let length_nm = decay_nm((1.5 * angle).sin());
                side.push((Part::Beyond { upper, turned }, length_nm));
            }
        }
        let [lower, upper] = beyond;
        parts.extend(lower.into_iter().rev());
        parts.extend(layers);
        parts.extend(upper);
        let mut plan = Plan {
            operator,
            pieces: vec![1; parts.len()],
            parts,
            refinement: 1,
            outside,
            angle,
        };
        let coarse = plan.line(2);
        for (index, (_, length)) in plan.parts.iter().enumerate() {
            let steepest = coarse.pencil.at(index).iter().fold(0.0_f64, |most, node| {
                let phase = |ev: f64| {
                    let energy = C64::from(ev);
                    ((energy - node.constant()) / node.a(energy)).norm()
                };
                most.max(phase(low_ev)).max(phase(top_ev))
            });
            let pieces = (steepest.sqrt() * length / MAX_PHASE).ceil() as usize;
            plan.pieces[index] = pieces.clamp(1, MAX_PIECES);
        }
        plan
    }

    /// The same with twice as many elements.
    pub fn finer(&self) -> Plan<'o> {
        let mut finer = self.clone();
        finer.pieces.iter_mut().for_each(|n| *n *= 2);
        finer.refinement *= 2;
        finer
    }

    /// The same elements inside the stack, with the real line going on outside for one state's sake.
    pub fn reaching(
        &self,
        reach_nm: [f64; 2],
        energy_ev: f64,
        (outside, angle): (Outside, f64),
    ) -> Plan<'o> {
        let energies_ev = [energy_ev; 2];
        let mut plan = Plan::new(self.operator, outside, energies_ev, reach_nm, angle);
        let mut own = self.layer_pieces().into_iter();
        for ((part, _), pieces) in plan.parts.iter().zip(&mut plan.pieces) {
            *pieces = match part {
                Part::Layer(_) => own.next().unwrap_or(*pieces),
                Part::Beyond { .. } => *pieces * self.refinement,
            };
        }
        plan
    }

    /// The number of elements in each layer.
    pub fn layer_pieces(&self) -> Vec<usize> {
        let parts = self.parts.iter().zip(&self.pieces);
        parts
            .filter(|((part, _), _)| matches!(part, Part::Layer(_)))
            .map(|(_, pieces)| *pieces)
            .collect()
    }

    /// The discretised problem.
    pub fn line(&self, order: usize) -> Line {
        let lengths: Vec<f64> = self.parts.iter().map(|(_, length)| *length).collect();
        let mesh = Mesh::new(&lengths, &self.pieces, order);
        let operator = self.operator;
        let field = operator.stack().field_v_per_nm;
        let is = |test: fn(&Part) -> bool| {
            let first = self.parts.iter().position(|(part, _)| test(part));
            let last = self.parts.iter().rposition(|(part, _)| test(part));
            let before = |part: usize| self.pieces[..part].iter().sum();
            [
                before(first.unwrap_or(0)),
                before(last.map_or(0, |l| l + 1)),
            ]
        };
        let stack = is(|part| matches!(part, Part::Layer(_)));
        let real = is(|part| !matches!(part, Part::Beyond { turned: true, .. }));
        let outer: f64 =
            self.lengths_where(|part| matches!(part, Part::Beyond { upper: false, .. }));
        let real_below = self.lengths_where(|part| {
            matches!(
                part,
                Part::Beyond {
                    upper: false,
                    turned: false
                }
            )
        });
        let real_above = self.lengths_where(|part| {
            matches!(
                part,
                Part::Beyond {
                    upper: true,
                    turned: false
                }
            )
        });
        let turn = C64::from_polar(1.0, self.angle);
        let turns_nm = [-real_below, operator.stack().total_width_nm() + real_above];
        let faces = [bare(operator, false), bare(operator, true)];
        let leads = [lead(operator, false), lead(operator, true)];
        let flat = !is_tilted(operator, self.outside);
        let stretches = mesh
            .elements
            .iter()
            .map(|element| match self.parts[element.segment].0 {
                Part::Beyond { turned: true, .. } => turn,
                _ => ONE,
            })
            .collect();
        let ends = if flat {
            [End::Flat(leads[0]), End::Flat(leads[1])]
        } else {
            [End::Wall, End::Wall]
        };
        let pencil = OpenPencil::new(mesh, stretches, ends, |mesh, element, q| {
            let z_nm = mesh.position(element, q) - outer;
            match self.parts[element.segment].0 {
                Part::Layer(layer) => Raised {
                    own: operator.at(layer, mesh.fraction(element, q), z_nm),
                    raise: ZERO,
                },
                Part::Beyond { upper, .. } if flat => Raised {
                    own: leads[usize::from(upper)],
                    raise: ZERO,
                },
                Part::Beyond { upper, turned } => Raised {
                    own: faces[usize::from(upper)],
                    raise: field * on_path(z_nm, turned, turns_nm, turn),
                },
            }
        });
        Line {
            pencil,
            stack,
            real,
            start_nm: -outer,
            turn,
            turns_nm,
        }
    }

    fn lengths_where(&self, test: impl Fn(&Part) -> bool) -> f64 {
        let parts = self.parts.iter().filter(|(part, _)| test(part));
        parts.map(|(_, length)| length).sum()
    }
}

fn on_path(z_nm: f64, turned: bool, turns_nm: [f64; 2], turn: C64) -> C64 {
    if !turned {
        return C64::from(z_nm);
    }
    // The turning place itself may lie on either side of it by rounding.
    let from = turns_nm[usize::from(2.0 * z_nm > turns_nm[0] + turns_nm[1])];
    from + (z_nm - from) * turn
}

impl Line {
    /// The position of a node above the bottom of the stack, in nm; complex off the real line.
    pub fn position_nm(&self, element: usize, q: usize) -> C64 {
        let mesh = &self.pencil.mesh;
        let z_nm = mesh.position(&mesh.elements[element], q) + self.start_nm;
        let turned = element < self.real[0] || element >= self.real[1];
        on_path(z_nm, turned, self.turns_nm, self.turn)
    }

    /// A vector of another line of the same stack, cut into the same elements there: carried over inside the stack, zero
    /// outside.
    pub fn carry(&self, from: &Line, x: &[C64]) -> Vec<C64> {
        let (there, here) = (from.pencil.mesh.order(), self.pencil.mesh.order());
        let nodes = &self.pencil.mesh.reference.nodes;
        let matrix = from.pencil.mesh.reference.interpolation(nodes);
        let mut out = vec![ZERO; self.pencil.size()];
        for k in 0..(self.stack[1] - self.stack[0]).min(from.stack[1] - from.stack[0]) {
            let first = (from.stack[0] + k) * there;
            let local = &x[first..=first + there];
            let target = (self.stack[0] + k) * here;
            for (q, row) in matrix.chunks_exact(there + 1).enumerate() {
                out[target + q] = row.iter().zip(local).map(|(m, v)| v * m).sum();
            }
        }
        out
    }

    /// As [`carry`](Self::carry) for a real vector on the inner nodes of the same elements between walls.
    pub fn embed(&self, x: &[f64]) -> Vec<C64> {
        let mut out = vec![ZERO; self.pencil.size()];
        let first = self.stack[0] * self.pencil.mesh.order();
        for (target, value) in out[first..].iter_mut().zip(x) {
            *target = C64::from(*value);
        }
        out
    }
}
