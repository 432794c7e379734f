//! Speed of a field sweep of an eight-well module, 100 points with eight levels and their transitions, states followed:
//! beside it a plain reference in the same run that solves one field after the other for the energies alone, by central
//! differences on a grid aligned with every interface and bisection with Sturm counts. `cargo bench --bench sweep`.

use criterion::{Criterion, criterion_group, criterion_main};
use rayon::ThreadPoolBuilder;
use std::hint::black_box;
use wellwright::constants::HBAR2_OVER_2M0;
use wellwright::structure;
use wellwright::subbands::Accuracy;
use wellwright::sweep::{Outcome, Part, sweep};

const WIDTHS_NM: [f64; 17] = [
    30.0, 8.1, 2.5, 6.8, 3.9, 15.2, 2.5, 9.6, 3.9, 8.1, 2.5, 6.8, 3.9, 15.2, 2.5, 9.6, 30.0,
];
const BARRIER_EV: f64 = 0.135;
const BARRIER_M0: f64 = 0.08;
const WELL_M0: f64 = 0.067;
const STATES: usize = 8;
const POINTS: usize = 100;
const LAST_KV_CM: f64 = 15.0;
/// Every interface lies on the grid.
const STEP_NM: f64 = 0.1;
/// Bisection ends here, in eV.
const ACCURACY_EV: f64 = 1e-8;

fn module() -> String {
    let mut text = format!(
        "bands: {{conduction: {{model: parabolic, states: {STATES}}}}}\nmaterials:\n  \
         Well: {{conduction_edge: 0 eV, electron_mass: {WELL_M0}}}\n  \
         Barrier: {{conduction_edge: {BARRIER_EV} eV, electron_mass: {BARRIER_M0}}}\n\
         sweep: {{vary: {{field: [0 kV/cm, {LAST_KV_CM} kV/cm]}}, points: {POINTS}}}\nlayers:\n"
    );
    for (k, width) in WIDTHS_NM.iter().enumerate() {
        let material = if k % 2 == 0 { "Barrier" } else { "Well" };
        text += &format!("  - {{material: {material}, width: {width} nm}}\n");
    }
    text
}

/// The lowest levels in a field, in eV, counted from the bottom of the stack.
fn central_differences(field_v_per_nm: f64) -> Vec<f64> {
    let (mut links, mut edges) = (Vec::new(), Vec::new());
    for (k, width) in WIDTHS_NM.iter().enumerate() {
        let (edge, mass) = if k % 2 == 0 {
            (BARRIER_EV, BARRIER_M0)
        } else {
            (0.0, WELL_M0)
        };
        for _ in 0..(width / STEP_NM).round() as usize {
            links.push(HBAR2_OVER_2M0 / mass / (STEP_NM * STEP_NM));
            edges.push(edge);
        }
    }
    let nodes = links.len() - 1;
    let diagonal: Vec<f64> = (0..nodes)
        .map(|k| {
            let edge = 0.5 * (edges[k] + edges[k + 1]);
            links[k] + links[k + 1] + edge + field_v_per_nm * (k + 1) as f64 * STEP_NM
        })
        .collect();
    let count = |energy: f64| {
        let (mut negative, mut pivot) = (0, f64::INFINITY);
        for (diagonal, link) in diagonal.iter().zip(&links) {
            pivot = diagonal - energy - link * link / pivot;
            negative += usize::from(pivot < 0.0);
        }
        negative
    };
    (0..STATES)
        .map(|level| {
            let (mut low, mut high) = (0.0, 1.0);
            while high - low > ACCURACY_EV {
                let middle = 0.5 * (low + high);
                if count(middle) > level {
                    high = middle;
                } else {
                    low = middle;
                }
            }
            0.5 * (low + high)
        })
        .collect()
}

fn field_v_per_nm(point: usize) -> f64 {
    1e-4 * LAST_KV_CM * point as f64 / (POINTS - 1) as f64
}

fn bench(c: &mut Criterion) {
    let (file, problems) = structure::read(&module());
    let file = file.unwrap_or_else(|| panic!("{problems:?}"));
    let stack = file.stack().expect("the stack is right");
    let ours = || -> Outcome {
        sweep(
            &file,
            &stack,
            None,
            Part::WHOLE,
            Accuracy::default(),
            &|_, _| {},
        )
        .expect("it can be swept")
    };
    let outcome = ours();
    let mut worst_ev = 0.0_f64;
    for (index, point) in outcome.points.iter().enumerate() {
        let found = point.found.as_ref().expect("every point can be solved");
        let reference = central_differences(field_v_per_nm(index));
        for (level, reference) in found.levels[0].iter().zip(reference) {
            worst_ev = worst_ev.max((level.energy_ev - reference).abs());
        }
    }
    println!(
        "the two differ by {worst_ev:.1e} eV at most; {} anticrossings",
        outcome.anticrossings.len()
    );
    let mut group = c.benchmark_group("field sweep of eight wells, 100 points");
    group.sample_size(10);
    for threads in [1, 2] {
        let pool = ThreadPoolBuilder::new()
            .num_threads(threads)
            .build()
            .expect("threads start");
        group.bench_function(format!("sweep, {threads} threads"), |b| {
            b.iter(|| black_box(pool.install(ours)))
        });
    }
    group.bench_function("central differences, one by one, energies alone", |b| {
        b.iter(|| {
            for point in 0..POINTS {
                black_box(central_differences(black_box(field_v_per_nm(point))));
            }
        })
    });
    group.finish();
}

criterion_group!(benches, bench);
criterion_main!(benches);
