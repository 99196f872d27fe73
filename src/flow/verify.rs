//! Puts a result back into the signal equations: at points modulo large primes the equations are solved directly, and
//! the result's value must be that of the signal asked for.
//!
//! How sure that makes: a wrong result differs from the true one by a polynomial that is not 0, of a degree d at most
//! the sum of those of the rows and the result; it vanishes at a point taken at random modulo a prime p with a
//! probability of at most d/p (Schwartz, "Fast probabilistic algorithms for verification of polynomial identities",
//! J. ACM 27, 1980).

use super::graph::Wiring;
use super::residue::{Point, Residues};
use super::rows::Laws;
use super::system::{self, Part, Question};
use crate::algebra::prime::Prime;
use crate::algebra::{Fraction, Poly};
use crate::diagnostics::Diagnostic;
use crate::results::Verified;
use std::collections::BTreeMap;

/// Points tried: each alone makes it about 2^-50 unlikely that an error passes.
const POINTS: u64 = 3;

/// How many points may be skipped where the equations happen to be singular modulo the prime.
const MAX_SKIPPED: usize = 8;

/// Checks a result for the sum of test signal and driver, not in lowest terms or in lowest terms.
///
/// # Errors
///
/// What the laws say when they are worked out.
pub(super) fn verify(
    wiring: &Wiring<'_>,
    laws: &Laws<'_>,
    part: &Part,
    question: &Question<'_>,
    fraction: &Fraction,
) -> Result<Verified, Box<Diagnostic>> {
    let equations = system::equations(wiring, laws, part, Some(question.from), question.open)?;
    let rows =
        equations.system.rows.iter().map(|row| row.iter().map(|(_, p)| degree(p)).max().unwrap_or(0)).sum::<u64>();
    let most = rows + degree(fraction.numerator()).max(degree(fraction.denominator()));
    let direct = question.from == question.to && !question.open.contains(&question.to);
    let (mut holds, mut tried) = (true, 0);
    for (number, prime) in (0u64..).zip(Prime::all()).take(POINTS as usize + MAX_SKIPPED) {
        if tried == POINTS {
            break;
        }
        let point = Point::new(prime, number);
        let system = Residues {
            rows: equations
                .system
                .rows
                .iter()
                .map(|row| row.iter().map(|(j, p)| (*j, point.of(p))).filter(|e| e.1 != 0).collect::<BTreeMap<_, _>>())
                .collect(),
            right: {
                let mut right = vec![0; part.rows.len()];
                equations.right.iter().for_each(|(i, p)| right[*i] = prime.add(right[*i], point.of(p)));
                right
            },
        };
        let below = point.of(fraction.denominator());
        let Some(solution) = system.solve(&prime).filter(|_| below != 0) else { continue };
        let answer = part.place(question.to).map_or(0, |i| solution[i]);
        let answer = if direct { prime.add(answer, prime.one) } else { answer };
        holds &= prime.mul(answer, below) == point.of(fraction.numerator());
        tried += 1;
    }
    let bits_a_point = 61u64.saturating_sub(u64::from((most + 1).ilog2()) + 1);
    Ok(Verified { holds: holds && tried == POINTS, points: tried as u32, bits: (tried * bits_a_point) as u32 })
}

/// Total degree.
fn degree(p: &Poly) -> u64 {
    p.variables().iter().map(|&v| u64::from(p.degree(v))).sum()
}
