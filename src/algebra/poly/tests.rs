//! Ring laws and division on random polynomials, against a product written out term by term.

use super::{Poly, Var};
use dashu_int::IBig;
use dashu_ratio::RBig;
use proptest::prelude::*;
use std::collections::BTreeMap;

/// Random polynomials: few or many terms, small or long coefficients, now and then a dead time's exponents.
pub(crate) fn polys(variables: u32, terms: usize) -> impl Strategy<Value = Poly> {
    let exponent = prop_oneof![8 => 0u32..4, 1 => 0u32..40, 1 => Just(1_000_000_000u32)];
    let coefficient = prop_oneof![
        6 => (-9i64..10).prop_map(IBig::from),
        1 => any::<i64>().prop_map(IBig::from),
        1 => any::<i64>().prop_map(|c| IBig::from(c).pow(3)),
    ];
    let monomial = prop::collection::vec((0..variables, exponent), 0..=variables as usize);
    prop::collection::vec((monomial, coefficient), 0..=terms).prop_map(|terms| {
        Poly::from_terms(terms.into_iter().map(|(m, c)| {
            let once: BTreeMap<u32, u32> = m.into_iter().collect();
            (once.into_iter().map(|(v, e)| (Var(v), e)).collect(), c)
        }))
    })
}

fn written_out(a: &Poly, b: &Poly) -> Poly {
    let mut out: BTreeMap<Vec<(Var, u32)>, IBig> = BTreeMap::new();
    for (m, x) in a.terms() {
        for (n, y) in b.terms() {
            let mut e: BTreeMap<Var, u32> = m.iter().copied().collect();
            for &(v, k) in &n {
                *e.entry(v).or_default() += k;
            }
            *out.entry(e.into_iter().collect()).or_default() += &x * y;
        }
    }
    Poly::from_terms(out)
}

proptest! {
    #[test]
    fn products_are_the_sums_of_all_term_products(a in polys(4, 9), b in polys(4, 9)) {
        prop_assert_eq!(a.mul(&b), written_out(&a, &b));
        prop_assert_eq!(b.mul(&a), a.mul(&b));
    }

    #[test]
    fn products_in_one_variable_too(a in polys(1, 40), b in polys(1, 40)) {
        prop_assert_eq!(a.mul(&b), written_out(&a, &b));
    }

    #[test]
    fn products_of_many_variables_take_many_words(a in polys(30, 6), b in polys(30, 6)) {
        let p = a.mul(&b);
        prop_assert_eq!(&p, &written_out(&a, &b));
        if !b.is_zero() {
            prop_assert_eq!(p.div_exact(&b), Some(a));
        }
    }

    #[test]
    fn ring_laws(a in polys(4, 6), b in polys(4, 6), c in polys(4, 6)) {
        prop_assert_eq!(a.add(&b), b.add(&a));
        prop_assert_eq!(a.add(&b).sub(&b), a.clone());
        prop_assert_eq!(a.add(&b.add(&c)), a.add(&b).add(&c));
        prop_assert_eq!(a.mul(&b.add(&c)), a.mul(&b).add(&a.mul(&c)));
        prop_assert_eq!(a.sub(&a), Poly::zero());
        prop_assert_eq!(a.pow(3), a.mul(&a).mul(&a));
    }

    #[test]
    fn exact_quotients_and_none_otherwise(a in polys(3, 8), b in polys(3, 5), r in polys(3, 2)) {
        prop_assume!(!b.is_zero());
        prop_assert_eq!(a.mul(&b).div_exact(&b), Some(a.clone()));
        let p = a.mul(&b).add(&r);
        if let Some(q) = p.div_exact(&b) {
            prop_assert_eq!(q.mul(&b), p);
        }
    }

    #[test]
    fn taken_apart_and_put_together(a in polys(3, 9), n in -20i64..20, d in 1i64..9) {
        prop_assert_eq!(Poly::from_terms(a.terms()), a.clone());
        let var = Var(1);
        prop_assume!(a.degree(var) < 100);
        prop_assert_eq!(Poly::from_coefficients(var, &a.coefficients(var)), a.clone());
        // Horner's scheme on the coefficients, against the substitution.
        let value = RBig::from_parts_signed(IBig::from(n), IBig::from(d));
        let (p, q) = a.substitute(var, &value);
        let (num, den) = (value.numerator().clone(), IBig::from(value.denominator().clone()));
        let mut scale = IBig::ONE;
        let mut sum = Poly::zero();
        for c in a.coefficients(var).iter().rev() {
            sum = sum.scale(&num).add(&c.scale(&scale));
            scale *= &den;
        }
        prop_assert_eq!(sum.scale(&q), p.scale(&(if a.is_zero() { IBig::ONE } else { scale / den })));
        // The product rule.
        let b = a.add(&Poly::var(Var(0)));
        let d = |p: &Poly| p.derivative(var);
        prop_assert_eq!(d(&a.mul(&b)), d(&a).mul(&b).add(&a.mul(&d(&b))));
    }
}

#[test]
fn terms_come_in_descending_order() {
    let p = Poly::from_terms([
        (vec![], IBig::from(3)),
        (vec![(Var(7), 1)], IBig::from(-1)),
        (vec![(Var(0), 1), (Var(9), 2)], IBig::from(5)),
        (vec![(Var(0), 2)], IBig::from(1)),
        (vec![(Var(0), 1), (Var(7), 1)], IBig::from(2)),
    ]);
    assert_eq!(format!("{p:?}"), "1*v0^2+2*v0^1*v7^1+5*v0^1*v9^2-1*v7^1+3");
}

#[test]
fn long_dense_products_and_quotients() {
    // (1 + x)^400 has the binomial coefficients, C(400, 200) about 1.03e119 (Pascal's triangle, worked out here).
    let mut row = vec![IBig::ONE];
    for _ in 0..400 {
        let mut next = vec![IBig::ONE];
        next.extend(row.windows(2).map(|w| &w[0] + &w[1]));
        next.push(IBig::ONE);
        row = next;
    }
    let x = Poly::var(Var(2));
    let p = x.add(&Poly::one()).pow(400);
    assert_eq!(p.to_dense(Var(2)), Some(row));
    let q = x.sub(&Poly::constant(IBig::from(3))).pow(150).neg();
    assert_eq!(p.mul(&q).div_exact(&q), Some(p.clone()));
    assert_eq!(p.mul(&q).add(&Poly::one()).div_exact(&q), None);
}
