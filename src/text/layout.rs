//! Cuts a text into statements before they are read, in two passes of linear time.
//!
//! The first pass finds the brackets that are never closed; the second one cuts, so an open
//! bracket in one statement does not hide the errors of the others.

use crate::source::{SourceId, Span};
use crate::text::error::TextError;
use crate::text::lexis::is_name_char;

/// One statement of a text, or the start or end of a block.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Piece {
    /// First byte.
    pub start: usize,
    /// One past the last byte that is not blank or comment; the brace is not part of it.
    pub end: usize,
    /// What follows it.
    pub kind: PieceKind,
    /// An error was already found; it is not worth reading.
    pub broken: bool,
}

/// What follows a piece of text.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum PieceKind {
    /// The end of the line, `;`, or the end of the text.
    Statement,
    /// `{` at this offset.
    Opens(usize),
    /// `}` at this offset; the piece itself is empty.
    Closes(usize),
}

/// Cuts a text into pieces; reports brackets and quotes without a partner.
pub fn pieces(source: SourceId, text: &str) -> (Vec<Piece>, Vec<TextError>) {
    let unclosed = unclosed(text);
    let mut cut = Cut {
        source,
        text,
        at: body_start(text),
        start: None,
        end: 0,
        depth: 0,
        broken: false,
        unclosed: &unclosed,
        pieces: Vec::new(),
        errors: Vec::new(),
    };
    while let Some(&byte) = text.as_bytes().get(cut.at) {
        cut.step(byte);
    }
    cut.finish(PieceKind::Statement);
    (cut.pieces, cut.errors)
}

/// A byte order mark at the start says nothing in UTF-8.
fn body_start(text: &str) -> usize {
    if text.starts_with('\u{feff}') { '\u{feff}'.len_utf8() } else { 0 }
}

/// The offset just after a quoted text that starts at `at`, and whether it is closed.
fn after_quote(text: &str, at: usize) -> (usize, bool) {
    match text[at + 1..].find(['"', '\n']) {
        Some(length) if text[at + 1 + length..].starts_with('"') => (at + length + 2, true),
        Some(length) => (at + 1 + length, false),
        None => (text.len(), false),
    }
}

/// The offset of the line end (or text end) from `at` on.
fn line_end(text: &str, at: usize) -> usize {
    text[at..].find('\n').map_or(text.len(), |length| at + length)
}

/// A bracket that is never closed.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
struct Unclosed {
    at: u32,
    /// The bracket to show: it took the `)` of `)-` that was meant for this one, or is this one.
    shown: u32,
}

/// The brackets that are never closed, in order.
fn unclosed(text: &str) -> Vec<Unclosed> {
    let bytes = text.as_bytes();
    let mut open: Vec<Unclosed> = Vec::new();
    let mut found = Vec::new();
    let mut at = body_start(text);
    while let Some(&byte) = bytes.get(at) {
        match byte {
            b'(' | b'[' => open.push(Unclosed { at: at as u32, shown: at as u32 }),
            b')' | b']' => {
                let inner = open.pop().filter(|_| leads_to_node(&text[at + 1..]));
                if let (Some(inner), Some(outer)) = (inner, open.last_mut())
                    && outer.shown == outer.at
                {
                    outer.shown = inner.at;
                }
            }
            // Braces never stand inside brackets.
            b'{' | b'}' => found.append(&mut open),
            b'#' => at = line_end(text, at) - 1,
            b'"' => {
                let (after, closed) = after_quote(text, at);
                // The missing quote is the error; the brackets before it are not blamed.
                if !closed {
                    open.clear();
                }
                at = after - 1;
            }
            b'\n' if !open.is_empty() && starts_statement(&text[at + 1..]) => {
                found.append(&mut open);
            }
            _ => {}
        }
        at += 1;
    }
    found.append(&mut open);
    found.sort_unstable();
    found
}

/// Whether what follows a `)` makes it the end of an element: a dash, a blank and no number.
fn leads_to_node(rest: &str) -> bool {
    let blank = rest.strip_prefix("- ").map(str::trim_ascii_start);
    blank.is_some_and(|node| node.starts_with(|c: char| is_name_char(c) && !c.is_numeric()))
}

/// Whether a line can only be the start of a statement, never a part of an expression.
fn starts_statement(line: &str) -> bool {
    fn skip(text: &str) -> &str {
        text.trim_start_matches([' ', '\t'])
    }
    fn word(text: &str) -> (&str, &str) {
        let end = text.find(|c: char| !is_name_char(c) && c != '.').unwrap_or(text.len());
        text.split_at(end)
    }
    let (first, rest) = word(skip(line));
    let rest = skip(rest);
    if first.is_empty() {
        return false;
    }
    if let Some(element) = rest.strip_prefix("-(") {
        let (name, rest) = word(skip(element.trim_start_matches(['*', '+', '<', '>'])));
        return !name.is_empty() && skip(rest).starts_with(':');
    }
    let (second, rest) = word(rest);
    let rest = skip(rest);
    match first {
        "let" | "read" => !second.is_empty() && rest.starts_with('=') && !rest.starts_with("=="),
        "couple" => !second.is_empty() && rest.starts_with(','),
        "title" | "include" => second.is_empty() && rest.starts_with('"'),
        _ => false,
    }
}

/// The second pass.
struct Cut<'a> {
    source: SourceId,
    text: &'a str,
    at: usize,
    /// First byte of the statement being cut, once there is one.
    start: Option<usize>,
    /// One past its last byte so far that is not blank or comment.
    end: usize,
    /// Open brackets that do get closed.
    depth: usize,
    broken: bool,
    /// Offsets of the brackets still ahead that never get closed.
    unclosed: &'a [Unclosed],
    pieces: Vec<Piece>,
    errors: Vec<TextError>,
}

impl Cut<'_> {
    fn step(&mut self, byte: u8) {
        match byte {
            b'\n' if self.depth == 0 => self.line_end(),
            b' ' | b'\t' | b'\r' | b'\n' => self.at += 1,
            b'#' => self.at = line_end(self.text, self.at),
            b'"' => self.quote(),
            b'(' | b'[' => self.open(),
            b')' | b']' => {
                match self.depth.checked_sub(1) {
                    Some(depth) => self.depth = depth,
                    None => self.fault(TextError::StrayBracket { span: self.span(1) }),
                }
                self.take(1);
            }
            b'{' => {
                let kind = PieceKind::Opens(self.at);
                self.finish(kind);
                self.at += 1;
            }
            b'}' => {
                self.finish(PieceKind::Statement);
                let at = self.at;
                let kind = PieceKind::Closes(at);
                self.pieces.push(Piece { start: at, end: at, kind, broken: false });
                self.at += 1;
            }
            b';' if self.depth == 0 => {
                self.finish(PieceKind::Statement);
                self.at += 1;
            }
            _ => self.take(self.text[self.at..].chars().next().map_or(1, char::len_utf8)),
        }
    }

    fn span(&self, length: usize) -> Span {
        Span::new(self.source, self.at, self.at + length)
    }

    /// Counts `length` bytes to the statement.
    fn take(&mut self, length: usize) {
        self.start.get_or_insert(self.at);
        self.at += length;
        self.end = self.at;
    }

    /// Reports the first error of a statement; what follows from it stays unsaid.
    fn fault(&mut self, error: TextError) {
        if !std::mem::replace(&mut self.broken, true) {
            self.errors.push(error);
        }
    }

    fn quote(&mut self) {
        let (after, closed) = after_quote(self.text, self.at);
        if !closed {
            self.fault(TextError::UnclosedQuote { span: self.span(1) });
            self.depth = 0;
        }
        self.take(after - self.at);
    }

    fn open(&mut self) {
        match self.unclosed {
            [first, rest @ ..] if first.at as usize == self.at => {
                self.unclosed = rest;
                let shown = first.shown as usize;
                // In a link the dash is part of the bracket.
                let link = shown == self.at
                    && self.start.is_some_and(|start| self.text[start..shown].ends_with('-'));
                let span = Span::new(self.source, shown - usize::from(link), shown + 1);
                self.fault(TextError::UnclosedBracket { span });
            }
            _ => self.depth += 1,
        }
        self.take(1);
    }

    /// A line end outside brackets: the statement goes on where it ends in `)-` or where the
    /// next line that is not blank or comment starts with `-(`.
    fn line_end(&mut self) {
        let next = after_blank_lines(self.text, self.at);
        let goes_on = self.start.is_some_and(|start| {
            self.text[start..self.end].ends_with(")-") || self.text[next..].starts_with("-(")
        });
        // After a bracket that is never closed, what looks like a statement is one.
        let new = self.broken && starts_statement(&self.text[next..]);
        if !goes_on || new {
            self.finish(PieceKind::Statement);
        }
        self.at = next;
    }

    fn finish(&mut self, kind: PieceKind) {
        let blank = self.start.is_none_or(|start| self.text[start..self.end].trim().is_empty());
        if !blank || kind != PieceKind::Statement {
            let start = self.start.unwrap_or(self.at);
            let end = self.end.max(start);
            self.pieces.push(Piece { start, end, kind, broken: self.broken });
        }
        self.start = None;
        self.depth = 0;
        self.broken = false;
    }
}

/// The offset of the first character from `at` on that is not blank or comment.
fn after_blank_lines(text: &str, mut at: usize) -> usize {
    loop {
        let rest = text[at..].trim_start();
        at = text.len() - rest.len();
        if !rest.starts_with('#') {
            return at;
        }
        at = line_end(text, at);
    }
}
