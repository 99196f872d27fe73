//! Polynomials and systems of equations at points modulo a prime: quick, and exact up to bad luck that can be counted.

use crate::algebra::prime::Prime;
use crate::algebra::{Poly, Var};
use rustc_hash::FxHashMap;
use std::collections::BTreeMap;

/// A point: a residue for every variable, always the same ones for the same number.
#[derive(Debug)]
pub(crate) struct Point {
    /// The prime.
    pub(crate) prime: Prime,
    number: u64,
}

impl Point {
    /// The point with this number, modulo this prime.
    pub(crate) fn new(prime: Prime, number: u64) -> Self {
        Self { prime, number }
    }

    /// The residue that stands for a variable.
    fn value(&self, var: Var) -> u64 {
        self.prime.scattered(self.number << 32 | u64::from(var.0))
    }

    /// The residue of a polynomial.
    pub(crate) fn of(&self, p: &Poly) -> u64 {
        let prime = &self.prime;
        if let Some(dense) = p.to_dense(Var::S) {
            let s = self.value(Var::S);
            return dense.iter().rev().fold(0, |sum, c| prime.add(prime.mul(sum, s), prime.of_big(c)));
        }
        let mut powers: FxHashMap<(Var, u32), u64> = FxHashMap::default();
        let mut sum = 0;
        for (exponents, c) in p.terms() {
            let mut term = prime.of_big(&c);
            for key in exponents {
                let power = *powers.entry(key).or_insert_with(|| prime.pow(self.value(key.0), u64::from(key.1)));
                term = prime.mul(term, power);
            }
            sum = prime.add(sum, term);
        }
        sum
    }
}

/// A square system by its rows, with one right side.
#[derive(Clone, Debug, Default)]
pub(crate) struct Residues {
    /// The rows.
    pub(crate) rows: Vec<BTreeMap<usize, u64>>,
    /// The right side.
    pub(crate) right: Vec<u64>,
}

impl Residues {
    /// Gaussian elimination in place, each time with the shortest row of the column; the determinant, 0 where the system
    /// is singular, in which case the elimination stops there. Afterwards every row begins with 1 at its pivot.
    fn eliminate(&mut self, prime: &Prime) -> (u64, Vec<(usize, usize)>) {
        let count = self.rows.len();
        let mut holders: Vec<Vec<usize>> = vec![Vec::new(); count];
        for (i, row) in self.rows.iter().enumerate() {
            row.keys().for_each(|&j| holders[j].push(i));
        }
        let (mut determinant, mut pivots) = (prime.one, Vec::with_capacity(count));
        let mut used = vec![false; count];
        let mut columns: Vec<usize> = (0..count).collect();
        // Columns with few entries first: they fill in least.
        columns.sort_by_key(|&j| holders[j].len());
        for column in columns {
            let live = |i: &usize| !used[*i] && self.rows[*i].contains_key(&column);
            let Some(pivot) =
                holders[column].iter().copied().filter(|i| live(i)).min_by_key(|&i| (self.rows[i].len(), i))
            else {
                return (0, pivots);
            };
            used[pivot] = true;
            let lead = self.rows[pivot][&column];
            determinant = prime.mul(determinant, lead);
            let inverse = prime.inverse(lead);
            self.rows[pivot].values_mut().for_each(|x| *x = prime.mul(*x, inverse));
            self.right[pivot] = prime.mul(self.right[pivot], inverse);
            let (source, source_right) = (self.rows[pivot].clone(), self.right[pivot]);
            let mut others = std::mem::take(&mut holders[column]);
            others.sort_unstable();
            others.dedup();
            for i in others.into_iter().filter(|&i| i != pivot && !used[i]) {
                let Some(factor) = self.rows[i].remove(&column) else { continue };
                for (&j, &x) in source.iter().filter(|(j, _)| **j != column) {
                    let product = prime.mul(factor, x);
                    let entry = self.rows[i].entry(j).or_insert_with(|| {
                        holders[j].push(i);
                        0
                    });
                    *entry = prime.sub(*entry, product);
                    if *entry == 0 {
                        self.rows[i].remove(&j);
                    }
                }
                self.right[i] = prime.sub(self.right[i], prime.mul(factor, source_right));
            }
            pivots.push((pivot, column));
        }
        (with_sign(determinant, &pivots, prime), pivots)
    }

    /// The determinant.
    pub(crate) fn determinant(mut self, prime: &Prime) -> u64 {
        self.right.resize(self.rows.len(), 0);
        self.eliminate(prime).0
    }

    /// The solution, or `None` for a singular system.
    pub(crate) fn solve(mut self, prime: &Prime) -> Option<Vec<u64>> {
        let (determinant, pivots) = self.eliminate(prime);
        if determinant == 0 {
            return None;
        }
        let mut solution = vec![0; self.rows.len()];
        for &(row, column) in pivots.iter().rev() {
            let known = self.rows[row].iter().filter(|(j, _)| **j != column);
            let sum = known.fold(0, |sum, (&j, &x)| prime.add(sum, prime.mul(x, solution[j])));
            solution[column] = prime.sub(self.right[row], sum);
        }
        Some(solution)
    }
}

/// The sign of the permutation row → column.
fn with_sign(determinant: u64, pivots: &[(usize, usize)], prime: &Prime) -> u64 {
    let mut image = vec![0; pivots.len()];
    pivots.iter().for_each(|&(row, column)| image[row] = column);
    let mut negative = false;
    for i in 0..image.len() {
        while image[i] != i {
            let j = image[i];
            image.swap(i, j);
            negative = !negative;
        }
    }
    if negative { prime.sub(0, determinant) } else { determinant }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_small_system_is_solved() {
        let p = Prime::first();
        // x + 2 y = 5, 3 x + 4 y = 11: x = 1, y = 2, determinant -2.
        let row = |a: i64, b: i64| BTreeMap::from([(0, p.of_signed(a)), (1, p.of_signed(b))]);
        let system = Residues { rows: vec![row(1, 2), row(3, 4)], right: vec![p.of(5), p.of(11)] };
        assert_eq!(system.clone().determinant(&p), p.of_signed(-2));
        assert_eq!(system.solve(&p), Some(vec![p.of(1), p.of(2)]));
        let singular = Residues { rows: vec![row(1, 2), row(2, 4)], right: vec![0, 0] };
        assert_eq!(singular.solve(&p), None);
    }
}
