//! What the parsers read from: the rest of a statement, with its place in the source text.

use crate::source::{SourceId, Span};
use crate::text::error::TextError;
use nom::error::{ErrorKind, ParseError};
use nom::{Compare, CompareResult, IResult, Input, Needed, Offset};
use std::str::{CharIndices, Chars};

/// How deep brackets, signs and powers may nest. Far beyond any formula people write, and small
/// enough for the stack of any thread.
pub const DEEPEST: u16 = 200;

/// The rest of a statement. Copying it is cheap, so a parser that fails simply drops its copy.
#[derive(Clone, Copy, Debug)]
pub struct Cursor<'a> {
    /// The text still to be read.
    pub rest: &'a str,
    /// Offset of `rest` in the source text, in bytes.
    pub at: usize,
    /// The text this is part of.
    pub source: SourceId,
    /// How many brackets, signs and powers are open around this place.
    depth: u16,
    /// Whether a `)` here would close an element, so that `*)` and `+)` are marks.
    pub in_element: bool,
}

/// What a parser returns.
pub type Read<'a, T> = IResult<Cursor<'a>, T, Fault>;

/// Why a parser did not succeed.
#[derive(Debug)]
pub enum Fault {
    /// Something else stands here; another parser may know what.
    Other,
    /// An error with words for it.
    Told(Box<TextError>),
}

/// A final error: no other parser is tried.
pub fn failure(error: TextError) -> nom::Err<Fault> {
    nom::Err::Failure(Fault::Told(Box::new(error)))
}

/// "Something else stands here": other parsers are tried.
pub fn other() -> nom::Err<Fault> {
    nom::Err::Error(Fault::Other)
}

impl<'a> Cursor<'a> {
    /// A cursor at the start of the piece `start..end` of a text.
    pub fn new(source: SourceId, text: &'a str, start: usize, end: usize) -> Self {
        Cursor { rest: &text[start..end], at: start, source, depth: 0, in_element: false }
    }

    /// The next character.
    pub fn peek(self) -> Option<char> {
        self.rest.chars().next()
    }

    /// A span of the next `length` bytes.
    pub fn span(self, length: usize) -> Span {
        Span::new(self.source, self.at, self.at + length)
    }

    /// The span from here to where `later` stands.
    pub fn span_to(self, later: Cursor<'a>) -> Span {
        Span::new(self.source, self.at, later.at)
    }

    /// The cursor `count` bytes on.
    pub fn advance(self, count: usize) -> Self {
        Cursor { rest: &self.rest[count..], at: self.at + count, ..self }
    }

    /// The cursor with or without a `)` ahead that closes an element.
    pub fn in_element(self, yes: bool) -> Self {
        Cursor { in_element: yes, ..self }
    }

    /// The cursor one level deeper; an error where that is too deep.
    pub fn deeper(self) -> Result<Self, nom::Err<Fault>> {
        if self.depth >= DEEPEST {
            let length = self.peek().map_or(0, char::len_utf8);
            return Err(failure(TextError::TooDeep { span: self.span(length) }));
        }
        Ok(Cursor { depth: self.depth + 1, ..self })
    }

    /// The cursor at this place, as deep and in the same surroundings as `outer`.
    pub fn back_to(self, outer: Cursor<'_>) -> Self {
        Cursor { depth: outer.depth, in_element: outer.in_element, ..self }
    }
}

impl<'a> ParseError<Cursor<'a>> for Fault {
    fn from_error_kind(_: Cursor<'a>, _: ErrorKind) -> Self {
        Fault::Other
    }

    fn append(_: Cursor<'a>, _: ErrorKind, other: Self) -> Self {
        other
    }
}

impl<'a> Input for Cursor<'a> {
    type Item = char;
    type Iter = Chars<'a>;
    type IterIndices = CharIndices<'a>;

    fn input_len(&self) -> usize {
        self.rest.len()
    }

    fn take(&self, index: usize) -> Self {
        Cursor { rest: &self.rest[..index], ..*self }
    }

    fn take_from(&self, index: usize) -> Self {
        self.advance(index)
    }

    fn take_split(&self, index: usize) -> (Self, Self) {
        (self.take_from(index), self.take(index))
    }

    fn position<P: Fn(char) -> bool>(&self, predicate: P) -> Option<usize> {
        self.rest.find(predicate)
    }

    fn iter_elements(&self) -> Chars<'a> {
        self.rest.chars()
    }

    fn iter_indices(&self) -> CharIndices<'a> {
        self.rest.char_indices()
    }

    fn slice_index(&self, count: usize) -> Result<usize, Needed> {
        self.rest.slice_index(count)
    }
}

impl Compare<&str> for Cursor<'_> {
    fn compare(&self, wanted: &str) -> CompareResult {
        self.rest.compare(wanted)
    }

    fn compare_no_case(&self, wanted: &str) -> CompareResult {
        self.rest.compare_no_case(wanted)
    }
}

impl Offset for Cursor<'_> {
    fn offset(&self, second: &Self) -> usize {
        second.at - self.at
    }
}
