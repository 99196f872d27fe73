//! How every room tells a mistake: one type for all of them, with code, severity, labelled places and the mend.
//!
//! The message makes sense alone and begins in lower case; advice goes into the help. The first label is the primary
//! one. Only this room knows the library that draws them (`render`).

mod codes;
mod render;

pub use codes::{Code, Severity};
pub use render::{Style, clean, render, summary, wrap};

use crate::source::Span;

/// A place in the text with a word on it.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub struct Label {
    /// The place; [`Span::NONE`] for what stands in no text.
    pub span: Span,
    /// What to say at that place.
    pub text: String,
}

/// One thing told to the user.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub struct Diagnostic {
    /// What it is about.
    pub code: Code,
    /// How much it weighs.
    pub severity: Severity,
    /// What is wrong, in one sentence that makes sense alone.
    pub message: String,
    /// How to mend it.
    pub help: Option<String>,
    /// The places, the primary one first.
    pub labels: Vec<Label>,
}

impl Diagnostic {
    /// A diagnostic with its code's own severity and no label yet.
    pub fn new(code: Code, message: impl Into<String>) -> Self {
        Self { code, severity: code.severity(), message: message.into(), help: None, labels: Vec::new() }
    }

    /// The same with another label at its end.
    #[must_use]
    pub fn label(mut self, span: Span, text: impl Into<String>) -> Self {
        self.labels.push(Label { span, text: text.into() });
        self
    }

    /// The same with this help.
    #[must_use]
    pub fn help(mut self, help: impl Into<String>) -> Self {
        self.help = Some(help.into());
        self
    }

    /// The same with this severity.
    #[must_use]
    pub fn severity(mut self, severity: Severity) -> Self {
        self.severity = severity;
        self
    }

    /// Whether it is an error.
    pub fn is_error(&self) -> bool {
        self.severity == Severity::Error
    }
}
