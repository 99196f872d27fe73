//! Polynomials in several variables with whole coefficients.
//!
//! A polynomial carries its own list of variables. The exponents of one term are packed into bit fields just wide
//! enough for the degrees, one word where that fits, the first variable highest: so comparing words compares
//! monomials, adding words multiplies them. Terms are sorted, descending. Coefficients are machine words where all fit.

pub(crate) mod arithmetic;
pub(crate) mod coefficients;
pub(crate) mod dense;
mod division;
pub(crate) mod layout;
mod shape;
#[cfg(test)]
pub(crate) mod tests;

use coefficients::Coefficients;
use dashu_int::IBig;
use layout::{Field, degrees, layout, repack, same_places, words};

/// A variable. The order of variables is the order of their numbers; a lower number is a higher variable.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Var(pub u32);

impl Var {
    /// The main variable, s or z: first in every order.
    pub const S: Self = Self(0);
}

/// A polynomial with whole coefficients, in canonical form: equal polynomials compare equal.
///
/// Invariants: `fields` has exactly the variables that occur, with their exact degrees, laid out by
/// [`layout::layout`]; keys are sorted descending, one for each coefficient; no coefficient is 0.
#[derive(Clone, PartialEq, Eq, Default)]
pub struct Poly {
    fields: Vec<Field>,
    keys: Vec<u64>,
    coefficients: Coefficients,
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
        if value == IBig::ZERO {
            return Self::zero();
        }
        Self { coefficients: Coefficients::from_big(vec![value]), ..Self::default() }
    }
    /// One variable.
    pub fn var(var: Var) -> Self {
        Self::monomial(&[(var, 1)], IBig::ONE)
    }
    /// One term; the variables rise, a coefficient of 0 gives 0.
    pub(crate) fn monomial(exponents: &[(Var, u64)], value: IBig) -> Self {
        if value == IBig::ZERO {
            return Self::zero();
        }
        let fields = layout(exponents.iter().copied());
        let mut keys = vec![0; words(&fields)];
        for f in &fields {
            f.set(&mut keys, f.degree);
        }
        Self { fields, keys, coefficients: Coefficients::from_big(vec![value]) }
    }
    /// From terms in any order: each is an exponent for some variables, and a coefficient.
    pub fn from_terms(terms: impl IntoIterator<Item = (Vec<(Var, u32)>, IBig)>) -> Self {
        let parts: Vec<Self> = terms
            .into_iter()
            .map(|(mut m, c)| {
                m.sort_unstable();
                let same: Vec<(Var, u64)> = m
                    .chunk_by(|a, b| a.0 == b.0)
                    .map(|run| (run[0].0, run.iter().map(|p| u64::from(p.1)).sum()))
                    .collect();
                Self::monomial(&same, c)
            })
            .collect();
        Self::sum_of(parts)
    }
    /// The sum of many, as a balanced tree.
    pub fn sum_of(mut parts: Vec<Self>) -> Self {
        while parts.len() > 1 {
            parts = parts.chunks(2).map(|p| if let [a, b] = p { a.add(b) } else { p[0].clone() }).collect();
        }
        parts.pop().unwrap_or_default()
    }
    /// Terms sorted descending without zeros, in a layout whose degrees may be too high.
    pub(crate) fn normalized(mut fields: Vec<Field>, mut keys: Vec<u64>, coefficients: Coefficients) -> Self {
        if coefficients.len() == 0 {
            return Self::zero();
        }
        let exact = degrees(&keys, &fields);
        if fields.iter().zip(&exact).any(|(f, d)| f.degree != *d) {
            let new = layout(fields.iter().zip(&exact).map(|(f, d)| (f.var, *d)));
            if !same_places(&fields, &new) {
                keys = repack(&keys, coefficients.len(), &fields, &new);
            }
            fields = new;
        }
        Self { fields, keys, coefficients }
    }
    /// Terms in any order, doubles and zeros among them.
    pub(crate) fn collected(fields: Vec<Field>, keys: &[u64], values: &[IBig]) -> Self {
        let w = words(&fields);
        if w == 0 {
            return Self::constant(values.iter().sum());
        }
        let key = |i: usize| &keys[i * w..(i + 1) * w];
        let mut order: Vec<usize> = (0..values.len()).collect();
        order.sort_unstable_by(|&i, &j| key(j).cmp(key(i)));
        let (mut out, mut sums): (Vec<u64>, Vec<IBig>) = (Vec::with_capacity(keys.len()), Vec::new());
        for run in order.chunk_by(|&i, &j| key(i) == key(j)) {
            let c: IBig = run.iter().map(|&i| &values[i]).sum();
            if c != IBig::ZERO {
                out.extend_from_slice(key(run[0]));
                sums.push(c);
            }
        }
        Self::normalized(fields, out, Coefficients::from_big(sums))
    }
    /// Whether it is 0.
    pub fn is_zero(&self) -> bool {
        self.coefficients.len() == 0
    }
    /// Whether it is 1.
    pub fn is_one(&self) -> bool {
        self.fields.is_empty() && matches!(&self.coefficients, Coefficients::Small(c) if **c == [1])
    }
    /// Whether it is a number.
    pub fn is_constant(&self) -> bool {
        self.fields.is_empty()
    }
    /// Its value where it is a number.
    pub fn as_constant(&self) -> Option<IBig> {
        if self.is_zero() {
            return Some(IBig::ZERO);
        }
        self.fields.is_empty().then(|| self.coefficients.get(0))
    }
    /// How many terms it has.
    pub fn len(&self) -> usize {
        self.coefficients.len()
    }
    /// Whether it has no term, which is to say that it is 0.
    pub fn is_empty(&self) -> bool {
        self.is_zero()
    }
    /// Bits of its greatest coefficient.
    pub fn bits(&self) -> usize {
        self.coefficients.bits()
    }
    /// The sum of its coefficients' magnitudes where that fits a word.
    pub(crate) fn magnitude(&self) -> Option<u64> {
        match &self.coefficients {
            Coefficients::Small(c) => c.iter().try_fold(0u64, |s, c| s.checked_add(c.unsigned_abs())),
            Coefficients::Big(_) => None,
        }
    }
    /// The packed exponents of term `i`.
    pub(crate) fn key(&self, i: usize) -> &[u64] {
        let w = words(&self.fields);
        &self.keys[i * w..(i + 1) * w]
    }
    /// Where the exponents stand.
    pub(crate) fn fields(&self) -> &[Field] {
        &self.fields
    }
    /// The coefficient of term `i` where all fit in 64 bits.
    pub(crate) fn small(&self, i: usize) -> Option<i64> {
        match &self.coefficients {
            Coefficients::Small(c) => c.get(i).copied(),
            Coefficients::Big(_) => None,
        }
    }
    /// All packed exponents.
    pub(crate) fn keys(&self) -> &[u64] {
        &self.keys
    }
    /// All coefficients.
    pub(crate) fn values(&self) -> &Coefficients {
        &self.coefficients
    }
    /// Its terms in descending lexicographic order of exponents: exponents of the variables that occur, coefficient.
    pub fn terms(&self) -> impl Iterator<Item = (Vec<(Var, u32)>, IBig)> + '_ {
        (0..self.len()).map(|i| {
            let key = self.key(i);
            let exponents = self.fields.iter().map(|f| (f.var, narrow(f.get(key)))).filter(|p| p.1 > 0).collect();
            (exponents, self.coefficients.get(i))
        })
    }
    /// The variables that occur, in their order.
    pub fn variables(&self) -> Vec<Var> {
        self.fields.iter().map(|f| f.var).collect()
    }
    /// Degree in one variable; 0 for the polynomial 0. Degrees beyond 32 bits, which [`super::solve`] refuses, show
    /// as the greatest of 32 bits.
    pub fn degree(&self, var: Var) -> u32 {
        narrow(self.degree_of(var))
    }
    pub(crate) fn degree_of(&self, var: Var) -> u64 {
        self.field(var).map_or(0, |f| f.degree)
    }
    pub(crate) fn field(&self, var: Var) -> Option<&Field> {
        self.fields.iter().find(|f| f.var == var)
    }
    /// Sum.
    #[must_use]
    pub fn add(&self, other: &Self) -> Self {
        arithmetic::sum(self, other, false)
    }
    /// Difference.
    #[must_use]
    pub fn sub(&self, other: &Self) -> Self {
        arithmetic::sum(self, other, true)
    }
    /// The negative.
    #[must_use]
    pub fn neg(&self) -> Self {
        Self { fields: self.fields.clone(), keys: self.keys.clone(), coefficients: self.coefficients.negated() }
    }
    /// Product with a whole number.
    #[must_use]
    pub fn scale(&self, by: &IBig) -> Self {
        if *by == IBig::ZERO {
            return Self::zero();
        }
        Self { fields: self.fields.clone(), keys: self.keys.clone(), coefficients: self.coefficients.scaled(by) }
    }
    /// Product.
    #[must_use]
    pub fn mul(&self, other: &Self) -> Self {
        if self.is_zero() || other.is_zero() {
            return Self::zero();
        }
        if self.is_one() {
            return other.clone();
        }
        if other.is_one() {
            return self.clone();
        }
        arithmetic::product(self, other)
    }
    /// Whole power, by squaring; the power 0 is 1.
    #[must_use]
    pub fn pow(&self, exponent: u32) -> Self {
        if let ([_, ..], 1) = (&self.fields[..], self.len()) {
            let powers: Vec<_> = self.fields.iter().map(|f| (f.var, f.degree * u64::from(exponent))).collect();
            return Self::monomial(&powers, self.coefficients.get(0).pow(exponent as usize));
        }
        let mut out = Self::one();
        for bit in (0..32 - exponent.leading_zeros()).rev() {
            out = out.mul(&out);
            if exponent >> bit & 1 == 1 {
                out = out.mul(self);
            }
        }
        out
    }
    /// Quotient where the division leaves nothing over, `None` otherwise (also for a divisor 0).
    pub fn div_exact(&self, divisor: &Self) -> Option<Self> {
        if divisor.is_zero() {
            return None;
        }
        if self.is_zero() || divisor.is_one() {
            return Some(self.clone());
        }
        if self == divisor {
            return Some(Self::one());
        }
        division::quotient(self, divisor)
    }
    /// All coefficients divided by a number that divides them.
    pub(crate) fn div_number(&self, by: &IBig) -> Option<Self> {
        let coefficients = self.coefficients.divided(by)?;
        Some(Self { fields: self.fields.clone(), keys: self.keys.clone(), coefficients })
    }
    /// The same with every coefficient changed; those that become 0 go.
    pub(crate) fn map_values(&self, change: impl Fn(IBig) -> IBig) -> Self {
        let values: Vec<IBig> = self.coefficients.iter().map(change).collect();
        let w = words(&self.fields);
        if values.iter().all(|c| *c != IBig::ZERO) {
            let coefficients = Coefficients::from_big(values);
            return Self { fields: self.fields.clone(), keys: self.keys.clone(), coefficients };
        }
        let mut keys = Vec::new();
        let mut kept = Vec::new();
        for (i, c) in values.into_iter().enumerate().filter(|(_, c)| *c != IBig::ZERO) {
            keys.extend_from_slice(&self.keys[i * w..(i + 1) * w]);
            kept.push(c);
        }
        Self::normalized(self.fields.clone(), keys, Coefficients::from_big(kept))
    }
    /// Greatest common divisor of the coefficients, not negative.
    pub fn content(&self) -> IBig {
        self.coefficients.content()
    }
    /// The coefficient of the first term in the order of [`Self::terms`]; 0 for 0.
    pub fn leading_coefficient(&self) -> IBig {
        if self.is_zero() { IBig::ZERO } else { self.coefficients.get(0) }
    }
    /// Whether the first coefficient is negative.
    pub(crate) fn is_negative(&self) -> bool {
        !self.is_zero() && self.coefficients.is_negative(0)
    }
    /// Divided by its content, the leading coefficient positive; 0 stays 0.
    #[must_use]
    pub fn primitive(&self) -> Self {
        if self.is_zero() {
            return Self::zero();
        }
        let mut content = self.content();
        if self.is_negative() {
            content = -content;
        }
        self.div_number(&content).unwrap_or_default()
    }
    /// Greatest common divisor, its leading coefficient positive; the numbers' own included.
    #[must_use]
    pub fn gcd(&self, other: &Self) -> Self {
        super::gcd::gcd(self, other)
    }
}

impl std::fmt::Debug for Poly {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        if self.is_zero() {
            return f.write_str("0");
        }
        for (i, (exponents, c)) in self.terms().enumerate() {
            let plus = if i > 0 && c > IBig::ZERO { "+" } else { "" };
            write!(f, "{plus}{c}")?;
            for (v, e) in exponents {
                write!(f, "*v{}^{e}", v.0)?;
            }
        }
        Ok(())
    }
}

/// An exponent in 32 bits, the greatest where it is beyond.
fn narrow(exponent: u64) -> u32 {
    u32::try_from(exponent).unwrap_or(u32::MAX)
}
