//! Speed of the sampled yield: 10 000 wafers of a five-layer double well, all transitions of four states, each wafer solved
//! in full. Beside it, in the same run, 100 wafers one at a time from scratch, by the program's own levels and by central
//! differences (the coarsest aligned grid that reaches 1 µeV, bisection with Sturm counts, no vectors): what a plain loop
//! would take is a hundred times that. `cargo bench --bench tolerance`.

use criterion::{Criterion, criterion_group, criterion_main};
use std::hint::black_box;
use wellwright::constants::HBAR2_OVER_2M0;
use wellwright::models::{Band, BandOperator};
use wellwright::structure::{self, BandName, Cause, Design, Level, Stack};
use wellwright::subbands::{Accuracy, Bands, solve};
use wellwright::tolerance::{Followed, sample, sources};

const STATES: usize = 4;
const ACCURACY: Accuracy = Accuracy { tolerance_ev: 1e-6 };
fn text(model: &str, more: &str) -> String {
    format!(
        "substrate: GaAs\ntemperature: 77 K\nfield: 20 kV/cm\nbands: {{conduction: {{model: {model}, states: {STATES}}}}}\nlayers:\n  \
         - {{material: Al0.3Ga0.7As, width: 10 nm}}\n  - {{material: GaAs, width: 6 nm}}\n  - {{material: Al0.3Ga0.7As, width: 2 nm}}\n  \
         - {{material: GaAs, width: 5 nm}}\n  - {{material: Al0.3Ga0.7As, width: 10 nm}}\n\
         tolerance:\n  rate: 0.7 %\n  flux: {{Ga: 0.5 %, Al: 1 %}}\n  jitter: 0.3 ML\n  composition: 0.005\n  field: 1 kV/cm\n  temperature: 2 K\n{more}"
    )
}

/// The lowest levels by central differences on a grid aligned with every interface, some `per_nm` points per nm in each
/// layer: bisection with Sturm counts of K − E M to a hundredth of what is asked for.
fn central_differences(stack: &Stack, per_nm: f64) -> Vec<f64> {
    let (mut links, mut steps, mut edges) = (Vec::new(), Vec::new(), Vec::new());
    for (k, layer) in stack.layers.iter().enumerate() {
        let material = stack.material_at(k, 0.0);
        let mass = material.electron_mass_m0.expect("known");
        let count = (layer.width_nm * per_nm).round();
        let step = layer.width_nm / count;
        for _ in 0..count as usize {
            links.push(HBAR2_OVER_2M0 / mass / step);
            steps.push(step);
            edges.push(material.conduction_edge_ev.expect("known"));
        }
    }
    let mut z = 0.0;
    let nodes: Vec<(f64, f64, f64)> = (1..links.len())
        .map(|k| {
            z += steps[k - 1];
            let weight = 0.5 * (steps[k - 1] + steps[k]);
            let edge = 0.5 * (edges[k - 1] * steps[k - 1] + edges[k] * steps[k]);
            let field = stack.field_v_per_nm * z * weight;
            (links[k - 1] + links[k] + edge + field, weight, links[k - 1])
        })
        .collect();
    let count = |energy: f64| {
        let (mut negative, mut pivot) = (0, f64::INFINITY);
        for (diagonal, weight, below) in &nodes {
            pivot = diagonal - energy * weight - below * below / pivot;
            if pivot == 0.0 {
                pivot = 1e-300;
            }
            negative += usize::from(pivot < 0.0);
        }
        negative
    };
    let floor = edges.iter().copied().fold(f64::INFINITY, f64::min);
    (0..STATES)
        .map(|level| {
            let (mut low, mut high) = (floor, floor + 0.8);
            while high - low > 0.01 * ACCURACY.tolerance_ev {
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
        let conduction = Band::Conduction(file.conduction.model);
        let bands = Bands::solve(design.stack(), &[(conduction, STATES)], ACCURACY)
            .expect("the materials suit");
        let level = |index| Level {
            band: BandName::Conduction,
            index,
        };
        let followed = Followed::new(&bands, (1..=STATES).map(level).collect());
        let pairs: Vec<(usize, usize)> = (0..STATES)
            .flat_map(|from| (from + 1..STATES).map(move |to| (from, to)))
            .collect();
        let sources = sources(&file, &stack, stated, &design, &followed);
        group.bench_function(name, |b| {
            b.iter(|| {
                black_box(sample(
                    &design,
                    &followed,
                    &pairs,
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
    // The coarsest grid that is as accurate as asked for.
    let exact = {
        let operator =
            BandOperator::conduction(&stack, file.conduction.model).expect("the materials suit");
        let fine = Accuracy {
            tolerance_ev: 1e-12,
        };
        solve(&operator, STATES, fine).pairs
    };
    let worst = |energies: &[f64]| {
        let errors = energies
            .iter()
            .zip(&exact)
            .map(|(e, x)| (e - x.value).abs());
        errors.fold(0.0, f64::max)
    };
    let per_nm = (10..)
        .step_by(5)
        .map(f64::from)
        .find(|&n| worst(&central_differences(&stack, n)) <= ACCURACY.tolerance_ev)
        .expect("some grid is fine enough");
    println!(
        "central differences with {per_nm} points per nm: worst error {:.1e} eV",
        worst(&central_differences(&stack, per_nm))
    );
    let mut group = c.benchmark_group("100 wafers one at a time, parabolic");
    group.sample_size(10);
    group.bench_function("solved from scratch", |b| {
        b.iter(|| {
            for wafer in &wafers {
                let operator = BandOperator::conduction(wafer, file.conduction.model)
                    .expect("the materials suit");
                black_box(solve(&operator, STATES, ACCURACY));
            }
        })
    });
    group.bench_function("central differences", |b| {
        b.iter(|| {
            for wafer in &wafers {
                black_box(central_differences(wafer, per_nm));
            }
        })
    });
    group.finish();
}

criterion_group!(benches, bench);
criterion_main!(benches);
