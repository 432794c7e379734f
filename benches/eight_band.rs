//! Speed of eight coupled bands on a mesh of about 60 nodes: 12 states nearest a shift with their vectors at one k∥, beside
//! nalgebra's dense eigensolver in the same run, and a dispersion of 50 k∥. `cargo bench --bench eight_band`.
//!
//! The matrix is written to `target/eight_band_matrix.txt`, for scipy's sparse shift-invert in `eight_band_scipy.py`.

use criterion::{Criterion, criterion_group, criterion_main};
use nalgebra::{DMatrix, DVector, SymmetricEigen};
use std::fmt::Write;
use std::hint::black_box;
use wellwright::models::multiband::{Direction, MultibandModel, MultibandOperator, Part};
use wellwright::numerics::mesh::Mesh;
use wellwright::numerics::nearest::{NearPair, around};
use wellwright::structure::{self, Stack};
use wellwright::subbands::follow::follow_on_mesh;
use wellwright::subbands::multiband::{Wanted, pencil};

const WELL: &str = "bands: {conduction: {model: parabolic, states: 1}}\nlayers:\n  - {material: Al0.3Ga0.7As, width: 9 nm}\n  \
                    - {material: GaAs, width: 10 nm}\n  - {material: Al0.3Ga0.7As, width: 9 nm}\n";
const K_PER_NM: f64 = 0.3;
/// Just below the first hole levels.
const SHIFT_EV: f64 = -0.83;
const STATES: usize = 12;

fn stack() -> Stack {
    let (file, _) = structure::read(WELL);
    file.and_then(|f| f.stack().ok())
        .expect("the stack is right")
}

fn mesh() -> Mesh {
    Mesh::new(&[9.0, 10.0, 9.0], &[2, 2, 2], 10)
}

/// The states of both parts, assembly included. In this stack, its own mirror image, each part has half of them.
fn nearest(operator: &MultibandOperator) -> Vec<Vec<NearPair>> {
    let parts = [Part::Plus, Part::Minus].into_iter();
    let solve = |part| {
        around(
            &pencil(operator, mesh(), K_PER_NM, part),
            SHIFT_EV,
            STATES / 2,
        )
    };
    parts.map(solve).collect()
}

fn dense(operator: &MultibandOperator) -> DMatrix<f64> {
    // The whole problem, node by node.
    let whole = pencil(operator, mesh(), K_PER_NM, Part::Both);
    let n = whole.size();
    let mut matrix = DMatrix::zeros(n, n);
    for k in 0..n {
        let mut unit = vec![0.0; n];
        unit[k] = 1.0;
        matrix.set_column(k, &DVector::from_vec(whole.matrix().times(&unit)));
    }
    matrix
}

fn speed(c: &mut Criterion) {
    let stack = stack();
    let operator = MultibandOperator::new(&stack, MultibandModel::EightBand, Direction::ALONG_100)
        .expect("known materials");
    let matrix = dense(&operator);
    let mut text = format!(
        "# {} rows; shift {SHIFT_EV} eV, {STATES} states\n",
        matrix.nrows()
    );
    for r in 0..matrix.nrows() {
        for col in 0..matrix.ncols() {
            if matrix[(r, col)] != 0.0 {
                let _ = writeln!(text, "{r} {col} {:?}", matrix[(r, col)]);
            }
        }
    }
    let target = concat!(env!("CARGO_MANIFEST_DIR"), "/target/eight_band_matrix.txt");
    std::fs::write(target, text).expect("target/ can be written");

    let mut own: Vec<f64> = nearest(&operator)
        .iter()
        .flatten()
        .map(|p| p.value)
        .collect();
    own.sort_by(f64::total_cmp);
    let mut all: Vec<f64> = SymmetricEigen::new(matrix.clone())
        .eigenvalues
        .iter()
        .copied()
        .collect();
    all.sort_by(|a, b| (a - SHIFT_EV).abs().total_cmp(&(b - SHIFT_EV).abs()));
    let mut expected = all[..STATES].to_vec();
    expected.sort_by(f64::total_cmp);
    for (own, expected) in own.iter().zip(&expected) {
        assert!((own - expected).abs() < 1e-9, "{own} for {expected}");
    }
    println!(
        "{} rows; the states agree with the dense ones: {own:?}",
        matrix.nrows()
    );

    c.bench_function("12 states nearest a shift", |b| {
        b.iter(|| nearest(black_box(&operator)))
    });
    let list: Vec<f64> = (0..50).map(|k| 0.02 * f64::from(k)).collect();
    let wanted = Wanted {
        conduction: 2,
        valence: 4,
    };
    c.bench_function("dispersion of 50 k", |b| {
        b.iter(|| follow_on_mesh(black_box(&operator), &mesh(), &list, wanted))
    });
    let mut slow = c.benchmark_group("reference");
    slow.sample_size(10);
    slow.bench_function("dense, all states, nalgebra", |b| {
        b.iter(|| SymmetricEigen::new(black_box(matrix.clone())))
    });
}

criterion_group!(benches, speed);
criterion_main!(benches);
