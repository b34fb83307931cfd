//! The smallest pieces: blanks, words, names, quoted texts, and what is found in their place.

use crate::text::ast::{Name, Text};
use crate::text::cursor::{Cursor, Fault, Read, failure, other};
use crate::text::error::TextError;
use nom::Parser;
use nom::bytes::complete::tag;
use std::borrow::Cow;
use std::sync::Arc;
use unicode_normalization::char::is_combining_mark;
use unicode_normalization::{UnicodeNormalization, is_nfc};

/// Characters that are taken for one of the language, and how that one is described.
const LOOK_ALIKES: [(&str, &str); 16] = [
    ("“”„‟″＂«»", "straight quotes: `\"`"),
    ("‘’‚", "straight quotes: `\"`"),
    ("−–—‐‑﹣－", "`-`"),
    ("×·⋅∙∗＊", "`*`"),
    ("÷∕⁄／", "`/`"),
    ("＋", "`+`"),
    ("＝", "`=`"),
    ("（", "`(`"),
    ("）", "`)`"),
    ("：﹕", "`:`"),
    ("；", "`;`"),
    ("，﹐", "`,`"),
    ("＃", "`#`"),
    ("＾", "`^`"),
    ("｜│", "`|`"),
    ("²³⁴√", "`^2` for a power and `sqrt(…)` for a root"),
];

/// Letters, digits, `_`, and the marks that combine with letters.
pub fn is_name_char(c: char) -> bool {
    c == '_' || c.is_alphanumeric() && !is_superscript(c) || is_combining_mark(c)
}

/// Superscript digits count as numerals in Unicode, but `mm²` is not a name.
fn is_superscript(c: char) -> bool {
    matches!(c, '²' | '³' | '¹' | '⁰' | '⁴'..='⁹' | '₀'..='₉')
}

/// Letters and `_`: what a name of a value or an element starts with.
pub fn is_name_start(c: char) -> bool {
    is_name_char(c) && !c.is_numeric() && !is_combining_mark(c)
}

/// Skips blanks, line ends and comments.
pub fn blank(input: Cursor<'_>) -> Cursor<'_> {
    let mut rest = input.rest.trim_start();
    while rest.starts_with('#') {
        rest = rest.find('\n').map_or("", |end| rest[end..].trim_start());
    }
    input.advance(input.rest.len() - rest.len())
}

/// Skips blanks within a line.
pub fn spaces(input: Cursor<'_>) -> Cursor<'_> {
    let rest = input.rest.trim_start_matches(|c: char| c.is_whitespace() && c != '\n');
    input.advance(input.rest.len() - rest.len())
}

/// A sign of the language, after any blanks; gives the cursor where it starts.
pub fn sign<'a>(
    wanted: &'static str,
) -> impl Parser<Cursor<'a>, Output = Cursor<'a>, Error = Fault> {
    move |input: Cursor<'a>| {
        let start = blank(input);
        tag(wanted).parse(start).map(|(rest, _): (Cursor<'a>, Cursor<'a>)| (rest, start))
    }
}

/// The characters of a word: letters, digits, `_`. Empty where none stands here.
pub fn word_here(input: Cursor<'_>) -> &str {
    let end = input.rest.find(|c| !is_name_char(c)).unwrap_or(input.rest.len());
    &input.rest[..end]
}

/// One given word of the language, not merely the start of a longer one.
pub fn word<'a>(
    wanted: &'static str,
) -> impl Parser<Cursor<'a>, Output = Cursor<'a>, Error = Fault> {
    move |input: Cursor<'a>| {
        let start = blank(input);
        let found = start.rest.starts_with(wanted) && word_here(start).len() == wanted.len();
        if found { Ok((start.advance(wanted.len()), start)) } else { Err(other()) }
    }
}

/// Builds a name from its characters, in Unicode NFC.
pub fn named(start: Cursor<'_>, text: &str) -> Name {
    let normal: Cow<'_, str> =
        if is_nfc(text) { Cow::Borrowed(text) } else { Cow::Owned(text.nfc().collect()) };
    Name { text: Arc::from(normal.as_ref()), span: start.span(text.len()) }
}

/// `plain_name`: a letter or `_`, then letters, digits and `_`.
pub fn plain_name(input: Cursor<'_>) -> Read<'_, Name> {
    let start = blank(input);
    let text = word_here(start);
    if !text.starts_with(is_name_start) {
        return Err(other());
    }
    Ok((start.advance(text.len()), named(start, text)))
}

/// `name`: words joined by points; may start with a digit.
pub fn name(input: Cursor<'_>) -> Read<'_, Name> {
    let start = blank(input);
    let mut length = word_here(start).len();
    if length == 0 || start.rest.starts_with(is_combining_mark) {
        return Err(other());
    }
    while start.rest[length..].starts_with('.') {
        let part = word_here(start.advance(length + 1)).len();
        if part == 0 {
            break;
        }
        length += 1 + part;
    }
    Ok((start.advance(length), named(start, &start.rest[..length])))
}

/// `element_name`: as `name`, but it starts with a letter or `_`.
pub fn element_name(input: Cursor<'_>) -> Read<'_, Name> {
    if !blank(input).rest.starts_with(is_name_start) {
        return Err(other());
    }
    name(input)
}

/// `text`: anything between straight quotes on one line.
pub fn text(input: Cursor<'_>) -> Read<'_, Text> {
    let (inner, start) = sign("\"").parse(input)?;
    let end = inner.rest.find(['"', '\n']).filter(|&end| inner.rest[end..].starts_with('"'));
    let Some(end) = end else {
        return Err(failure(TextError::UnclosedQuote { span: start.span(1) }));
    };
    let rest = inner.advance(end + 1);
    Ok((rest, Text { text: inner.rest[..end].to_owned(), span: start.span_to(rest) }))
}

/// Turns "something else stands here" into an error that names what is needed.
pub fn expect<'a, T>(
    what: &'static str,
    parser: impl Parser<Cursor<'a>, Output = T, Error = Fault>,
) -> impl Parser<Cursor<'a>, Output = T, Error = Fault> {
    expect_or(what, "", parser)
}

/// As [`expect`], with a way out.
pub fn expect_or<'a, T>(
    what: &'static str,
    hint: &'static str,
    mut parser: impl Parser<Cursor<'a>, Output = T, Error = Fault>,
) -> impl Parser<Cursor<'a>, Output = T, Error = Fault> {
    move |input: Cursor<'a>| match parser.parse(input) {
        Err(nom::Err::Error(Fault::Other)) => Err(failure(unexpected(input, what, hint))),
        result => result,
    }
}

/// Nothing but blanks may follow.
pub fn end<'a>(input: Cursor<'a>, what: &'static str) -> Read<'a, ()> {
    let rest = blank(input);
    if rest.rest.is_empty() { Ok((rest, ())) } else { Err(failure(unexpected(rest, what, ""))) }
}

/// The error for whatever stands at `input` in the place of `what`.
pub fn unexpected(input: Cursor<'_>, what: &'static str, hint: &'static str) -> TextError {
    let start = blank(input);
    let Some(first) = start.peek() else {
        // The end is marked right after the last character, not after blanks or comments.
        let found = "the end of the statement".to_owned();
        return TextError::Expected { what, found, hint, span: input.span(0) };
    };
    if let Some((_, meant)) = LOOK_ALIKES.iter().find(|(set, _)| set.contains(first)) {
        return TextError::LookAlike { written: first, meant, span: start.span(first.len_utf8()) };
    }
    let word = word_here(start);
    let length = if word.is_empty() { first.len_utf8() } else { word.len() };
    let found = if first.is_control() || first.is_whitespace() || is_invisible(first) {
        format!("the invisible character U+{:04X}", first as u32)
    } else {
        format!("`{}`", shortened(&start.rest[..length]))
    };
    TextError::Expected { what, found, hint, span: start.span(length) }
}

/// Characters without a shape that get into texts by copying.
fn is_invisible(c: char) -> bool {
    matches!(c, '\u{ad}' | '\u{200b}'..='\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2060}'..='\u{206f}' | '\u{feff}')
}

/// A word for a message: long ones are cut.
pub fn shortened(word: &str) -> String {
    const LONGEST: usize = 40;
    match word.char_indices().nth(LONGEST) {
        Some((cut, _)) => format!("{}…", &word[..cut]),
        None => word.to_owned(),
    }
}
