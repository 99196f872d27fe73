//! Polynomials by the powers of one variable: coefficients, substitution, derivative.

use super::coefficients::Coefficients;
use super::layout::{Field, layout, repack, words};
use super::{Poly, Var, narrow};
use dashu_int::IBig;
use dashu_ratio::RBig;

impl Poly {
    /// Coefficients as a polynomial in one variable, from the power 0 up; empty for 0.
    ///
    /// The list has degree + 1 entries; where the degree may be large and most entries 0 (dead times), use
    /// [`Self::powers`].
    pub fn coefficients(&self, var: Var) -> Vec<Self> {
        if self.is_zero() {
            return Vec::new();
        }
        let mut out = vec![Self::zero(); self.degree(var) as usize + 1];
        for (k, c) in self.powers(var) {
            out[k as usize] = c;
        }
        out
    }
    /// The powers of one variable that occur, descending, each with its coefficient.
    pub fn powers(&self, var: Var) -> Vec<(u32, Self)> {
        let Some(&field) = self.field(var) else {
            return if self.is_zero() { Vec::new() } else { vec![(0, self.clone())] };
        };
        let w = words(&self.fields);
        let mut groups: std::collections::BTreeMap<u64, Vec<usize>> = std::collections::BTreeMap::new();
        for (i, key) in self.keys.chunks_exact(w).enumerate() {
            groups.entry(field.get(key)).or_default().push(i);
        }
        groups.into_iter().rev().map(|(power, list)| (narrow(power), self.selected(&list, |v| v != var))).collect()
    }
    /// Terms from a rising list with only some variables; no two become the same.
    pub(crate) fn selected(&self, list: &[usize], keep: impl Fn(Var) -> bool) -> Self {
        let mut keys = Vec::with_capacity(list.len() * words(&self.fields));
        for &i in list {
            keys.extend_from_slice(self.key(i));
        }
        let coefficients = match &self.coefficients {
            Coefficients::Small(c) => Coefficients::Small(list.iter().map(|&i| c[i]).collect()),
            Coefficients::Big(c) => Coefficients::from_big(list.iter().map(|&i| c[i].clone()).collect()),
        };
        let rest = layout(self.fields.iter().filter(|f| keep(f.var)).map(|f| (f.var, f.degree)));
        let keys = repack(&keys, list.len(), &self.fields, &rest);
        Self::normalized(rest, keys, coefficients)
    }
    /// The coefficient of one power of one variable.
    #[must_use]
    pub fn coefficient(&self, var: Var, power: u32) -> Self {
        let Some(&field) = self.field(var) else {
            return if power == 0 { self.clone() } else { Self::zero() };
        };
        let w = words(&self.fields);
        let list: Vec<usize> =
            (0..self.len()).filter(|i| field.get(&self.keys[i * w..(i + 1) * w]) == u64::from(power)).collect();
        self.selected(&list, |v| v != var)
    }
    /// The leading coefficient as a polynomial in one variable.
    #[must_use]
    pub fn leading(&self, var: Var) -> Self {
        self.coefficient(var, self.degree(var))
    }
    /// The polynomial with these coefficients in one variable, from the power 0 up.
    pub fn from_coefficients(var: Var, coefficients: &[Self]) -> Self {
        let shifted = |(k, c): (usize, &Self)| c.mul(&Self::monomial(&[(var, k as u64)], IBig::ONE));
        Self::sum_of(coefficients.iter().enumerate().rev().map(shifted).collect())
    }
    /// The same with the exponents of one variable changed by a rising function that keeps 0.
    pub(crate) fn with_exponents(&self, var: Var, change: impl Fn(u64) -> u64) -> Self {
        let Some(old) = self.field(var) else { return self.clone() };
        let degree = |f: &Field| if f.var == var { change(f.degree) } else { f.degree };
        let fields = layout(self.fields.iter().map(|f| (f.var, degree(f))));
        let others: Vec<Field> = fields.iter().copied().filter(|f| f.var != var).collect();
        let w = words(&fields);
        let mut keys = vec![0; w * self.len()];
        let narrower = repack(&self.keys, self.len(), &self.fields, &others);
        let v = words(&others);
        for (i, key) in self.keys.chunks_exact(words(&self.fields)).enumerate() {
            let new = &mut keys[i * w..(i + 1) * w];
            new[..v].copy_from_slice(&narrower[i * v..(i + 1) * v]);
            if let Some(f) = fields.iter().find(|f| f.var == var) {
                f.set(new, change(old.get(key)));
            }
        }
        Self { fields, keys, coefficients: self.coefficients.clone() }
    }
    /// The derivative with respect to one variable.
    #[must_use]
    pub fn derivative(&self, var: Var) -> Self {
        let Some(field) = self.field(var) else { return Self::zero() };
        let w = words(&self.fields);
        let (mut keys, mut values) = (Vec::new(), Vec::new());
        for (key, c) in self.keys.chunks_exact(w).zip(self.coefficients.iter()) {
            let e = field.get(key);
            if e > 0 {
                let start = keys.len();
                keys.extend_from_slice(key);
                keys[start + field.word as usize] -= 1 << field.shift;
                values.push(c * IBig::from(e));
            }
        }
        Self::normalized(self.fields.clone(), keys, Coefficients::from_big(values))
    }
    /// The same with a number for one variable, and the denominator that was multiplied away:
    /// `p(value) = result.0 / result.1`.
    pub fn substitute(&self, var: Var, value: &RBig) -> (Self, IBig) {
        let Some(&field) = self.field(var) else { return (self.clone(), IBig::ONE) };
        let d = field.degree as usize;
        let (n, q) = (value.numerator().clone(), IBig::from(value.denominator().clone()));
        let w = words(&self.fields);
        let powers: Vec<u64> = self.keys.chunks_exact(w).map(|key| field.get(key)).collect();
        let factor = |e: u64| n.pow(e as usize) * q.pow(d - e as usize);
        let mut known: std::collections::BTreeMap<u64, IBig> = std::collections::BTreeMap::new();
        let values: Vec<IBig> = powers
            .iter()
            .zip(self.coefficients.iter())
            .map(|(&e, c)| c * &*known.entry(e).or_insert_with(|| factor(e)))
            .collect();
        let rest = layout(self.fields.iter().filter(|f| f.var != var).map(|f| (f.var, f.degree)));
        let keys = repack(&self.keys, self.len(), &self.fields, &rest);
        (Self::collected(rest, &keys, &values), q.pow(d))
    }
}
