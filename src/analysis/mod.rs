//! What a loop does, in figures: stability, modes, margins, responses, and whether requirements hold.
//!
//! The door is [`assess()`]. It takes exact forms from `flow` and gives plain results; text and JSON are not known here.
//!
//! - `quasi` has sums of polynomials and dead times, exact; `axis` exact polynomials along the imaginary axis and their
//!   roots; `curve` and `search` the verified searches that take over where dead times are inside;
//! - `stability` and `modes` speak of the whole, `response` and `margins` of a loop, `modal`, `step`, `sampled` and `norm`
//!   of time responses;
//! - `looked_at` keeps what is known of one loop or transfer function, `requirements` and `equal` judge, `assess` and
//!   `tell` put the results together.

mod assess;
mod axis;
mod curve;
mod equal;
mod looked_at;
mod margins;
mod modal;
mod modes;
mod norm;
mod quasi;
mod requirements;
mod response;
mod sampled;
mod search;
mod stability;
mod step;
mod tell;

pub use assess::Assessed;

use crate::netlist::Netlist;

/// Figures of a netlist: nominal and each case that an `in` names.
///
/// What can't be worked out is told in the diagnostics and left out of the results; the others stand.
pub fn assess(netlist: &Netlist) -> Assessed {
    assess::assess(netlist)
}
