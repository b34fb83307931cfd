//! Every statement but the path.

use crate::source::Span;
use crate::text::ast::{Couple, Coupling, Expr, Limit, LimitKind, Name, StatementKind};
use crate::text::cursor::{Cursor, Fault, Read, failure};
use crate::text::error::TextError;
use crate::text::expression::expression;
use crate::text::lexis::{
    blank, element_name, expect, expect_or, name, plain_name, sign, text, unexpected, word,
};
use crate::text::words::reserved;
use nom::Parser;
use nom::branch::alt;
use nom::combinator::{cut, map, opt, value};
use nom::multi::{many0, separated_list1};
use nom::sequence::{pair, preceded};

/// A value that cannot be missing.
fn needed_value(input: Cursor<'_>) -> Read<'_, Expr> {
    expect("a value", expression).parse(input)
}

/// `title`: the words over a circuit's results.
pub fn title(input: Cursor<'_>) -> Read<'_, StatementKind> {
    let words = expect_or("a text in quotes", "write `title \"…\"`", text);
    map(words, StatementKind::Title).parse(input)
}

/// `include`: another file.
pub fn include(input: Cursor<'_>) -> Read<'_, StatementKind> {
    let file = expect_or("a file name in quotes", "write `include \"…\"`", text);
    map(file, StatementKind::Include).parse(input)
}

/// `reference`: the node an island is measured against.
pub fn reference(input: Cursor<'_>) -> Read<'_, StatementKind> {
    map(expect("the name of a node", name), StatementKind::Reference).parse(input)
}

/// A new name for a value: no word of the language and no unit.
fn value_name(input: Cursor<'_>) -> Read<'_, Name> {
    let (rest, name) = plain_name(input)?;
    match reserved(&name.text) {
        None => Ok((rest, name)),
        Some(reason) => {
            let (span, name) = (name.span, name.text.to_string());
            Err(failure(TextError::Reserved { name, reason, span }))
        }
    }
}

/// `let`: a named value.
pub fn let_value(input: Cursor<'_>) -> Read<'_, StatementKind> {
    let what = "a name that starts with a letter";
    let (rest, name) = expect(what, value_name).parse(input)?;
    let colon = blank(rest);
    if colon.rest.starts_with(':') {
        return Err(failure(TextError::ColonForEquals { span: colon.span(1) }));
    }
    let (rest, _) = expect_or("`=`", "write `let name = value`", equals).parse(rest)?;
    let (rest, value) = needed_value(rest)?;
    Ok((rest, StatementKind::Let { name, value }))
}

/// One `=`, not `==`.
fn equals(input: Cursor<'_>) -> Read<'_, ()> {
    let (rest, start) = sign("=").parse(input)?;
    if start.rest.starts_with("==") {
        return Err(failure(unexpected(rest, "a value", "one `=` is enough")));
    }
    Ok((rest, ()))
}

/// `read`: a named reading and its limits.
pub fn read(input: Cursor<'_>) -> Read<'_, StatementKind> {
    let hint = "write `read name = expression`";
    let (rest, name) = expect_or("a name for the reading", hint, plain_name).parse(input)?;
    let (rest, _) = expect_or("`=`", hint, equals).parse(rest)?;
    let (rest, value) = needed_value(rest)?;
    let (rest, limits) = many0(preceded(sign(","), cut(limit))).parse(rest)?;
    Ok((rest, StatementKind::Read { name, value, limits }))
}

/// `limit`: `least` or `most` with its value.
fn limit(input: Cursor<'_>) -> Read<'_, Limit> {
    let start = blank(input);
    let kind = alt((value(LimitKind::Least, word("least")), value(LimitKind::Most, word("most"))));
    let (rest, kind) = expect("`least` or `most`", kind).parse(input)?;
    let (rest, value) = needed_value(rest)?;
    let span = Span { end: value.span.end, ..start.span(0) };
    Ok((rest, Limit { kind, value, span }))
}

/// `couple`: windings and how they couple, or a file of couplings.
pub fn couple(input: Cursor<'_>) -> Read<'_, StatementKind> {
    // A winding may be called `from`, so the quote decides.
    let from = pair(word("from"), text);
    if let (rest, Some((_, file))) = opt(from).parse(input)? {
        return Ok((rest, StatementKind::Couple(Couple::FromFile(file))));
    }
    let winding = expect("the name of a winding", name);
    let (rest, windings) = separated_list1(sign(","), winding).parse(input)?;
    let hint = "write `couple a, b : k 0.98`";
    let (rest, colon) = expect_or("`,` or `:`", hint, sign(":")).parse(rest)?;
    if let [only] = windings.as_slice() {
        return Err(failure(TextError::TooFewWindings { span: only.span.to(colon.span(1)) }));
    }
    let (rest, how) = coupling(rest)?;
    Ok((rest, StatementKind::Couple(Couple::Stated { windings, how })))
}

/// `coupling`: a coupling as it was measured.
fn coupling(input: Cursor<'_>) -> Read<'_, Coupling> {
    let words = (word("k"), word("M"), word("leakage"), word("aiding"), word("opposing"));
    let (k, m, leakage, aiding, opposing) = words;
    let which = alt((
        value("k", k),
        value("M", m),
        value("leakage", leakage),
        value("aiding", aiding),
        value("opposing", opposing),
    ));
    let what = "`k`, `M`, `leakage` or `aiding`";
    let (rest, which) = expect(what, which).parse(input)?;
    let (rest, first) = coupling_value(which)(rest)?;
    match which {
        "k" => Ok((rest, Coupling::Factor(first))),
        "M" => {
            let resistance = preceded(
                pair(sign(","), expect("`R` (a mutual resistance)", word("R"))),
                coupling_value("R"),
            );
            let (rest, resistance) = opt(resistance).parse(rest)?;
            Ok((rest, Coupling::Mutual { inductance: first, resistance }))
        }
        "leakage" => {
            let hint = "write `leakage 2.1 µH at dock`: the winding it was read at";
            let (rest, _) = expect_or("`at`", hint, word("at")).parse(rest)?;
            let (rest, at) = expect("the name of a winding", name).parse(rest)?;
            Ok((rest, Coupling::Leakage { value: first, at }))
        }
        _ => {
            let second = if which == "aiding" { "opposing" } else { "aiding" };
            let what = "the other reading, `aiding` or `opposing`";
            let hint = "write `aiding 41 µH, opposing 9 µH`";
            let both = pair(sign(","), word(second));
            let (rest, _) = expect_or(what, hint, both).parse(rest)?;
            let (rest, other) = coupling_value(second)(rest)?;
            let (aiding, opposing) =
                if which == "aiding" { (first, other) } else { (other, first) };
            Ok((rest, Coupling::Series { aiding, opposing }))
        }
    }
}

/// The value after a word of a coupling, where `=` is a common slip.
fn coupling_value(which: &'static str) -> impl Fn(Cursor<'_>) -> Read<'_, Expr> {
    move |input| {
        let start = blank(input);
        if start.rest.starts_with('=') {
            return Err(failure(TextError::EqualsInCoupling { word: which, span: start.span(1) }));
        }
        needed_value(input)
    }
}

/// `ideal`: an ideal transformer.
pub fn ideal(input: Cursor<'_>) -> Read<'_, StatementKind> {
    let hint = "write `ideal name : a b | c d, turns 10 : 1`";
    let (rest, name) = device_name(hint).parse(input)?;
    let node = || expect_or("the name of a node", hint, crate::text::lexis::name);
    let (rest, windings) = separated_list1(sign("|"), pair(node(), node())).parse(rest)?;
    let (rest, _) = expect_or("`|` or `,`", hint, sign(",")).parse(rest)?;
    let (rest, _) = expect_or("`turns`", hint, word("turns")).parse(rest)?;
    let (rest, turns) = separated_list1(sign(":"), needed_value).parse(rest)?;
    Ok((rest, StatementKind::Ideal { name, windings, turns }))
}

/// `opamp`: an ideal amplifier.
pub fn opamp(input: Cursor<'_>) -> Read<'_, StatementKind> {
    let hint = "write `opamp name : plus minus out`";
    let (rest, name) = device_name(hint).parse(input)?;
    let node = || expect_or("the name of a node", hint, crate::text::lexis::name);
    let (rest, (plus, minus, out)) = (node(), node(), node()).parse(rest)?;
    Ok((rest, StatementKind::Opamp { name, plus, minus, out }))
}

/// `name :` of a device.
fn device_name<'a>(hint: &'static str) -> impl Parser<Cursor<'a>, Output = Name, Error = Fault> {
    let named = expect_or("a name", hint, element_name);
    map(pair(named, expect_or("`:`", hint, sign(":"))), |(name, _)| name)
}

/// `block`: the head of a block, up to its brace.
pub fn block(input: Cursor<'_>) -> Read<'_, StatementKind> {
    let hint = "write `block name (nodes ; parameters) { … }`";
    let (rest, name) = expect_or("a name", hint, plain_name).parse(input)?;
    let parameter = pair(value_name, opt(preceded(sign("="), needed_value)));
    let (rest, (nodes, parameters)) = outer(rest, hint, parameter)?;
    Ok((rest, StatementKind::Block { name, nodes, parameters, body: Vec::new() }))
}

/// `use`: an instance of a block.
pub fn use_block(input: Cursor<'_>) -> Read<'_, StatementKind> {
    let hint = "write `use block as name (nodes ; parameters)`";
    let (rest, block) = expect_or("the name of a block", hint, plain_name).parse(input)?;
    let (rest, _) = expect_or("`as`", hint, word("as")).parse(rest)?;
    let (rest, name) = expect_or("a name", hint, plain_name).parse(rest)?;
    let given = preceded(expect_or("`=`", hint, sign("=")), needed_value);
    let (rest, (nodes, parameters)) = outer(rest, hint, pair(value_name, given))?;
    Ok((rest, StatementKind::Use { block, name, nodes, parameters }))
}

/// `outer`: `(nodes ; parameters)`.
fn outer<'a, T>(
    input: Cursor<'a>,
    hint: &'static str,
    parameter: impl Parser<Cursor<'a>, Output = T, Error = Fault>,
) -> Read<'a, (Vec<Name>, Vec<T>)> {
    let (rest, _) = expect_or("`(`", hint, sign("(")).parse(input)?;
    let (rest, nodes) = many0(name).parse(rest)?;
    let separated = blank(rest).rest.starts_with(',');
    let hint = if separated { "nodes are separated by blanks only" } else { hint };
    let list = separated_list1(sign(","), expect("the name of a parameter", parameter));
    let (rest, parameters) = opt(preceded(sign(";"), list)).parse(rest)?;
    let what = if parameters.is_some() { "`,` or `)`" } else { "`;` or `)`" };
    let (rest, _) = expect_or(what, hint, sign(")")).parse(rest)?;
    Ok((rest, (nodes, parameters.unwrap_or_default())))
}
