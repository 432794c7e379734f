//! Speed of open ends: the levels of a double barrier with their widths, and the part that crosses at 1000 energies. Beside
//! the latter a plain transfer matrix in the same run (Tsu & Esaki, Appl. Phys. Lett. 22, 562 (1973)).
//! `cargo bench --bench open_ends`.

use criterion::{Criterion, criterion_group, criterion_main};
use nalgebra::{Complex, Matrix2, Vector2};
use std::hint::black_box;
use wellwright::constants::HBAR2_OVER_2M0;
use wellwright::models::BandOperator;
use wellwright::open_ends::{Outside, Wanted, crossing, quasi_bound};
use wellwright::structure;

/// Width in nm, edge in eV, mass in m0.
const LAYERS: [[f64; 3]; 5] = [
    [15.0, 0.0, 0.067],
    [2.8, 0.25, 0.096],
    [4.8, 0.0, 0.067],
    [2.8, 0.25, 0.096],
    [15.0, 0.0, 0.067],
];
const ENERGIES: usize = 1000;
const HIGHEST_EV: f64 = 0.35;

fn text() -> String {
    let [[_, well_ev, well_m0], [_, barrier_ev, barrier_m0], ..] = LAYERS;
    let mut text = format!(
        "ends: open\nbands: {{conduction: {{model: parabolic, states: 2}}}}\nmaterials:\n  \
         Well: {{conduction_edge: {well_ev} eV, electron_mass: {well_m0}}}\n  \
         Barrier: {{conduction_edge: {barrier_ev} eV, electron_mass: {barrier_m0}}}\nlayers:\n"
    );
    for (k, [width_nm, ..]) in LAYERS.iter().enumerate() {
        let material = if k % 2 == 0 { "Well" } else { "Barrier" };
        text += &format!("  - {{material: {material}, width: {width_nm} nm}}\n");
    }
    text
}

/// (ψ, A ψ′) carried down from the wave that leaves at the top, layer by layer.
fn transfer_matrix(energy_ev: f64) -> f64 {
    let law = |[_, edge_ev, mass_m0]: [f64; 3]| {
        let a = HBAR2_OVER_2M0 / mass_m0;
        (a, Complex::from((energy_ev - edge_ev) / a).sqrt())
    };
    let (a, k) = law(LAYERS[4]);
    let i = Complex::<f64>::i();
    let mut wave = Vector2::new(Complex::<f64>::from(1.0), i * k * a);
    for layer in LAYERS.iter().rev() {
        let (a, k) = law(*layer);
        let (s, c) = ((k * layer[0]).sin(), (k * layer[0]).cos());
        wave = Matrix2::new(c, -s / (k * a), s * k * a, c) * wave;
    }
    // Both leads are alike.
    let incoming: Complex<f64> = (wave[0] + wave[1] / (i * k * a)) * 0.5;
    1.0 / incoming.norm_sqr()
}

fn bench(c: &mut Criterion) {
    let (file, problems) = structure::read(&text());
    let file = file.unwrap_or_else(|| panic!("{problems:?}"));
    let stack = file.stack().expect("the stack is right");
    let operator =
        BandOperator::conduction(&stack, file.conduction.model).expect("the materials are right");
    let energies_ev: Vec<f64> = (1..=ENERGIES)
        .map(|n| HIGHEST_EV * n as f64 / ENERGIES as f64)
        .collect();
    let points = crossing(&operator, &energies_ev);
    let worst = points
        .iter()
        .map(|point| (point.crossing / transfer_matrix(point.energy_ev) - 1.0).abs())
        .fold(0.0, f64::max);
    println!("the two differ by {worst:.1e} of T at most");
    c.bench_function("two levels of a double barrier with their widths", |b| {
        b.iter(|| {
            black_box(quasi_bound(
                black_box(&operator),
                Outside::Field,
                &Wanted::lowest(2),
            ))
        })
    });
    let mut group = c.benchmark_group("the part that crosses at 1000 energies");
    group.bench_function("crossing", |b| {
        b.iter(|| black_box(crossing(&operator, black_box(&energies_ev))))
    });
    group.bench_function("plain transfer matrix", |b| {
        b.iter(|| {
            for energy_ev in &energies_ev {
                black_box(transfer_matrix(black_box(*energy_ev)));
            }
        })
    });
    group.finish();
}

criterion_group!(benches, bench);
criterion_main!(benches);
