//! The texts a circuit came from, and places in them.

/// Index of a text held by [`Sources`].
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct SourceId(pub u32);

/// A half-open range of bytes, `start..end`, in one source text.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Span {
    /// The text the range lies in.
    pub source: SourceId,
    /// First byte.
    pub start: u32,
    /// One past the last byte.
    pub end: u32,
}

impl Span {
    /// The range `start..end` of `source`.
    pub fn new(source: SourceId, start: usize, end: usize) -> Self {
        debug_assert!(start <= end && end <= u32::MAX as usize);
        Span { source, start: start as u32, end: end as u32 }
    }

    /// The smallest range that covers both; both must lie in the same source.
    pub fn to(self, other: Span) -> Span {
        Span {
            source: self.source,
            start: self.start.min(other.start),
            end: self.end.max(other.end),
        }
    }

    /// The range as `usize`, ready to slice a text with.
    pub fn range(self) -> std::ops::Range<usize> {
        self.start as usize..self.end as usize
    }
}

/// One text: a file, standard input, or an argument of the command line.
#[derive(Clone, Debug)]
pub struct Source {
    /// What messages call it: a path as the user wrote it, `<stdin>`, `--set name`.
    pub name: String,
    /// The whole text.
    pub text: String,
}

/// Every text read in one run.
#[derive(Clone, Debug, Default)]
pub struct Sources {
    list: Vec<Source>,
}

/// A place for people: 1-based line, and 1-based column in characters.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Location {
    /// Line number, from 1.
    pub line: usize,
    /// Column in characters, from 1.
    pub column: usize,
}

impl Sources {
    /// Keeps a text and gives it a number.
    pub fn add(&mut self, name: impl Into<String>, text: impl Into<String>) -> SourceId {
        self.list.push(Source { name: name.into(), text: text.into() });
        SourceId(self.list.len() as u32 - 1)
    }

    /// The text with this number.
    pub fn get(&self, id: SourceId) -> &Source {
        &self.list[id.0 as usize]
    }

    /// The characters a span covers.
    pub fn slice(&self, span: Span) -> &str {
        &self.get(span.source).text[span.range()]
    }

    /// Line and column of the start of a span.
    pub fn location(&self, span: Span) -> Location {
        let before = &self.get(span.source).text[..span.start as usize];
        let line_start = before.rfind('\n').map_or(0, |i| i + 1);
        Location {
            line: before.bytes().filter(|&b| b == b'\n').count() + 1,
            column: before[line_start..].chars().count() + 1,
        }
    }
}

#[cfg(test)]
mod tests {
    use crate::source::{Location, Sources, Span};

    #[test]
    fn a_span_at_the_last_byte_of_a_text_has_a_place() {
        let mut sources = Sources::default();
        let id = sources.add("x.bfl", "let a = 1\nµ");
        let end = sources.get(id).text.len();
        assert_eq!(sources.location(Span::new(id, end, end)), Location { line: 2, column: 2 });
        assert_eq!(sources.slice(Span::new(id, end - 2, end)), "µ");
    }
}
