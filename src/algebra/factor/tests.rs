//! Factors of random products, and factorizations worked out elsewhere.

use super::{factor, factor_with};
use crate::algebra::poly::tests::polys;
use crate::algebra::{IBig, Poly, Var};
use proptest::prelude::*;

fn product(f: &super::Factored) -> Poly {
    f.factors.iter().fold(Poly::constant(f.unit.clone()), |p, (q, k)| p.mul(&q.pow(*k)))
}

/// A polynomial in x from its coefficients, the highest first.
fn x(coefficients: &[i64]) -> Poly {
    let rising: Vec<IBig> = coefficients.iter().rev().map(|&c| IBig::from(c)).collect();
    Poly::from_dense(Var(0), &rising)
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(100))]

    #[test]
    fn products_come_back(a in polys(3, 3), b in polys(3, 3), c in polys(2, 3)) {
        prop_assume!([&a, &b, &c].iter().all(|p| (0..3).all(|v| p.degree(Var(v)) < 12)));
        let p = a.mul(&b).mul(&c).mul(&c);
        let f = factor(&p);
        prop_assert_eq!(product(&f), p.clone());
        prop_assert_eq!(product(&factor_with(&p, &[a, c])), p);
        for (q, _) in &f.factors {
            prop_assert!(q.content() == IBig::ONE && q.leading_coefficient() > IBig::ZERO);
        }
    }

    #[test]
    fn rational_roots_are_found(roots in prop::collection::vec((1i64..60, -60i64..60), 1..9)) {
        let p = roots.iter().fold(Poly::one(), |p, &(a, b)| p.mul(&x(&[a, b])));
        let f = factor(&p);
        prop_assert_eq!(product(&f), p);
        prop_assert_eq!(f.factors.iter().map(|(_, k)| k).sum::<u32>() as usize, roots.len());
        prop_assert!(f.factors.iter().all(|(q, _)| q.degree(Var(0)) == 1));
    }
}

/// python-flint 0.9.0, fmpz_poly.factor.
#[test]
fn irreducible_factors_in_one_variable() {
    // x^24 - 1: the cyclotomic polynomials of the divisors of 24.
    let mut list = vec![0; 25];
    (list[0], list[24]) = (1, -1);
    let degrees: Vec<u32> = factor(&x(&list)).factors.iter().map(|(p, _)| p.degree(Var(0))).collect();
    assert_eq!(degrees, [1, 1, 2, 2, 2, 4, 4, 8]);
    // Swinnerton-Dyer's polynomial for 2, 3, 5: irreducible, but of factors of degree 1 or 2 modulo every prime.
    let p = x(&[1, 0, -40, 0, 352, 0, -960, 0, 576]);
    assert_eq!(factor(&p).factors, [(p, 1)]);
    // Sophie Germain's identity: x^4 + 4 = (x^2 - 2x + 2)(x^2 + 2x + 2).
    assert_eq!(factor(&x(&[1, 0, 0, 0, 4])).factors, [(x(&[1, -2, 2]), 1), (x(&[1, 2, 2]), 1)]);
    let p = x(&[2, 1, 3]).mul(&x(&[5, 0, -1, 7])).pow(2).mul(&x(&[3, 0, 0, 0, 1, 1]));
    let expected = [(x(&[2, 1, 3]), 2), (x(&[5, 0, -1, 7]), 2), (x(&[3, 0, 0, 0, 1, 1]), 1)];
    assert_eq!(factor(&p.scale(&IBig::from(-6))).factors, expected);
    assert_eq!(factor(&p.scale(&IBig::from(-6))).unit, IBig::from(-6));
}

#[test]
fn factors_in_several_variables() {
    let (s, k, t) = (Poly::var(Var(0)), Poly::var(Var(1)), Poly::var(Var(2)));
    let line = |a: &Poly, n: i64| a.add(&Poly::constant(IBig::from(n)));
    let p = line(&s, 2).pow(3).mul(&line(&s.mul(&t), 1).pow(2)).mul(&s.add(&k)).mul(&k);
    let f = factor(&p);
    let expected = [(line(&s, 2), 3), (k.clone(), 1), (s.add(&k), 1), (line(&s.mul(&t), 1), 2)];
    assert_eq!(f.factors, expected);
    // One variable in disguise.
    let p = s.add(&k).mul(&s.add(&k.scale(&IBig::from(2))));
    assert_eq!(factor(&p).factors.len(), 2);
    let st = s.mul(&t);
    assert_eq!(factor(&line(&st, 1).mul(&line(&st, 2))).factors, [(line(&st, 1), 1), (line(&st, 2), 1)]);
}
