//! Paths: nodes, links and elements.

use crate::text::ast::{Attribute, AttributeKind, Element, Link, Mark, MarkKind, Name, Path};
use crate::text::cursor::{Cursor, Read, failure, other};
use crate::text::error::TextError;
use crate::text::expression::expression;
use crate::text::lexis::{
    blank, element_name, expect, expect_or, name, shortened, sign, spaces, unexpected, word,
    word_here,
};
use nom::Parser;
use nom::branch::alt;
use nom::combinator::opt;
use nom::sequence::preceded;

/// Whether a link stands here, so that the statement is a path.
pub fn is_link(input: Cursor<'_>) -> bool {
    let start = blank(input);
    start.rest.starts_with("-(") || start.rest.starts_with("==")
}

/// `path`: a node, and links that each lead to a next node.
pub fn path<'a>(input: Cursor<'a>, first: Name) -> Read<'a, Path> {
    let mut rest = input;
    let mut steps = Vec::new();
    while let (after, Some(step)) = opt(step).parse(rest)? {
        steps.push(step);
        rest = after;
    }
    Ok((rest, Path { first, steps }))
}

/// `step`: a link and the node it leads to.
fn step(input: Cursor<'_>) -> Read<'_, (Link, Name)> {
    let (rest, link) = alt((wire, elements)).parse(input)?;
    let parallel = blank(rest).rest.starts_with('(');
    let hint = if parallel {
        "between two elements in series stands a node; parallel elements are joined by `)(`"
    } else {
        ""
    };
    let (rest, node) = expect_or("a node after the link", hint, name).parse(rest)?;
    Ok((rest, (link, node)))
}

/// `wire`: `==`.
fn wire(input: Cursor<'_>) -> Read<'_, Link> {
    let (rest, start) = sign("==").parse(input)?;
    Ok((rest, Link::Wire(start.span(2))))
}

/// `elements`: `-( … )-`, and more between `)(`.
fn elements(input: Cursor<'_>) -> Read<'_, Link> {
    let (rest, start) = sign("-(").parse(input)?;
    let mut bracket = start.advance(1);
    let mut found = Vec::new();
    let mut inner = rest;
    loop {
        let (rest, element) = element(bracket, inner)?;
        found.push(element);
        if rest.rest.starts_with('-') {
            return Ok((rest.advance(1), Link::Elements(found)));
        }
        bracket = spaces(rest);
        if !bracket.rest.starts_with('(') {
            let closing = inner_end(rest);
            return Err(failure(TextError::ElementNotEnded { span: closing }));
        }
        inner = bracket.advance(1);
    }
}

/// The span of the `)` right before a place.
fn inner_end(rest: Cursor<'_>) -> crate::source::Span {
    crate::source::Span::new(rest.source, rest.at - 1, rest.at)
}

/// `element`: what stands in one pair of brackets; `bracket` is its `(`, `inner` what follows.
fn element<'a>(bracket: Cursor<'a>, inner: Cursor<'a>) -> Read<'a, Element> {
    let (rest, left_mark) = opt(mark).parse(inner)?;
    if let Some(apart) = mark_at(blank(rest)).filter(|_| left_mark.is_none()) {
        let fixed = match apart.kind {
            MarkKind::Dot => "(*",
            MarkKind::Plus => "(+",
            MarkKind::Rightward => "(>",
            MarkKind::Leftward => "(<",
        };
        return Err(failure(TextError::MarkApart { fixed, span: apart.span }));
    }
    let (rest, name) = element_label(rest)?;
    let value_at = rest.in_element(true);
    let (rest, value) = match expression(value_at) {
        Err(nom::Err::Error(_)) => return Err(missing_value(value_at, &name)),
        result => result?,
    };
    let mut rest = rest;
    let mut attributes = Vec::new();
    while let (after, Some(found)) = opt(preceded(sign(","), attribute)).parse(rest)? {
        attributes.push(found);
        rest = after;
    }
    let (rest, right_mark) = opt(mark).parse(blank(rest))?;
    let rest = rest.in_element(false);
    let closing = if right_mark.is_some() { rest } else { blank(rest) };
    if !closing.rest.starts_with(')') {
        return Err(not_closed(closing, right_mark));
    }
    let end = closing.advance(1);
    let span = bracket.span_to(end);
    Ok((end, Element { name, value, attributes, left_mark, right_mark, span }))
}

/// `element_label`: the name and its colon.
fn element_label(input: Cursor<'_>) -> Read<'_, Name> {
    let start = blank(input);
    let missing = |length: usize| TextError::MissingElementName { span: start.span(length) };
    let Ok((rest, name)) = element_name(start) else {
        let length = match start.peek() {
            Some('0'..='9' | '(' | ':') => start.peek().map_or(0, char::len_utf8),
            Some(')') => 0,
            _ => return Err(failure(unexpected(input, "the name of an element", NAME_HINT))),
        };
        return Err(failure(missing(length)));
    };
    let colon = blank(rest);
    match colon.peek() {
        Some(':') => Ok((colon.advance(1), name)),
        Some('=') => Err(failure(TextError::EqualsForColon { span: colon.span(1) })),
        Some('*' | '/' | '+' | '^' | '(') => Err(failure(missing(rest.at - start.at))),
        _ => Err(failure(unexpected(rest, "`:` after the element's name", NAME_HINT))),
    }
}

const NAME_HINT: &str = "write `-( name : value )-`";

/// The error for an element whose value cannot be read.
fn missing_value(place: Cursor<'_>, name: &Name) -> nom::Err<crate::text::cursor::Fault> {
    let start = blank(place);
    // The value starts with a mark of the right bracket, an attribute, or the bracket itself.
    let ends = start.rest.starts_with([')', ',']) || start.rest.starts_with(['*', '+', '>', '<']);
    if ends {
        let name = shortened(&name.text);
        return failure(TextError::MissingValue { name, span: place.span(0) });
    }
    failure(unexpected(place, "a value", ""))
}

/// The error for an element whose `)` does not stand here.
fn not_closed(place: Cursor<'_>, right_mark: Option<Mark>) -> nom::Err<crate::text::cursor::Fault> {
    let apart = mark_at(place).filter(|_| right_mark.is_none());
    if let Some(apart) = apart.filter(|_| blank(place.advance(1)).rest.starts_with(')')) {
        let fixed = match apart.kind {
            MarkKind::Dot => "*)",
            MarkKind::Plus => "+)",
            MarkKind::Rightward => ">)",
            MarkKind::Leftward => "<)",
        };
        return failure(TextError::MarkApart { fixed, span: apart.span });
    }
    failure(unexpected(place, "an operator, `,` or `)-`", ""))
}

/// `mark`: a sign that touches its bracket: right after `(`, or right before `)`.
fn mark(input: Cursor<'_>) -> Read<'_, Mark> {
    let mark = mark_at(input).ok_or_else(other)?;
    let rest = input.advance(1);
    if input.in_element && !rest.rest.starts_with(')') {
        return Err(other());
    }
    Ok((rest, mark))
}

/// The mark that stands here, touching or not.
fn mark_at(input: Cursor<'_>) -> Option<Mark> {
    let kind = match input.peek()? {
        '*' => MarkKind::Dot,
        '+' => MarkKind::Plus,
        '>' => MarkKind::Rightward,
        '<' => MarkKind::Leftward,
        _ => return None,
    };
    Some(Mark { kind, span: input.span(1) })
}

/// `attribute`: `q`, `esr`, `tand` or `tol` with its value.
fn attribute(input: Cursor<'_>) -> Read<'_, Attribute> {
    let start = blank(input);
    let words = ["q", "esr", "tand", "tol"];
    let found = words.iter().find_map(|w| word(w).parse(start).ok().map(|(rest, _)| (*w, rest)));
    let Some((which, rest)) = found else {
        let comma = start.rest.starts_with(|c: char| c.is_ascii_digit());
        let hint = match words.into_iter().find(|w| strsim::osa_distance(word_here(start), w) == 1)
        {
            _ if comma => "a decimal point is written `.`",
            Some("q") if start.rest.starts_with('Q') => "did you mean `q`?",
            Some("esr") => "did you mean `esr`?",
            Some("tand") => "did you mean `tand`?",
            Some("tol") => "did you mean `tol`?",
            _ => "",
        };
        let what = "an attribute: `q`, `esr`, `tand` or `tol`";
        return Err(failure(unexpected(input, what, hint)));
    };
    let (rest, expr) = expect("a value", expression).parse(rest)?;
    let (rest, kind) = match which {
        "q" => {
            let frequency = preceded(word("at"), expect("a frequency", expression));
            let (rest, at) = opt(frequency).parse(rest)?;
            (rest, AttributeKind::Quality { value: expr, at })
        }
        "esr" => (rest, AttributeKind::SeriesResistance(expr)),
        "tand" => (rest, AttributeKind::LossTangent(expr)),
        _ => (rest, AttributeKind::Tolerance(expr)),
    };
    Ok((rest, Attribute { kind, span: start.span_to(rest) }))
}
