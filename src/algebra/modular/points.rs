//! The method that serves any system: sparse elimination at points modulo primes, and interpolation.

use super::super::prime::Prime;
use super::sparse::{Condensed, Functional, Row};
use rustc_hash::FxHashMap;

/// The determinant and, for each right side and output, the numerator Σ coefficient·det·x, modulo one prime; `None`
/// where the determinant vanishes modulo the prime.
///
/// The degree of the determinant is at most the sum of the rows' degrees; a numerator's is as large again as right
/// sides are longer than their rows.
pub(super) fn images(system: &Condensed, outputs: &[Functional], rights: usize, f: &Prime) -> Option<Vec<Vec<u64>>> {
    let (degree, excess) = degrees(&system.rows);
    let place: FxHashMap<usize, usize> = system.columns.iter().enumerate().map(|(k, &c)| (c, k)).collect();
    let rows: Vec<Modular> = system.rows.iter().map(|r| Modular::new(r, &place, f)).collect();
    let weights: Vec<Vec<(usize, u64)>> =
        outputs.iter().map(|o| o.terms.iter().map(|(j, c)| (place[j], f.of_big(c))).collect()).collect();
    let count = degree + excess + 1;
    let (mut points, mut values, mut singular) = (Vec::new(), Vec::new(), 0);
    let mut next = 0;
    while points.len() < count {
        next += 1;
        let at = f.of(next);
        match solve_at(&rows, rights, at, f) {
            Some((det, x)) => {
                points.push(at);
                let mut all = vec![det];
                for solution in &x {
                    all.extend(weights.iter().map(|w| {
                        let sum = w.iter().fold(0, |s, &(j, c)| f.add(s, f.mul(c, solution[j])));
                        f.mul(sum, det)
                    }));
                }
                values.push(all);
            }
            // A determinant that is not 0 has no more roots than its degree.
            None if singular == degree => return None,
            None => singular += 1,
        }
    }
    let kinds = values.first().map_or(0, Vec::len);
    let polynomial = |k: usize| interpolate(&points, values.iter().map(|v| v[k]).collect(), f);
    Some((0..kinds).map(|k| polynomial(k).into_iter().map(|c| f.value(c)).collect()).collect())
}

/// Bound on the degree of the determinant, and how much longer numerators may be.
pub(super) fn degrees(rows: &[Row]) -> (usize, usize) {
    let own = |r: &Row| r.entries.iter().map(|t| t.1.len() - 1).max().unwrap_or(0);
    let right = |r: &Row| r.right.iter().map(|t| t.1.len() - 1).max().unwrap_or(0);
    let excess = rows.iter().map(|r| right(r).saturating_sub(own(r))).max().unwrap_or(0);
    (rows.iter().map(own).sum(), excess)
}

/// A row's coefficients modulo a prime.
struct Modular {
    entries: Vec<(usize, Vec<u64>)>,
    right: Vec<(usize, Vec<u64>)>,
}

impl Modular {
    fn new(row: &Row, place: &FxHashMap<usize, usize>, f: &Prime) -> Self {
        let residues = |p: &[dashu_int::IBig]| p.iter().map(|c| f.of_big(c)).collect::<Vec<u64>>();
        Self {
            entries: row.entries.iter().map(|(j, p)| (place[j], residues(p))).collect(),
            right: row.right.iter().map(|(r, p)| (*r, residues(p))).collect(),
        }
    }
}

fn value(p: &[u64], at: u64, f: &Prime) -> u64 {
    p.iter().rev().fold(0, |v, &c| f.add(f.mul(v, at), c))
}

/// The determinant at a point and the solutions for each right side; `None` where it is 0. Pivots are taken from the
/// shortest row, in its least used column (H. M. Markowitz, "The elimination form of the inverse and its application to
/// linear programming", Management Science 3, 1957).
fn solve_at(rows: &[Modular], rights: usize, at: u64, f: &Prime) -> Option<(u64, Vec<Vec<u64>>)> {
    let n = rows.len();
    // Columns from n on are right sides.
    let mut work: Vec<Vec<(usize, u64)>> = rows
        .iter()
        .map(|r| {
            let left = r.entries.iter().map(|(j, p)| (*j, value(p, at, f)));
            let right = r.right.iter().map(|(k, p)| (n + k, value(p, at, f)));
            left.chain(right).filter(|t| t.1 != 0).collect()
        })
        .collect();
    let mut users: Vec<Vec<usize>> = vec![Vec::new(); n];
    for (i, row) in work.iter().enumerate() {
        for &(j, _) in row.iter().filter(|t| t.0 < n) {
            users[j].push(i);
        }
    }
    let mut open: Vec<bool> = vec![true; n];
    let mut order = Vec::with_capacity(n);
    let mut det = f.one;
    for _ in 0..n {
        let width = |i: &usize| work[*i].iter().filter(|t| t.0 < n).count();
        let i = (0..n).filter(|&i| open[i]).min_by_key(width)?;
        let (column, pivot) = work[i].iter().copied().filter(|t| t.0 < n).min_by_key(|t| users[t.0].len())?;
        det = f.mul(det, pivot);
        open[i] = false;
        let inverse = f.inverse(pivot);
        let source = work[i].clone();
        for &k in &std::mem::take(&mut users[column]) {
            if !open[k] {
                continue;
            }
            let factor = work[k].iter().find(|t| t.0 == column).map_or(0, |t| f.mul(t.1, inverse));
            work[k] = less(&work[k], &source, factor, column, f);
            for &(j, _) in work[k].iter().filter(|t| t.0 < n) {
                if !users[j].contains(&k) {
                    users[j].push(k);
                }
            }
        }
        for &(j, _) in source.iter().filter(|t| t.0 < n) {
            users[j].retain(|&k| k != i);
        }
        order.push((i, column, inverse));
    }
    let row_order: Vec<usize> = order.iter().map(|t| t.0).collect();
    let column_order: Vec<usize> = order.iter().map(|t| t.1).collect();
    if super::sparse::is_odd(&row_order) != super::sparse::is_odd(&column_order) {
        det = f.sub(0, det);
    }
    let mut x = vec![vec![0; n]; rights];
    for &(i, column, inverse) in order.iter().rev() {
        for (r, x) in x.iter_mut().enumerate() {
            let mut sum = 0;
            for &(j, c) in &work[i] {
                if j == n + r {
                    sum = f.add(sum, c);
                } else if j < n && j != column {
                    sum = f.sub(sum, f.mul(c, x[j]));
                }
            }
            x[column] = f.mul(sum, inverse);
        }
    }
    Some((det, x))
}

/// a - factor·b without one column; both by rising columns.
fn less(a: &[(usize, u64)], b: &[(usize, u64)], factor: u64, skip: usize, f: &Prime) -> Vec<(usize, u64)> {
    let mut out = Vec::with_capacity(a.len() + b.len());
    let (mut i, mut j) = (0, 0);
    while i < a.len() || j < b.len() {
        let (p, q) = (a.get(i).map_or(usize::MAX, |t| t.0), b.get(j).map_or(usize::MAX, |t| t.0));
        let column = p.min(q);
        let mut c = 0;
        if p == column {
            c = a[i].1;
            i += 1;
        }
        if q == column {
            c = f.sub(c, f.mul(factor, b[j].1));
            j += 1;
        }
        if c != 0 && column != skip {
            out.push((column, c));
        }
    }
    out
}

/// Newton's interpolation: the polynomial's coefficients from its values at distinct points.
fn interpolate(points: &[u64], mut values: Vec<u64>, f: &Prime) -> Vec<u64> {
    let n = points.len();
    for level in 1..n {
        for k in (level..n).rev() {
            let run = f.inverse(f.sub(points[k], points[k - level]));
            values[k] = f.mul(f.sub(values[k], values[k - 1]), run);
        }
    }
    let mut out = vec![0; n];
    for k in (0..n).rev() {
        // out·(s - point) + value
        for j in (1..n).rev() {
            out[j] = f.sub(out[j - 1], f.mul(points[k], out[j]));
        }
        out[0] = f.sub(values[k], f.mul(points[k], out[0]));
    }
    out
}
