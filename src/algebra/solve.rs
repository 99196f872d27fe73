//! Exact solutions of systems of linear equations whose coefficients are polynomials.

use super::Poly;

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
    /// det A, up to a sign that it shares with the numerators; the factors that `numerators` and it have in common
    /// are not cancelled.
    pub determinant: Poly,
}

impl System {
    /// Solves A x = b for some unknowns; `right` lists (row, value) of b.
    ///
    /// # Errors
    ///
    /// [`SolveError::Singular`] where det A = 0; [`SolveError::Limit`] where a named limit would be passed.
    pub fn solve(&self, right: &[(usize, Poly)], wanted: &[usize]) -> Result<Solution, SolveError> {
        let determinant = self.determinant_of(None);
        if determinant.is_zero() {
            return Err(SolveError::Singular);
        }
        let numerators = wanted.iter().map(|&w| self.determinant_of(Some((w, right)))).collect();
        Ok(Solution { numerators, determinant })
    }

    /// det A, with one column replaced by `right` where asked for; fraction-free elimination (Bareiss 1968).
    fn determinant_of(&self, replaced: Option<(usize, &[(usize, Poly)])>) -> Poly {
        let n = self.rows.len();
        let mut a = vec![vec![Poly::zero(); n]; n];
        for (i, row) in self.rows.iter().enumerate() {
            for (j, p) in row {
                a[i][*j] = p.clone();
            }
        }
        if let Some((w, right)) = replaced {
            for row in &mut a {
                row[w] = Poly::zero();
            }
            for (i, p) in right {
                a[*i][w] = p.clone();
            }
        }
        let (mut last, mut negative) = (Poly::one(), false);
        for k in 0..n {
            let Some(p) = (k..n).filter(|&i| !a[i][k].is_zero()).min_by_key(|&i| a[i][k].len()) else {
                return Poly::zero();
            };
            if p != k {
                a.swap(p, k);
                negative = !negative;
            }
            for i in k + 1..n {
                for j in k + 1..n {
                    let t = a[k][k].mul(&a[i][j]).sub(&a[i][k].mul(&a[k][j]));
                    a[i][j] = t.div_exact(&last).unwrap_or_default();
                }
            }
            last = a[k][k].clone();
        }
        if negative { last.neg() } else { last }
    }
}
