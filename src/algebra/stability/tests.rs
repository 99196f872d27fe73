//! Counts against published examples and products of known factors.

use super::*;
use crate::algebra::dense::{product, tests::poly};

fn counts(a: &[i64]) -> (usize, usize, usize) {
    let c = half_plane(&poly(a));
    (c.left, c.axis, c.right)
}

fn multiply(factors: &[&[i64]]) -> Vec<IBig> {
    factors.iter().fold(poly(&[1]), |p, f| product(&p, &poly(f)))
}

/// N. S. Nise, Control Systems Engineering, from memory: Example 6.2 (a zero in the first column), 6.4 (a row of
/// zeros: all of s^4 + 6 s^2 + 8 on the axis), 6.5 (a row of zeros, s^8 + ... + 20).
#[test]
fn worked_examples_of_nise() {
    assert_eq!(counts(&[3, 5, 6, 3, 2, 1]), (3, 0, 2));
    assert_eq!(counts(&[56, 8, 42, 6, 7, 1]), (1, 4, 0));
    assert_eq!(counts(&[20, 38, 48, 59, 39, 22, 12, 1, 1]), (2, 4, 2));
}

/// F. R. Gantmacher, The Theory of Matrices, vol. 2, ch. XV, §4: s^4 + s^3 + 2 s^2 + 2 s + 1 has a zero pivot (from
/// memory), and s^6 + s^5 + 3 s^4 + 3 s^3 + 3 s^2 + 2 s + 1 another.
#[test]
fn zero_pivots() {
    assert_eq!(counts(&[1, 2, 2, 1, 1]), (2, 0, 2));
    assert_eq!(counts(&[1, 2, 3, 3, 3, 1, 1]), (2, 2, 2));
}

#[test]
fn products_of_known_factors() {
    let p = multiply(&[&[1, 1], &[1, 1], &[-2, 1], &[9, 0, 1], &[9, 0, 1], &[0, 1], &[5, 2, 1], &[5, -2, 1]]);
    assert_eq!(half_plane(&p), HalfPlane { left: 4, axis: 5, right: 3 });
    assert_eq!(counts(&[]), (0, 0, 0));
    assert_eq!(counts(&[7]), (0, 0, 0));
    assert_eq!(counts(&[0, 0, -3]), (0, 2, 0));
    assert_eq!(counts(&[-4, 0, 0, 0, 1]), (1, 2, 1));
    // z - 1/2, z + 1 twice, z - 1, z^2 + 1, z - 3, z, z^2 + z + 2
    let q = multiply(&[&[-1, 2], &[1, 1], &[1, 1], &[-1, 1], &[1, 0, 1], &[-3, 1], &[0, 1], &[2, 1, 1]]);
    assert_eq!(unit_circle(&q), UnitCircle { inside: 2, on: 5, outside: 3 });
    assert_eq!(unit_circle(&poly(&[3])), UnitCircle::default());
    assert_eq!(unit_circle(&poly(&[1, 1])), UnitCircle { inside: 0, on: 1, outside: 0 });
}

#[test]
fn real_roots_and_sturm_counts() {
    // (x - 1)^2 (x - 2)(2 x - 1)(x + 3)^3 x (x^2 + 1)(x^2 - 2)
    let p = multiply(&[
        &[-1, 1],
        &[-1, 1],
        &[-2, 1],
        &[-1, 2],
        &[3, 1],
        &[3, 1],
        &[3, 1],
        &[0, 1],
        &[1, 0, 1],
        &[-2, 0, 1],
    ]);
    let found = real_roots(&p, 30);
    let near: Vec<_> = found.iter().map(|r| (r.low.to_f64().value(), r.multiplicity)).collect();
    let w = std::f64::consts::SQRT_2;
    let expected = [(-3.0, 3), (-w, 1), (0.0, 1), (0.5, 1), (1.0, 2), (w, 1), (2.0, 1)];
    assert_eq!(near.len(), expected.len());
    for ((x, m), (y, k)) in near.iter().zip(expected) {
        assert!((x - y).abs() < 1e-8 && *m == k, "{near:?}");
    }
    assert!(found.windows(2).all(|w| w[0].high < w[1].low));
    let count = |l: i64, h: i64| real_count(&p, Some(&RBig::from(l)), Some(&RBig::from(h)));
    assert_eq!([count(-3, 0), count(-4, 0), count(0, 1), count(1, 2), count(2, 9)], [2, 3, 2, 2, 0]);
    assert_eq!(real_count(&p, None, None), 7);
}
