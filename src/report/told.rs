//! Diagnostics in the form of the results: with files, lines and columns instead of positions.

use crate::diagnostics::Diagnostic;
use crate::results::{Check, ToldDiagnostic, ToldLabel};
use crate::source::SourceMap;
use serde::Serialize;

/// Diagnostics as results tell them, in their order; labels that stand in no text are left out.
pub fn told(diagnostics: &[Diagnostic], sources: &SourceMap) -> Vec<ToldDiagnostic> {
    diagnostics.iter().map(|d| one(d, sources)).collect()
}

/// The document of `check`.
pub fn check(diagnostics: Vec<ToldDiagnostic>) -> Check {
    let ok = diagnostics.iter().all(|d| d.severity != crate::diagnostics::Severity::Error);
    Check { schema: "loopwright.check.1", ok, diagnostics }
}

/// A document of a command that came to no result.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Nothing {
    schema: &'static str,
    model: String,
    ok: bool,
    diagnostics: Vec<ToldDiagnostic>,
}

/// The document of a command that came to no result: what stands in it says why.
pub fn nothing(schema: &'static str, model: String, diagnostics: Vec<ToldDiagnostic>) -> Nothing {
    Nothing { schema, model, ok: false, diagnostics }
}

fn one(diagnostic: &Diagnostic, sources: &SourceMap) -> ToldDiagnostic {
    let labels = diagnostic.labels.iter().filter_map(|label| {
        let place = sources.place(label.span)?;
        Some(ToldLabel {
            file: place.file.to_owned(),
            line: place.line,
            column: place.column,
            length: place.length,
            text: label.text.clone(),
        })
    });
    ToldDiagnostic {
        code: diagnostic.code,
        severity: diagnostic.severity,
        message: diagnostic.message.clone(),
        help: diagnostic.help.clone(),
        labels: labels.collect(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::diagnostics::Code;
    use crate::source::Span;

    #[test]
    fn places_count_scalar_values_from_one() {
        let mut sources = SourceMap::new();
        sources.add("a.loop", "\u{feff}input r\nsum ζω = r - y # ζ\n");
        let start = sources.files()[0].text.find('y').expect("there is one") as u32;
        let d = Diagnostic::new(Code::UndrivenSignal, "m")
            .label(Span::new(start, start + 1), "t")
            .label(Span::NONE, "on the command line");
        let told = told(&[d], &sources);
        let label = &told[0].labels[0];
        assert_eq!(told[0].labels.len(), 1);
        assert_eq!((label.line, label.column, label.length), (2, 14, 1));
        assert!(!check(told).ok);
    }
}
