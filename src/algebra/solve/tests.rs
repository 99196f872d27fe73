//! Solutions of random systems, put back into their equations; determinants against Leibniz' sum.

use super::{SolveError, System};
use crate::algebra::{IBig, Poly, Var};
use proptest::prelude::*;

/// Entries as they come from blocks: numbers, s, symbols, and a few products.
fn entry() -> impl Strategy<Value = Poly> {
    let number = |n: i64| Poly::constant(IBig::from(n));
    prop_oneof![
        4 => Just(1i64).prop_map(move |n| number(n)),
        4 => Just(-1i64).prop_map(move |n| number(n)),
        2 => (-9i64..9).prop_map(move |n| number(n)),
        2 => (1u32..6).prop_map(|v| Poly::var(Var(v)).neg()),
        2 => (1u32..6, -4i64..4).prop_map(move |(v, n)| Poly::var(Var(v)).mul(&Poly::var(Var(0))).add(&number(n))),
    ]
}

fn systems(size: usize) -> impl Strategy<Value = Vec<Vec<Option<Poly>>>> {
    (1..=size).prop_flat_map(|n| {
        let cell = prop_oneof![3 => entry().prop_map(Some), 4 => Just(None)];
        prop::collection::vec(prop::collection::vec(cell, n + 2), n)
    })
}

fn leibniz(a: &[Vec<Option<Poly>>], columns: &[usize]) -> Poly {
    let Some((row, rest)) = a.split_first() else { return Poly::one() };
    let mut sum = Poly::zero();
    for (k, &j) in columns.iter().enumerate() {
        if let Some(p) = &row[j] {
            let others: Vec<usize> = columns.iter().copied().filter(|&c| c != j).collect();
            let term = p.mul(&leibniz(rest, &others));
            sum = if k % 2 == 0 { sum.add(&term) } else { sum.sub(&term) };
        }
    }
    sum
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(300))]

    /// Two right sides, two wanted unknowns: all by Cramer's rule, with Leibniz' sum for each determinant.
    #[test]
    fn cramers_rule(a in systems(5)) {
        let n = a.len();
        let list = |row: &Vec<Option<Poly>>| -> Vec<(usize, Poly)> {
            row[..n].iter().enumerate().filter_map(|(j, p)| Some((j, p.clone().filter(|p| !p.is_zero())?))).collect()
        };
        let system = System { rows: a.iter().map(list).collect() };
        let right = |k: usize| -> Vec<(usize, Poly)> {
            a.iter().enumerate().filter_map(|(i, r)| Some((i, r[n + k].clone()?))).collect()
        };
        let columns: Vec<usize> = (0..n).collect();
        let determinant = leibniz(&a, &columns);
        prop_assert_eq!(system.determinant(), Ok(determinant.clone()));
        let wanted = [0, n - 1];
        match system.solve_many(&[&right(0), &right(1)], &wanted) {
            Err(e) => {
                prop_assert_eq!(e, SolveError::Singular);
                prop_assert!(determinant.is_zero());
            }
            Ok(all) => {
                prop_assert_eq!(&all.determinant, &determinant);
                for k in 0..2 {
                    for (i, &w) in wanted.iter().enumerate() {
                        let replaced: Vec<usize> = (0..n).map(|j| if j == w { n + k } else { j }).collect();
                        prop_assert_eq!(&all.numerators[k][i], &leibniz(&a, &replaced));
                    }
                }
            }
        }
    }
}

/// Nine coupled sections in s alone, eliminated without fractions, against the minors of the same system with one of its
/// numbers as a symbol.
#[test]
fn numeric_systems_agree_with_symbolic_ones() {
    let number = |n: i64| Poly::constant(IBig::from(n));
    let n = 9;
    let rows = |gain: Poly| -> Vec<Vec<(usize, Poly)>> {
        (0..n)
            .map(|i| {
                let own = Poly::var(Var::S).scale(&IBig::from(i as i64 + 2)).add(&number(3));
                let mut row = vec![(i, own), ((i + 1) % n, number(-2)), ((i + 4) % n, number(i as i64 - 5))];
                row.retain(|e| !e.1.is_zero());
                if i == 0 {
                    row[1].1 = gain.clone();
                }
                row.sort_by_key(|e| e.0);
                row
            })
            .collect()
    };
    let right = [(2, number(7)), (5, Poly::var(Var::S))];
    let (seven, symbol) = (number(-7), Poly::var(Var(9)));
    let numeric = System { rows: rows(seven) }.solve(&right, &[0, 4]).expect("it is regular");
    let symbolic = System { rows: rows(symbol) }.solve(&right, &[0, 4]).expect("it is regular");
    let value = |p: &Poly| p.substitute(Var(9), &crate::algebra::RBig::from(-7)).0;
    assert_eq!(numeric.determinant, value(&symbolic.determinant));
    assert_eq!(numeric.numerators, symbolic.numerators.iter().map(value).collect::<Vec<_>>());
}

#[test]
fn too_tangled_for_so_many_symbols() {
    let n = 40;
    let rows = (0..n).map(|i| (0..n).map(|j| (j, Poly::var(Var((1 + i * n + j) as u32)))).collect()).collect();
    assert!(matches!(System { rows }.determinant(), Err(SolveError::Limit(_))));
}
