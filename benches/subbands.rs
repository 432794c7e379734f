//! Speed of a solve beside a plain reference in the same run: central differences on a grid aligned with every
//! interface, bisection with Sturm counts, inverse iteration. Both solve a five-layer double well in a field, four states
//! with all dipoles, at 1 µeV; the reference once on the coarsest grid that is within 1 µeV, and once on the coarsest that
//! is as exact as the elements turn out to be. `cargo bench --bench subbands`.

use criterion::{Criterion, criterion_group, criterion_main};
use std::hint::black_box;
use wellwright::constants::HBAR2_OVER_2M0;
use wellwright::models::BandOperator;
use wellwright::optics::transitions;
use wellwright::structure;
use wellwright::subbands::{Accuracy, solve};
use wellwright::tune;

const WIDTHS_NM: [f64; 5] = [10.0, 6.0, 2.0, 5.0, 10.0];
const EDGES_EV: [f64; 5] = [0.25, 0.0, 0.25, 0.0, 0.25];
const MASSES_M0: [f64; 5] = [0.09, 0.067, 0.09, 0.067, 0.09];
const FIELD_V_PER_NM: f64 = 20e-4;
const STATES: usize = 4;
const ACCURACY_EV: f64 = 1e-6;

fn double_well(states: usize) -> String {
    let mut text = format!(
        "field: 20 kV/cm\nbands: {{conduction: {{model: parabolic, states: {states}}}}}\nmaterials:\n  \
         Well: {{conduction_edge: 0 eV, electron_mass: 0.067}}\n  Barrier: {{conduction_edge: 0.25 eV, electron_mass: 0.09}}\nlayers:\n"
    );
    for (k, width) in WIDTHS_NM.iter().enumerate() {
        text += &format!(
            "  - {{material: {}, width: {width} nm}}\n",
            if k % 2 == 0 { "Barrier" } else { "Well" }
        );
    }
    text
}

/// Central differences with `per_nm` points per nm: energies and the dipoles of all pairs.
fn central_differences(per_nm: usize) -> (Vec<f64>, Vec<f64>) {
    let step = 1.0 / per_nm as f64;
    let mut links = Vec::new();
    let mut edges = Vec::new();
    for ((width, edge), mass) in WIDTHS_NM.iter().zip(EDGES_EV).zip(MASSES_M0) {
        for _ in 0..(width * per_nm as f64).round() as usize {
            links.push(HBAR2_OVER_2M0 / mass / (step * step));
            edges.push(edge);
        }
    }
    let n = links.len() - 1;
    let diagonal: Vec<f64> = (0..n)
        .map(|k| {
            links[k]
                + links[k + 1]
                + 0.5 * (edges[k] + edges[k + 1])
                + FIELD_V_PER_NM * (k + 1) as f64 * step
        })
        .collect();
    let below: Vec<f64> = (0..n - 1).map(|k| -links[k + 1]).collect();
    let count = |energy: f64| {
        let mut negative = 0;
        let mut pivot = 1.0;
        for k in 0..n {
            let coupling = if k == 0 {
                0.0
            } else {
                below[k - 1] * below[k - 1] / pivot
            };
            pivot = diagonal[k] - energy - coupling;
            if pivot == 0.0 {
                pivot = 1e-300;
            }
            negative += usize::from(pivot < 0.0);
        }
        negative
    };
    let mut energies = Vec::new();
    let mut states: Vec<Vec<f64>> = Vec::new();
    for level in 0..STATES {
        let (mut low, mut high) = (0.0, 0.6);
        while high - low > 0.01 * ACCURACY_EV {
            let middle = 0.5 * (low + high);
            if count(middle) > level {
                high = middle
            } else {
                low = middle
            }
        }
        let energy = 0.5 * (low + high);
        let mut state = vec![1.0; n];
        for _ in 0..2 {
            solve_tridiagonal(&diagonal, &below, energy, &mut state);
            let norm = (step * state.iter().map(|v| v * v).sum::<f64>()).sqrt();
            state.iter_mut().for_each(|v| *v /= norm);
        }
        energies.push(energy);
        states.push(state);
    }
    let mut dipoles = Vec::new();
    for i in 0..STATES {
        for j in i + 1..STATES {
            dipoles.push(
                (0..n)
                    .map(|k| step * (k + 1) as f64 * step * states[i][k] * states[j][k])
                    .sum::<f64>()
                    .abs(),
            );
        }
    }
    (energies, dipoles)
}

/// Gaussian elimination with row exchanges for (T − energy) x = b.
fn solve_tridiagonal(diagonal: &[f64], below: &[f64], energy: f64, x: &mut [f64]) {
    let n = diagonal.len();
    let mut rows: Vec<[f64; 3]> = (0..n)
        .map(|k| {
            [
                diagonal[k] - energy,
                if k + 1 < n { below[k] } else { 0.0 },
                0.0,
            ]
        })
        .collect();
    for k in 0..n - 1 {
        let mut next = [
            below[k],
            diagonal[k + 1] - energy,
            if k + 2 < n { below[k + 1] } else { 0.0 },
        ];
        if next[0].abs() > rows[k][0].abs() {
            std::mem::swap(&mut rows[k], &mut next);
            x.swap(k, k + 1);
        }
        let factor = next[0] / rows[k][0];
        rows[k + 1] = [
            next[1] - factor * rows[k][1],
            next[2] - factor * rows[k][2],
            0.0,
        ];
        x[k + 1] -= factor * x[k];
    }
    if rows[n - 1][0] == 0.0 {
        rows[n - 1][0] = 1e-300;
    }
    for k in (0..n).rev() {
        let mut sum = x[k];
        if k + 1 < n {
            sum -= rows[k][1] * x[k + 1];
        }
        if k + 2 < n {
            sum -= rows[k][2] * x[k + 2];
        }
        x[k] = sum / rows[k][0];
    }
}

fn bench(c: &mut Criterion) {
    let (file, _) = structure::read(&double_well(STATES));
    let file = file.expect("the file is right");
    let stack = file.stack().expect("the stack is right");
    let accuracy = Accuracy {
        tolerance_ev: ACCURACY_EV,
    };
    let ours = || {
        let operator =
            BandOperator::conduction(&stack, file.conduction.model).expect("the materials suit");
        let subbands = solve(&operator, STATES, accuracy);
        let list = transitions(&subbands);
        (subbands, list)
    };
    // The coarsest grid that is as accurate as asked for: its worst level within 1 µeV of the converged one.
    let exact = {
        let operator =
            BandOperator::conduction(&stack, file.conduction.model).expect("the materials suit");
        solve(
            &operator,
            STATES,
            Accuracy {
                tolerance_ev: 1e-12,
            },
        )
        .pairs
    };
    let worst = |energies: &[f64]| {
        energies
            .iter()
            .zip(&exact)
            .map(|(e, x)| (e - x.value).abs())
            .fold(0.0, f64::max)
    };
    let coarsest = |error_ev: f64| {
        (10..)
            .step_by(5)
            .find(|&n| worst(&central_differences(n).0) <= error_ev)
            .expect("some grid is fine enough")
    };
    let own: Vec<f64> = ours().0.pairs.iter().map(|p| p.value).collect();
    let (per_nm, as_exact_per_nm) = (coarsest(ACCURACY_EV), coarsest(worst(&own)));
    println!(
        "worst error: elements {:.1e} eV with {} unknowns; central differences {:.1e} eV with {}, {:.1e} eV with {}",
        worst(&own),
        ours().0.pencil.size(),
        worst(&central_differences(per_nm).0),
        33 * per_nm - 1,
        worst(&central_differences(as_exact_per_nm).0),
        33 * as_exact_per_nm - 1,
    );
    let mut group = c.benchmark_group("double well in a field, 1 µeV");
    group.bench_function("elements", |b| b.iter(|| black_box(ours())));
    group.bench_function("central differences within 1 µeV", |b| {
        b.iter(|| black_box(central_differences(black_box(per_nm))))
    });
    group.bench_function("central differences as exact as the elements", |b| {
        b.iter(|| black_box(central_differences(black_box(as_exact_per_nm))))
    });
    group.finish();

    let mut group = c.benchmark_group("stacks of many layers, four states");
    group.sample_size(10);
    for repeats in [4, 40, 400] {
        let text = double_well(STATES).replace(
            "layers:\n",
            &format!("layers:\n  - repeat: {repeats}\n    layers:\n"),
        );
        let text = text
            .replace("\n  - {material", "\n      - {material")
            .replace("field: 20 kV/cm\n", "");
        let (file, problems) = structure::read(&text);
        let file = file.unwrap_or_else(|| panic!("{problems:?}"));
        let stack = file.stack().expect("the stack is right");
        group.bench_function(format!("{} layers", stack.layers.len()), |b| {
            b.iter(|| {
                let operator = BandOperator::conduction(&stack, file.conduction.model)
                    .expect("the materials suit");
                black_box(solve(&operator, STATES, accuracy))
            })
        });
    }
    group.finish();

    let (file, problems) = structure::read(COUPLED_WELLS);
    let file = file.unwrap_or_else(|| panic!("{problems:?}"));
    let stack = file.stack().expect("the stack is right");
    c.bench_function(
        "tune three widths and a composition to two transitions",
        |b| b.iter(|| black_box(tune::tune(&file, &stack, Accuracy::default(), &|_| {}).is_ok())),
    );
}

const COUPLED_WELLS: &str = "
substrate: GaAs
temperature: 77 K
field: 35 kV/cm
bands: {conduction: {model: energy-dependent, states: 3}}
layers:
  - {material: Al0.33Ga0.67As, width: 20 nm}
  - {name: wide well, material: GaAs, width: 7.2 nm}
  - {name: tunnel barrier, material: Al0.33Ga0.67As, width: 1.4 nm}
  - {name: narrow well, material: GaAs, width: 5.0 nm}
  - {material: Al0.33Ga0.67As, width: 20 nm}
tune:
  vary:
    - {layer: wide well, width: [5 nm, 9 nm]}
    - {layer: tunnel barrier, width: [0.8 nm, 2.5 nm]}
    - {layer: narrow well, width: [3 nm, 7 nm]}
    - {layer: tunnel barrier, fraction: Al, between: [0.2, 0.45]}
  aims:
    - {from: conduction 2, to: conduction 3, wavelength: 10.3 µm}
    - {from: conduction 1, to: conduction 2, energy: 36 meV}
  snap: monolayer
";

criterion_group!(benches, bench);
criterion_main!(benches);
