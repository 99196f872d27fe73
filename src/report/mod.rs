//! Results as text and as JSON. All views are made from the same result types; none of them knows how they were made.
//!
//! Everything goes to a writer as it is made: a symbolic result may be larger than what one likes to hold twice.

mod assess;
mod derive;
mod factors;
mod json;
mod junit;
mod mason;
mod number;
mod page;
mod roots;
mod sarif;
mod sum;
mod told;

pub use assess::{assess, assess_document};
pub use derive::{TextOptions, derive};
pub use factors::FractionStyle;
pub use json::{json, schema};
pub use junit::junit;
pub use mason::mason;
pub use sarif::sarif;
pub use told::{Nothing, check, nothing, told};

/// The caution that goes with every result which somebody might build on.
pub const CAUTION: &str = "Results are calculations from the model as written, not a proof of safety: verify them on \
                           the real plant; local codes and licensed practice prevail.";

#[cfg(test)]
mod tests;
