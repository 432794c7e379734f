//! Exact derivatives of eigenvalues, eigenvectors and moments of a [`Pencil`] with respect to a parameter of it.
//!
//! Values: λ′ = x · T′ x for a vector normalised by x · N x = 1 (Hellmann 1937, Feynman 1939, on the discrete problem).
//! Vectors: Nelson's method (Nelson, AIAA J. 14, 1201 (1976)): the singular system for x′ is solved with the largest
//! component held fixed, and the norm then decides the multiple of x that is missing.

use super::eigenpairs::Eigenpair;
use super::mesh::Element;
use super::pencil::{Coefficient, Pencil, Pole, dot};
use super::quadrature::MAX_ORDER;

/// How the discretised problem changes with one parameter.
#[derive(Clone, Debug)]
pub struct Change {
    /// Slopes of each element's start and length.
    pub elements: Vec<(f64, f64)>,
    /// Slopes of the coefficients at the nodes of each element, in the pencil's order; a pole's slopes stand where the
    /// pole stands.
    pub coefficients: Vec<Coefficient>,
}

/// The derivative of an eigenpair.
#[derive(Clone, Debug)]
pub struct PairSlope {
    pub value: f64,
    pub vector: Vec<f64>,
}

/// A pole's distance at λ with its slope, and whether it is inside its range.
fn distance_slope(pole: &Pole, change: &Pole, lambda: f64, lambda_slope: f64) -> (f64, f64, bool) {
    let (distance, inside) = pole.distance(lambda);
    let slope = if inside {
        lambda_slope - change.position
    } else if distance == pole.nearest {
        change.nearest
    } else {
        change.farthest
    };
    (distance, slope, inside)
}

/// Pairs of a pole and its slopes.
fn poles<'c>(
    at: &'c Coefficient,
    change: &'c Coefficient,
) -> impl Iterator<Item = (&'c Pole, &'c Pole)> {
    at.poles
        .iter()
        .zip(&change.poles)
        .filter_map(|(pole, change)| Some((pole.as_ref()?, change.as_ref()?)))
}

/// The explicit slope of A at fixed λ.
fn a_slope(at: &Coefficient, change: &Coefficient, lambda: f64) -> f64 {
    let mut sum = change.stiffness;
    for (pole, change) in poles(at, change) {
        let (x, x_slope, _) = distance_slope(pole, change, lambda, 0.0);
        sum += (change.strength - pole.strength * x_slope / x) / x;
    }
    sum
}

/// The whole slope of the divided difference of −A between λ and μ.
fn divided_slope(
    at: &Coefficient,
    change: &Coefficient,
    lambda: (f64, f64),
    mu: (f64, f64),
) -> f64 {
    let mut sum = 0.0;
    for (pole, change) in poles(at, change) {
        let (x, x_slope, x_inside) = distance_slope(pole, change, lambda.0, lambda.1);
        let (y, y_slope, y_inside) = distance_slope(pole, change, mu.0, mu.1);
        let (ratio, ratio_slope) = match (x_inside, y_inside) {
            (true, true) => (1.0, 0.0),
            (false, false) => continue,
            _ => {
                let gap = lambda.0 - mu.0;
                let ratio = (x - y) / gap;
                (ratio, (x_slope - y_slope - ratio * (lambda.1 - mu.1)) / gap)
            }
        };
        let product = pole.strength / (x * y);
        sum += (change.strength / (x * y) - product * (x_slope / x + y_slope / y)) * ratio
            + product * ratio_slope;
    }
    sum
}

/// T′ x at fixed λ.
fn changed_product(pencil: &Pencil, change: &Change, lambda: f64, x: &[f64]) -> Vec<f64> {
    let reference = pencil.mesh.reference;
    let p = reference.order;
    let mut out = vec![0.0; x.len()];
    let mut buffer = [0.0; MAX_ORDER + 1];
    let slopes = &mut buffer[..=p];
    for (index, element) in pencil.mesh.elements.iter().enumerate() {
        let (_, stretch) = change.elements[index];
        let relative = stretch / element.length;
        let changes = &change.coefficients[index * (p + 1)..(index + 1) * (p + 1)];
        let local = pencil.mesh.local(index, x);
        reference.slopes(local, slopes);
        let target = &mut out[index * p..=(index + 1) * p];
        for q in 0..=p {
            let (at, w) = (&pencil.at(index)[q], reference.weights[q]);
            let a = a_slope(at, &changes[q], lambda) - relative * at.a(lambda);
            slopes[q] *= 2.0 / element.length * w * a;
            let c = changes[q].constant + relative * (at.constant - lambda);
            target[q] += 0.5 * element.length * w * c * local[q];
        }
        reference.add_slopes_transposed(slopes, target);
    }
    let last = out.len() - 1;
    (out[0], out[last]) = (0.0, 0.0);
    out
}

/// The derivative of an eigenvalue.
pub fn value_slope(pencil: &Pencil, change: &Change, pair: &Eigenpair) -> f64 {
    dot(
        &pair.vector,
        &changed_product(pencil, change, pair.value, &pair.vector),
    )
}

/// The derivatives of one eigenpair with respect to several parameters.
pub fn pair_slopes(pencil: &Pencil, changes: &[Change], pair: &Eigenpair) -> Vec<PairSlope> {
    let (lambda, x) = (pair.value, &pair.vector);
    let largest = (1..x.len() - 1)
        .max_by(|&a, &b| x[a].abs().total_cmp(&x[b].abs()))
        .unwrap_or(1);
    let mut matrix = pencil.storage();
    pencil.assemble(lambda, &mut matrix);
    matrix.pin(largest - 1);
    let original = matrix.clone();
    let factored = matrix.factor();
    let weighted = pencil.weight(lambda, lambda, x);
    let inner = 1..x.len() - 1;
    changes
        .iter()
        .map(|change| {
            let product = changed_product(pencil, change, lambda, x);
            let value = dot(x, &product);
            let mut right: Vec<f64> = inner
                .clone()
                .map(|k| value * weighted[k] - product[k])
                .collect();
            right[largest - 1] = 0.0;
            let mut y = right.clone();
            factored.solve(&mut y);
            // One refinement: the factorisation does not exchange rows, so a small pivot may have cost digits.
            let mut residual: Vec<f64> = original
                .times(&y)
                .iter()
                .zip(&right)
                .map(|(t, r)| r - t)
                .collect();
            factored.solve(&mut residual);
            let mut vector = vec![0.0; x.len()];
            for (k, (v, r)) in y.iter().zip(&residual).enumerate() {
                vector[k + 1] = v + r;
            }
            let slope = (lambda, value);
            let norm_change = form_slope(pencil, change, (slope, x), (slope, x), |_| (1.0, 0.0));
            let missing = -(dot(&weighted, &vector) + 0.5 * norm_change);
            for (v, x) in vector.iter_mut().zip(x) {
                *v += missing * x;
            }
            PairSlope { value, vector }
        })
        .collect()
}

/// The moment x · N z y of two eigenvectors: the matrix element of the position.
pub fn moment(pencil: &Pencil, i: &Eigenpair, j: &Eigenpair) -> f64 {
    form(pencil, (i.value, &i.vector), (j.value, &j.vector))
}

/// The derivative of [`moment`].
pub fn moment_slope(
    pencil: &Pencil,
    change: &Change,
    i: (&Eigenpair, &PairSlope),
    j: (&Eigenpair, &PairSlope),
) -> f64 {
    let (value_i, value_j) = ((i.0.value, i.1.value), (j.0.value, j.1.value));
    let explicit = form_slope(
        pencil,
        change,
        (value_i, &i.0.vector),
        (value_j, &j.0.vector),
        |place| place,
    );
    explicit
        + form(pencil, (i.0.value, &i.1.vector), (j.0.value, &j.0.vector))
        + form(pencil, (i.0.value, &i.0.vector), (j.0.value, &j.1.vector))
}

/// ∫ z (x y + B x′ y′) with B the divided difference of −A.
fn form(pencil: &Pencil, (lambda, x): (f64, &[f64]), (mu, y): (f64, &[f64])) -> f64 {
    let mut sum = 0.0;
    if pencil.is_linear() {
        // B vanishes.
        let p = pencil.mesh.order();
        for (index, element) in pencil.mesh.elements.iter().enumerate() {
            let (x, y) = (pencil.mesh.local(index, x), pencil.mesh.local(index, y));
            for q in 0..=p {
                let weight = 0.5 * element.length * pencil.mesh.reference.weights[q];
                sum += weight * pencil.mesh.position(element, q) * x[q] * y[q];
            }
        }
        return sum;
    }
    for_each_node(pencil, x, y, |index, element, q, node| {
        let at = &pencil.at(index)[q];
        let z = pencil.mesh.position(element, q);
        sum += node.weight * z * (node.values + at.divided(lambda, mu) * node.slopes);
    });
    sum
}

/// The slope of ∫ f (x y + B x′ y′) at fixed nodal values, where f is 1 or the position: `factor` picks it out of
/// (position, slope of the position).
fn form_slope(
    pencil: &Pencil,
    change: &Change,
    (lambda, x): ((f64, f64), &[f64]),
    (mu, y): ((f64, f64), &[f64]),
    factor: impl Fn((f64, f64)) -> (f64, f64),
) -> f64 {
    let p = pencil.mesh.order();
    let mut sum = 0.0;
    for_each_node(pencil, x, y, |index, element, q, node| {
        let at = &pencil.at(index)[q];
        let (start_slope, stretch) = change.elements[index];
        let along = 0.5 * (1.0 + pencil.mesh.reference.nodes[q]);
        let (f, f_slope) = factor((
            element.start + along * element.length,
            start_slope + along * stretch,
        ));
        let relative = stretch / element.length;
        let b = at.divided(lambda.0, mu.0);
        let b_slope = divided_slope(at, &change.coefficients[index * (p + 1) + q], lambda, mu);
        // x y scales with the element's length, x′ y′ with its inverse.
        let values = (f_slope + f * relative) * node.values;
        let slopes = (f_slope * b + f * b_slope - f * b * relative) * node.slopes;
        sum += node.weight * (values + slopes);
    });
    sum
}

/// Products at one quadrature node.
struct Node {
    weight: f64,
    values: f64,
    slopes: f64,
}

fn for_each_node(
    pencil: &Pencil,
    x: &[f64],
    y: &[f64],
    mut visit: impl FnMut(usize, &Element, usize, Node),
) {
    let reference = pencil.mesh.reference;
    let p = reference.order;
    let (mut x_slopes, mut y_slopes) = ([0.0; MAX_ORDER + 1], [0.0; MAX_ORDER + 1]);
    for (index, element) in pencil.mesh.elements.iter().enumerate() {
        let (x, y) = (pencil.mesh.local(index, x), pencil.mesh.local(index, y));
        reference.slopes(x, &mut x_slopes[..=p]);
        reference.slopes(y, &mut y_slopes[..=p]);
        let scale = 2.0 / element.length;
        for q in 0..=p {
            let node = Node {
                weight: 0.5 * element.length * reference.weights[q],
                values: x[q] * y[q],
                slopes: scale * scale * x_slopes[q] * y_slopes[q],
            };
            visit(index, element, q, node);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::eigenpairs::lowest;
    use super::super::mesh::Mesh;
    use super::*;

    /// Three segments whose middle length and whose coefficients depend on v.
    fn problem(v: f64) -> Pencil {
        let lengths = [1.0, 0.8 + v, 1.1];
        Pencil::new(Mesh::new(&lengths, &[1, 2, 1], 10), |_, e, _| {
            let s = e.segment as f64;
            Coefficient {
                stiffness: 0.3 + 0.05 * s + 0.2 * v,
                poles: [
                    Some(Pole {
                        strength: 1.5 + v,
                        position: -2.0 - s - 0.7 * v,
                        nearest: 0.1,
                        farthest: 1e9,
                    }),
                    (e.segment == 1).then_some(Pole {
                        strength: 0.4,
                        position: -3.0 + v,
                        nearest: 0.1,
                        farthest: 1e9,
                    }),
                ],
                constant: [9.0, 0.0, 7.0][e.segment] + v * v + 0.3 * v * s,
            }
        })
    }

    fn change(pencil: &Pencil) -> Change {
        let elements = pencil.mesh.elements.iter().map(|e| match e.segment {
            0 => (0.0, 0.0),
            1 => (e.start_fraction, e.length_fraction),
            _ => (1.0, 0.0),
        });
        let coefficients = pencil.mesh.elements.iter().flat_map(|e| {
            let s = e.segment as f64;
            let slope = Coefficient {
                stiffness: 0.2,
                poles: [
                    Some(Pole {
                        strength: 1.0,
                        position: -0.7,
                        nearest: 0.0,
                        farthest: 0.0,
                    }),
                    (e.segment == 1).then_some(Pole {
                        strength: 0.0,
                        position: 1.0,
                        nearest: 0.0,
                        farthest: 0.0,
                    }),
                ],
                constant: 0.3 * s,
            };
            vec![slope; pencil.mesh.order() + 1]
        });
        Change {
            elements: elements.collect(),
            coefficients: coefficients.collect(),
        }
    }

    #[test]
    fn slopes_are_those_of_differences() {
        let pencil = problem(0.0);
        let pairs = lowest(&pencil, 3);
        let change = change(&pencil);
        let slopes: Vec<PairSlope> = pairs
            .iter()
            .map(|pair| pair_slopes(&pencil, std::slice::from_ref(&change), pair).remove(0))
            .collect();
        let h = 1e-5;
        let (ahead, behind) = (problem(h), problem(-h));
        let (ahead_pairs, behind_pairs) = (lowest(&ahead, 3), lowest(&behind, 3));
        for i in 0..3 {
            let difference = (ahead_pairs[i].value - behind_pairs[i].value) / (2.0 * h);
            assert!((difference - slopes[i].value).abs() < 1e-7 * difference.abs().max(1.0));
            for j in 0..3 {
                let difference = (moment(&ahead, &ahead_pairs[i], &ahead_pairs[j])
                    - moment(&behind, &behind_pairs[i], &behind_pairs[j]))
                    / (2.0 * h);
                let slope = moment_slope(
                    &pencil,
                    &change,
                    (&pairs[i], &slopes[i]),
                    (&pairs[j], &slopes[j]),
                );
                assert!(
                    (difference - slope).abs() < 1e-7 * difference.abs().max(1.0),
                    "{i} {j} {difference} {slope}"
                );
            }
        }
    }
}
