//! Rational functions in lowest terms.

use super::Poly;
use dashu_int::IBig;
use dashu_ratio::RBig;

/// A quotient of two polynomials in lowest terms, the leading coefficient of its denominator positive.
///
/// Equal functions compare equal.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Fraction {
    numerator: Poly,
    denominator: Poly,
}

impl Fraction {
    /// The quotient in lowest terms, or `None` where the denominator is 0.
    pub fn new(numerator: Poly, denominator: Poly) -> Option<Self> {
        if denominator.is_zero() {
            return None;
        }
        let g = numerator.gcd(&denominator);
        let (mut n, mut d) =
            if g.is_one() { (numerator, denominator) } else { (exact(&numerator, &g), exact(&denominator, &g)) };
        if d.is_negative() {
            (n, d) = (n.neg(), d.neg());
        }
        Some(Self { numerator: n, denominator: d })
    }
    /// 0
    pub fn zero() -> Self {
        Poly::zero().into()
    }
    /// 1
    pub fn one() -> Self {
        Poly::one().into()
    }
    /// A rational number.
    pub fn number(value: &RBig) -> Self {
        Self {
            numerator: Poly::constant(value.numerator().clone()),
            denominator: Poly::constant(IBig::from(value.denominator().clone())),
        }
    }
    /// What stands above.
    pub fn numerator(&self) -> &Poly {
        &self.numerator
    }
    /// What stands below.
    pub fn denominator(&self) -> &Poly {
        &self.denominator
    }
    /// Whether it is 0.
    pub fn is_zero(&self) -> bool {
        self.numerator.is_zero()
    }
    /// Its value where it is a number.
    pub fn as_number(&self) -> Option<RBig> {
        let (n, d) = (self.numerator.as_constant()?, self.denominator.as_constant()?);
        Some(RBig::from_parts_signed(n, d))
    }
    /// Sum (Henrici, "A subroutine for computations with rational numbers", 1956: the only common factors that a sum
    /// can have are those of the two denominators).
    #[must_use]
    pub fn add(&self, other: &Self) -> Self {
        if self.is_zero() {
            return other.clone();
        }
        if other.is_zero() {
            return self.clone();
        }
        let (b, d) = (&self.denominator, &other.denominator);
        let shared = if b == d { d.clone() } else { b.gcd(d) };
        if shared.is_one() {
            let numerator = self.numerator.mul(d).add(&other.numerator.mul(b));
            return Self::from_parts(numerator, b.mul(d));
        }
        let (left, right) = (exact(b, &shared), exact(d, &shared));
        let numerator = self.numerator.mul(&right).add(&other.numerator.mul(&left));
        let common = numerator.gcd(&shared);
        Self::from_parts(exact(&numerator, &common), left.mul(&exact(d, &common)))
    }
    /// Difference.
    #[must_use]
    pub fn sub(&self, other: &Self) -> Self {
        self.add(&other.neg())
    }
    /// The negative.
    #[must_use]
    pub fn neg(&self) -> Self {
        Self { numerator: self.numerator.neg(), denominator: self.denominator.clone() }
    }
    /// Product: common factors stand only across.
    #[must_use]
    pub fn mul(&self, other: &Self) -> Self {
        self.product(&other.numerator, &other.denominator)
    }
    /// Quotient, or `None` where `other` is 0.
    pub fn div(&self, other: &Self) -> Option<Self> {
        if other.is_zero() {
            return None;
        }
        Some(if other.numerator.is_negative() {
            self.product(&other.denominator.neg(), &other.numerator.neg())
        } else {
            self.product(&other.denominator, &other.numerator)
        })
    }
    /// self · n/d, n/d in lowest terms with d positive.
    fn product(&self, n: &Poly, d: &Poly) -> Self {
        let (g, h) = (self.numerator.gcd(d), n.gcd(&self.denominator));
        if self.is_zero() || n.is_zero() {
            return Self::zero();
        }
        Self {
            numerator: exact(&self.numerator, &g).mul(&exact(n, &h)),
            denominator: exact(&self.denominator, &h).mul(&exact(d, &g)),
        }
    }
    /// Whole power, or `None` for a negative power of 0.
    pub fn pow(&self, exponent: i32) -> Option<Self> {
        let k = exponent.unsigned_abs();
        let (n, d) = (self.numerator.pow(k), self.denominator.pow(k));
        if exponent >= 0 {
            Some(Self { numerator: n, denominator: d })
        } else if n.is_zero() {
            None
        } else if n.is_negative() {
            Some(Self { numerator: d.neg(), denominator: n.neg() })
        } else {
            Some(Self { numerator: d, denominator: n })
        }
    }

    /// Parts without common factors, the denominator positive.
    fn from_parts(numerator: Poly, denominator: Poly) -> Self {
        if numerator.is_zero() { Self::zero() } else { Self { numerator, denominator } }
    }
}

/// A quotient that is known to be exact.
fn exact(p: &Poly, by: &Poly) -> Poly {
    if by.is_one() { p.clone() } else { p.div_exact(by).unwrap_or_default() }
}

impl From<Poly> for Fraction {
    fn from(numerator: Poly) -> Self {
        Self { numerator, denominator: Poly::one() }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::algebra::Var;
    use crate::algebra::poly::tests::polys;
    use proptest::prelude::*;

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(100))]

        /// Every operation against its definition, reduced from scratch.
        #[test]
        fn operations_stay_in_lowest_terms(a in polys(3, 3), b in polys(3, 3), c in polys(3, 3), d in polys(3, 3)) {
            prop_assume!([&a, &b, &c, &d].iter().all(|p| (0..3).all(|v| p.degree(Var(v)) < 20)));
            // Denominators with a factor in common.
            let (Some(x), Some(y)) = (Fraction::new(a, b.mul(&d)), Fraction::new(c, d)) else { return Ok(()) };
            let (n, m) = (x.numerator(), x.denominator());
            let (p, q) = (y.numerator(), y.denominator());
            prop_assert_eq!(Some(x.add(&y)), Fraction::new(n.mul(q).add(&p.mul(m)), m.mul(q)));
            prop_assert_eq!(Some(x.sub(&y)), Fraction::new(n.mul(q).sub(&p.mul(m)), m.mul(q)));
            prop_assert_eq!(Some(x.mul(&y)), Fraction::new(n.mul(p), m.mul(q)));
            prop_assert_eq!(x.div(&y), Fraction::new(n.mul(q), m.mul(p)));
            prop_assert_eq!(x.pow(-2), Fraction::new(m.mul(m), n.mul(n)));
            prop_assert_eq!(x.sub(&x), Fraction::zero());
        }
    }
}
