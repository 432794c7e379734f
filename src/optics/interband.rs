//! Light between the valence and the conduction band, at k∥ = 0.
//!
//! The squared momentum matrix element of one electron spin with the two holes of a pair, in units of that of the bulk,
//! 2|p|²/m₀ = E_P: overlap² times a factor of the zone-centre states |3/2, ±3/2⟩ and |3/2, ±1/2⟩ (Chuang, Physics of
//! Optoelectronic Devices (Wiley 1995), table 9.1; Coldren and Corzine, Diode Lasers and Photonic Integrated Circuits
//! (Wiley 1995), appendix 8, with |M|² = m₀ E_P/6 as unit: 3/2 and 0, 1/2 and 2):
//!
//! | | TE (field in the plane) | TM (field along growth) |
//! | --- | --- | --- |
//! | heavy hole | 1/2 | 0 |
//! | light hole | 1/6 | 2/3 |
//!
//! Sum rule: two TE directions and TM add to 1 for each hole; heavy, light and split-off hole (1/3 each) add to 1 for each
//! direction.
//!
//! A hole of six bands has a function for each kind of hole, h, l and s; the elements are those of its parts of X and Z
//! with the electron's envelope f: TE = ⟨f|h/√2 + l/√6 + s/√3⟩², TM = ⟨f|2l/√6 − s/√3⟩², which is the table for a hole of
//! one kind. With eight bands both states have all functions, and the elements are those of ∂H/∂k
//! (`subbands/strengths.rs`), set against E_P as it is in use in the layer that holds most of the electron.

use super::exciton::{Exciton, Pair, exciton};
use crate::constants::HC_EV_UM;
use crate::models::{Band, BandOperator, Hole};
use crate::numerics::mesh::Mesh;
use crate::numerics::shared_points::SharedPoints;
use crate::structure::Stack;
use crate::subbands::multiband::Shares;
use crate::subbands::{Bands, Place, Solution, State, Subbands};
use std::borrow::Cow;

/// A pair of a hole and an electron state.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Interband {
    pub hole: Place,
    pub electron: Place,
    pub energy_ev: f64,
    /// |∫ ψ_e ψ_h dz| of the envelopes. With an energy-dependent mass, and with eight bands, the electron's is that of the
    /// conduction band, less than the whole state. A coupled hole has several envelopes, whose overlaps add up in square.
    pub overlap: f64,
    /// Squared momentum matrix elements in units of E_P.
    pub te: f64,
    pub tm: f64,
    /// E_P that they are set against where it is not the bulk's own, in eV: with eight bands.
    pub kane_energy_ev: Option<f64>,
    pub selection: Selection,
    pub alignment: Alignment,
}

/// What the envelopes say of a transition.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Selection {
    Allowed,
    /// Envelopes of different numbers of nodes, or far apart.
    Suppressed,
    /// Envelopes of opposite parity.
    Forbidden,
}

/// Where electron and hole mostly are.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Alignment {
    /// In the same layer.
    Direct,
    /// In layers of which one holds electrons and the other holes: both edges of one lie above those of the other.
    TypeTwo,
    /// The same, and the conduction edge of the one lies below the valence edge of the other.
    BrokenGap,
    /// In different layers that are no such pair: coupled wells, or a field that draws them apart.
    Apart,
}

/// A transition whose strengths in the three directions add up to less than this is suppressed, to less than that
/// forbidden. Where the electron is in one band the sum is the overlap's square.
const SUPPRESSED: f64 = 0.1;
const FORBIDDEN: f64 = 1e-8;
/// Points of the exciton's form factor are in stretches no longer than this, or than this part of the stack: the kink of
/// exp(−q|z − z′|) at z = z′ then costs less than a µeV.
const LONGEST_NM: f64 = 1.0;
const LONGEST_PART: f64 = 1e-3;
/// Probabilities below this do not count.
const NEGLIGIBLE: f64 = 1e-12;

impl Interband {
    /// Vacuum wavelength in µm; `None` where the hole lies above the electron, in a broken gap.
    pub fn wavelength_um(&self) -> Option<f64> {
        (self.energy_ev > 0.0).then(|| HC_EV_UM / self.energy_ev)
    }
}

/// TE and TM factors of a hole that is solved on its own.
fn factors(band: Band) -> [f64; 2] {
    match band {
        Band::Hole(Hole::Heavy) => [1.0 / 2.0, 0.0],
        Band::Hole(Hole::Light) => [1.0 / 6.0, 2.0 / 3.0],
        Band::Conduction(_) | Band::Valence(_) => [0.0, 0.0],
    }
}

/// What joins one electron and one hole.
#[derive(Clone, Copy, Debug)]
struct Joint {
    overlap: f64,
    te: f64,
    tm: f64,
}

/// All pairs of an electron and a hole state, by electron, then by hole from the highest.
pub fn interband(stack: &Stack, bands: &Bands) -> Vec<Interband> {
    let electrons = bands.states(0);
    let edges_ev: Vec<LayerEdges> = (0..bands.count())
        .map(|band| edges_ev(stack, bands, band))
        .collect();
    let joints: Vec<Vec<Vec<Joint>>> = (0..bands.count())
        .map(|band| match bands.band(band) {
            Band::Conduction(_) => Vec::new(),
            Band::Hole(_) | Band::Valence(_) => joints(bands, band),
        })
        .collect();
    let states: Vec<Vec<State>> = (0..bands.count()).map(|band| bands.states(band)).collect();
    let holes = bands.holes();
    let mut list = Vec::new();
    for (state, electron) in electrons.iter().enumerate() {
        let kane_energy_ev = match bands.solution(0) {
            Solution::Alone(_) => None,
            Solution::Coupled(coupled, _) => coupled.kane_energy_ev(electron.layer),
        };
        for &hole in &holes {
            let own = &states[hole.band][hole.state];
            let Joint { overlap, te, tm } = joints[hole.band][state][hole.state];
            let unit = kane_energy_ev.unwrap_or(1.0);
            list.push(Interband {
                hole,
                electron: Place { band: 0, state },
                energy_ev: electron.energy_ev - own.energy_ev,
                overlap,
                te: te / unit,
                tm: tm / unit,
                kane_energy_ev,
                // The sum over the three directions of the field: overlap² where the electron is in one band.
                selection: match (2.0 * te + tm) / unit {
                    s if s < FORBIDDEN => Selection::Forbidden,
                    s if s < SUPPRESSED => Selection::Suppressed,
                    _ => Selection::Allowed,
                },
                alignment: alignment([&edges_ev[0], &edges_ev[hole.band]], electron, own),
            });
        }
    }
    list
}

/// Where the two are, by the edges of both bands in the layers.
fn alignment([conduction, valence]: [&LayerEdges; 2], electron: &State, hole: &State) -> Alignment {
    let (layer, hole_layer) = (electron.layer, hole.layer);
    let kind = kind(hole);
    if layer == hole_layer {
        Alignment::Direct
    } else if conduction[layer][0] < valence[hole_layer][kind] {
        Alignment::BrokenGap
    } else if conduction[layer][0] < conduction[hole_layer][0]
        && valence[layer][kind] < valence[hole_layer][kind]
    {
        Alignment::TypeTwo
    } else {
        Alignment::Apart
    }
}

/// The elements of each electron with each hole of a band; with eight bands in eV, else in units of E_P.
fn joints(bands: &Bands, hole_band: usize) -> Vec<Vec<Joint>> {
    let per_electron = |list: Vec<Joint>| -> Vec<Vec<Joint>> {
        let holes = bands.level_count(hole_band).max(1);
        list.chunks(holes).map(<[Joint]>::to_vec).collect()
    };
    match (bands.solution(0), bands.solution(hole_band)) {
        (Solution::Coupled(coupled, _), _) => {
            let strengths = coupled.interband_strengths().into_iter();
            per_electron(
                strengths
                    .map(|s| Joint {
                        overlap: coupled.interband_overlap(s.conduction - 1, s.valence - 1),
                        te: s.te_ev,
                        tm: s.tm_ev,
                    })
                    .collect(),
            )
        }
        (Solution::Alone(electrons), Solution::Alone(holes)) => {
            let meshes = [&electrons.pencil.mesh, &holes.pencil.mesh];
            let points = SharedPoints::new(meshes, f64::INFINITY);
            let [te, tm] = factors(holes.band);
            let holes = points.values(1, meshes[1], &vectors(holes));
            let electrons = points.values(0, meshes[0], &vectors(electrons));
            let pairs = electrons
                .iter()
                .flat_map(|e| holes.iter().map(move |h| (e, h)));
            let joints = pairs.map(|(electron, hole)| {
                let overlap = overlap(&points, electron, hole).abs();
                let square = overlap * overlap;
                Joint {
                    overlap,
                    te: te * square,
                    tm: tm * square,
                }
            });
            per_electron(joints.collect())
        }
        (Solution::Alone(electrons), Solution::Coupled(coupled, side)) => {
            let meshes = [&electrons.pencil.mesh, &coupled.pencil().mesh];
            let points = SharedPoints::new(meshes, f64::INFINITY);
            let electrons = points.values(0, meshes[0], &vectors(electrons));
            let holes: Vec<Vec<Vec<f64>>> = (0..coupled.pairs(side).len())
                .map(|state| {
                    let functions = coupled.functions(side, state);
                    let functions: Vec<&[f64]> = functions.iter().map(|f| &f[..]).collect();
                    points.values(1, meshes[1], &functions)
                })
                .collect();
            let pairs = electrons
                .iter()
                .flat_map(|e| holes.iter().map(move |h| (e, h)));
            let joints = pairs.map(|(electron, hole)| {
                // Heavy, light and split-off hole stand last.
                let [h, l, s] = [3, 2, 1]
                    .map(|from_end| overlap(&points, electron, &hole[hole.len() - from_end]));
                Joint {
                    overlap: (h * h + l * l + s * s).sqrt(),
                    te: (h / 2.0_f64.sqrt() + l / 6.0_f64.sqrt() + s / 3.0_f64.sqrt()).powi(2),
                    tm: (2.0 * l / 6.0_f64.sqrt() - s / 3.0_f64.sqrt()).powi(2),
                }
            });
            per_electron(joints.collect())
        }
    }
}

/// The edges of a band in each layer, the field left out: of electrons, heavy and light holes, all the same where the band
/// was solved on its own.
type LayerEdges = Vec<[f64; 3]>;

/// Which of them is a hole's own. Of coupled holes that of the kind that makes up most of the state.
fn kind(hole: &State) -> usize {
    match hole.shares {
        Some(shares) if shares.heavy > 0.5 => 1,
        _ => 2,
    }
}

fn edges_ev(stack: &Stack, bands: &Bands, band: usize) -> LayerEdges {
    match bands.solution(band) {
        Solution::Coupled(coupled, _) => coupled.layer_edges_ev(),
        Solution::Alone(subbands) => match BandOperator::new(stack, subbands.band) {
            Ok(operator) => (0..stack.layers.len())
                .map(|layer| [operator.edge_ev(layer); 3])
                .collect(),
            // Not of a band that was solved.
            Err(_) => vec![[0.0; 3]; stack.layers.len()],
        },
    }
}

fn vectors(subbands: &Subbands) -> Vec<&[f64]> {
    subbands.pairs.iter().map(|pair| &*pair.vector).collect()
}

/// ∫ of the product of two functions given at shared points.
fn overlap(points: &SharedPoints, one: &[f64], other: &[f64]) -> f64 {
    let products = one.iter().zip(other).zip(&points.weights);
    products.map(|((a, b), w)| a * b * w).sum()
}

/// Why no exciton of the lowest pair is given.
#[derive(Clone, Copy, Debug, PartialEq, thiserror::Error)]
pub enum NoExciton {
    #[error("there is no electron or no hole state")]
    NoPair,
    #[error("the gap is broken: electron and hole mix instead of binding")]
    BrokenGap,
    #[error("the in-plane mass of the {} at k∥ = 0 is not positive ({mass_m0:.3} m0)", if *hole { "hole" } else { "electron" })]
    Mass { hole: bool, mass_m0: f64 },
    #[error("a material has no `permittivity_static`")]
    NoPermittivity,
    #[error("the pair does not bind")]
    Unbound,
}

/// The exciton of the lowest electron and the highest hole: the pair that emits when little is excited.
///
/// Its in-plane masses are the states' own, its permittivity the mean of the static one over both states. A coupled state
/// is where all of its functions together are.
///
/// # Errors
/// Why there is none.
pub fn lowest_exciton(stack: &Stack, bands: &Bands) -> Result<(Place, Exciton), NoExciton> {
    let highest = *bands.holes().first().ok_or(NoExciton::NoPair)?;
    let electron = bands
        .states(0)
        .into_iter()
        .next()
        .ok_or(NoExciton::NoPair)?;
    let hole = bands.states(highest.band).swap_remove(highest.state);
    let edges_ev = [0, highest.band].map(|band| edges_ev(stack, bands, band));
    // In a broken gap that confinement has opened again, the two are an ordinary pair.
    let inside = electron.energy_ev < edges_ev[1][hole.layer][kind(&hole)];
    let apart = alignment(edges_ev.each_ref(), &electron, &hole) != Alignment::BrokenGap;
    let inverted = |shares: &Shares| shares.conduction < 0.5;
    if electron.energy_ev <= hole.energy_ev
        || (inside && !apart)
        || electron.shares.as_ref().is_some_and(inverted)
    {
        return Err(NoExciton::BrokenGap);
    }
    for (is_hole, state) in [(false, &electron), (true, &hole)] {
        if state.in_plane_mass_m0 <= 0.0 {
            return Err(NoExciton::Mass {
                hole: is_hole,
                mass_m0: state.in_plane_mass_m0,
            });
        }
    }
    let lowest = Place { band: 0, state: 0 };
    let meshes = [mesh(bands, lowest), mesh(bands, highest)];
    let longest_nm = LONGEST_NM.max(LONGEST_PART * stack.total_width_nm());
    let points = SharedPoints::new(meshes, longest_nm);
    let values = |which: usize, place: Place| {
        let functions = functions(bands, place);
        let functions: Vec<&[f64]> = functions.iter().map(|f| &**f).collect();
        points.values(which, meshes[which], &functions)
    };
    let pair = Pair::of_functions(&points, &values(0, lowest), &values(1, highest));
    let inverse_mass = 1.0 / electron.in_plane_mass_m0 + 1.0 / hole.in_plane_mass_m0;
    let permittivity = pair
        .mean(|z_nm| {
            let (layer, t) = stack.layer_at(z_nm)?;
            stack.material_at(layer, t).permittivity_static
        })
        .ok_or(NoExciton::NoPermittivity)?;
    let exciton = exciton(&pair, inverse_mass, permittivity).ok_or(NoExciton::Unbound)?;
    Ok((highest, exciton))
}

fn mesh(bands: &Bands, place: Place) -> &Mesh {
    match bands.solution(place.band) {
        Solution::Alone(subbands) => &subbands.pencil.mesh,
        Solution::Coupled(coupled, _) => &coupled.pencil().mesh,
    }
}

/// The values of a state's functions at the nodes: its envelope, or those of all bands that are coupled.
fn functions(bands: &Bands, place: Place) -> Vec<Cow<'_, [f64]>> {
    match bands.solution(place.band) {
        Solution::Alone(subbands) => vec![Cow::Borrowed(&subbands.pairs[place.state].vector)],
        Solution::Coupled(coupled, side) => {
            let functions = coupled.functions(side, place.state).into_iter();
            functions.map(Cow::Owned).collect()
        }
    }
}

impl Pair {
    /// Electron and hole envelopes at shared points, each normalised.
    pub fn of_envelopes(points: &SharedPoints, electron: &[f64], hole: &[f64]) -> Pair {
        Pair::of_functions(points, &[electron], &[hole])
    }

    /// Electron and hole at shared points, each as the sum of the squares of its functions, normalised.
    pub fn of_functions<F: AsRef<[f64]>>(
        points: &SharedPoints,
        electron: &[F],
        hole: &[F],
    ) -> Pair {
        let probability = |functions: &[F]| -> Vec<f64> {
            let mut list = vec![0.0; points.weights.len()];
            for function in functions {
                for ((p, v), w) in list.iter_mut().zip(function.as_ref()).zip(&points.weights) {
                    *p += w * v * v;
                }
            }
            let sum: f64 = list.iter().sum();
            list.into_iter().map(|p| p / sum).collect()
        };
        let (electron, hole) = (probability(electron), probability(hole));
        let kept: Vec<usize> = (0..electron.len())
            .filter(|&k| electron[k].max(hole[k]) > NEGLIGIBLE)
            .collect();
        let pick = |list: &[f64]| kept.iter().map(|&k| list[k]).collect();
        Pair {
            positions_nm: pick(&points.positions),
            electron: pick(&electron),
            hole: pick(&hole),
        }
    }

    /// The mean over electron and hole of a quantity that depends on the height.
    fn mean(&self, of: impl Fn(f64) -> Option<f64>) -> Option<f64> {
        let mut sum = 0.0;
        let points = self.positions_nm.iter().zip(&self.electron).zip(&self.hole);
        for ((z_nm, electron), hole) in points {
            sum += 0.5 * (electron + hole) * of(*z_nm)?;
        }
        Some(sum)
    }
}
