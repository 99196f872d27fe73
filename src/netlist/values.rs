//! Exact values of expressions for one case, with some params kept as symbols.
//!
//! Variables of the polynomials: [`Var::S`] is s or z; [`Var`]s of [`DELAYS`] are dead times; [`PARAMS`] + i is the
//! param with number i; [`PI`] is π. So the order of variables is: s, dead times, params in the order of the file, π.

use crate::algebra::Var;

/// Number of the first dead-time variable: `Var(DELAYS + i)` stands for exp(-T·s) with T the i-th basic dead time.
pub const DELAYS: u32 = 1;

/// Number of the first param's variable.
pub const PARAMS: u32 = 1 << 20;

/// π as a symbol.
pub const PI: Var = Var(u32::MAX);
