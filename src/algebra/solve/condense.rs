//! Elimination of unknowns that cost nothing: with a pivot ±1 in a row or column that has little else.

use super::Augmented;
use crate::algebra::{IBig, Poly};
use std::collections::{BTreeMap, BTreeSet, VecDeque};

/// The smaller system, its rows and columns renumbered, and whether its determinant and numerators must be negated.
pub(super) fn condense(system: Augmented) -> (Augmented, bool) {
    let n = system.unknowns;
    let mut rows: Vec<BTreeMap<usize, Poly>> = system.rows.into_iter().map(|r| r.into_iter().collect()).collect();
    let mut columns: Vec<BTreeSet<usize>> = vec![BTreeSet::new(); n];
    for (i, row) in rows.iter().enumerate() {
        row.keys().filter(|&&j| j < n).for_each(|&j| {
            columns[j].insert(i);
        });
    }
    let kept: BTreeSet<usize> = system.wanted.iter().copied().collect();
    let (mut row_order, mut column_order, mut negative) = (Vec::new(), Vec::new(), false);
    let mut gone = vec![false; n];
    let mut queue: VecDeque<usize> = (0..n).collect();
    let mut queued = vec![true; n];
    while let Some(r) = queue.pop_front() {
        queued[r] = false;
        if gone[r] {
            continue;
        }
        let Some((c, minus)) = pivot(&rows, &columns, r, &kept) else { continue };
        let row = std::mem::take(&mut rows[r]);
        gone[r] = true;
        row_order.push(r);
        column_order.push(c);
        negative ^= minus;
        for &j in row.keys().filter(|&&j| j < n) {
            columns[j].remove(&r);
        }
        for i in std::mem::take(&mut columns[c]) {
            let Some(factor) = rows[i].remove(&c) else { continue };
            let factor = if minus { factor.neg() } else { factor };
            for (&j, p) in row.iter().filter(|(j, _)| **j != c) {
                let product = factor.mul(p);
                let entry = rows[i].entry(j).or_default();
                *entry = entry.sub(&product);
                if entry.is_zero() {
                    rows[i].remove(&j);
                    if j < n {
                        columns[j].remove(&i);
                    }
                } else if j < n {
                    columns[j].insert(i);
                }
            }
            if !std::mem::replace(&mut queued[i], true) {
                queue.push_back(i);
            }
        }
    }
    let left_rows: Vec<usize> = (0..n).filter(|&i| !gone[i]).collect();
    let taken: BTreeSet<usize> = column_order.iter().copied().collect();
    let left_columns: Vec<usize> = (0..n).filter(|j| !taken.contains(j)).collect();
    row_order.extend(&left_rows);
    column_order.extend(&left_columns);
    negative ^= is_odd(&row_order) ^ is_odd(&column_order);
    let mut place = vec![0; n + system.rights];
    left_columns
        .iter()
        .chain(&(n..n + system.rights).collect::<Vec<_>>())
        .enumerate()
        .for_each(|(new, &j)| place[j] = new);
    let smaller = Augmented {
        unknowns: left_columns.len(),
        rights: system.rights,
        wanted: system.wanted.iter().map(|&w| place[w]).collect(),
        rows: left_rows
            .into_iter()
            .map(|i| std::mem::take(&mut rows[i]).into_iter().map(|(j, p)| (place[j], p)).collect())
            .collect(),
    };
    (smaller, negative)
}

/// A column with ±1 in row `r` whose elimination makes the system no fuller, and whether it is -1.
fn pivot(
    rows: &[BTreeMap<usize, Poly>],
    columns: &[BTreeSet<usize>],
    r: usize,
    kept: &BTreeSet<usize>,
) -> Option<(usize, bool)> {
    let others = rows[r].len().checked_sub(1)?;
    let mut best: Option<(usize, usize, bool)> = None;
    for (&c, p) in rows[r].iter().filter(|(c, _)| **c < columns.len() && !kept.contains(c)) {
        let Some(value) = p.as_constant().filter(|v| *v == IBig::ONE || *v == IBig::NEG_ONE) else { continue };
        let meets = columns[c].len() - 1;
        // Products of a row's entries with the factors must stay short, and entries few.
        let single = |p: &Poly| p.len() == 1;
        let short = rows[r].iter().all(|(j, p)| *j == c || single(p))
            || columns[c].iter().all(|&i| i == r || rows[i].get(&c).is_none_or(single));
        let fill = others * meets;
        if short && fill <= others + meets && best.is_none_or(|b| fill < b.0) {
            best = Some((fill, c, value == IBig::NEG_ONE));
        }
    }
    best.map(|(_, c, minus)| (c, minus))
}

/// Whether an order of 0, 1, 2, … is an odd permutation.
pub(super) fn is_odd(order: &[usize]) -> bool {
    let mut left = order.to_vec();
    let mut odd = false;
    for i in 0..left.len() {
        while left[i] != i {
            let j = left[i];
            left.swap(i, j);
            odd = !odd;
        }
    }
    odd
}
