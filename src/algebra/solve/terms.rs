//! Sorted lists of terms and their merging.

use crate::algebra::poly::arithmetic::Key;
use crate::algebra::poly::coefficients::Coefficient;
use std::cmp::Ordering;

/// Terms sorted descending, none 0.
pub(super) struct Terms<K, C> {
    pub(super) keys: Vec<K>,
    pub(super) values: Vec<C>,
}

/// Part of a list times one term, not multiplied out.
#[derive(Clone)]
pub(super) struct Run<'a, K, C> {
    pub(super) keys: &'a [K],
    pub(super) values: &'a [C],
    pub(super) shift: &'a K,
    pub(super) scale: C,
}

/// Lists that have served. Fresh memory costs more than merging does: the system hands it out page by page.
pub(super) struct Pool<K, C> {
    free: Vec<Terms<K, C>>,
}

/// More lists than this aren't kept.
const KEPT: usize = 12;

impl<K: Key, C: Coefficient> Pool<K, C> {
    pub(super) fn new() -> Self {
        Self { free: Vec::new() }
    }
    /// An empty list with room for so many terms: the smallest that serves.
    fn take(&mut self, room: usize) -> Terms<K, C> {
        let serves = |t: &&(usize, usize)| t.1 >= room;
        let sizes: Vec<(usize, usize)> = self.free.iter().map(|t| t.keys.capacity()).enumerate().collect();
        match sizes.iter().filter(serves).min_by_key(|t| t.1) {
            Some((i, _)) => self.free.swap_remove(*i),
            None => Terms { keys: Vec::with_capacity(room), values: Vec::with_capacity(room) },
        }
    }
    /// Takes a list back.
    pub(super) fn give(&mut self, mut terms: Terms<K, C>) {
        terms.keys.clear();
        terms.values.clear();
        self.free.push(terms);
        if self.free.len() > KEPT {
            let smallest = (0..self.free.len()).min_by_key(|&i| self.free[i].keys.capacity()).unwrap_or(0);
            self.free.swap_remove(smallest);
        }
    }
}

/// About so many terms of one run are merged at a time: what stands between then stays in the cache.
const BLOCK: usize = 1024;

/// The sum of all runs.
pub(super) fn merged<K: Key, C: Coefficient>(mut runs: Vec<Run<'_, K, C>>, pool: &mut Pool<K, C>) -> Terms<K, C> {
    let mut out = pool.take(runs.iter().map(|r| r.keys.len()).sum());
    loop {
        runs.retain(|r| !r.keys.is_empty());
        // The longest run's term number BLOCK parts what is merged now from what is merged later.
        let Some(longest) = runs.iter().max_by_key(|r| r.keys.len()) else { return out };
        let Some(pivot) = longest.keys.get(BLOCK).map(|k| k.times(longest.shift)) else {
            merge_all(&mut runs, pool, &mut out);
            return out;
        };
        let mut now = Vec::with_capacity(runs.len());
        for r in &mut runs {
            let count = r.keys.partition_point(|k| k.times(r.shift) > pivot);
            if count > 0 {
                now.push(Run { keys: &r.keys[..count], values: &r.values[..count], ..r.clone() });
                (r.keys, r.values) = (&r.keys[count..], &r.values[count..]);
            }
        }
        merge_all(&mut now, pool, &mut out);
    }
}

/// Appends the sum of all runs.
fn merge_all<K: Key, C: Coefficient>(runs: &mut [Run<'_, K, C>], pool: &mut Pool<K, C>, out: &mut Terms<K, C>) {
    // The shortest first, in pairs, so that few terms are moved more than once.
    runs.sort_by_key(|r| r.keys.len());
    if runs.len() <= 2 {
        merge_pair(runs, out);
        return;
    }
    let mut lists: std::collections::VecDeque<Terms<K, C>> = std::collections::VecDeque::new();
    for pair in runs.chunks(2) {
        let mut sum = pool.take(pair.iter().map(|r| r.keys.len()).sum());
        merge_pair(pair, &mut sum);
        lists.push_back(sum);
    }
    while let (Some(a), Some(b)) = (lists.pop_front(), lists.pop_front()) {
        let last = lists.is_empty();
        let mut sum = if last { None } else { Some(pool.take(a.keys.len() + b.keys.len())) };
        let to = sum.as_mut().unwrap_or(out);
        merge(&(&a.keys, &a.values, K::clone, C::clone), &(&b.keys, &b.values, K::clone, C::clone), to);
        pool.give(a);
        pool.give(b);
        if let Some(sum) = sum {
            let at = lists.iter().position(|l| l.keys.len() > sum.keys.len()).unwrap_or(lists.len());
            lists.insert(at, sum);
        }
    }
}

/// Appends the sum of no more than two runs.
fn merge_pair<K: Key, C: Coefficient>(pair: &[Run<'_, K, C>], out: &mut Terms<K, C>) {
    match pair {
        [a, b] => merge(
            &(a.keys, a.values, |k: &K| k.times(a.shift), |c: &C| c.product(&a.scale)),
            &(b.keys, b.values, |k: &K| k.times(b.shift), |c: &C| c.product(&b.scale)),
            out,
        ),
        [run] => {
            out.keys.extend(run.keys.iter().map(|k| k.times(run.shift)));
            out.values.extend(run.values.iter().map(|c| c.product(&run.scale)));
        }
        _ => {}
    }
}

/// One list with what is to be done to its monomials and its coefficients.
type Side<'a, K, C, F, G> = (&'a [K], &'a [C], F, G);

fn merge<K: Key, C: Coefficient, F, G, H, I>(a: &Side<'_, K, C, F, G>, b: &Side<'_, K, C, H, I>, out: &mut Terms<K, C>)
where
    F: Fn(&K) -> K,
    G: Fn(&C) -> C,
    H: Fn(&K) -> K,
    I: Fn(&C) -> C,
{
    let (keys, values) = (&mut out.keys, &mut out.values);
    let (mut i, mut j) = (0, 0);
    while i < a.0.len() && j < b.0.len() {
        let (x, y) = (a.2(&a.0[i]), b.2(&b.0[j]));
        let order = x.cmp(&y);
        if C::MACHINE {
            // Which of the two comes next can't be foretold, so nothing branches on it.
            let (left, right) = (order != Ordering::Less, order != Ordering::Greater);
            let mut c = a.3(&a.1[i]).kept(left);
            c.add(&b.3(&b.1[j]).kept(right));
            if !c.is_zero() {
                keys.push(if left { x } else { y });
                values.push(c);
            }
            i += usize::from(left);
            j += usize::from(right);
        } else if order == Ordering::Greater {
            keys.push(x);
            values.push(a.3(&a.1[i]));
            i += 1;
        } else if order == Ordering::Less {
            keys.push(y);
            values.push(b.3(&b.1[j]));
            j += 1;
        } else {
            let mut c = a.3(&a.1[i]);
            c.add(&b.3(&b.1[j]));
            (i, j) = (i + 1, j + 1);
            if !c.is_zero() {
                keys.push(x);
                values.push(c);
            }
        }
    }
    keys.extend(a.0[i..].iter().map(&a.2));
    values.extend(a.1[i..].iter().map(&a.3));
    keys.extend(b.0[j..].iter().map(&b.2));
    values.extend(b.1[j..].iter().map(&b.3));
}
