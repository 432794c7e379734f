//! Speed of a self-consistent well beside a plain reference in the same run: central differences at 0.1 nm with damped
//! mixing of the potential, each level by bisection with Sturm counts. Both solve a well doped on one side at 77 K with six
//! subbands; the reference to 1e-6 eV, the elements to 1e-9 eV. `cargo bench --bench charge`.

use criterion::{Criterion, criterion_group, criterion_main};
use std::hint::black_box;
use wellwright::charge;
use wellwright::constants::{COULOMB_EV_NM, HBAR2_OVER_2M0};
use wellwright::models::Band;
use wellwright::structure;
use wellwright::subbands::Accuracy;

const STATES: usize = 6;
const STEP_NM: f64 = 0.1;
const MASS_M0: f64 = 0.067;
const PERMITTIVITY: f64 = 12.9;
const KT_EV: f64 = 8.617_333_262e-5 * 77.0;
const SHEET_PER_NM2: f64 = 1e-2;
/// 10 nm barrier, 10 nm doped barrier, 10 nm barrier, 20 nm well, 20 nm barrier.
const FACES_NM: [f64; 4] = [10.0, 20.0, 30.0, 50.0];
const WIDTH_NM: f64 = 70.0;

const WELL: &str = "
temperature: 77 K
bands: {conduction: {states: 6}}
materials:
  Well: {conduction_edge: 0 eV, electron_mass: 0.067, permittivity_static: 12.9}
  Barrier: {conduction_edge: 0.25 eV, electron_mass: 0.067, permittivity_static: 12.9}
layers:
  - {material: Barrier, width: 10 nm}
  - {material: Barrier, width: 10 nm, sheet_donors: 1e12 cm^-2}
  - {material: Barrier, width: 10 nm}
  - {material: Well, width: 20 nm}
  - {material: Barrier, width: 20 nm}
";

fn filling(x: f64) -> f64 {
    x.max(0.0) + KT_EV * (-x.abs() / KT_EV).exp().ln_1p()
}

/// The levels by central differences and the number of iterations.
fn damped_mixing() -> (Vec<f64>, usize) {
    let inner = (WIDTH_NM / STEP_NM).round() as usize - 1;
    let link = HBAR2_OVER_2M0 / MASS_M0 / (STEP_NM * STEP_NM);
    let z = |k: usize| (k + 1) as f64 * STEP_NM;
    // A node on a face belongs to both sides by half.
    let inside = |z: f64, lower: f64, upper: f64| {
        0.5 + 0.5
            * ((z - lower) / (0.5 * STEP_NM))
                .clamp(-1.0, 1.0)
                .min(((upper - z) / (0.5 * STEP_NM)).clamp(-1.0, 1.0))
    };
    let edges: Vec<f64> = (0..inner)
        .map(|k| 0.25 - 0.25 * inside(z(k), FACES_NM[2], FACES_NM[3]))
        .collect();
    let dopants: Vec<f64> = (0..inner)
        .map(|k| SHEET_PER_NM2 / 10.0 * inside(z(k), FACES_NM[0], FACES_NM[1]))
        .collect();
    let states_per_ev = MASS_M0 / (2.0 * std::f64::consts::PI * HBAR2_OVER_2M0);
    let mut u = vec![0.0; inner];
    let mut levels = vec![0.0; STATES];
    for iteration in 1..1000 {
        let diagonal: Vec<f64> = (0..inner).map(|k| 2.0 * link + edges[k] + u[k]).collect();
        let mut density = vec![0.0; inner];
        let mut squares = Vec::new();
        for (level, energy) in levels.iter_mut().enumerate() {
            *energy = bisected(&diagonal, link, level);
            squares.push(state(&diagonal, link, *energy));
        }
        let excess = |fermi: f64| -> f64 {
            let filled = levels.iter().map(|e| states_per_ev * filling(fermi - e));
            SHEET_PER_NM2 - filled.sum::<f64>()
        };
        let (mut low, mut high) = (levels[0] - 1.0, levels[0] + 1.0);
        for _ in 0..60 {
            let middle = 0.5 * (low + high);
            if excess(middle) > 0.0 {
                low = middle
            } else {
                high = middle
            }
        }
        for (energy, squares) in levels.iter().zip(&squares) {
            let sheet = states_per_ev * filling(low - energy);
            density
                .iter_mut()
                .zip(squares)
                .for_each(|(n, s)| *n += sheet * s);
        }
        let (mut flux, mut next, mut change) = (0.0, 0.0, 0.0_f64);
        for k in 0..inner {
            let moved = next - u[k];
            change = change.max(moved.abs());
            u[k] += 0.2 * moved;
            flux += STEP_NM * (dopants[k] - density[k]);
            next += STEP_NM * flux * 4.0 * std::f64::consts::PI * COULOMB_EV_NM / PERMITTIVITY;
        }
        if change < 1e-6 {
            return (levels, iteration);
        }
    }
    panic!("the reference did not settle");
}

fn bisected(diagonal: &[f64], link: f64, level: usize) -> f64 {
    let (mut low, mut high) = (-1.0, 2.0);
    while high - low > 1e-9 {
        let middle = 0.5 * (low + high);
        let (mut below, mut pivot) = (0, f64::INFINITY);
        for d in diagonal {
            pivot = d - middle - link * link / pivot;
            below += usize::from(pivot < 0.0);
        }
        if below > level {
            high = middle
        } else {
            low = middle
        }
    }
    0.5 * (low + high)
}

/// ψ² by two steps of inverse iteration.
fn state(diagonal: &[f64], link: f64, energy: f64) -> Vec<f64> {
    let n = diagonal.len();
    let mut x: Vec<f64> = (0..n).map(|k| 1.0 + 0.01 * (k as f64).sin()).collect();
    let shift = energy + 1e-8;
    for _ in 0..3 {
        let mut pivots = vec![0.0; n];
        for k in 0..n {
            pivots[k] = diagonal[k] - shift;
            if k > 0 {
                pivots[k] -= link * link / pivots[k - 1];
                x[k] += link / pivots[k - 1] * x[k - 1];
            }
        }
        for k in (0..n).rev() {
            if k + 1 < n {
                x[k] += link * x[k + 1];
            }
            x[k] /= pivots[k];
        }
        let norm = (STEP_NM * x.iter().map(|v| v * v).sum::<f64>()).sqrt();
        x.iter_mut().for_each(|v| *v /= norm);
    }
    x.iter().map(|v| v * v).collect()
}

fn benches(criterion: &mut Criterion) {
    let (structure, _) = structure::read(WELL);
    let structure = structure.unwrap();
    let stack = structure.stack().unwrap();
    let solve = || {
        charge::solve(
            &stack,
            &structure.charge,
            &Band::of(&structure),
            Accuracy::default(),
        )
        .unwrap()
    };
    let solution = solve();
    let found = solution.equilibrium.as_ref().unwrap();
    assert!(found.is_settled());
    let (levels, iterations) = damped_mixing();
    println!(
        "{} iterations here, {iterations} of damped mixing",
        found.iterations
    );
    for (k, level) in levels.iter().enumerate() {
        let conduction = solution.bands.conduction().unwrap();
        let found = conduction.energy_ev(k) - conduction.energy_ev(0);
        // The grid of the reference is off by its step squared.
        assert!(
            (found - (level - levels[0])).abs() < 5e-4,
            "{k}: {found} {}",
            level - levels[0]
        );
    }
    criterion.bench_function("charge: self-consistent well", |b| {
        b.iter(|| black_box(solve()))
    });
    criterion.bench_function("charge: damped mixing on central differences", |b| {
        b.iter(|| black_box(damped_mixing()))
    });
}

criterion_group! {
    name = group;
    config = Criterion::default().sample_size(20);
    targets = benches
}
criterion_main!(group);
