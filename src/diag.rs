//! Diagnostics: what is wrong, where, and what to do; and how they are drawn.

use crate::source::{Sources, Span};

/// How much a diagnostic weighs.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Severity {
    /// The circuit or the call cannot be used.
    Error,
    /// The circuit can be used; the writer should know something.
    Remark,
}

/// A marked piece of text and what to say about it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Label {
    /// The marked range.
    pub span: Span,
    /// Words under the mark; may be empty.
    pub text: String,
}

/// One thing to tell the writer of a circuit.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Diagnostic {
    /// Error or remark.
    pub severity: Severity,
    /// What is wrong, in one line.
    pub message: String,
    /// The places; the first one gives the file, line and column. May be empty.
    pub labels: Vec<Label>,
    /// Ways out, one line each.
    pub help: Vec<String>,
}

impl Diagnostic {
    /// An error without a place.
    pub fn error(message: impl Into<String>) -> Self {
        Self::new(Severity::Error, message)
    }

    /// A remark without a place.
    pub fn remark(message: impl Into<String>) -> Self {
        Self::new(Severity::Remark, message)
    }

    fn new(severity: Severity, message: impl Into<String>) -> Self {
        Diagnostic { severity, message: message.into(), labels: Vec::new(), help: Vec::new() }
    }

    /// Marks a place.
    pub fn at(mut self, span: Span, text: impl Into<String>) -> Self {
        self.labels.push(Label { span, text: text.into() });
        self
    }

    /// Adds a way out.
    pub fn help(mut self, text: impl Into<String>) -> Self {
        self.help.push(text.into());
        self
    }

    /// Draws the diagnostic with its source lines and carets.
    pub fn render(&self, sources: &Sources, colour: bool) -> String {
        let _ = (sources, colour);
        todo!()
    }
}

/// The one of `names` that `wanted` was most likely meant to be.
pub fn did_you_mean<'a>(wanted: &str, names: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    /// Below this Jaro-Winkler similarity a suggestion is noise (judged on typical typing slips).
    const LEAST_SIMILARITY: f64 = 0.8;
    names
        .into_iter()
        .map(|name| (strsim::jaro_winkler(wanted, name), name))
        .filter(|(similarity, _)| *similarity >= LEAST_SIMILARITY)
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, name)| name)
}
