//! Speed of the sampled yield: 10 000 wafers of a five-layer double well, all transitions of four states, each wafer solved
//! in full. Beside it, in the same run, 100 of the wafers solved one at a time from scratch by the program's own levels
//! and by central differences (a grid as fine as 1 µeV needs, bisection with Sturm counts): what a plain loop would take
//! is a hundred times that. `cargo bench --bench tolerance`.

use criterion::{Criterion, criterion_group, criterion_main};
use std::hint::black_box;
use wellwright::constants::HBAR2_OVER_2M0;
use wellwright::models::ConductionOperator;
use wellwright::structure::{self, Cause, Design, Stack};
use wellwright::subbands::{Accuracy, Nearby, solve};
use wellwright::tolerance::{sample, sources};

const STATES: usize = 4;
const ACCURACY: Accuracy = Accuracy { tolerance_ev: 1e-6 };
/// Points per nm at which central differences reach 1 µeV on this stack, as `benches/subbands.rs` finds.
const POINTS_PER_NM: f64 = 65.0;

fn text(model: &str, more: &str) -> String {
    format!(
        "substrate: GaAs\ntemperature: 77 K\nfield: 20 kV/cm\nbands: {{conduction: {{model: {model}, states: {STATES}}}}}\nlayers:\n  \
         - {{material: Al0.3Ga0.7As, width: 10 nm}}\n  - {{material: GaAs, width: 6 nm}}\n  - {{material: Al0.3Ga0.7As, width: 2 nm}}\n  \
         - {{material: GaAs, width: 5 nm}}\n  - {{material: Al0.3Ga0.7As, width: 10 nm}}\n\
         tolerance:\n  rate: 0.7 %\n  flux: {{Ga: 0.5 %, Al: 1 %}}\n  jitter: 0.3 ML\n  composition: 0.005\n  field: 1 kV/cm\n  temperature: 2 K\n{more}"
    )
}

/// The four lowest levels by central differences: midpoint masses, bisection to a hundredth of a µeV.
fn central_differences(stack: &Stack) -> Vec<f64> {
    let step = 1.0 / POINTS_PER_NM;
    let faces = stack.faces_nm();
    let total = faces[faces.len() - 1];
    let n = (total / step) as usize;
    let step = total / n as f64;
    let layer = |z: f64| {
        (0..stack.layers.len())
            .find(|&k| z < faces[k + 1])
            .unwrap_or(stack.layers.len() - 1)
    };
    let materials: Vec<(f64, f64)> = (0..stack.layers.len())
        .map(|k| {
            let material = stack.material_at(k, 0.0);
            (
                material.conduction_edge_ev.expect("known"),
                HBAR2_OVER_2M0 / material.electron_mass_m0.expect("known"),
            )
        })
        .collect();
    let links: Vec<f64> = (0..n)
        .map(|k| materials[layer((k as f64 + 0.5) * step)].1 / (step * step))
        .collect();
    let diagonal: Vec<f64> = (1..n)
        .map(|k| {
            let z = k as f64 * step;
            links[k - 1] + links[k] + materials[layer(z)].0 + stack.field_v_per_nm * z
        })
        .collect();
    let count = |energy: f64| {
        let (mut negative, mut pivot) = (0, 1.0);
        for (k, d) in diagonal.iter().enumerate() {
            let coupling = if k == 0 {
                0.0
            } else {
                links[k] * links[k] / pivot
            };
            pivot = d - energy - coupling;
            if pivot == 0.0 {
                pivot = 1e-300;
            }
            negative += usize::from(pivot < 0.0);
        }
        negative
    };
    let floor = materials.iter().map(|m| m.0).fold(f64::INFINITY, f64::min);
    (0..STATES)
        .map(|level| {
            let (mut low, mut high) = (floor, floor + 0.8);
            while high - low > 1e-8 {
                let middle = 0.5 * (low + high);
                if count(middle) > level {
                    high = middle
                } else {
                    low = middle
                }
            }
            0.5 * (low + high)
        })
        .collect()
}

fn bench(c: &mut Criterion) {
    let mut group = c.benchmark_group("10 000 wafers of a double well");
    group.sample_size(10);
    for (name, text) in [
        ("parabolic", text("parabolic", "")),
        ("energy-dependent mass", text("energy-dependent", "")),
        (
            "parabolic, graded interfaces",
            text("parabolic", "  grading: {length: 0.5 nm, spread: 0.1 nm}\n"),
        ),
    ] {
        let (file, problems) = structure::read(&text);
        let file = file.unwrap_or_else(|| panic!("{problems:?}"));
        let stack = file.stack().expect("the stack is right");
        let stated = file.tolerance.as_ref().expect("a tolerance block");
        let grading_nm = stated.grading.as_ref().map(|g| g.length_nm);
        let design = Design::new(&stack, grading_nm).expect("a design");
        let model = file.conduction.model;
        let operator = ConductionOperator::new(design.stack(), model).expect("the materials suit");
        let solved = solve(&operator, STATES, ACCURACY);
        let nearby = Nearby::new(&solved);
        let sources = sources(&file, &stack, stated, &design, &nearby);
        group.bench_function(name, |b| {
            b.iter(|| {
                black_box(sample(
                    model,
                    &design,
                    &nearby,
                    &sources,
                    &[],
                    (10_000, 1),
                    &|_| {},
                ))
            })
        });
    }
    group.finish();

    let (file, _) = structure::read(&text("parabolic", ""));
    let file = file.expect("the file is right");
    let stack = file.stack().expect("the stack is right");
    let design = Design::new(&stack, None).expect("a design");
    let wafers: Vec<Stack> = (0..100)
        .map(|k| {
            let mut wafer = design.stack().clone();
            let off = [1e-4 * (k as f64 - 50.0)];
            design
                .grow(&mut wafer, &[Cause::Rate], &off)
                .expect("a wafer");
            wafer
        })
        .collect();
    let mut group = c.benchmark_group("100 wafers one at a time, parabolic");
    group.sample_size(10);
    group.bench_function("solved from scratch", |b| {
        b.iter(|| {
            for wafer in &wafers {
                let operator = ConductionOperator::new(wafer, file.conduction.model)
                    .expect("the materials suit");
                black_box(solve(&operator, STATES, ACCURACY));
            }
        })
    });
    group.bench_function("central differences", |b| {
        b.iter(|| {
            for wafer in &wafers {
                black_box(central_differences(wafer));
            }
        })
    });
    group.finish();
}

criterion_group!(benches, bench);
criterion_main!(benches);
