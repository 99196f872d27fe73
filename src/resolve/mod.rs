//! Syntax trees to the netlist: names bound, units checked, `define` and `repeat` written out, cases applied.
//!
//! The passes, in their order: [`files`] reads what is `use`d; [`write_out`] declares and writes out one scope after
//! the other, binding expressions with [`bind`] and [`linear`]; [`requests`] binds cases, requests and requirements;
//! [`judge`] tells what only the whole shows (undriven signals, units of signals, values of cases).

mod bind;
mod blocks;
mod calls;
mod circles;
mod declare;
mod files;
mod instances;
mod judge;
mod linear;
mod numbers;
mod requests;
mod scope;
mod states;
mod suggest;
#[cfg(test)]
mod tests;
mod unit_text;
pub mod units;
mod whole;
mod write_out;

use crate::diagnostics::{Code, Diagnostic};
use crate::netlist::Netlist;
use crate::source::{FileId, Loader, SourceMap, Span};

/// The most statements, calls and terms that `repeat`, instances, `sum( )` and calls may write out together: what
/// stays of each is some hundred bytes, so this is what a large machine holds.
pub const MAX_WRITTEN_OUT: u64 = 20_000_000;

/// How deep instances and calls of defined laws may stand in each other.
pub const MAX_DEFINE_DEPTH: usize = 100;

/// How many files a chain of `use` may be long.
pub const MAX_USE_DEPTH: usize = 64;

/// The largest power of ten that a number's exponent may name.
pub const MAX_DECIMAL_EXPONENT: i64 = 10_000;

/// What the command line adds to a file.
#[derive(Clone, Debug, Default)]
pub struct CommandLine {
    /// Requests in place of those of the file, each as after `find`.
    pub requests: Vec<String>,
    /// `NAME=VALUE`: values that win over the file's and its cases'.
    pub settings: Vec<String>,
    /// The case that stands in nominal's place.
    pub case: Option<String>,
    /// Params that stay symbols in every request.
    pub keep: Vec<String>,
}

/// What comes of a file.
#[derive(Debug)]
pub struct Resolved {
    /// The netlist; none where a named limit ended the reading. With errors among the diagnostics it is good for
    /// further checks only: what is unknown stands in it as strictly proper laws of nameless params.
    pub netlist: Option<Netlist>,
    /// All that is to be told, in the order of the text.
    pub diagnostics: Vec<Diagnostic>,
}

/// Resolves one file of `sources`, with what it uses, which is read through `loader` and added to `sources`.
pub fn resolve(sources: &mut SourceMap, root: FileId, loader: &dyn Loader, line: &CommandLine) -> Resolved {
    let mut loaded = files::load(sources, root, loader, line);
    let mut diagnostics = std::mem::take(&mut loaded.diagnostics);
    let limit = |d: &Diagnostic| d.code == Code::LimitReached;
    if let Some(reached) = diagnostics.iter().find(|d| limit(d)) {
        return Resolved { netlist: None, diagnostics: vec![reached.clone()] };
    }
    let mut writer = write_out::Writer::new(sources, &loaded);
    let outcome = writer.write_out(line);
    let (netlist, told) = writer.finish();
    if outcome.is_err() {
        let reached = told.into_iter().filter(limit).take(1);
        return Resolved { netlist: None, diagnostics: reached.collect() };
    }
    diagnostics.extend(told);
    // The trees are the larger part of what is held, and no longer needed.
    drop(loaded);
    if !diagnostics.iter().any(Diagnostic::is_error) {
        diagnostics.extend(judge::values(&netlist));
    }
    Resolved { netlist: Some(netlist), diagnostics: in_order(diagnostics) }
}

/// Sorted by place, each kind once at one place: an error inside a `define` or a `repeat` is told for the first
/// instance only.
fn in_order(mut diagnostics: Vec<Diagnostic>) -> Vec<Diagnostic> {
    let place = |d: &Diagnostic| d.labels.first().map_or(Span::NONE, |l| l.span);
    diagnostics.sort_by_key(|d| (place(d), d.code));
    diagnostics.dedup_by(|b, a| a.code == b.code && place(a) == place(b) && place(a) != Span::NONE);
    diagnostics
}

/// A named limit was reached; it has been told, and the reading ends.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
struct LimitReached;
