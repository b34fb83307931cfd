//! Expressions.

use crate::diag::did_you_mean;
use crate::quantity::Unit;
use crate::source::Span;
use crate::text::ast::{Expr, ExprKind, Name, ProductOperator, Reading, SumOperator};
use crate::text::cursor::{Cursor, Read, failure, other};
use crate::text::error::TextError;
use crate::text::lexis::{
    blank, expect, expect_or, is_name_start, name, named, plain_name, shortened, sign, spaces,
    text, word, word_here,
};
use crate::text::number::{number, unit, unit_word};
use crate::text::words::{FUNCTIONS, JOINTS, READINGS, is_usual_unit};
use nom::Parser;
use nom::branch::alt;
use nom::combinator::{opt, value};
use nom::multi::separated_list1;
use nom::sequence::preceded;

/// The way out where a mark may have been meant.
const MARK_HINT: &str = "a mark touches its bracket, as in `*)` and `+)`";

/// `expression`: terms joined by `+` and `-`.
pub fn expression(input: Cursor<'_>) -> Read<'_, Expr> {
    let (mut rest, first) = product(input)?;
    let mut terms = Vec::new();
    while let (after, Some(operator)) = opt(sum_operator).parse(rest)? {
        let (after, term) = operand(input, product).parse(after)?;
        start_small(&mut terms);
        terms.push((operator, term));
        rest = after;
    }
    let Some((_, last)) = terms.last() else {
        return Ok((rest, first));
    };
    let span = first.span.to(last.span);
    Ok((rest, Expr { kind: ExprKind::Sum(Box::new(first), terms), span }))
}

/// Most chains have one link: room for more is made when they come.
fn start_small<T>(chain: &mut Vec<T>) {
    if chain.is_empty() {
        chain.reserve_exact(1);
    }
}

fn sum_operator(input: Cursor<'_>) -> Read<'_, SumOperator> {
    let start = blank(input);
    if start.in_element && start.rest.starts_with("+)") {
        return Err(other());
    }
    alt((value(SumOperator::Plus, sign("+")), value(SumOperator::Minus, sign("-")))).parse(start)
}

/// `product`: signed values joined by `*` and `/`.
fn product(input: Cursor<'_>) -> Read<'_, Expr> {
    let (mut rest, first) = signed(input)?;
    let mut factors = Vec::new();
    while let (after, Some(operator)) = opt(product_operator).parse(rest)? {
        let (after, factor) = operand(input, signed).parse(after)?;
        start_small(&mut factors);
        factors.push((operator, factor));
        rest = after;
    }
    let Some((_, last)) = factors.last() else {
        return Ok((rest, first));
    };
    let span = first.span.to(last.span);
    Ok((rest, Expr { kind: ExprKind::Product(Box::new(first), factors), span }))
}

fn product_operator(input: Cursor<'_>) -> Read<'_, ProductOperator> {
    let start = blank(input);
    if start.in_element && start.rest.starts_with("*)") {
        return Err(other());
    }
    alt((value(ProductOperator::Times, sign("*")), value(ProductOperator::Over, sign("/"))))
        .parse(start)
}

/// What stands after an operator: it cannot be missing.
fn operand<'a>(
    place: Cursor<'a>,
    parser: fn(Cursor<'a>) -> Read<'a, Expr>,
) -> impl Parser<Cursor<'a>, Output = Expr, Error = crate::text::cursor::Fault> {
    let hint = if place.in_element { MARK_HINT } else { "" };
    move |input: Cursor<'a>| {
        let closes = blank(input).rest.starts_with(')');
        expect_or("a value after the operator", if closes { hint } else { "" }, parser).parse(input)
    }
}

/// `signed`: minus signs, then a power.
fn signed(input: Cursor<'_>) -> Read<'_, Expr> {
    let mut minuses: Vec<Span> = Vec::new();
    let mut rest = input;
    while let (after, Some(minus)) = opt(sign("-")).parse(rest)? {
        minuses.push(minus.span(1));
        rest = after.deeper()?;
    }
    let (rest, inner) =
        if minuses.is_empty() { power(rest)? } else { operand(input, power).parse(rest)? };
    let expr = minuses.iter().rev().fold(inner, |inner, minus| {
        let span = minus.to(inner.span);
        Expr { kind: ExprKind::Negative(Box::new(inner)), span }
    });
    Ok((rest.back_to(input), expr))
}

/// `power`: a phasor, and `^` with its exponent; it groups from the right.
fn power(input: Cursor<'_>) -> Read<'_, Expr> {
    let (rest, base) = phasor(input)?;
    let (rest, Some(caret)) = opt(sign("^")).parse(rest)? else {
        return Ok((rest, base));
    };
    // A nesting that is too deep is shown at its caret.
    caret.deeper()?;
    let (rest, exponent) = operand(input, signed).parse(rest.deeper()?)?;
    let span = base.span.to(exponent.span);
    let kind = ExprKind::Power(Box::new(base), Box::new(exponent));
    Ok((rest.back_to(input), Expr { kind, span }))
}

/// `phasor`: a quantity, and `∠` or `ang` with its angle.
fn phasor(input: Cursor<'_>) -> Read<'_, Expr> {
    let (rest, size) = quantity(input)?;
    let (rest, Some(_)) = opt(alt((sign("∠"), word("ang")))).parse(rest)? else {
        return Ok((rest, size));
    };
    let (rest, minus) = opt(sign("-")).parse(rest)?;
    let hint = "write an angle such as `30°` or `-30°`";
    let (rest, mut angle) = expect_or("an angle", hint, quantity).parse(rest)?;
    if matches!(angle.kind, ExprKind::Number { unit: None, .. }) {
        return Err(failure(TextError::AngleWithoutUnit { span: angle.span }));
    }
    if let Some(minus) = minus {
        let span = minus.span(1).to(angle.span);
        angle = Expr { kind: ExprKind::Negative(Box::new(angle)), span };
    }
    let span = size.span.to(angle.span);
    Ok((rest, Expr { kind: ExprKind::Phasor(Box::new(size), Box::new(angle)), span }))
}

/// `quantity`: a value; a unit may follow its closing bracket.
fn quantity(input: Cursor<'_>) -> Read<'_, Expr> {
    let (rest, inner) = primary(input)?;
    if matches!(inner.kind, ExprKind::Number { .. } | ExprKind::Name(_))
        && !ends_in_bracket(input, rest)
    {
        return Ok((rest, inner));
    }
    let (after, Some(unit)) = unit(spaces(rest))? else {
        return Ok((rest, inner));
    };
    let span = Span { end: after.at as u32, ..inner.span };
    Ok((after, Expr { kind: ExprKind::WithUnit(Box::new(inner), unit), span }))
}

/// Whether the text between two places ends with `)`.
fn ends_in_bracket(from: Cursor<'_>, to: Cursor<'_>) -> bool {
    from.rest[..to.at - from.at].ends_with(')')
}

/// `primary`: a number, a bracket, a call or a name.
fn primary(input: Cursor<'_>) -> Read<'_, Expr> {
    let start = blank(input);
    match start.peek() {
        Some('0'..='9' | '.') => number(start),
        Some('(') => bracket(start),
        Some('°' | '%') => Err(lone_unit(start)),
        Some(c) if is_name_start(c) => call_or_name(start),
        _ => Err(other()),
    }
}

/// `bracket`: an expression in `( )`.
fn bracket(start: Cursor<'_>) -> Read<'_, Expr> {
    let inner = start.deeper()?.advance(1).in_element(false);
    let (rest, mut expr) = expect("a value after `(`", expression).parse(inner)?;
    let (rest, _) = close(rest)?;
    expr.span = start.span_to(rest);
    Ok((rest.back_to(start), expr))
}

/// The `)` of a bracket or a call.
fn close(input: Cursor<'_>) -> Read<'_, Cursor<'_>> {
    expect("an operator or `)`", sign(")")).parse(input)
}

/// `call_or_name`: a function, a reading, measured data, or the name of a value.
fn call_or_name(start: Cursor<'_>) -> Read<'_, Expr> {
    let (rest, name) = plain_name(start)?;
    let found = &*name.text;
    if JOINTS.contains(&found) {
        return Err(other());
    }
    let bracket = spaces(rest);
    let called = bracket.rest.starts_with('(');
    let known = FUNCTIONS.contains(&found) || READINGS.contains(&found) || found == "table";
    if !called && known {
        let span = name.span;
        let name = found.to_owned();
        return Err(failure(TextError::FunctionWithoutBrackets { name, span }));
    }
    if is_usual_unit(found) {
        return Err(lone_unit(start));
    }
    if !called {
        let span = name.span;
        return Ok((rest, Expr { kind: ExprKind::Name(name), span }));
    }
    if !known {
        let all = FUNCTIONS.iter().chain(&READINGS).copied().chain(["table"]);
        let suggestion = did_you_mean(found, all);
        let (name, span) = (shortened(found), name.span);
        return Err(failure(TextError::UnknownFunction { name, suggestion, span }));
    }
    let inner = bracket.deeper()?.advance(1).in_element(false);
    let (rest, kind) = match found {
        "table" => table(inner)?,
        "volts" => volts(inner)?,
        "drop" | "amps" | "power" => of_element(inner, found)?,
        _ => call(inner, name)?,
    };
    let (rest, _) = close(rest)?;
    Ok((rest.back_to(start), Expr { kind, span: start.span_to(rest) }))
}

/// The error for a unit that stands without a number.
fn lone_unit(start: Cursor<'_>) -> nom::Err<crate::text::cursor::Fault> {
    let word = match word_here(start) {
        "" => unit_word(start),
        word => word,
    };
    let spoken = Unit::spoken(word).unwrap_or_else(|| "unit".to_owned());
    failure(TextError::LoneUnit { word: shortened(word), spoken, span: start.span(word.len()) })
}

/// `call`: the arguments of a function.
fn call(inner: Cursor<'_>, function: Name) -> Read<'_, ExprKind> {
    let argument = expect("a value", expression);
    let (rest, arguments) = separated_list1(sign(","), argument).parse(inner)?;
    Ok((rest, ExprKind::Call(function, arguments)))
}

/// `table`: the file and the place to read it at.
fn table(inner: Cursor<'_>) -> Read<'_, ExprKind> {
    let hint = "write `table(\"file.csv\", f)`";
    let (rest, file) = expect_or("a file name in quotes", hint, text).parse(inner)?;
    let (rest, _) = expect_or("`,`", hint, sign(",")).parse(rest)?;
    let (rest, at) = expect_or("a value", hint, expression).parse(rest)?;
    Ok((rest, ExprKind::Table(file, Box::new(at))))
}

/// `volts`: a node, and the node it is measured against.
fn volts(inner: Cursor<'_>) -> Read<'_, ExprKind> {
    let (rest, node) = expect("the name of a node", name).parse(inner)?;
    let hint = "write `volts(a to b)`";
    let other = preceded(word("to"), expect("the name of a node", name));
    let (rest, to) = opt(other).parse(rest)?;
    let (rest, _) = expect_or("`to` or `)`", hint, nom::combinator::peek(sign(")"))).parse(rest)?;
    Ok((rest, ExprKind::Reading(Reading::Volts { node, to })))
}

/// `drop(…)`, `amps(…)` and `power(…)` of an element.
fn of_element<'a>(inner: Cursor<'a>, which: &str) -> Read<'a, ExprKind> {
    let (rest, element) = expect("the name of an element", name).parse(inner)?;
    let reading = match which {
        "drop" => Reading::Drop(element),
        "amps" => Reading::Amps(element),
        _ => Reading::Power(element),
    };
    Ok((rest, ExprKind::Reading(reading)))
}

/// A name as an expression, used where a reading has no name of its own.
pub fn leading_name(input: Cursor<'_>) -> Option<(Cursor<'_>, Name)> {
    let start = blank(input);
    let text = word_here(start);
    let rest = blank(start.advance(text.len()));
    let named_here = text.starts_with(is_name_start) && rest.rest.starts_with('=');
    (named_here && !rest.rest.starts_with("==")).then(|| (rest.advance(1), named(start, text)))
}
