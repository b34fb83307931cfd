//! Diagnostics: what is wrong, where, and what to do; and how they are drawn.

use crate::source::{Sources, Span};
use annotate_snippets::{Annotation, AnnotationKind, Group, Level, Renderer, Snippet};
use std::ops::Range;

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
        let excerpts = self.excerpts(sources);
        let level = match self.severity {
            Severity::Error => Level::ERROR,
            Severity::Remark => Level::NOTE.with_name("remark"),
        };
        let snippets = excerpts.iter().map(|excerpt| excerpt.snippet(sources));
        let mut groups = vec![level.primary_title(visible(&self.message)).elements(snippets)];
        let help = |text: &String| Group::with_title(Level::HELP.secondary_title(visible(text)));
        groups.extend(self.help.iter().map(help));
        let renderer = if colour { Renderer::styled() } else { Renderer::plain() };
        let mut drawn = renderer.render(&groups);
        // The drawing counts columns from where a window starts; people count from the line's.
        for excerpt in excerpts.iter().filter(|excerpt| excerpt.cut.0) {
            let (counted, meant) = excerpt.places(sources);
            drawn = drawn.replacen(&counted, &meant, 1);
        }
        drawn
    }

    /// The pieces of the texts to draw, the first label's first.
    fn excerpts(&self, sources: &Sources) -> Vec<Excerpt> {
        let mut excerpts: Vec<Excerpt> = Vec::new();
        for (index, label) in self.labels.iter().enumerate() {
            let mark = Mark { span: label.span, text: visible(&label.text), primary: index == 0 };
            let new = Excerpt::new(sources, mark);
            match excerpts.iter_mut().find(|excerpt| excerpt.can_take(&new)) {
                Some(excerpt) => excerpt.take(new),
                None => excerpts.push(new),
            }
        }
        excerpts
    }
}

/// Longest piece of a text that is drawn from, in bytes: keeps drawing quick on huge texts.
const LONGEST_EXCERPT: usize = 16 << 10;

/// Of a line longer than that, so many bytes around the mark are drawn.
const WINDOW: usize = 240;

/// Text for people: control characters could break the drawing, or the terminal.
fn visible(text: &str) -> String {
    text.chars().map(|c| if c.is_control() && c != '\n' { '\u{fffd}' } else { c }).collect()
}

/// A label, ready to draw.
struct Mark {
    span: Span,
    text: String,
    primary: bool,
}

/// A piece of a text with the marks on it: whole lines, or a window of a very long line.
struct Excerpt {
    /// Bytes of the source text.
    range: Range<usize>,
    /// Whether the line goes on before and after the range.
    cut: (bool, bool),
    marks: Vec<Mark>,
}

impl Excerpt {
    /// The line the mark starts on, or a window of it.
    fn new(sources: &Sources, mark: Mark) -> Self {
        let text = &sources.get(mark.span.source).text;
        let at = mark.span.start as usize;
        let line_start = text[..at].rfind('\n').map_or(0, |before| before + 1);
        let line_end = text[at..].find('\n').map_or(text.len(), |length| at + length);
        let mut range = line_start..line_end;
        if range.len() > LONGEST_EXCERPT {
            range.start = range.start.max(at.saturating_sub(WINDOW / 3));
            range.end = range.end.min(range.start + WINDOW);
            while !text.is_char_boundary(range.start) {
                range.start += 1;
            }
            while !text.is_char_boundary(range.end) {
                range.end -= 1;
            }
        }
        let cut = (range.start > line_start, range.end < line_end);
        Excerpt { range, cut, marks: vec![mark] }
    }

    /// Whether another excerpt can be drawn as a part of this one.
    fn can_take(&self, other: &Excerpt) -> bool {
        let whole = |excerpt: &Excerpt| excerpt.cut == (false, false);
        let together = self.range.start.min(other.range.start)..self.range.end.max(other.range.end);
        let at = other.marks[0].span.start as usize;
        self.marks[0].span.source == other.marks[0].span.source
            && if whole(self) && whole(other) {
                together.len() <= LONGEST_EXCERPT
            } else {
                self.range.contains(&at)
            }
    }

    fn take(&mut self, other: Excerpt) {
        if self.cut == (false, false) {
            self.range.start = self.range.start.min(other.range.start);
            self.range.end = self.range.end.max(other.range.end);
        }
        self.marks.extend(other.marks);
    }

    /// The text as drawn, and the offset in it of every character of the source.
    fn drawn(&self, text: &str) -> (String, Vec<(usize, usize)>) {
        let mut drawn = String::from(if self.cut.0 { "…" } else { "" });
        let mut offsets = Vec::new();
        for (at, c) in text[self.range.clone()].char_indices() {
            offsets.push((self.range.start + at, drawn.len()));
            match c {
                '\r' => {}
                c if c.is_control() && c != '\t' && c != '\n' => drawn.push('\u{fffd}'),
                c => drawn.push(c),
            }
        }
        offsets.push((self.range.end, drawn.len()));
        drawn.push_str(if self.cut.1 { "…" } else { "" });
        (drawn, offsets)
    }

    fn snippet(&self, sources: &Sources) -> Snippet<'static, Annotation<'static>> {
        let source = sources.get(self.marks[0].span.source);
        let (drawn, offsets) = self.drawn(&source.text);
        let offset = |at: usize| {
            let index = offsets.partition_point(|(from, _)| *from < at).min(offsets.len() - 1);
            offsets[index].1
        };
        let annotation = |mark: &Mark| {
            let (start, end) = (mark.span.start as usize, mark.span.end as usize);
            // A range of many lines is marked on its first one.
            let line_end = source.text[start..end].find('\n').map_or(end, |length| start + length);
            let kind = if mark.primary { AnnotationKind::Primary } else { AnnotationKind::Context };
            let label = Some(mark.text.clone()).filter(|text| !text.is_empty());
            kind.span(offset(start)..offset(line_end)).label(label)
        };
        let annotations: Vec<_> = self.marks.iter().map(annotation).collect();
        let id = self.marks[0].span.source;
        let first = sources.location(Span::new(id, self.range.start, self.range.start));
        Snippet::source(drawn)
            .path(visible(&source.name))
            .line_start(first.line)
            .annotations(annotations)
    }

    /// `file:line:column` as the drawing counts it in a window, and as it is.
    fn places(&self, sources: &Sources) -> (String, String) {
        let headed = |mark: &&Mark| (!mark.primary, mark.span.start);
        let span = self.marks.iter().min_by_key(headed).map_or(Span::default(), |mark| mark.span);
        let source = sources.get(span.source);
        let place = sources.location(span);
        let before = source.text[self.range.start..span.start as usize].chars().count();
        let from_window = before + 1 + usize::from(self.cut.0);
        let name = visible(&source.name);
        let line = place.line;
        (format!("{name}:{line}:{from_window}"), format!("{name}:{line}:{}", place.column))
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

#[cfg(test)]
mod tests {
    use crate::diag::Diagnostic;
    use crate::source::{Sources, Span};
    use expect_test::expect;

    const TEXT: &str = "let a = 1\r\ngnd -( r\u{1}: 5 kOhm )- µ\n  let b =";

    #[test]
    fn a_diagnostic_shows_its_place_its_line_and_a_way_out() {
        let mut sources = Sources::default();
        let id = sources.add("x.bfl", TEXT);
        let fault = Diagnostic::error("`kOhm` is not a unit")
            .at(Span::new(id, 24, 28), "")
            .help("did you mean `kohm`?");
        let drawn = fault.render(&sources, false).replace('\u{fffd}', "?");
        expect![[r"
            error: `kOhm` is not a unit
             --> x.bfl:2:14
              |
            2 | gnd -( r?: 5 kOhm )- µ
              |              ^^^^
              |
            help: did you mean `kohm`?"]]
        .assert_eq(&drawn);
    }

    #[test]
    fn labels_of_one_text_are_drawn_together_and_an_empty_mark_may_end_it() {
        let mut sources = Sources::default();
        let id = sources.add("x.bfl", TEXT);
        let fault = Diagnostic::error("expected a value")
            .at(Span::new(id, TEXT.len(), TEXT.len()), "here")
            .at(Span::new(id, 4, 5), "other");
        let drawn = fault.render(&sources, false).replace('\u{fffd}', "?");
        expect![[r"
            error: expected a value
             --> x.bfl:3:10
              |
            1 | let a = 1
              |     - other
            2 | gnd -( r?: 5 kOhm )- µ
            3 |   let b =
              |          ^ here"]]
        .assert_eq(&drawn);
    }

    #[test]
    fn a_very_long_line_is_drawn_as_a_window_with_the_right_column() {
        let mut sources = Sources::default();
        let long = format!("x\n{}", "let a = 1; ".repeat(200_000));
        let id = sources.add("long.bfl", long);
        let fault = Diagnostic::error("not so").at(Span::new(id, 1_100_002, 1_100_005), "here");
        let drawn = fault.render(&sources, false);
        assert!(drawn.contains("--> long.bfl:2:1100001\n"), "{drawn}");
        assert!(drawn.contains("^^^ here"), "{drawn}");
        assert!(drawn.len() < 1000, "{drawn}");
        let lines: Vec<_> = drawn.lines().collect();
        let at = lines[4].find('^').expect("a mark");
        assert_eq!(lines[3].chars().skip(at).take(3).collect::<String>(), "let");
    }

    #[test]
    fn a_diagnostic_without_a_place_is_its_message_and_help() {
        let remark = Diagnostic::remark("nothing is read").help("add a `read` statement");
        expect![[r"
            remark: nothing is read
             |
            help: add a `read` statement"]]
        .assert_eq(&remark.render(&Sources::default(), false));
    }

    #[test]
    fn colour_is_used_only_when_asked_for() {
        let mut sources = Sources::default();
        let id = sources.add("x.bfl", TEXT);
        let fault = Diagnostic::error("no").at(Span::new(id, 0, 3), "");
        assert!(fault.render(&sources, true).contains('\u{1b}'));
        assert!(!fault.render(&sources, false).contains('\u{1b}'));
    }
}
