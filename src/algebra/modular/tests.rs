//! Against fraction-free elimination (Bareiss), which shares nothing with these methods.

use super::*;
use crate::algebra::Var;
use crate::algebra::dense::tests::poly;

/// splitmix64
struct Random(u64);

impl Random {
    fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }
    fn below(&mut self, n: u64) -> u64 {
        self.next() % n
    }
    fn signed(&mut self, n: i64) -> i64 {
        self.below(2 * n as u64 + 1) as i64 - n
    }
}

fn p(a: &[i64]) -> Poly {
    Poly::from_dense(Var::S, &poly(a))
}

/// The determinant by cofactors, for tiny systems.
fn determinant(a: &[Vec<Poly>]) -> Poly {
    let Some(first) = a.first() else { return Poly::one() };
    let mut sum = Poly::zero();
    for (j, c) in first.iter().enumerate().filter(|t| !t.1.is_zero()) {
        let minor: Vec<Vec<Poly>> =
            a[1..].iter().map(|r| r.iter().enumerate().filter(|t| t.0 != j).map(|t| t.1.clone()).collect()).collect();
        let term = c.mul(&determinant(&minor));
        sum = if j.is_multiple_of(2) { sum.add(&term) } else { sum.sub(&term) };
    }
    sum
}

fn full(system: &System) -> Vec<Vec<Poly>> {
    let n = system.rows.len();
    let mut a = vec![vec![Poly::zero(); n]; n];
    for (i, row) in system.rows.iter().enumerate() {
        for (j, c) in row {
            a[i][*j] = c.clone();
        }
    }
    a
}

/// Cramer's rule by cofactors.
fn check(system: &System, right: &[(usize, Poly)], wanted: &[usize]) {
    let a = full(system);
    let det = determinant(&a);
    let got = solve(system, &[right], wanted).expect("one variable");
    if det.is_zero() {
        assert_eq!(got, Err(SolveError::Singular));
        return;
    }
    let got = got.expect("not singular");
    let told = Poly::from_dense(Var::S, &got.determinant);
    let (n, d) = (got.factor.numerator().clone(), IBig::from(got.factor.denominator().clone()));
    assert_eq!(told.scale(&n), det.scale(&d), "determinant of {a:?}");
    for (k, &w) in wanted.iter().enumerate() {
        let mut b = a.clone();
        for (i, row) in b.iter_mut().enumerate() {
            row[w] = right.iter().filter(|t| t.0 == i).fold(Poly::zero(), |s, t| s.add(&t.1));
        }
        let numerator = Poly::from_dense(Var::S, &got.numerators[0][k]);
        assert_eq!(numerator.scale(&n), determinant(&b).scale(&d), "unknown {w} of {a:?} = {right:?}");
    }
}

#[test]
fn small_systems_of_every_kind() {
    let mut random = Random(7);
    for _ in 0..600 {
        let n = 1 + random.below(6) as usize;
        let mut system = System::default();
        for i in 0..n {
            let mut row = Vec::new();
            for j in 0..n {
                let degree = if i % 2 == 0 { 0 } else { random.below(3) };
                let kind = random.below(10);
                if kind < 4 || (i == j && kind < 9) {
                    let top = if i == j { degree } else { random.below(degree + 1) };
                    let c: Vec<i64> = (0..=top).map(|_| random.signed(9)).collect();
                    if !p(&c).is_zero() {
                        row.push((j, p(&c)));
                    }
                }
            }
            system.rows.push(row);
        }
        let long: Vec<i64> = (0..=random.below(3)).map(|_| random.signed(1000)).collect();
        let right: Vec<_> = [(0, p(&[3])), (n - 1, p(&long))].into_iter().filter(|t| !t.1.is_zero()).collect();
        check(&system, &right, &[0, n - 1]);
    }
}

/// Two equal subsystems side by side: M has every eigenvalue twice, no sequence shows more than half of them.
#[test]
fn derogatory_and_hidden_modes() {
    let block = |k: usize| vec![(k, p(&[2, 3, 1])), (k + 1, p(&[-1]))];
    let back = |k: usize| vec![(k, p(&[5])), (k + 1, p(&[1, 1]))];
    let system = System { rows: vec![block(0), back(0), block(2), back(2)] };
    check(&system, &[(0, p(&[1])), (2, p(&[1]))], &[0, 3]);
    // The right side reaches one of two different subsystems only.
    let other =
        System { rows: vec![vec![(0, p(&[2, 1]))], vec![(1, p(&[3, 1]))], vec![(2, p(&[4, 1])), (0, p(&[7]))]] };
    check(&other, &[(1, p(&[1]))], &[1, 2]);
    check(&other, &[(0, p(&[1]))], &[2, 0, 1]);
    // Nothing is asked for; nothing is driven.
    check(&other, &[(0, p(&[1]))], &[]);
    check(&other, &[], &[1]);
}

#[test]
fn long_coefficients() {
    let big = |k: i64| Poly::constant(IBig::from(k)).scale(&IBig::from(10).pow(40)).add(&p(&[1]));
    let system = System {
        rows: vec![
            vec![(0, p(&[0, 1]).add(&big(3))), (1, big(-2))],
            vec![(0, big(5)), (1, p(&[0, 0, 1]).add(&big(1))), (2, p(&[1 << 40]))],
            vec![(0, p(&[1])), (2, p(&[1 << 30, 1 << 35]))],
        ],
    };
    check(&system, &[(0, big(9)), (2, p(&[0, 1]))], &[0, 1, 2]);
}

/// Larger ones: the results satisfy A x = b at points modulo a prime that the engine does not use first.
#[test]
fn larger_systems_satisfy_their_equations() {
    let mut random = Random(11);
    for n in [10, 30, 60] {
        let mut system = System::default();
        for i in 0..n {
            // Sums in odd rows, blocks in even ones.
            let mut row =
                vec![(i, if i % 2 == 0 { p(&[random.signed(999), random.signed(999), 1000]) } else { p(&[1000]) })];
            for _ in 0..2 {
                let j = random.below(n as u64) as usize;
                if row.iter().all(|t| t.0 != j) {
                    let c =
                        if i % 2 == 0 { p(&[random.signed(999), random.signed(99)]) } else { p(&[random.signed(999)]) };
                    if !c.is_zero() && (i % 2 == 0 || j.is_multiple_of(2)) {
                        row.push((j, c));
                    }
                }
            }
            row.sort_by_key(|t| t.0);
            system.rows.push(row);
        }
        let wanted: Vec<usize> = (0..n).collect();
        let right = vec![(1, p(&[1000]))];
        let got = solve(&system, &[&right], &wanted).expect("one variable").expect("regular");
        let f = Prime::new((1 << 61) - 1);
        let at = f.of(987_654_321);
        let value = |c: &[IBig]| c.iter().rev().fold(0, |v, c| f.add(f.mul(v, at), f.of_big(c)));
        let det = value(&got.determinant);
        for (i, row) in system.rows.iter().enumerate() {
            let sum = row.iter().fold(0, |s, (j, c)| {
                let c = value(&c.to_dense(Var::S).expect("one variable"));
                f.add(s, f.mul(c, value(&got.numerators[0][*j])))
            });
            let expected = if i == 1 { f.mul(f.of(1000), det) } else { 0 };
            assert_eq!(sum, expected, "row {i} of {n}");
        }
    }
}
