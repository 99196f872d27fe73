//! Systems in one variable with whole coefficients, and the elimination of rows of constants before any prime.

use super::super::Poly;
use super::super::Var;
use super::super::dense;
use super::super::solve::System;
use dashu_base::{Gcd, UnsignedAbs};
use dashu_int::{IBig, UBig};
use dashu_ratio::RBig;

/// Entries added beyond those taken away, up to which the elimination of an unknown is worth it: as an equation of its
/// own it would cost about this many products at each step (its pivot's inverse, the split of its value).
const FILL: usize = 6;
/// Coefficients longer than this are no longer one product each; elimination stops short of making them.
const LONG: usize = 26;

/// A row: (column, polynomial), columns rising, no zeros; and the right sides that are not 0 (which, polynomial).
#[derive(Clone, Debug, Default)]
pub(super) struct Row {
    /// The coefficients.
    pub(super) entries: Vec<(usize, Vec<IBig>)>,
    /// The right sides.
    pub(super) right: Vec<(usize, Vec<IBig>)>,
}

/// A row that says what an unknown is once the later ones are known: pivot·x = right - the other entries.
#[derive(Clone, Debug)]
pub(super) struct Eliminated {
    /// Which unknown.
    pub(super) column: usize,
    /// Its coefficient, a constant.
    pub(super) pivot: IBig,
    /// The other entries, all constants, and the right sides.
    pub(super) row: Row,
}

/// What is left of a system.
#[derive(Clone, Debug, Default)]
pub(super) struct Condensed {
    /// Rows that remain.
    pub(super) rows: Vec<Row>,
    /// Columns that remain, rising.
    pub(super) columns: Vec<usize>,
    /// In the order of elimination.
    pub(super) eliminated: Vec<Eliminated>,
    /// det of the whole = factor · det of what remains.
    pub(super) factor: RBig,
}

/// Sum of two sparse lists of polynomials, `a`·x + `b`·y.
fn combine(
    a: &[(usize, Vec<IBig>)],
    x: &IBig,
    b: &[(usize, Vec<IBig>)],
    y: &[IBig],
    skip: Option<usize>,
) -> Vec<(usize, Vec<IBig>)> {
    let mut out: Vec<(usize, Vec<IBig>)> = Vec::with_capacity(a.len() + b.len());
    let (mut i, mut j) = (0, 0);
    while i < a.len() || j < b.len() {
        let next = a.get(i).map_or(usize::MAX, |t| t.0).min(b.get(j).map_or(usize::MAX, |t| t.0));
        let mut sum = Vec::new();
        if let Some((_, p)) = a.get(i).filter(|t| t.0 == next) {
            sum = p.iter().map(|c| c * x).collect();
            i += 1;
        }
        if let Some((_, p)) = b.get(j).filter(|t| t.0 == next) {
            let product = dense::product(p, y);
            if sum.len() < product.len() {
                sum.resize(product.len(), IBig::ZERO);
            }
            for (s, c) in sum.iter_mut().zip(product) {
                *s += c;
            }
            j += 1;
        }
        let sum = dense::trim(sum);
        if !sum.is_empty() && skip != Some(next) {
            out.push((next, sum));
        }
    }
    out
}

impl Row {
    /// Greatest common divisor of all numbers in it.
    fn content(&self) -> UBig {
        let all: Vec<IBig> = self.entries.iter().chain(&self.right).flat_map(|t| t.1.iter().cloned()).collect();
        dense::content(&all)
    }
    fn divide(&mut self, by: &IBig) {
        for c in self.entries.iter_mut().chain(&mut self.right).flat_map(|t| &mut t.1) {
            *c = &*c / by;
        }
    }
    fn entry(&self, column: usize) -> Option<&Vec<IBig>> {
        self.entries.binary_search_by_key(&column, |t| t.0).ok().map(|k| &self.entries[k].1)
    }
    /// Whether it can be eliminated: constants only.
    fn is_constant(&self) -> bool {
        self.entries.iter().all(|t| t.1.len() == 1)
    }
    /// Numbers in it that are not 0.
    fn terms(&self) -> usize {
        self.entries.iter().map(|t| t.1.iter().filter(|c| !c.is_zero()).count()).sum()
    }
    fn longest(&self) -> usize {
        self.entries.iter().map(|t| dense::height_bits(&t.1)).max().unwrap_or(0)
    }
}

/// The rows of a system in [`Var::S`] alone, each divided by its content; `None` where another variable occurs.
pub(super) fn read(system: &System, rights: &[&[(usize, Poly)]]) -> Option<(Vec<Row>, IBig)> {
    let mut rows = Vec::with_capacity(system.rows.len());
    for row in &system.rows {
        let entries: Option<Vec<_>> = row.iter().map(|(j, p)| Some((*j, p.to_dense(Var::S)?))).collect();
        rows.push(Row { entries: entries?, right: Vec::new() });
    }
    for (k, right) in rights.iter().enumerate() {
        let mut values: Vec<&(usize, Poly)> = right.iter().collect();
        values.sort_by_key(|v| v.0);
        for same in values.chunk_by(|a, b| a.0 == b.0) {
            let sum = same.iter().fold(Poly::zero(), |s, v| s.add(&v.1));
            if !sum.is_zero() {
                rows[same[0].0].right.push((k, sum.to_dense(Var::S)?));
            }
        }
    }
    let mut factor = IBig::ONE;
    for row in &mut rows {
        let content = IBig::from(row.content());
        if !content.is_zero() && content != IBig::ONE {
            row.divide(&content);
            factor *= content;
        }
    }
    Some((rows, factor))
}

/// Eliminates unknowns by rows of constants where that costs little.
pub(super) fn condense(mut rows: Vec<Row>, factor: IBig) -> Condensed {
    let n = rows.len();
    let mut uses: Vec<Vec<usize>> = vec![Vec::new(); n];
    for (i, row) in rows.iter().enumerate() {
        for (j, _) in &row.entries {
            uses[*j].push(i);
        }
    }
    let mut factor = RBig::from(factor);
    let (mut row_gone, mut column_gone) = (vec![false; n], vec![false; n]);
    let (mut row_order, mut column_order) = (Vec::new(), Vec::new());
    let mut eliminated = Vec::new();
    // A row may become worth it once others have gone; two passes find nearly all.
    for i in (0..n).chain(0..n) {
        if row_gone[i] || !rows[i].is_constant() {
            continue;
        }
        let Some(column) = cheapest(&rows, &uses, i) else { continue };
        let row = std::mem::take(&mut rows[i]);
        let pivot = row.entry(column).map(|p| p[0].clone()).unwrap_or_default();
        let rest = Row { entries: row.entries.iter().filter(|t| t.0 != column).cloned().collect(), right: row.right };
        for &k in uses[column].iter().filter(|&&k| k != i) {
            let negative: Vec<IBig> = rows[k].entry(column).map(|p| p.iter().map(|c| -c).collect()).unwrap_or_default();
            let mut new = Row {
                entries: combine(&rows[k].entries, &pivot, &rest.entries, &negative, Some(column)),
                right: combine(&rows[k].right, &pivot, &rest.right, &negative, None),
            };
            let content = IBig::from(new.content());
            if !content.is_zero() {
                new.divide(&content);
                factor = factor * RBig::from(content) / RBig::from(pivot.clone());
            }
            rows[k] = new;
        }
        // Only rows of `column` have changed, and only in columns of row i.
        let touched: Vec<usize> = uses[column].iter().copied().filter(|&k| k != i).collect();
        for (j, _) in &rest.entries {
            uses[*j].retain(|&k| k != i);
            for &k in &touched {
                let has = rows[k].entry(*j).is_some();
                match (uses[*j].iter().position(|&u| u == k), has) {
                    (None, true) => uses[*j].push(k),
                    (Some(at), false) => drop(uses[*j].remove(at)),
                    _ => {}
                }
            }
        }
        uses[column].clear();
        factor *= RBig::from(pivot.clone());
        (row_gone[i], column_gone[column]) = (true, true);
        row_order.push(i);
        column_order.push(column);
        eliminated.push(Eliminated { column, pivot, row: rest });
    }
    let columns: Vec<usize> = (0..n).filter(|&j| !column_gone[j]).collect();
    row_order.extend((0..n).filter(|&i| !row_gone[i]));
    column_order.extend(&columns);
    if is_odd(&row_order) != is_odd(&column_order) {
        factor = -factor;
    }
    let rows = rows.into_iter().zip(row_gone).filter(|t| !t.1).map(|t| t.0).collect();
    Condensed { rows, columns, eliminated, factor }
}

/// The column of a constant row by which to eliminate it; `None` where that fills in more than it saves.
fn cheapest(rows: &[Row], uses: &[Vec<usize>], i: usize) -> Option<usize> {
    let row = &rows[i];
    let mut best: Option<(usize, usize)> = None;
    for (column, _) in &row.entries {
        let mut after = 0;
        for &k in uses[*column].iter().filter(|&&k| k != i) {
            if row.longest() + rows[k].longest() > LONG {
                after = usize::MAX / 2;
                break;
            }
            let terms = rows[k].entry(*column).map_or(0, |p| p.iter().filter(|c| !c.is_zero()).count());
            after += terms * (row.entries.len() - 1);
        }
        if best.is_none_or(|b| after < b.0) {
            best = Some((after, *column));
        }
    }
    let (after, column) = best?;
    let saved: usize = row.terms()
        + uses[column]
            .iter()
            .filter(|&&k| k != i)
            .map(|&k| rows[k].entry(column).map_or(0, |p| p.iter().filter(|c| !c.is_zero()).count()))
            .sum::<usize>();
    (after <= saved + FILL).then_some(column)
}

/// Whether a permutation of 0..n is odd.
pub(super) fn is_odd(permutation: &[usize]) -> bool {
    let mut seen = vec![false; permutation.len()];
    let mut odd = false;
    for start in 0..permutation.len() {
        let (mut k, mut length) = (start, 0usize);
        while !seen[k] {
            seen[k] = true;
            k = permutation[k];
            length += 1;
        }
        odd ^= length > 0 && length % 2 == 0;
    }
    odd
}

/// A wanted unknown in terms of those that remain: (Σ coefficient·x + Σ constant of each right side) / denominator.
#[derive(Clone, Debug)]
pub(super) struct Functional {
    /// (column, coefficient), whole.
    pub(super) terms: Vec<(usize, IBig)>,
    /// For some right sides, a polynomial.
    pub(super) constants: Vec<(usize, Vec<IBig>)>,
}

/// The wanted unknowns in terms of those that remain, over one common denominator.
pub(super) fn functionals(condensed: &Condensed, wanted: &[usize]) -> (Vec<Functional>, IBig) {
    let unit = |column: usize| vec![(column, vec![IBig::ONE])];
    let mut all: Vec<(Row, IBig)> =
        wanted.iter().map(|&w| (Row { entries: unit(w), right: Vec::new() }, IBig::ONE)).collect();
    for step in &condensed.eliminated {
        for (row, denominator) in &mut all {
            let Some(factor) = row.entry(step.column).cloned() else { continue };
            let negative: Vec<IBig> = factor.iter().map(|c| -c).collect();
            row.entries = combine(&row.entries, &step.pivot, &step.row.entries, &negative, Some(step.column));
            row.right = combine(&row.right, &step.pivot, &step.row.right, &factor, None);
            *denominator *= &step.pivot;
            let all = IBig::from(row.content().gcd(&(&*denominator).unsigned_abs()));
            row.divide(&all);
            *denominator = &*denominator / &all;
        }
    }
    let common = all.iter().fold(IBig::ONE, |l, (_, d)| {
        let g = IBig::from((&l).unsigned_abs().gcd(&d.unsigned_abs()));
        l * d / g
    });
    let out = all
        .into_iter()
        .map(|(row, d)| {
            let scale = &common / d;
            let scaled = |p: Vec<IBig>| p.into_iter().map(|c| c * &scale).collect::<Vec<_>>();
            let terms = row.entries.into_iter().map(|(j, p)| (j, scaled(p).swap_remove(0))).collect();
            let constants = row.right.into_iter().map(|(k, p)| (k, scaled(p))).collect();
            Functional { terms, constants }
        })
        .collect();
    (out, common)
}
