//! Exact arithmetic: polynomials, rational functions, determinants, roots. Knows nothing of netlists.

pub mod decimal;
pub mod dense;
pub mod factor;
mod fraction;
pub mod functions;
mod gcd;
pub mod modular;
mod poly;
pub(crate) mod prime;
mod residues;
pub mod roots;
pub mod solve;
pub mod stability;

pub use dashu_int::{IBig, UBig};
pub use dashu_ratio::RBig;
pub use fraction::Fraction;
pub use poly::{Poly, Var};
