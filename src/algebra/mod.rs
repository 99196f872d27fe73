//! Exact arithmetic: polynomials, rational functions, determinants, roots. Knows nothing of netlists.

pub mod factor;
mod fraction;
pub mod functions;
mod gcd;
mod poly;
mod prime;
mod residues;
pub mod solve;

pub use dashu_int::{IBig, UBig};
pub use dashu_ratio::RBig;
pub use fraction::Fraction;
pub use poly::{Poly, Var};
