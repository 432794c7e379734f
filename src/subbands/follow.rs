//! Subbands of coupled bands followed through k∥ by their likeness.

use super::multiband::{
    Band, PartSolution, Shares, Wanted, fewest, kinds, list, shares, solve_multiband, solve_part,
    solve_parts,
};
use crate::models::multiband::MultibandOperator;
use crate::numerics::mesh::Mesh;
use crate::numerics::nearest::NearPair;
use rayon::prelude::*;

/// States are followed with this many more at hand, so that none leaves the list.
const SPARE: usize = 2;
/// A step along k∥ is halved where a state looks like its follower by less than this.
const ALIKE: f64 = 0.6;
const MAX_DEPTH: usize = 5;

/// A subband followed through k∥.
#[derive(Clone, Debug)]
pub struct FollowedBand {
    pub band: Band,
    /// At the first k∥.
    pub number: usize,
    pub energies_ev: Vec<[f64; 2]>,
    /// Of the first member.
    pub shares: Vec<Shares>,
}

/// Energies along a list of k∥ in 1/nm, in the direction of the operator, ascending from the first. The states are
/// followed by their likeness from one k∥ to the next, each member of a pair on its own, with smaller steps between
/// where that is in doubt. The mesh is the one that reaches the tolerance at both ends of the list.
pub fn follow_multiband(
    operator: &MultibandOperator,
    list_per_nm: &[f64],
    wanted: Wanted,
    tolerance_ev: f64,
) -> Vec<FollowedBand> {
    let (Some(&first), Some(&last)) = (list_per_nm.first(), list_per_nm.last()) else {
        return Vec::new();
    };
    let ends = [first, last].map(|k| solve_multiband(operator, k, wanted, tolerance_ev));
    let mesh = ends
        .iter()
        .map(|subbands| &subbands.parts[0].pencil.mesh)
        .max_by_key(|mesh| mesh.node_count())
        .cloned();
    let Some(mesh) = mesh else {
        return Vec::new();
    };
    follow_on_mesh(operator, &mesh, list_per_nm, wanted)
}

/// As [`follow_multiband`], on a given mesh.
pub fn follow_on_mesh(
    operator: &MultibandOperator,
    mesh: &Mesh,
    list_per_nm: &[f64],
    wanted: Wanted,
) -> Vec<FollowedBand> {
    let more = |count: usize| if count == 0 { 0 } else { count + SPARE };
    let roomy = Wanted {
        conduction: more(wanted.conduction),
        valence: more(wanted.valence),
    };
    let solve = |k: f64| solve_parts(operator, mesh, k, roomy);
    // One part after the other on its way through k∥, both at the same time.
    let ways: Vec<Vec<PartSolution>> = kinds(operator)
        .par_iter()
        .map(|&part| {
            let mut way: Vec<PartSolution> = Vec::with_capacity(list_per_nm.len());
            for &k in list_per_nm {
                let next = solve_part(operator, mesh, k, roomy, part, way.last());
                way.push(next);
            }
            way
        })
        .collect();
    let mut solved: Vec<Vec<PartSolution>> = list_per_nm.iter().map(|_| Vec::new()).collect();
    for way in ways {
        for (parts, part) in solved.iter_mut().zip(way) {
            parts.push(part);
        }
    }
    let Some(start) = solved.first() else {
        return Vec::new();
    };
    let mut bands = Vec::new();
    for (band, count) in [
        (Band::Conduction, wanted.conduction),
        (Band::Valence, wanted.valence),
    ] {
        // For each part the place of every followed state in the list at the present k∥.
        let copies = 2 / start.len();
        let mut places: Vec<Vec<usize>> =
            vec![(0..list(&start[0], band).len()).collect(); start.len()];
        let fewest = solved.iter().map(|parts| fewest(parts, band)).min();
        let count = count.min(fewest.unwrap_or(0) / copies);
        if count == 0 {
            continue;
        }
        let mut followed: Vec<FollowedBand> = (0..count)
            .map(|index| FollowedBand {
                band,
                number: index + 1,
                energies_ev: Vec::with_capacity(list_per_nm.len()),
                shares: Vec::with_capacity(list_per_nm.len()),
            })
            .collect();
        for (step, parts) in solved.iter().enumerate() {
            if step > 0 {
                let between = [list_per_nm[step - 1], list_per_nm[step]];
                let ends = [&solved[step - 1], parts];
                let moves = successors(&solve, between, ends, band, MAX_DEPTH);
                for (own, moves) in places.iter_mut().zip(&moves) {
                    own.iter_mut().for_each(|place| *place = moves[*place]);
                }
            }
            for (index, band_of) in followed.iter_mut().enumerate() {
                let member = |which: usize| {
                    let (part, place) = if copies == 1 {
                        (which, places[which][index])
                    } else {
                        (0, places[0][2 * index + which])
                    };
                    (&parts[part].pencil, &list(&parts[part], band)[place])
                };
                let (pencil, pair) = member(0);
                band_of.energies_ev.push([pair.value, member(1).1.value]);
                band_of.shares.push(shares(pencil, pair));
            }
        }
        bands.extend(followed);
    }
    bands
}

/// For each part, where in the list of the second k∥ each state of the first goes.
fn successors(
    solve: &impl Fn(f64) -> Vec<PartSolution>,
    between: [f64; 2],
    ends: [&Vec<PartSolution>; 2],
    band: Band,
    depth: usize,
) -> Vec<Vec<usize>> {
    let [from, to] = ends;
    let direct: Vec<(Vec<usize>, f64)> = from
        .iter()
        .zip(to)
        .map(|(a, b)| alike(list(a, band), list(b, band)))
        .collect();
    if depth == 0 || direct.iter().all(|(_, least)| *least >= ALIKE) {
        return direct.into_iter().map(|(moves, _)| moves).collect();
    }
    let middle = 0.5 * (between[0] + between[1]);
    let parts = solve(middle);
    let lower = successors(solve, [between[0], middle], [from, &parts], band, depth - 1);
    let upper = successors(solve, [middle, between[1]], [&parts, to], band, depth - 1);
    lower
        .into_iter()
        .zip(upper)
        .map(|(first, then)| first.into_iter().map(|place| then[place]).collect())
        .collect()
}

/// The assignment of states by their overlap, the most alike first, and the least overlap among those that are not the
/// outermost.
fn alike(from: &[NearPair], to: &[NearPair]) -> (Vec<usize>, f64) {
    let mut overlaps = Vec::with_capacity(from.len() * to.len());
    for (i, a) in from.iter().enumerate() {
        for (j, b) in to.iter().enumerate() {
            let product: f64 = a.vector.iter().zip(&b.vector).map(|(x, y)| x * y).sum();
            overlaps.push((product * product, i, j));
        }
    }
    overlaps.sort_by(|a, b| b.0.total_cmp(&a.0));
    // A state that finds no follower, because fewer are at hand, stays with the last one.
    let mut places = vec![to.len().saturating_sub(1); from.len()];
    let mut placed = vec![false; from.len()];
    let mut taken = vec![false; to.len()];
    let mut least = 1.0_f64;
    for (overlap, i, j) in overlaps {
        if !placed[i] && !taken[j] {
            places[i] = j;
            placed[i] = true;
            taken[j] = true;
            if i + SPARE < from.len() {
                least = least.min(overlap);
            }
        }
    }
    (places, least)
}
