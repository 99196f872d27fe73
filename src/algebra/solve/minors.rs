//! Determinants of symbolic systems without any division: expansion row by row over sets of columns.
//!
//! After k rows, each set of k columns that can still matter has the minor of these rows and columns. A set that lacks a
//! column which no later row has is of no use, so rows are ordered to keep few columns open. The right sides are further
//! columns, so that the determinant and all numerators come from one expansion: a set with a right side that lacks a
//! wanted unknown gives that unknown's numerator (Gentleman and Johnson, "Analysis of algorithms: a case study.
//! Determinants of matrices with polynomial entries", 1976, for the method and its cost).
//!
//! Which sets matter is worked out before any polynomial is multiplied, with an upper bound of their terms.

use super::condense::is_odd;
use super::terms::{Pool, Run, Terms, merged};
use super::{Augmented, Solutions, SolveError};
use crate::algebra::poly::arithmetic::{Key, by_words};
use crate::algebra::poly::coefficients::Coefficient;
use crate::algebra::poly::layout::{Field, layout, repack, words};
use crate::algebra::{IBig, Poly, Var};
use rustc_hash::FxHashMap;
use std::collections::BTreeMap;

/// Columns beyond this don't fit the masks. Without a narrow front far fewer are out of reach already.
pub const MAX_COLUMNS: usize = 128;

/// At most so many terms may stand in one row's minors, by the bound worked out beforehand: about 2 GB.
pub const MAX_TERMS: u64 = 60_000_000;

/// At most so many ways from one set of columns to the next are looked at, which takes a second or so.
pub const MAX_SETS: usize = 2_000_000;

/// One way from a set to a larger one: through the entry of the row at hand in one further column.
struct Edge {
    from: u32,
    to: u32,
    entry: u32,
    negative: bool,
}

/// What one row does.
struct Step {
    row: usize,
    /// The sets of columns after it.
    sets: Vec<u128>,
    /// Sorted by where they lead.
    edges: Vec<Edge>,
}

/// A worked out order of expansion.
pub(super) struct Plan {
    steps: Vec<Step>,
    /// Whether the order of rows is an odd permutation.
    odd: bool,
    /// Upper bound of the products of terms to be merged.
    pub(super) cost: u64,
    /// Upper bound of the terms after the worst row.
    pub(super) terms: u64,
}

/// Row orders to look at closely.
const CLOSE_LOOKS: usize = 3;

/// The best of several greedy orders.
pub(super) fn plan(system: &Augmented) -> Result<Plan, SolveError> {
    let n = system.unknowns;
    if n + system.rights > MAX_COLUMNS {
        return Err(SolveError::Limit(format!(
            "{n} unknowns remain in a system with symbols, and {MAX_COLUMNS} are the limit; keep fewer symbols"
        )));
    }
    let masks: Vec<u128> = system.rows.iter().map(|r| r.iter().fold(0, |m, e| m | 1 << e.0)).collect();
    let mut orders: Vec<(u128, Vec<usize>)> = (0..n).map(|start| greedy(&masks, start)).collect();
    orders.sort();
    orders.dedup();
    let mut best: Option<Plan> = None;
    let mut failure = None;
    for (_, order) in orders.into_iter().take(CLOSE_LOOKS) {
        match expand_sets(system, &order) {
            Ok(plan) if best.as_ref().is_none_or(|b| plan.cost < b.cost) => best = Some(plan),
            Ok(_) => {}
            Err(e) => failure = Some(e),
        }
    }
    best.ok_or_else(|| failure.unwrap_or(SolveError::Singular))
}

/// Rows one after the other, each the one that leaves the fewest columns open; the measure counts sets of open columns.
fn greedy(masks: &[u128], start: usize) -> (u128, Vec<usize>) {
    let n = masks.len();
    let mut count = [0u32; MAX_COLUMNS];
    let columns = |m: u128| std::iter::successors(Some(m), |m| Some(m & m.wrapping_sub(1))).take_while(|m| *m != 0);
    for &m in masks {
        columns(m).for_each(|m| count[m.trailing_zeros() as usize] += 1);
    }
    let mut left: Vec<usize> = (0..n).collect();
    let (mut order, mut open, mut measure) = (Vec::with_capacity(n), 0u128, 0u128);
    while !left.is_empty() {
        let front = |i: usize| {
            let closed = columns(masks[i]).filter(|m| count[m.trailing_zeros() as usize] == 1).count();
            (open | masks[i]).count_ones() as usize - closed
        };
        let at = if order.is_empty() {
            start
        } else {
            (0..left.len()).min_by_key(|&k| (front(left[k]), left[k])).unwrap_or(0)
        };
        let row = left.remove(at);
        open |= masks[row];
        for m in columns(masks[row]) {
            let j = m.trailing_zeros();
            count[j as usize] -= 1;
            if count[j as usize] == 0 {
                open &= !(1 << j);
            }
        }
        measure += 1 << open.count_ones().min(100);
        order.push(row);
    }
    (measure, order)
}

/// Whether a set can still become a full one: what columns it lacks for good, and how many right sides it has.
struct Usable {
    unknowns: u128,
    rights: u128,
    wanted: u128,
}

impl Usable {
    /// `closed`: no later row has them. A full set has all unknowns, or one right side for one wanted unknown.
    fn holds(&self, set: u128, closed: u128) -> bool {
        let lacks = closed & self.unknowns & !set;
        let rights = (set & self.rights).count_ones();
        if lacks.count_ones() > 1 || lacks & !self.wanted != 0 || rights > 1 {
            return false;
        }
        let can_lack = self.wanted & !set != 0;
        let can_have = self.rights & !closed != 0;
        (rights == 0 || can_lack) && (lacks == 0 || rights == 1 || can_have)
    }
}

/// All sets of columns that lead from none to a full one, with the bound of their terms.
fn expand_sets(system: &Augmented, order: &[usize]) -> Result<Plan, SolveError> {
    let n = system.unknowns;
    let all = |k: usize| if k == 128 { u128::MAX } else { (1 << k) - 1 };
    let usable = Usable {
        unknowns: all(n),
        rights: all(n + system.rights) & !all(n),
        wanted: system.wanted.iter().fold(0, |m, &w| m | 1 << w),
    };
    let mut last = [0usize; MAX_COLUMNS];
    for (t, &row) in order.iter().enumerate() {
        for e in &system.rows[row] {
            last[e.0] = t + 1;
        }
    }
    let mut steps: Vec<Step> = Vec::with_capacity(n);
    let (mut sets, mut seen) = (vec![0u128], 1);
    for (t, &row) in order.iter().enumerate() {
        let closed = (0..n + system.rights).filter(|&j| last[j] <= t + 1).fold(0u128, |m, j| m | 1 << j);
        let mut places: FxHashMap<u128, u32> = FxHashMap::default();
        let (mut next, mut edges) = (Vec::new(), Vec::new());
        for (from, &set) in sets.iter().enumerate() {
            for (entry, (j, _)) in system.rows[row].iter().enumerate() {
                let larger = set | 1 << j;
                if larger == set || !usable.holds(larger, closed) {
                    continue;
                }
                let to = *places.entry(larger).or_insert_with(|| {
                    next.push(larger);
                    next.len() as u32 - 1
                });
                let negative = (set >> j).count_ones() % 2 == 1;
                edges.push(Edge { from: from as u32, to, entry: entry as u32, negative });
            }
            if seen + edges.len() > MAX_SETS {
                return Err(SolveError::Limit(format!(
                    "the loops are too tangled for so many symbols: more than {MAX_SETS} minors; keep fewer symbols"
                )));
            }
        }
        seen += edges.len();
        steps.push(Step { row, sets: next.clone(), edges });
        sets = next;
    }
    prune(&mut steps);
    let (cost, terms) = bound(system, &steps);
    Ok(Plan { odd: is_odd(order), steps, cost, terms })
}

/// Drops sets that lead nowhere, from the last row back, and puts edges in the order of their targets.
fn prune(steps: &mut [Step]) {
    let mut needed: Option<Vec<u32>> = None;
    for step in steps.iter_mut().rev() {
        if let Some(needed) = &needed {
            let mut place = vec![u32::MAX; step.sets.len()];
            for (new, &old) in needed.iter().enumerate() {
                place[old as usize] = new as u32;
            }
            step.sets = needed.iter().map(|&i| step.sets[i as usize]).collect();
            step.edges.retain_mut(|e| {
                e.to = place[e.to as usize];
                e.to != u32::MAX
            });
        }
        step.edges.sort_by_key(|e| (e.to, e.from, e.entry));
        let mut sources: Vec<u32> = step.edges.iter().map(|e| e.from).collect();
        sources.sort_unstable();
        sources.dedup();
        for e in &mut step.edges {
            e.from = sources.binary_search(&e.from).unwrap_or(0) as u32;
        }
        needed = Some(sources);
    }
}

/// Upper bounds: of all products of terms, and of the terms that stand after a row. A minor has at most as many terms as
/// its parts together, and no more than its degrees leave room for.
fn bound(system: &Augmented, steps: &[Step]) -> (u64, u64) {
    let mut counts = vec![1u64];
    let (mut cost, mut most) = (0u64, 0u64);
    let mut degrees: BTreeMap<Var, u64> = BTreeMap::new();
    for step in steps {
        for (v, d) in row_degrees(&system.rows[step.row]) {
            *degrees.entry(v).or_default() += d;
        }
        let room = degrees.values().fold(1u64, |r, d| r.saturating_mul(d.saturating_add(1)));
        let mut next = vec![0u64; step.sets.len()];
        for e in &step.edges {
            let terms = system.rows[step.row][e.entry as usize].1.len() as u64;
            let product = counts[e.from as usize].saturating_mul(terms);
            cost = cost.saturating_add(product);
            let sum = &mut next[e.to as usize];
            *sum = sum.saturating_add(product).min(room);
        }
        most = most.max(next.iter().fold(0, |s, c| s.saturating_add(*c)));
        counts = next;
    }
    (cost, most)
}

fn row_degrees(row: &[(usize, Poly)]) -> BTreeMap<Var, u64> {
    let mut out = BTreeMap::new();
    for f in row.iter().flat_map(|e| e.1.fields()) {
        let d: &mut u64 = out.entry(f.var).or_default();
        *d = f.degree.max(*d);
    }
    out
}

/// Carries a plan out.
pub(super) fn run(system: &Augmented, plan: &Plan) -> Result<Solutions, SolveError> {
    if plan.terms > MAX_TERMS {
        return Err(SolveError::Limit(format!(
            "the transfer function may have {} terms, and {MAX_TERMS} are the limit; keep fewer symbols or open a loop",
            plan.terms
        )));
    }
    let mut degrees: BTreeMap<Var, u64> = BTreeMap::new();
    // No minor's coefficient is greater than the product over rows of all magnitudes in the row.
    let mut bits = 0;
    for row in &system.rows {
        for (v, d) in row_degrees(row) {
            *degrees.entry(v).or_default() += d;
        }
        let count: usize = row.iter().map(|e| e.1.len()).sum();
        let largest = row.iter().map(|e| e.1.bits()).max().unwrap_or(0);
        let whole = row.iter().try_fold(0u64, |s, e| Some(s.saturating_add(e.1.magnitude()?)));
        bits += whole.map_or(largest + count.max(1).ilog2() as usize + 1, |s| (64 - s.leading_zeros()) as usize);
    }
    let fields = layout(degrees);
    let w = words(&fields).max(1);
    let parts = if bits <= 62 {
        by_words!(w, K => minors::<K, i64>(system, plan, &fields, |c| i64::try_from(c).unwrap_or(0)))
    } else if bits <= 126 {
        by_words!(w, K => minors::<K, i128>(system, plan, &fields, |c| i128::try_from(c).unwrap_or(0)))
    } else {
        by_words!(w, K => minors::<K, IBig>(system, plan, &fields, IBig::clone))
    };
    Ok(sorted_out(system, plan, parts))
}

/// The full sets' minors as the determinant and the numerators.
fn sorted_out(system: &Augmented, plan: &Plan, parts: Vec<(u128, Poly)>) -> Solutions {
    let n = system.unknowns;
    let mut determinant = Poly::zero();
    let mut numerators = vec![vec![Poly::zero(); system.wanted.len()]; system.rights];
    for (set, p) in parts {
        let right = (0..system.rights).find(|k| set >> (n + k) & 1 == 1);
        let lacks = (0..n).find(|&j| set >> j & 1 == 0);
        match (right, lacks) {
            (Some(k), Some(w)) => {
                // The right side stands last and belongs into the place of the unknown.
                let p = if plan.odd ^ ((n - 1 - w) % 2 == 1) { p.neg() } else { p };
                for (i, _) in system.wanted.iter().enumerate().filter(|(_, x)| **x == w) {
                    numerators[k][i] = p.clone();
                }
            }
            _ => determinant = if plan.odd { p.neg() } else { p },
        }
    }
    Solutions { numerators, determinant }
}

/// All minors, row by row; gives those of the full sets.
fn minors<K: Key, C: Coefficient>(
    system: &Augmented,
    plan: &Plan,
    fields: &[Field],
    number: impl Fn(&IBig) -> C,
) -> Vec<(u128, Poly)> {
    let w = words(fields).max(1);
    let unit = |c: &[u64]| K::load(c, w).into_owned();
    let one = unit(&vec![0; w]).remove(0);
    let mut now: Vec<Terms<K, C>> = vec![Terms { keys: vec![one], values: vec![number(&IBig::ONE)] }];
    let mut pool = Pool::new();
    for step in &plan.steps {
        let entries: Vec<Terms<K, C>> = system.rows[step.row]
            .iter()
            .map(|(_, p)| {
                let keys = if p.is_constant() { vec![0; w] } else { repack(p.keys(), p.len(), p.fields(), fields) };
                let keys = if keys.is_empty() { vec![0; w * p.len()] } else { keys };
                Terms { keys: unit(&keys), values: p.values().iter().map(|c| number(&c)).collect() }
            })
            .collect();
        let mut next: Vec<Terms<K, C>> = Vec::with_capacity(step.sets.len());
        for group in step.edges.chunk_by(|a, b| a.to == b.to) {
            let mut runs = Vec::new();
            for e in group {
                let entry = &entries[e.entry as usize];
                for (k, c) in entry.keys.iter().zip(&entry.values) {
                    let mut scale = c.clone();
                    if e.negative {
                        scale.negate();
                    }
                    let from = &now[e.from as usize];
                    runs.push(Run { keys: &from.keys, values: &from.values, shift: k, scale });
                }
            }
            next.push(merged(runs, &mut pool));
        }
        for terms in std::mem::replace(&mut now, next) {
            pool.give(terms);
        }
    }
    drop(pool);
    let sets = plan.steps.last().map_or(&[][..], |s| &s.sets);
    let poly = |t: Terms<K, C>| {
        let keys = if fields.is_empty() { Vec::new() } else { K::flatten(t.keys) };
        Poly::normalized(fields.to_vec(), keys, C::collect(t.values))
    };
    sets.iter().copied().zip(now.into_iter().map(poly)).collect()
}
