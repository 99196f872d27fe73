//! Large numeric systems, exactly: determinant and solutions of A(s) x = b(s), whole coefficients, one variable.
//!
//! 1. Rows of constants are eliminated where that costs little (`sparse`).
//! 2. The rest becomes a state machine (`program`): det A(s) = det L·det(sI - M).
//! 3. Modulo four primes of 50 bits at a time (`lanes`), a Krylov sequence of M is run and its minimal generating
//!    polynomial found (`krylov`). That is det(sI - M) wherever its degree is the number of states; otherwise the
//!    sequence of arbitrary vectors is tried, and where that falls short as well (M has an eigenvalue with two
//!    independent eigenvectors), or where L has no triangular form, elimination at points and interpolation
//!    (`points`) does the same.
//! 4. Chinese remainders (`remainders`) give the integers.
//!
//! **How sure.** Modulo each prime, everything is exact. How many primes are needed is bounded by Hadamard's inequality;
//! mostly fewer do. Once a weighted sum of all coefficients no longer changes over [`SPARE`] further primes, the integers
//! are made from those before, and every one of them is compared with its residues modulo the further ones. Were one of
//! them wrong, its error would be a multiple of each of these primes, of which it can have no more than its length in
//! bits over 49; were the primes drawn at random from the 10^13 of 50 bits, the chance of that would be below
//! (10^-9)^[`SPARE`] for numbers up to a million bits. (They are fixed, so that results repeat; a system would have to be
//! built to deceive them.) Where the bound is reached there is nothing to compare: the result is proved.

mod krylov;
mod lanes;
mod points;
mod program;
mod remainders;
mod sparse;
#[cfg(test)]
mod tests;

use super::prime::Prime;
use super::solve::{SolveError, System};
use super::{Poly, dense};
use dashu_base::Gcd;
use dashu_int::IBig;
use dashu_ratio::RBig;
use krylov::{Outcome, Plan};
use program::Program;
use rayon::prelude::*;
use remainders::{Basis, Probe};
use sparse::{Condensed, Functional};

/// Further primes that must change nothing.
pub const SPARE: usize = 2;
/// Degrees beyond this are left to the caller: the work grows with their square for each of as many primes.
pub const MAX_STATES: usize = 1 << 14;
/// Bits that each prime surely has.
const PRIME_BITS: f64 = 49.9;
/// Primes modulo which the determinant must vanish before it is said to be 0.
const ZERO_PRIMES: usize = 3;

/// The solution of a numeric system: `x[wanted[i]] = numerators[k][i] / determinant` for the right side k.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Exact {
    /// For each right side and wanted unknown, coefficients from the power 0 up; no whole number divides them all and
    /// the determinant.
    pub numerators: Vec<Vec<Vec<IBig>>>,
    /// det A divided by `factor`, coefficients from the power 0 up.
    pub determinant: Vec<IBig>,
    /// What det A has more than `determinant`: a number, not 0.
    pub factor: RBig,
}

/// Solves A x = b for several right sides and some unknowns, where [`super::Var::S`] is the only variable: `None` where it
/// is not, or where the degree may pass [`MAX_STATES`]. A has no empty rows beyond its columns, as in [`System::solve`].
///
/// # Errors
///
/// [`SolveError::Singular`] where det A = 0 (modulo three primes of 62 bits at more points than its degree).
pub fn solve(system: &System, rights: &[&[(usize, Poly)]], wanted: &[usize]) -> Option<Result<Exact, SolveError>> {
    let (rows, factor) = sparse::read(system, rights)?;
    if points::degrees(&rows).0 > MAX_STATES {
        return None;
    }
    Some(solve_rows(rows, factor, rights.len(), wanted))
}

fn solve_rows(rows: Vec<sparse::Row>, factor: IBig, rights: usize, wanted: &[usize]) -> Result<Exact, SolveError> {
    if rows.iter().any(|r| r.entries.is_empty()) {
        return Err(SolveError::Singular);
    }
    let condensed = sparse::condense(rows, factor);
    let (outputs, denominator) = sparse::functionals(&condensed, wanted);
    let all = integers(&condensed, &outputs, rights)?;
    let mut all = all.into_iter();
    let determinant = dense::trim(all.next().unwrap_or_default());
    if determinant.is_empty() {
        return Err(SolveError::Singular);
    }
    let mut numerators: Vec<Vec<Vec<IBig>>> = Vec::with_capacity(rights);
    for r in 0..rights {
        let mut own = Vec::with_capacity(outputs.len());
        for o in &outputs {
            let mut sum = all.next().unwrap_or_default();
            for (_, constant) in o.constants.iter().filter(|t| t.0 == r) {
                let more = dense::product(&determinant, constant);
                if sum.len() < more.len() {
                    sum.resize(more.len(), IBig::ZERO);
                }
                for (s, c) in sum.iter_mut().zip(more) {
                    *s += c;
                }
            }
            own.push(dense::trim(sum));
        }
        numerators.push(own);
    }
    Ok(lowest(determinant, numerators, denominator, condensed.factor))
}

/// Takes the outputs' common denominator into the determinant, and common numbers out of everything.
fn lowest(determinant: Vec<IBig>, numerators: Vec<Vec<Vec<IBig>>>, denominator: IBig, factor: RBig) -> Exact {
    let mut content = dense::content(&determinant);
    let mut above = dashu_int::UBig::ZERO;
    for p in numerators.iter().flatten() {
        let own = dense::content(p);
        above = if above.is_zero() {
            own
        } else if own.is_zero() {
            above
        } else {
            above.gcd(own)
        };
    }
    // determinant·denominator and the numerators divided by what they share.
    content *= dashu_base::UnsignedAbs::unsigned_abs(&denominator);
    let common = IBig::from(if above.is_zero() { content } else { content.gcd(above) });
    let divided = |p: Vec<IBig>| if common == IBig::ONE { p } else { p.into_iter().map(|c| c / &common).collect() };
    let numerators = numerators.into_iter().map(|r| r.into_iter().map(divided).collect()).collect();
    let determinant = if denominator == IBig::ONE {
        divided(determinant)
    } else {
        determinant.into_iter().map(|c| c * &denominator / &common).collect()
    };
    let factor = factor * RBig::from(common) / RBig::from(denominator);
    Exact { numerators, determinant, factor }
}

/// The determinant of what remains and, for each right side and output, the output times the determinant.
fn integers(system: &Condensed, outputs: &[Functional], rights: usize) -> Result<Vec<Vec<IBig>>, SolveError> {
    let bits = bound(system, outputs);
    let most = (bits / PRIME_BITS) as usize + 2;
    if let Some(program) = Program::compile(system, outputs, rights) {
        let mut primes = Primes::below(lanes::LIMIT);
        for plan in [Plan::Direct, Plan::Arbitrary] {
            if let Some(all) = by_krylov(&program, plan, &mut primes, most) {
                return Ok(all);
            }
        }
    }
    by_points(system, outputs, rights, most)
}

/// Primes below a limit, downwards, each once.
struct Primes {
    next: u64,
}

impl Primes {
    fn below(limit: u64) -> Self {
        Self { next: limit - 1 }
    }
    fn take(&mut self) -> u64 {
        while !Prime::is_prime(self.next) {
            self.next -= 2;
        }
        self.next -= 2;
        self.next + 2
    }
}

/// Images are taken in waves until they suffice. `None` where the sequence is too short.
fn by_krylov(program: &Program, plan: Plan, primes: &mut Primes, most: usize) -> Option<Vec<Vec<IBig>>> {
    let mut taken = Taken::default();
    // The first wave is one group, which shows whether the plan serves; the second most of what it will take.
    let mut wave = 1;
    loop {
        let groups: Vec<[u64; 4]> = (0..wave).map(|_| [(); 4].map(|()| primes.take())).collect();
        let outcomes: Vec<Outcome> = groups.into_par_iter().map(|g| krylov::images(program, g, plan)).collect();
        for o in outcomes {
            match o {
                Outcome::Done(images) => {
                    for (p, image) in images.primes.into_iter().zip(images.images) {
                        taken.take(p, image);
                    }
                }
                Outcome::Short => return None,
                Outcome::Unlucky => {}
            }
        }
        if let Some(all) = taken.finish(most) {
            return Some(all);
        }
        let left = most.saturating_sub(taken.primes.len()).div_ceil(4).max(1);
        wave = if taken.primes.len() * 2 < most { (left * 5 / 8).max(1) } else { left.min(2) };
    }
}

/// The same by elimination at points, which serves any system.
fn by_points(
    system: &Condensed,
    outputs: &[Functional],
    rights: usize,
    most: usize,
) -> Result<Vec<Vec<IBig>>, SolveError> {
    let mut primes = Primes::below(1 << 62);
    let (mut taken, mut zeros) = (Taken::default(), 0);
    loop {
        let wave: Vec<u64> = (0..4).map(|_| primes.take()).collect();
        let images: Vec<Option<Vec<Vec<u64>>>> =
            wave.par_iter().map(|&p| points::images(system, outputs, rights, &Prime::new(p))).collect();
        for (p, image) in wave.into_iter().zip(images) {
            match image {
                Some(image) => taken.take(p, image),
                None => zeros += 1,
            }
        }
        if zeros >= ZERO_PRIMES && taken.primes.is_empty() {
            return Err(SolveError::Singular);
        }
        if let Some(all) = taken.finish(most) {
            return Ok(all);
        }
    }
}

/// Images modulo the primes so far.
#[derive(Default)]
struct Taken {
    primes: Vec<u64>,
    images: Vec<Vec<Vec<u64>>>,
    probe: Probe,
}

impl Taken {
    fn take(&mut self, p: u64, image: Vec<Vec<u64>>) {
        self.probe.take(p, image.iter().flatten());
        self.primes.push(p);
        self.images.push(image);
    }

    /// The integers, where there are primes enough; `most` of them certainly are.
    fn finish(&self, most: usize) -> Option<Vec<Vec<IBig>>> {
        let proved = self.primes.len() >= most;
        let used = if proved { self.primes.len() } else { self.probe.enough(SPARE)?.max(1) };
        let basis = Basis::new(&self.primes[..used]);
        let kinds = self.images.first().map_or(0, Vec::len);
        let all: Vec<Vec<IBig>> = (0..kinds)
            .map(|k| basis.numbers(&self.images[..used].iter().map(|i| i[k].as_slice()).collect::<Vec<_>>()))
            .collect();
        let further = self.primes[used..].iter().zip(&self.images[used..]);
        let agrees = further.into_iter().all(|(&p, image)| {
            let f = Prime::new(p);
            all.iter().flatten().zip(image.iter().flatten()).all(|(c, &r)| f.value(f.of_big(c)) == r)
        });
        (proved || agrees).then_some(all)
    }
}

/// Bits that no coefficient of the determinant or of a numerator passes, sign included, by Hadamard's inequality on
/// |s| = 1: each row counts with the norm of its entries' sums of magnitudes, right sides included.
fn bound(system: &Condensed, outputs: &[Functional]) -> f64 {
    let log2 = |c: &IBig| {
        let bits = dense::bits(c);
        let shift = bits.saturating_sub(53);
        if bits == 0 {
            f64::NEG_INFINITY
        } else {
            libm::log2((c >> shift).to_f64().value().abs()) + shift as f64 + 1e-9
        }
    };
    let magnitude = |p: &[IBig]| p.iter().fold(IBig::ZERO, |s, c| s + dashu_base::Abs::abs(c.clone()));
    let mut bits = 4.0;
    for row in &system.rows {
        let mut square = IBig::ZERO;
        for (_, p) in row.entries.iter().chain(&row.right) {
            let m = magnitude(p);
            square += &m * &m;
        }
        bits += (log2(&square) / 2.0).max(0.0);
    }
    let weights = outputs.iter().map(|o| o.terms.iter().fold(IBig::ONE, |s, t| s + dashu_base::Abs::abs(t.1.clone())));
    bits + weights.map(|w| log2(&w)).fold(0.0, f64::max)
}
