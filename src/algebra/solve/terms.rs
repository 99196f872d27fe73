//! Sorted lists of terms and their merging.

use crate::algebra::poly::arithmetic::Key;
use crate::algebra::poly::coefficients::Coefficient;
use std::cmp::Ordering;

/// Terms sorted descending, none 0.
pub(super) struct Terms<K, C> {
    pub(super) keys: Vec<K>,
    pub(super) values: Vec<C>,
}

/// A list times one term, not multiplied out.
pub(super) struct Run<'a, K, C> {
    pub(super) terms: &'a Terms<K, C>,
    pub(super) shift: &'a K,
    pub(super) scale: C,
}

/// The sum of all runs.
pub(super) fn merged<K: Key, C: Coefficient>(mut runs: Vec<Run<'_, K, C>>) -> Terms<K, C> {
    // The shortest first, in pairs, so that few terms are moved more than once.
    runs.sort_by_key(|r| r.terms.keys.len());
    let mut lists: std::collections::VecDeque<Terms<K, C>> = runs
        .chunks(2)
        .map(|pair| match pair {
            [a, b] => merge(
                (&a.terms.keys, &a.terms.values, |k: &K| k.times(a.shift), |c: &C| c.product(&a.scale)),
                (&b.terms.keys, &b.terms.values, |k: &K| k.times(b.shift), |c: &C| c.product(&b.scale)),
            ),
            rest => Terms {
                keys: rest[0].terms.keys.iter().map(|k| k.times(rest[0].shift)).collect(),
                values: rest[0].terms.values.iter().map(|c| c.product(&rest[0].scale)).collect(),
            },
        })
        .collect();
    while lists.len() > 1 {
        if let (Some(a), Some(b)) = (lists.pop_front(), lists.pop_front()) {
            let sum = merge((&a.keys, &a.values, K::clone, C::clone), (&b.keys, &b.values, K::clone, C::clone));
            let at = lists.iter().position(|l| l.keys.len() > sum.keys.len()).unwrap_or(lists.len());
            lists.insert(at, sum);
        }
    }
    lists.pop_front().unwrap_or(Terms { keys: Vec::new(), values: Vec::new() })
}

/// One list with what is to be done to its monomials and its coefficients.
type Side<'a, K, C, F, G> = (&'a [K], &'a [C], F, G);

fn merge<K: Key, C: Coefficient, F, G, H, I>(a: Side<'_, K, C, F, G>, b: Side<'_, K, C, H, I>) -> Terms<K, C>
where
    F: Fn(&K) -> K,
    G: Fn(&C) -> C,
    H: Fn(&K) -> K,
    I: Fn(&C) -> C,
{
    let room = a.0.len() + b.0.len();
    let (mut keys, mut values) = (Vec::with_capacity(room), Vec::with_capacity(room));
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
    Terms { keys, values }
}
