//! From the netlist to results: the signal-flow graph, its loops, and its reduction to transfer functions.
//!
//! The doors are [`derive()`] (the requested transfer functions), [`mason()`] (the gain rule worked out for one of them) and
//! [`check()`] (what only the graph can tell). Everything is exact.
//!
//! - `graph` knows who reads whom, `rows` gives each signal's equation exact coefficients, `system` puts the equations of
//!   the part together that one transfer function goes through;
//! - `direct`, `tangles`, `walk`, `breaks` and `loops` find and tell algebraic loops;
//! - `cancelled`, `modes`, `characteristic` and `hidden` deal with modes that a transfer function does not show;
//! - `residue` and `verify` check results modulo primes.

mod breaks;
mod cancelled;
mod cases;
mod characteristic;
mod check;
mod derive;
mod direct;
pub(crate) mod forms;
mod graph;
mod hidden;
mod ill_posed;
mod improper;
mod loops;
mod mason;
mod modes;
mod named;
mod paths;
mod rates;
mod residue;
mod rows;
pub(crate) mod system;
mod tangles;
mod text;
mod transfer;
mod unused;
mod verify;
mod walk;
mod worked;

use crate::diagnostics::Diagnostic;
use crate::netlist::{Netlist, Request};
use crate::results::mason::Mason;
use crate::results::{Characteristic, Transfer};

pub use transfer::MAX_ROOTS_DEGREE;

/// How transfer functions are worked out.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Method {
    /// Elimination of the signal equations.
    #[default]
    Elimination,
    /// The sums of Mason's gain rule, which enumerate paths and loops: for small netlists, as a second opinion.
    Mason,
}

/// What a derivation is asked for besides the requests.
#[derive(Clone, Copy, Debug, Default)]
pub struct DeriveOptions {
    /// Poles and zeros also above degree [`MAX_ROOTS_DEGREE`].
    pub roots: bool,
    /// By which method.
    pub method: Method,
    /// Whether to put each result back into the signal equations.
    pub verify: bool,
    /// Whether to give the characteristic polynomial of the whole netlist too.
    pub characteristic: bool,
}

/// What a derivation gives.
#[derive(Clone, Debug, Default)]
pub struct Derived {
    /// The results, in the order of the requests.
    pub transfers: Vec<Transfer>,
    /// The characteristic polynomial for each case, where it was asked for.
    pub characteristic: Vec<Characteristic>,
    /// What could not be answered, and why.
    pub diagnostics: Vec<Diagnostic>,
}

/// The requested transfer functions, exact and in lowest terms, in the order of the contract.
///
/// A request that can't be answered is told in the diagnostics and left out of the results; the others stand.
pub fn derive(netlist: &Netlist, options: &DeriveOptions) -> Derived {
    derive::derive(netlist, options)
}

/// Mason's gain rule worked out for one request, a transfer function or the return ratio at one signal, in the first of its
/// cases: forward paths, loops, groups of loops that do not touch, determinant, cofactors, gain.
///
/// # Errors
///
/// Why it can't be worked out; past the limits of loops, paths and groups it says how many there are at least.
pub fn mason(netlist: &Netlist, request: &Request) -> Result<Mason, Vec<Diagnostic>> {
    worked::mason(netlist, request)
}

/// What only the graph can tell of a netlist: algebraic loops, blocks on which nothing depends, laws that would answer
/// before they are asked, unstable modes that no request shows, sampling periods that differ.
///
/// Linear in the size of the netlist except where something is found.
pub fn check(netlist: &Netlist) -> Vec<Diagnostic> {
    check::check(netlist)
}

#[cfg(test)]
mod tests;
