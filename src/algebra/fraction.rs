//! Rational functions in lowest terms.

use super::Poly;
use dashu_base::Sign;
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
        let (mut n, mut d) = (numerator.div_exact(&g)?, denominator.div_exact(&g)?);
        if d.leading_coefficient().sign() == Sign::Negative {
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
    /// Sum.
    #[must_use]
    pub fn add(&self, other: &Self) -> Self {
        let n = self.numerator.mul(&other.denominator).add(&other.numerator.mul(&self.denominator));
        Self::reduced(n, self.denominator.mul(&other.denominator))
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
    /// Product.
    #[must_use]
    pub fn mul(&self, other: &Self) -> Self {
        Self::reduced(self.numerator.mul(&other.numerator), self.denominator.mul(&other.denominator))
    }
    /// Quotient, or `None` where `other` is 0.
    pub fn div(&self, other: &Self) -> Option<Self> {
        Self::new(self.numerator.mul(&other.denominator), self.denominator.mul(&other.numerator))
    }
    /// Whole power, or `None` for a negative power of 0.
    pub fn pow(&self, exponent: i32) -> Option<Self> {
        let k = exponent.unsigned_abs();
        let (n, d) = (self.numerator.pow(k), self.denominator.pow(k));
        if exponent < 0 { Self::new(d, n) } else { Some(Self { numerator: n, denominator: d }) }
    }

    /// In lowest terms; the caller knows that the denominator is not 0.
    fn reduced(numerator: Poly, denominator: Poly) -> Self {
        Self::new(numerator, denominator).unwrap_or_else(Self::zero)
    }
}

impl From<Poly> for Fraction {
    fn from(numerator: Poly) -> Self {
        Self { numerator, denominator: Poly::one() }
    }
}
