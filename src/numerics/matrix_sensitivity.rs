//! Exact derivatives of levels, vectors and moments of a [`MatrixPencil`] with respect to a parameter of it.
//!
//! With the unknowns scaled to unit mass the problem is ordinary: λ′ = x · r with r = (T′ − λ M′) x (Hellmann 1937, Feynman
//! 1939, on the discrete problem), and the scaled slope of the functions solves (T − λ) u = −(r − λ′ x), the norm giving
//! what lies along x.

use super::curvature::respond;
use super::matrix_pencil::{MatrixCoefficient, MatrixPencil};
use super::nearest::{NearPair, dot};
use super::quadrature::MAX_ORDER;
use nalgebra::DMatrix;
use std::sync::Arc;

/// The coefficients at one node; C is `c` raised by a number.
#[derive(Clone, Copy, Debug)]
pub struct At<'c> {
    pub a: &'c DMatrix<f64>,
    pub g: &'c DMatrix<f64>,
    pub c: &'c DMatrix<f64>,
    pub raised: f64,
}

/// Slopes of the coefficients at one node.
#[derive(Clone, Debug, Default)]
pub struct NodeSlope {
    pub matrices: Option<Arc<MatrixCoefficient>>,
    /// Of what C is raised by.
    pub raised: f64,
}

/// How the discretised problem changes with one parameter.
#[derive(Clone, Debug)]
pub struct MatrixChange {
    /// Slopes of each element's start and length.
    pub elements: Vec<(f64, f64)>,
    /// At the nodes of each element, element by element.
    pub coefficients: Vec<NodeSlope>,
}

/// The derivative of a level and of its functions, scaled as the pencil's vectors are.
#[derive(Clone, Debug)]
pub struct MatrixPairSlope {
    pub value: f64,
    pub vector: Vec<f64>,
}

/// (T′ − λ M′) x, scaled. `at(element, node)` are the coefficients of the pencil.
fn changed_product<'c>(
    pencil: &MatrixPencil,
    at: impl Fn(usize, usize) -> At<'c>,
    change: &MatrixChange,
    pair: &NearPair,
) -> Vec<f64> {
    let mesh = &pencil.mesh;
    let reference = mesh.reference;
    let (n, p) = (pencil.components(), reference.order);
    let functions: Vec<Vec<f64>> = (0..n).map(|k| pencil.function(&pair.vector, k)).collect();
    let mut images = vec![vec![0.0; mesh.node_count()]; n];
    let empty = [0.0; MAX_ORDER + 1];
    let (mut slopes, mut along, mut across) = (vec![empty; n], vec![empty; n], vec![empty; n]);
    for (index, element) in mesh.elements.iter().enumerate() {
        let stretch = change.elements[index].1;
        let own = &change.coefficients[index * (p + 1)..(index + 1) * (p + 1)];
        let changed = |slope: &NodeSlope| slope.matrices.is_some() || slope.raised != 0.0;
        if stretch == 0.0 && !own.iter().any(changed) {
            continue;
        }
        let relative = stretch / element.length;
        for (function, slopes) in functions.iter().zip(&mut slopes) {
            reference.slopes(mesh.local(index, function), &mut slopes[..=p]);
        }
        let value = |k: usize, q: usize| functions[k][index * p + q];
        let slope_of = |k: usize, q: usize| slopes[k][q];
        for q in 0..=p {
            let (here, slope, w) = (at(index, q), &own[q], reference.weights[q]);
            let (shorter, longer) = (2.0 / element.length * w, 0.5 * element.length * w);
            for r in 0..n {
                let (mut f, mut g) = (0.0, longer * slope.raised * value(r, q));
                if relative != 0.0 {
                    for c in 0..n {
                        f -= shorter * relative * here.a[(r, c)] * slope_of(c, q);
                        g += longer * relative * here.c[(r, c)] * value(c, q);
                    }
                    g += longer * relative * (here.raised - pair.value) * value(r, q);
                }
                if let Some(m) = &slope.matrices {
                    for c in 0..n {
                        f += shorter * m.a[(r, c)] * slope_of(c, q) + w * m.g[(r, c)] * value(c, q);
                        g += w * m.g[(c, r)] * slope_of(c, q) + longer * m.c[(r, c)] * value(c, q);
                    }
                }
                (along[r][q], across[r][q]) = (f, g);
            }
        }
        for (image, (along, across)) in images.iter_mut().zip(along.iter().zip(&across)) {
            let target = &mut image[index * p..=(index + 1) * p];
            for (t, g) in target.iter_mut().zip(across) {
                *t += g;
            }
            reference.add_slopes_transposed(&along[..=p], target);
        }
    }
    pencil.scaled_form(&images)
}

/// The derivative of a level.
pub fn value_slope<'c>(
    pencil: &MatrixPencil,
    at: impl Fn(usize, usize) -> At<'c>,
    change: &MatrixChange,
    pair: &NearPair,
) -> f64 {
    dot(&pair.vector, &changed_product(pencil, at, change, pair))
}

/// The derivative of a level with its functions; `known` are the solved pairs around it, itself among them.
pub fn pair_slope<'c>(
    pencil: &MatrixPencil,
    at: impl Fn(usize, usize) -> At<'c>,
    change: &MatrixChange,
    known: &[&NearPair],
    pair: &NearPair,
) -> MatrixPairSlope {
    let mut rest = changed_product(pencil, at, change, pair);
    let value = dot(&pair.vector, &rest);
    for (r, x) in rest.iter_mut().zip(&pair.vector) {
        *r = value * x - *r;
    }
    // Levels that coincide and are coupled by the change have no slopes of their own.
    let mut vector = respond(pencil, known, pair, &rest).unwrap_or_else(|| vec![0.0; rest.len()]);
    let norm_change = form_slope(pencil, change, [&pair.vector; 2], |_| (1.0, 0.0));
    for (u, x) in vector.iter_mut().zip(&pair.vector) {
        *u -= 0.5 * norm_change * x;
    }
    MatrixPairSlope { value, vector }
}

/// ∫ z x · y.
pub fn moment(pencil: &MatrixPencil, x: &[f64], y: &[f64]) -> f64 {
    let n = pencil.components();
    let products = x
        .chunks_exact(n)
        .zip(y.chunks_exact(n))
        .map(|(x, y)| dot(x, y));
    products.zip(pencil.positions()).map(|(xy, z)| xy * z).sum()
}

/// The derivative of [`moment`] of two solved pairs.
pub fn moment_slope(
    pencil: &MatrixPencil,
    change: &MatrixChange,
    i: (&NearPair, &MatrixPairSlope),
    j: (&NearPair, &MatrixPairSlope),
) -> f64 {
    form_slope(pencil, change, [&i.0.vector, &j.0.vector], |place| place)
        + moment(pencil, &i.1.vector, &j.0.vector)
        + moment(pencil, &i.0.vector, &j.1.vector)
}

/// The slope of ∫ f x · y at fixed functions, where f is 1 or the position: `factor` picks it out of (position, slope of
/// the position).
fn form_slope(
    pencil: &MatrixPencil,
    change: &MatrixChange,
    vectors: [&[f64]; 2],
    factor: impl Fn((f64, f64)) -> (f64, f64),
) -> f64 {
    let mesh = &pencil.mesh;
    let mut sum = 0.0;
    for k in 0..pencil.components() {
        let [x, y] = vectors.map(|vector| pencil.function(vector, k));
        for (index, element) in mesh.elements.iter().enumerate() {
            let (start_slope, stretch) = change.elements[index];
            let relative = stretch / element.length;
            let (x, y) = (mesh.local(index, &x), mesh.local(index, &y));
            for q in 0..=mesh.order() {
                let along = 0.5 * (1.0 + mesh.reference.nodes[q]);
                let place = (mesh.position(element, q), start_slope + along * stretch);
                let (f, f_slope) = factor(place);
                let weight = 0.5 * element.length * mesh.reference.weights[q];
                sum += weight * (f_slope + f * relative) * x[q] * y[q];
            }
        }
    }
    sum
}
