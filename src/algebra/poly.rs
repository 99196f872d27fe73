//! Polynomials in several variables with whole coefficients.

use dashu_base::{Abs, Gcd, Sign};
use dashu_int::IBig;
use dashu_ratio::RBig;
use std::collections::BTreeMap;

/// A variable. The order of variables is the order of their numbers; a lower number is a higher variable.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Var(pub u32);

impl Var {
    /// The main variable, s or z: first in every order.
    pub const S: Self = Self(0);
}

type Monomial = Vec<(Var, u32)>;

/// A polynomial with whole coefficients, in canonical form: equal polynomials compare equal.
#[derive(Clone, Debug, PartialEq, Eq, Default)]
pub struct Poly {
    terms: BTreeMap<Monomial, IBig>,
}

impl Poly {
    /// The polynomial 0.
    pub fn zero() -> Self {
        Self::default()
    }
    /// The polynomial 1.
    pub fn one() -> Self {
        Self::constant(IBig::ONE)
    }
    /// A whole number as a polynomial.
    pub fn constant(value: IBig) -> Self {
        let mut terms = BTreeMap::new();
        if value != IBig::ZERO {
            terms.insert(Vec::new(), value);
        }
        Self { terms }
    }
    /// One variable.
    pub fn var(var: Var) -> Self {
        Self { terms: BTreeMap::from([(vec![(var, 1)], IBig::ONE)]) }
    }
    /// From terms in any order: each is an exponent for some variables, and a coefficient.
    pub fn from_terms(terms: impl IntoIterator<Item = (Vec<(Var, u32)>, IBig)>) -> Self {
        let mut out = Self::zero();
        for (mut m, c) in terms {
            m.retain(|p| p.1 > 0);
            m.sort_unstable();
            out.add_term(m, c);
        }
        out
    }
    fn add_term(&mut self, m: Monomial, c: IBig) {
        let e = self.terms.entry(m).or_default();
        *e += c;
        self.terms.retain(|_, c| *c != IBig::ZERO);
    }
    /// Whether it is 0.
    pub fn is_zero(&self) -> bool {
        self.terms.is_empty()
    }
    /// Whether it is 1.
    pub fn is_one(&self) -> bool {
        self.as_constant().is_some_and(|c| c == IBig::ONE)
    }
    /// Its value where it is a number.
    pub fn as_constant(&self) -> Option<IBig> {
        if self.is_zero() {
            return Some(IBig::ZERO);
        }
        if self.terms.len() == 1 { self.terms.get(&Vec::new()).cloned() } else { None }
    }
    /// How many terms it has.
    pub fn len(&self) -> usize {
        self.terms.len()
    }
    /// Its terms in descending lexicographic order of exponents: exponents of the variables that occur, coefficient.
    pub fn terms(&self) -> impl Iterator<Item = (Vec<(Var, u32)>, IBig)> + '_ {
        let vars = self.variables();
        let mut all: Vec<_> = self.terms.iter().collect();
        let key =
            |m: &Monomial| vars.iter().map(|v| m.iter().find(|p| p.0 == *v).map_or(0, |p| p.1)).collect::<Vec<_>>();
        all.sort_by_key(|(m, _)| std::cmp::Reverse(key(m)));
        all.into_iter().map(|(m, c)| (m.clone(), c.clone()))
    }
    /// The variables that occur, in their order.
    pub fn variables(&self) -> Vec<Var> {
        let mut v: Vec<Var> = self.terms.keys().flatten().map(|p| p.0).collect();
        v.sort_unstable();
        v.dedup();
        v
    }
    /// Degree in one variable; 0 for the polynomial 0.
    pub fn degree(&self, var: Var) -> u32 {
        self.terms.keys().filter_map(|m| m.iter().find(|p| p.0 == var)).map(|p| p.1).max().unwrap_or(0)
    }
    /// Coefficients as a polynomial in one variable, from the power 0 up; empty for 0.
    pub fn coefficients(&self, var: Var) -> Vec<Self> {
        if self.is_zero() {
            return Vec::new();
        }
        let mut out = vec![Self::zero(); self.degree(var) as usize + 1];
        for (m, c) in &self.terms {
            let k = m.iter().find(|p| p.0 == var).map_or(0, |p| p.1);
            let rest = m.iter().copied().filter(|p| p.0 != var).collect();
            out[k as usize].terms.insert(rest, c.clone());
        }
        out
    }
    /// The polynomial with these coefficients in one variable, from the power 0 up.
    pub fn from_coefficients(var: Var, coefficients: &[Self]) -> Self {
        let mut out = Self::zero();
        for (k, c) in coefficients.iter().enumerate() {
            out = out.add(&c.mul(&Self::var(var).pow(k as u32)));
        }
        out
    }
    /// Sum.
    #[must_use]
    pub fn add(&self, other: &Self) -> Self {
        let mut out = self.clone();
        for (m, c) in &other.terms {
            *out.terms.entry(m.clone()).or_default() += c;
        }
        out.terms.retain(|_, c| *c != IBig::ZERO);
        out
    }
    /// Difference.
    #[must_use]
    pub fn sub(&self, other: &Self) -> Self {
        self.add(&other.neg())
    }
    /// The negative.
    #[must_use]
    pub fn neg(&self) -> Self {
        self.scale(&IBig::NEG_ONE)
    }
    /// Product with a whole number.
    #[must_use]
    pub fn scale(&self, by: &IBig) -> Self {
        if *by == IBig::ZERO {
            return Self::zero();
        }
        Self { terms: self.terms.iter().map(|(m, c)| (m.clone(), c * by)).collect() }
    }
    /// Product.
    #[must_use]
    pub fn mul(&self, other: &Self) -> Self {
        let mut out = Self::zero();
        for (a, x) in &self.terms {
            for (b, y) in &other.terms {
                let mut m: BTreeMap<Var, u32> = a.iter().copied().collect();
                for &(v, e) in b {
                    *m.entry(v).or_default() += e;
                }
                *out.terms.entry(m.into_iter().collect()).or_default() += x * y;
            }
        }
        out.terms.retain(|_, c| *c != IBig::ZERO);
        out
    }
    /// Whole power.
    #[must_use]
    pub fn pow(&self, exponent: u32) -> Self {
        (0..exponent).fold(Self::one(), |p, _| p.mul(self))
    }
    /// Quotient where the division leaves nothing over, `None` otherwise.
    pub fn div_exact(&self, divisor: &Self) -> Option<Self> {
        let (lead, lc) = divisor.terms().next()?;
        let (mut rest, mut out) = (self.clone(), Self::zero());
        loop {
            let Some((m, c)) = rest.terms().next() else { break };
            let mut q: BTreeMap<Var, u32> = m.into_iter().collect();
            for &(v, e) in &lead {
                let have = q.entry(v).or_default();
                *have = have.checked_sub(e)?;
            }
            if &c % &lc != IBig::ZERO {
                return None;
            }
            let t = Self::from_terms([(q.into_iter().collect(), c / &lc)]);
            rest = rest.sub(&t.mul(divisor));
            out = out.add(&t);
        }
        Some(out)
    }
    /// Greatest common divisor of the coefficients, not negative.
    pub fn content(&self) -> IBig {
        self.terms
            .values()
            .fold(IBig::ZERO, |g, c| if g == IBig::ZERO { c.clone().abs() } else { IBig::from(g.gcd(c)) })
    }
    /// The coefficient of the first term in the order of [`Self::terms`]; 0 for 0.
    pub fn leading_coefficient(&self) -> IBig {
        self.terms().next().map_or(IBig::ZERO, |t| t.1)
    }
    /// Greatest common divisor, its leading coefficient positive; the numbers' own included.
    #[must_use]
    pub fn gcd(&self, other: &Self) -> Self {
        fn positive(p: Poly) -> Poly {
            if p.leading_coefficient().sign() == Sign::Negative { p.neg() } else { p }
        }
        if self.is_zero() {
            return positive(other.clone());
        }
        if other.is_zero() {
            return positive(self.clone());
        }
        let Some(v) = self.variables().into_iter().chain(other.variables()).min() else {
            return Self::constant(IBig::from(self.content().gcd(&other.content())));
        };
        let content = |p: &Self| p.coefficients(v).iter().fold(Self::zero(), |g, c| g.gcd(c));
        let (ca, cb) = (content(self), content(other));
        let common = ca.gcd(&cb);
        let (mut a, mut b) = (self.div_exact(&ca).unwrap_or_default(), other.div_exact(&cb).unwrap_or_default());
        if a.degree(v) < b.degree(v) {
            std::mem::swap(&mut a, &mut b);
        }
        while !b.is_zero() {
            if b.degree(v) == 0 {
                return common;
            }
            let lead = b.coefficients(v).pop().unwrap_or_default();
            let mut r = a;
            while !r.is_zero() && r.degree(v) >= b.degree(v) {
                let top = r.coefficients(v).pop().unwrap_or_default();
                let shift = Self::var(v).pow(r.degree(v) - b.degree(v));
                r = r.mul(&lead).sub(&b.mul(&top).mul(&shift));
            }
            a = b;
            let c = content(&r);
            b = if r.is_zero() { r } else { r.div_exact(&c).unwrap_or_default() };
        }
        positive(a.mul(&common))
    }
    /// The same with a number for one variable, and the denominator that was multiplied away:
    /// `p(value) = result.0 / result.1`.
    pub fn substitute(&self, var: Var, value: &RBig) -> (Self, IBig) {
        let d = self.degree(var);
        let (n, q) = (value.numerator().clone(), IBig::from(value.denominator().clone()));
        let mut out = Self::zero();
        for (k, c) in self.coefficients(var).iter().enumerate() {
            out = out.add(&c.scale(&(n.pow(k) * q.pow(d as usize - k))));
        }
        (out, q.pow(d as usize))
    }
}
