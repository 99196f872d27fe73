//! Exact solutions of systems of linear equations whose coefficients are polynomials.
//!
//! Three steps: unknowns with a pivot ±1 in a sparse row or column are eliminated as they stand; then, where symbols
//! occur, minors over sets of columns give determinant and numerators without any division ([`minors`]); small systems in
//! one variable go by fraction-free elimination ([`bareiss`]). Larger systems in the main variable alone go to [`super::modular`] as they stand.

mod bareiss;
mod condense;
mod minors;
mod terms;
#[cfg(test)]
mod tests;

use super::{IBig, Poly, Var, modular};
pub use minors::{MAX_COLUMNS, MAX_SETS, MAX_TERMS};

/// From as many rows on, systems in the main variable alone go to [`modular`]; below, its set-up costs more.
const MODULAR_ROWS: usize = 12;

/// A square system A x = b, by its rows; each row lists (column, coefficient), columns rising, no zeros.
#[derive(Clone, Debug, Default)]
pub struct System {
    /// The rows of A.
    pub rows: Vec<Vec<(usize, Poly)>>,
}

/// Why there is no solution.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum SolveError {
    /// det A = 0.
    Singular,
    /// It would take more than a named limit allows; the text says what and how much.
    Limit(String),
}

/// Solutions by Cramer's rule, not reduced: `x[wanted[i]] = numerators[i] / determinant`.
#[derive(Clone, Debug)]
pub struct Solution {
    /// One for each wanted unknown.
    pub numerators: Vec<Poly>,
    /// det A, up to a number that it shares with the numerators; the factors that `numerators` and it have in common
    /// are not cancelled.
    pub determinant: Poly,
}

/// Solutions for several right sides, which share the determinant: `x[wanted[i]] = numerators[k][i] / determinant` for
/// the right side k.
#[derive(Clone, Debug)]
pub struct Solutions {
    /// For each right side, one for each wanted unknown.
    pub numerators: Vec<Vec<Poly>>,
    /// As in [`Solution`].
    pub determinant: Poly,
}

/// A system while it is worked on: columns from `unknowns` on are right sides.
#[derive(Clone, Debug)]
struct Augmented {
    rows: Vec<Vec<(usize, Poly)>>,
    unknowns: usize,
    rights: usize,
    wanted: Vec<usize>,
}

impl System {
    /// Solves A x = b for some unknowns; `right` lists (row, value) of b.
    ///
    /// # Errors
    ///
    /// [`SolveError::Singular`] where det A = 0; [`SolveError::Limit`] where a named limit would be passed.
    pub fn solve(&self, right: &[(usize, Poly)], wanted: &[usize]) -> Result<Solution, SolveError> {
        let mut all = self.solve_many(&[right], wanted)?;
        Ok(Solution { numerators: all.numerators.pop().unwrap_or_default(), determinant: all.determinant })
    }

    /// Solves A x = b for several right sides b and some unknowns.
    ///
    /// # Errors
    ///
    /// As [`Self::solve`].
    pub fn solve_many(&self, rights: &[&[(usize, Poly)]], wanted: &[usize]) -> Result<Solutions, SolveError> {
        let n = self.rows.len();
        if n >= MODULAR_ROWS
            && let Some(result) = modular::solve(self, rights, wanted)
        {
            return result.map(Solutions::from);
        }
        let mut rows = self.rows.clone();
        for (k, right) in rights.iter().enumerate() {
            let mut values: Vec<(usize, Poly)> = right.to_vec();
            values.sort_by_key(|v| v.0);
            for same in values.chunk_by(|a, b| a.0 == b.0) {
                let sum = same[1..].iter().fold(same[0].1.clone(), |s, v| s.add(&v.1));
                if !sum.is_zero() {
                    rows[same[0].0].push((n + k, sum));
                }
            }
        }
        let system = Augmented { rows, unknowns: n, rights: rights.len(), wanted: wanted.to_vec() };
        check_degrees(&system)?;
        let (system, negative) = condense::condense(system);
        let mut all = expand(&system)?;
        if all.determinant.is_zero() {
            return Err(SolveError::Singular);
        }
        if negative {
            all.determinant = all.determinant.neg();
            all.numerators.iter_mut().flatten().for_each(|p| *p = p.neg());
        }
        Ok(all)
    }

    /// det A, up to a number other than 0; 0 for a singular system.
    ///
    /// # Errors
    ///
    /// [`SolveError::Limit`] where a named limit would be passed.
    pub fn determinant(&self) -> Result<Poly, SolveError> {
        match self.solve_many(&[], &[]) {
            Ok(all) => Ok(all.determinant),
            Err(SolveError::Singular) => Ok(Poly::zero()),
            Err(limit) => Err(limit),
        }
    }
}

impl From<modular::Exact> for Solutions {
    fn from(exact: modular::Exact) -> Self {
        let poly = |p: &Vec<IBig>| Poly::from_dense(Var::S, p);
        Self {
            numerators: exact.numerators.iter().map(|r| r.iter().map(poly).collect()).collect(),
            determinant: poly(&exact.determinant),
        }
    }
}

/// Degrees beyond 32 bits have no exponents that could be given back.
fn check_degrees(system: &Augmented) -> Result<(), SolveError> {
    let most = |row: &Vec<(usize, Poly)>| row.iter().flat_map(|e| e.1.fields()).map(|f| f.degree).max().unwrap_or(0);
    let sum = system.rows.iter().fold(0u64, |s, r| s.saturating_add(most(r)));
    if sum > u64::from(u32::MAX) {
        return Err(SolveError::Limit(
            "dead times have no common divisor that is large enough: their multiples pass 4294967295; \
             round the dead times"
                .to_owned(),
        ));
    }
    Ok(())
}

/// Determinant and numerators by the way that suits.
fn expand(system: &Augmented) -> Result<Solutions, SolveError> {
    let mut variables: Vec<_> = system.rows.iter().flatten().flat_map(|e| e.1.variables()).collect();
    variables.sort_unstable();
    variables.dedup();
    if variables.len() > 1 {
        let plan = minors::plan(system)?;
        return minors::run(system, &plan);
    }
    bareiss::solve(system)
}
