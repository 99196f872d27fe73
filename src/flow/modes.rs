//! The modes of a matrix of transfer functions: its pole polynomial, and its zero polynomial.
//!
//! The pole polynomial is the least common denominator of all minors, whatever their size; the zero polynomial is the
//! greatest common divisor of the numerators of all minors of the order of the normal rank, each over the pole
//! polynomial (MacFarlane and Karcanias, Poles and zeros of linear multivariable systems, Int. J. Control 24, 1976).

use super::rows::least_common_multiple;
use crate::algebra::{Fraction, Poly};
use std::collections::BTreeMap;

/// The most minors of one matrix that are worked out: 7 by 7 has 3431 of them. Their number quadruples with each
/// further row and column.
pub(crate) const MAX_MINORS: usize = 4_000;

/// The largest number of rows or columns of a matrix whose minors are listed by bit masks.
const MAX_SIDE: usize = 32;

/// All minors of a matrix that are not 0, by the bit masks of their rows and columns; the empty one is 1.
type Minors = BTreeMap<(u32, u32), Fraction>;

/// The parts of a matrix that share neither rows nor columns with an entry other than 0: what holds of the whole is a
/// product over them.
fn separate(entries: &[Vec<Fraction>]) -> Vec<Vec<Vec<Fraction>>> {
    let columns = entries.first().map_or(0, Vec::len);
    let mut parts: Vec<(Vec<usize>, Vec<bool>)> = Vec::new();
    for (i, row) in entries.iter().enumerate() {
        let own: Vec<bool> = row.iter().map(|e| !e.is_zero()).collect();
        if !own.contains(&true) {
            continue;
        }
        let mut joined = (vec![i], own);
        let meets = |part: &(Vec<usize>, Vec<bool>), own: &[bool]| part.1.iter().zip(own).any(|(a, b)| *a && *b);
        let own = joined.1.clone();
        let (met, rest): (Vec<_>, Vec<_>) = parts.into_iter().partition(|part| meets(part, &own));
        for (rows, used) in met {
            joined.0.extend(rows);
            joined.1.iter_mut().zip(used).for_each(|(a, b)| *a |= b);
        }
        parts = rest;
        parts.push(joined);
    }
    parts
        .into_iter()
        .map(|(mut rows, used)| {
            rows.sort_unstable();
            let line = |&i: &usize| (0..columns).filter(|&j| used[j]).map(|j| entries[i][j].clone()).collect();
            rows.iter().map(line).collect()
        })
        .collect()
}

/// Works out all minors by expansion along the first row, the smaller ones first.
///
/// # Errors
///
/// What the limit is and how to stay within it.
fn minors(entries: &[Vec<Fraction>]) -> Result<Minors, String> {
    let (rows, columns) = (entries.len(), entries.first().map_or(0, Vec::len));
    let count = binomial(rows + columns, rows);
    if rows > MAX_SIDE || columns > MAX_SIDE || count > MAX_MINORS {
        return Err(format!(
            "a matrix of {rows} rows and {columns} columns takes part with {count} minors, and {MAX_MINORS} are the limit"
        ));
    }
    let mut all = Minors::from([((0, 0), Fraction::one())]);
    let mut last: Vec<((u32, u32), Fraction)> = vec![((0, 0), Fraction::one())];
    for _ in 0..rows.min(columns) {
        let mut next = Minors::new();
        for ((row_mask, column_mask), minor) in &last {
            // Every row below the lowest one of the minor may be put before it: each set of rows is made once.
            let lowest = if *row_mask == 0 { rows } else { row_mask.trailing_zeros() as usize };
            for (row, line) in entries.iter().enumerate().take(lowest) {
                for (column, entry) in line.iter().enumerate() {
                    if column_mask >> column & 1 == 1 || entry.is_zero() {
                        continue;
                    }
                    let before = (column_mask & ((1 << column) - 1)).count_ones();
                    let product = entry.mul(minor);
                    let product = if before % 2 == 1 { product.neg() } else { product };
                    let key = (row_mask | 1 << row, column_mask | 1 << column);
                    let sum = next.entry(key).or_insert_with(Fraction::zero);
                    *sum = sum.add(&product);
                }
            }
        }
        next.retain(|_, minor| !minor.is_zero());
        last = next.iter().map(|(k, v)| (*k, v.clone())).collect();
        all.append(&mut next);
    }
    Ok(all)
}

fn binomial(n: usize, k: usize) -> usize {
    (0..k).try_fold(1usize, |b, i| b.checked_mul(n - i).map(|b| b / (i + 1))).unwrap_or(usize::MAX)
}

/// The product of the least common denominators of the rows, and the pole polynomial.
///
/// # Errors
///
/// The text of a limit.
pub(crate) fn of_rows_and_least(entries: &[Vec<Fraction>]) -> Result<(Poly, Poly), String> {
    let row = |line: &Vec<Fraction>| line.iter().fold(Poly::one(), |m, e| least_common_multiple(&m, e.denominator()));
    let rows = entries.iter().map(row).fold(Poly::one(), |product, p| product.mul(&p));
    let mut least = Poly::one();
    for part in separate(entries) {
        least = least.mul(&poles(&minors(&part)?));
    }
    Ok((rows, least))
}

/// The least common denominator of some minors.
fn poles(minors: &Minors) -> Poly {
    minors.values().fold(Poly::one(), |m, minor| least_common_multiple(&m, minor.denominator()))
}

/// The zero polynomial of a matrix of transfer functions, 0 for a matrix that is 0.
///
/// # Errors
///
/// The text of a limit.
pub(crate) fn zeros(entries: &[Vec<Fraction>]) -> Result<Poly, String> {
    let parts = separate(entries);
    let mut product = if parts.is_empty() { Poly::zero() } else { Poly::one() };
    for part in parts {
        let all = minors(&part)?;
        let poles = poles(&all);
        let rank = all.keys().map(|(rows, _)| rows.count_ones()).max().unwrap_or(0);
        let mut common = Poly::zero();
        for (_, minor) in all.iter().filter(|((rows, _), _)| rows.count_ones() == rank) {
            let factor = poles.div_exact(minor.denominator()).unwrap_or_else(Poly::one);
            common = common.gcd(&minor.numerator().mul(&factor));
        }
        product = product.mul(&common);
    }
    Ok(product)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::algebra::{IBig, Var};

    fn poly(coefficients: &[i64]) -> Poly {
        let constants: Vec<Poly> = coefficients.iter().map(|&c| Poly::constant(IBig::from(c))).collect();
        Poly::from_coefficients(Var::S, &constants)
    }

    fn over(n: &[i64], d: &[i64]) -> Fraction {
        Fraction::new(poly(n), poly(d)).unwrap_or_else(Fraction::zero)
    }

    /// S. Skogestad and I. Postlethwaite, Multivariable Feedback Control, Example 4.9 (from memory): the least
    /// realization has the pole polynomial (s + 1)(s + 2)²(s - 1), where the entries' rows would give more.
    #[test]
    fn poles_of_a_two_by_three_matrix() {
        let whole = poly(&[2, 3, 1]).mul(&poly(&[-1, 1]));
        let by = |n: Poly| Fraction::new(n, whole.clone()).unwrap_or_else(Fraction::zero);
        let g = vec![
            vec![by(poly(&[-1, 1]).mul(&poly(&[2, 1]))), Fraction::zero(), by(poly(&[-1, 1]).pow(2))],
            vec![
                by(poly(&[1, 1]).mul(&poly(&[2, 1])).neg()),
                by(poly(&[-1, 1]).mul(&poly(&[1, 1]))),
                by(poly(&[-1, 1]).mul(&poly(&[1, 1]))),
            ],
        ];
        let (_, least) = of_rows_and_least(&g).expect("within limits");
        let expected = poly(&[1, 1]).mul(&poly(&[2, 1]).pow(2)).mul(&poly(&[-1, 1]));
        assert_eq!(least, expected);
        // The same source, Example 4.11: the only zero is at s = 1.
        assert_eq!(zeros(&g).expect("within limits"), poly(&[-1, 1]));
    }

    /// The quadruple tank with equal flow splits g has zeros where det = 0; a matrix whose determinant is 0 has the
    /// rank 1, and the zeros of its entries in common.
    #[test]
    fn rank_one_matrix_has_common_zeros() {
        let g = vec![
            vec![over(&[3, 1], &[1, 1]), over(&[6, 2], &[1, 1])],
            vec![over(&[3, 1], &[1, 1]), over(&[6, 2], &[1, 1])],
        ];
        assert_eq!(zeros(&g).expect("within limits"), poly(&[3, 1]));
    }

    /// A diagonal matrix has the poles and zeros of its entries, however large it is.
    #[test]
    fn a_diagonal_matrix_comes_apart() {
        let entry = |i: usize, j: usize| {
            if i == j { over(&[3, 1], &[i as i64 + 1, 1]) } else { Fraction::zero() }
        };
        let g: Vec<Vec<Fraction>> = (0..12).map(|i| (0..12).map(|j| entry(i, j)).collect()).collect();
        let (rows, least) = of_rows_and_least(&g).expect("within limits");
        // At i = 2 pole and zero are the same and cancel.
        assert_eq!((rows.clone(), least.degree(Var::S)), (least, 11));
        assert_eq!(zeros(&g).expect("within limits"), poly(&[3, 1]).pow(11));
    }

    #[test]
    fn a_matrix_over_the_limit_says_so() {
        let g = vec![vec![Fraction::one(); 9]; 9];
        assert!(minors(&g).is_err_and(|text| text.contains("48620")));
    }
}
