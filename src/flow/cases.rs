//! The cases of a request, and the values for each, worked out once.

use super::rows::Laws;
use crate::diagnostics::{Code, Diagnostic, Severity};
use crate::netlist::values::Values;
use crate::netlist::{AskedCases, CaseId, Keep, Netlist};
use crate::source::Span;
use std::rc::Rc;

/// The values of one netlist by case and kept params.
pub(super) struct Cases<'n> {
    netlist: &'n Netlist,
    known: Vec<(Option<CaseId>, Keep, Option<Rc<Laws<'n>>>)>,
}

impl<'n> Cases<'n> {
    /// Nothing is worked out yet.
    pub(super) fn new(netlist: &'n Netlist) -> Self {
        Self { netlist, known: Vec::new() }
    }

    /// The values for a case; `None`, and told, where they can't be worked out.
    pub(super) fn laws(
        &mut self,
        case: Option<CaseId>,
        keep: &Keep,
        diagnostics: &mut Vec<Diagnostic>,
    ) -> Option<Rc<Laws<'n>>> {
        if let Some((_, _, laws)) = self.known.iter().find(|(c, k, _)| *c == case && k == keep) {
            return laws.clone();
        }
        let laws = match Values::new(self.netlist, case, keep) {
            Ok(values) => Some(Rc::new(Laws::new(values, case, keep))),
            Err(told) => {
                let new: Vec<_> = told.into_iter().filter(|d| !diagnostics.contains(d)).collect();
                diagnostics.extend(new);
                None
            }
        };
        self.known.push((case, keep.clone(), laws.clone()));
        laws
    }
}

/// What a case is called in results.
pub(super) fn name(netlist: &Netlist, case: Option<CaseId>) -> String {
    let named = |c: CaseId| netlist.cases[c.index()].name.clone();
    case.or(netlist.nominal).map_or_else(|| "nominal".to_owned(), named)
}

/// The cases that a request asks for, nominal first. `in all` leaves nominal out, with a note, where it lacks a value
/// that every case gives.
pub(super) fn of(
    netlist: &Netlist,
    asked: &AskedCases,
    span: Span,
    diagnostics: &mut Vec<Diagnostic>,
) -> Vec<Option<CaseId>> {
    match asked {
        AskedCases::Nominal => vec![None],
        AskedCases::These(list) => {
            let mut list = list.clone();
            list.sort_by_key(Option::is_some);
            list.dedup();
            list
        }
        AskedCases::All => {
            let cases = (0..netlist.cases.len()).map(|i| Some(CaseId(i as u32)));
            let note = lacks(netlist, span);
            let nominal = if note.is_some() { None } else { Some(None) };
            diagnostics.extend(note.filter(|n| !diagnostics.contains(n)));
            nominal.into_iter().chain(cases).collect()
        }
    }
}

/// The note on a param without a value that every case sets.
fn lacks(netlist: &Netlist, span: Span) -> Option<Diagnostic> {
    if netlist.cases.is_empty() || netlist.nominal.is_some() {
        return None;
    }
    let sets = |case: &crate::netlist::Case, id: usize| case.settings.iter().any(|(p, _)| p.index() == id);
    let valueless = netlist.params.iter().enumerate().filter(|(_, p)| p.value.is_none());
    let (_, param) = { valueless }.find(|(i, _)| netlist.cases.iter().all(|c| sets(c, *i)))?;
    let name = netlist.names.get(param.name);
    Some(
        Diagnostic::new(
            Code::ParameterWithoutValue,
            format!("`in all` leaves the nominal values out: `{name}` has a value only in the cases"),
        )
        .severity(Severity::Note)
        .label(span, "asked for here")
        .label(param.origin.span, "no value here, and one in every case")
        .help("give it a value here if the nominal values are meant too"),
    )
}
