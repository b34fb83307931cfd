//! What `check` found, as plain data for the renderers.

use crate::diag::{Diagnostic, Severity};
use crate::source::Sources;
use serde::Serialize;

/// How much there is in a circuit.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
pub struct Counts {
    /// Nodes, `gnd` included.
    pub nodes: usize,
    /// Elements.
    pub elements: usize,
    /// Coupled pairs.
    pub couplings: usize,
    /// Parts that no element ties together.
    pub islands: usize,
}

/// The findings of a check with the names they are shown under.
#[derive(Clone, Copy, Debug)]
pub struct CheckPage<'a> {
    /// The file name, without folders.
    pub circuit: &'a str,
    /// The title the circuit gives itself.
    pub title: Option<&'a str>,
    /// The sizes; `None` where there are errors.
    pub counts: Option<Counts>,
    /// Errors and remarks.
    pub diagnostics: &'a [Diagnostic],
    /// The texts they point into.
    pub sources: &'a Sources,
}

/// One finding as data.
#[derive(Debug, Serialize)]
pub struct Finding<'a> {
    /// What is the matter.
    pub message: &'a str,
    /// The text it is about.
    pub file: Option<&'a str>,
    /// Line from 1.
    pub line: Option<usize>,
    /// Column in characters from 1.
    pub column: Option<usize>,
    /// Ways out.
    pub help: &'a [String],
}

/// All findings as data.
#[derive(Debug, Serialize)]
pub struct Findings<'a> {
    schema: &'static str,
    circuit: &'a str,
    title: Option<&'a str>,
    counts: Option<Counts>,
    /// What keeps the circuit from being used.
    pub errors: Vec<Finding<'a>>,
    /// What its writer should know.
    pub remarks: Vec<Finding<'a>>,
}

impl<'a> CheckPage<'a> {
    /// The page as data, errors and remarks apart.
    pub fn as_data(&self) -> Findings<'a> {
        let of = |severity| {
            let chosen = self.diagnostics.iter().filter(move |d| d.severity == severity);
            chosen.map(|d| finding(d, self.sources)).collect()
        };
        Findings {
            schema: "bifilar.check.1",
            circuit: self.circuit,
            title: self.title,
            counts: self.counts,
            errors: of(Severity::Error),
            remarks: of(Severity::Remark),
        }
    }

    /// The closing line: `7 nodes, 6 elements, 1 coupling, 2 islands`.
    pub fn summary(&self) -> String {
        let Some(counts) = self.counts else { return "not usable".to_owned() };
        let parts = [
            (counts.nodes, "node"),
            (counts.elements, "element"),
            (counts.couplings, "coupling"),
            (counts.islands, "island"),
        ];
        let text =
            |(n, word): (usize, &str)| format!("{n} {word}{}", if n == 1 { "" } else { "s" });
        parts.map(text).join(", ")
    }
}

fn finding<'a>(diagnostic: &'a Diagnostic, sources: &'a Sources) -> Finding<'a> {
    let span = diagnostic.labels.first().map(|label| label.span);
    let place = span.map(|span| sources.location(span));
    Finding {
        message: &diagnostic.message,
        file: span.map(|span| sources.get(span.source).name.as_str()),
        line: place.map(|place| place.line),
        column: place.map(|place| place.column),
        help: &diagnostic.help,
    }
}

#[cfg(test)]
mod tests {
    use crate::diag::Diagnostic;
    use crate::render::check::{CheckPage, Counts};
    use crate::render::{Form, Format, Style, renderer};
    use crate::source::{Sources, Span};
    use expect_test::expect;

    #[test]
    fn findings_keep_their_places_and_ways_out() {
        let mut sources = Sources::default();
        let id = sources.add("link.bfl", "a -( r: 1 Ω )- 0\n");
        let remark = Diagnostic::remark("`0` is a plain node")
            .at(Span::new(id, 16, 17), "")
            .help("write `gnd` for the reference");
        let page = CheckPage {
            circuit: "link.bfl",
            title: None,
            counts: Some(Counts { nodes: 2, elements: 1, couplings: 0, islands: 1 }),
            diagnostics: &[remark],
            sources: &sources,
        };
        assert_eq!(page.summary(), "2 nodes, 1 element, 0 couplings, 1 island");
        let mut out = Vec::new();
        let style = Style { form: Form::Polar, peak: false, digits: 6, bounds: false };
        renderer(Format::Json, style).check(&page, &mut out);
        renderer(Format::Csv, style).check(&page, &mut out);
        expect![[r#"
            {"schema":"bifilar.check.1","circuit":"link.bfl","title":null,"counts":{"nodes":2,"elements":1,"couplings":0,"islands":1},"errors":[],"remarks":[{"message":"`0` is a plain node","file":"link.bfl","line":1,"column":16,"help":["write `gnd` for the reference"]}]}
            severity,file,line,column,message
            remark,link.bfl,1,16,`0` is a plain node
        "#]].assert_eq(&String::from_utf8(out).unwrap());
    }
}
