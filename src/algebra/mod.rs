//! Exact arithmetic: polynomials, rational functions, determinants, roots. Knows nothing of netlists.

mod fraction;
pub mod functions;
mod gcd;
mod poly;
mod prime;
pub mod solve;

pub use dashu_int::{IBig, UBig};
pub use dashu_ratio::RBig;
pub use fraction::Fraction;
pub use poly::{Poly, Var};
