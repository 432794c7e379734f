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

use super::exciton::{Exciton, Pair, exciton};
use crate::constants::HC_EV_UM;
use crate::models::{Band, BandOperator, Hole};
use crate::numerics::shared_points::SharedPoints;
use crate::structure::Stack;
use crate::subbands::{Bands, Place, State, Subbands};

/// A pair of a hole and an electron state.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Interband {
    pub hole: Place,
    pub electron: Place,
    pub energy_ev: f64,
    /// |∫ ψ_e ψ_h dz| of the envelopes. With an energy-dependent mass the electron's is that of the conduction band,
    /// less than the whole state.
    pub overlap: f64,
    /// Squared momentum matrix elements in units of E_P.
    pub te: f64,
    pub tm: f64,
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
    /// In different layers that are no such pair: coupled wells, or a field that draws them apart.
    Apart,
}

/// An overlap whose square is below this is suppressed, below that forbidden.
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

/// TE and TM factors of a hole band.
fn factors(band: Band) -> [f64; 2] {
    match band {
        Band::Hole(Hole::Heavy) => [1.0 / 2.0, 0.0],
        Band::Hole(Hole::Light) => [1.0 / 6.0, 2.0 / 3.0],
        Band::Conduction(_) => [0.0, 0.0],
    }
}

/// All pairs of an electron and a hole state, by electron, then by hole from the highest.
pub fn interband(stack: &Stack, bands: &Bands) -> Vec<Interband> {
    let electrons = bands.conduction();
    let electron_states = electrons.states();
    let conduction_ev = edges_ev(stack, electrons.band);
    let hole_bands: Vec<HoleBand> = bands.all()[1..]
        .iter()
        .map(|holes| HoleBand {
            states: holes.states(),
            overlaps: overlaps(electrons, holes),
            edges_ev: edges_ev(stack, holes.band),
        })
        .collect();
    let holes = bands.holes();
    let mut list = Vec::new();
    for (state, electron) in electron_states.iter().enumerate() {
        for &hole in &holes {
            let with = &hole_bands[hole.band - 1];
            let own = &with.states[hole.state];
            let overlap = with.overlaps[state][hole.state].abs();
            let square = overlap * overlap;
            let [te, tm] = factors(bands.of(hole).band).map(|factor| factor * square);
            list.push(Interband {
                hole,
                electron: Place { band: 0, state },
                energy_ev: electron.energy_ev - own.energy_ev,
                overlap,
                te,
                tm,
                selection: match square {
                    s if s < FORBIDDEN => Selection::Forbidden,
                    s if s < SUPPRESSED => Selection::Suppressed,
                    _ => Selection::Allowed,
                },
                alignment: alignment([&conduction_ev, &with.edges_ev], electron.layer, own.layer),
            });
        }
    }
    list
}

/// Where the two are, by the edges of both bands in the layers.
fn alignment(edges_ev: [&Vec<f64>; 2], electron: usize, hole: usize) -> Alignment {
    if electron == hole {
        Alignment::Direct
    } else if edges_ev.iter().all(|band| band[electron] < band[hole]) {
        Alignment::TypeTwo
    } else {
        Alignment::Apart
    }
}

struct HoleBand {
    states: Vec<State>,
    /// By electron, then by hole.
    overlaps: Vec<Vec<f64>>,
    edges_ev: Vec<f64>,
}

/// The band's edge in each layer, the field left out.
fn edges_ev(stack: &Stack, band: Band) -> Vec<f64> {
    match BandOperator::new(stack, band) {
        Ok(operator) => (0..stack.layers.len())
            .map(|layer| operator.edge_ev(layer))
            .collect(),
        // Not of a band that was solved.
        Err(_) => vec![0.0; stack.layers.len()],
    }
}

fn vectors(subbands: &Subbands) -> Vec<&[f64]> {
    subbands.pairs.iter().map(|pair| &*pair.vector).collect()
}

fn overlaps(electrons: &Subbands, holes: &Subbands) -> Vec<Vec<f64>> {
    let meshes = [&electrons.pencil.mesh, &holes.pencil.mesh];
    let points = SharedPoints::new(meshes, f64::INFINITY);
    let electrons = points.values(0, meshes[0], &vectors(electrons));
    let holes = points.values(1, meshes[1], &vectors(holes));
    let overlap = |electron: &Vec<f64>, hole: &Vec<f64>| {
        let products = electron.iter().zip(hole).zip(&points.weights);
        products.map(|((e, h), w)| e * h * w).sum()
    };
    electrons
        .iter()
        .map(|electron| holes.iter().map(|hole| overlap(electron, hole)).collect())
        .collect()
}

/// The exciton of the lowest electron and the highest hole: the pair that emits when little is excited.
///
/// Its in-plane masses are the states' own, its permittivity the mean of the static one over both states. `None` without
/// holes, or when a layer that holds part of the pair has no `permittivity_static`.
pub fn lowest_exciton(stack: &Stack, bands: &Bands) -> Option<(Place, Exciton)> {
    let highest = *bands.holes().first()?;
    let (electrons, holes) = (bands.conduction(), bands.of(highest));
    let meshes = [&electrons.pencil.mesh, &holes.pencil.mesh];
    let longest_nm = LONGEST_NM.max(LONGEST_PART * stack.total_width_nm());
    let points = SharedPoints::new(meshes, longest_nm);
    let pair = Pair::of_envelopes(
        &points,
        &points.values(0, meshes[0], &[&electrons.pairs.first()?.vector])[0],
        &points.values(1, meshes[1], &[&holes.pairs[highest.state].vector])[0],
    );
    let electron = electrons.states().into_iter().next()?;
    let hole = holes.states().into_iter().nth(highest.state)?;
    let inverse_mass = 1.0 / electron.in_plane_mass_m0 + 1.0 / hole.in_plane_mass_m0;
    let permittivity = pair.mean(|z_nm| {
        let (layer, t) = stack.layer_at(z_nm)?;
        stack.material_at(layer, t).permittivity_static
    })?;
    Some((highest, exciton(&pair, inverse_mass, permittivity)?))
}

impl Pair {
    /// Electron and hole envelopes at shared points, each normalised.
    pub fn of_envelopes(points: &SharedPoints, electron: &[f64], hole: &[f64]) -> Pair {
        let probability = |envelope: &[f64]| -> Vec<f64> {
            let squares = envelope.iter().zip(&points.weights).map(|(v, w)| w * v * v);
            let list: Vec<f64> = squares.collect();
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
