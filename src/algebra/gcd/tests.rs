//! Divisors of random products.

use crate::algebra::poly::tests::polys;
use crate::algebra::{IBig, Poly, Var};
use proptest::prelude::*;

proptest! {
    #![proptest_config(ProptestConfig::with_cases(200))]

    #[test]
    fn divisors_divide_and_what_is_left_is_coprime(a in polys(3, 4), b in polys(3, 4), g in polys(3, 3)) {
        prop_assume!([&a, &b, &g].iter().all(|p| (0..3).all(|v| p.degree(Var(v)) < 50)));
        let (x, y) = (a.mul(&g), b.mul(&g));
        let d = x.gcd(&y);
        if x.is_zero() && y.is_zero() {
            prop_assert!(d.is_zero());
            return Ok(());
        }
        prop_assert!(d.leading_coefficient() > IBig::ZERO);
        if !g.is_zero() {
            prop_assert!(d.div_exact(&g).is_some());
        }
        let (p, q) = (x.div_exact(&d), y.div_exact(&d));
        prop_assert!(p.is_some() && q.is_some());
        prop_assert!(p.unwrap_or_default().gcd(&q.unwrap_or_default()).is_one());
    }

    #[test]
    fn divisors_in_one_variable(a in polys(1, 12), b in polys(1, 12), g in polys(1, 8)) {
        prop_assume!([&a, &b, &g].iter().all(|p| !p.is_zero() && p.degree(Var(0)) < 50));
        let d = a.mul(&g).gcd(&b.mul(&g));
        prop_assert_eq!(d, g.mul(&a.gcd(&b)).mul(&Poly::constant(g.leading_coefficient().signum())));
    }
}
