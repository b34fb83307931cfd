//! Tests of the language, by part.

mod errors;
mod expressions;
mod limits;
mod numbers;
mod statements;

use crate::quantity::{Conversion, Unit};
use crate::source::SourceId;
use crate::text::ast::{Expr, ExprKind, File, ProductOperator, Reading, SumOperator};
use crate::text::{TextError, parse, parse_expression};

const ID: SourceId = SourceId(0);

/// Reads a text that must be free of errors.
#[track_caller]
fn good(text: &str) -> File {
    let (file, errors) = parse(ID, text);
    assert!(errors.is_empty(), "{text}: {errors:?}");
    file
}

/// The errors of a text.
fn errors(text: &str) -> Vec<TextError> {
    parse(ID, text).1
}

/// An expression as nested lists.
#[track_caller]
fn read(text: &str) -> String {
    shown(&parse_expression(ID, text).unwrap_or_else(|error| panic!("{text}: {error:?}")))
}

fn shown_unit(unit: Unit) -> String {
    let conversion = match unit.conversion {
        Conversion::Plain => "",
        Conversion::Degrees => "°",
        Conversion::Peak => "pk",
    };
    let power = match unit.power_of_ten {
        0 => String::new(),
        power => format!("e{power}"),
    };
    format!("{}{conversion}{power}", unit.dimension)
}

fn shown(expr: &Expr) -> String {
    let list = |head: &str, all: &[&Expr]| {
        let all: Vec<_> = all.iter().map(|e| shown(e)).collect();
        format!("({head} {})", all.join(" "))
    };
    match &expr.kind {
        ExprKind::Number { value, unit } => {
            let unit = unit.map_or(String::new(), |unit| format!("[{}]", shown_unit(unit)));
            format!("{}{unit}", value.to_f64())
        }
        ExprKind::Imaginary(value) => format!("{}j", value.to_f64()),
        ExprKind::Name(name) => name.text.to_string(),
        ExprKind::Negative(inner) => list("neg", &[inner]),
        ExprKind::Sum(first, rest) => rest.iter().fold(shown(first), |left, (op, right)| {
            let op = if *op == SumOperator::Plus { "+" } else { "-" };
            format!("({op} {left} {})", shown(right))
        }),
        ExprKind::Product(first, rest) => rest.iter().fold(shown(first), |left, (op, right)| {
            let op = if *op == ProductOperator::Times { "*" } else { "/" };
            format!("({op} {left} {})", shown(right))
        }),
        ExprKind::Power(base, exponent) => list("^", &[base, exponent]),
        ExprKind::Phasor(size, angle) => list("∠", &[size, angle]),
        ExprKind::WithUnit(inner, unit) => format!("{}[{}]", shown(inner), shown_unit(*unit)),
        ExprKind::Call(name, all) => list(&name.text, &all.iter().collect::<Vec<_>>()),
        ExprKind::Table(file, at) => format!("(table {:?} {})", file.text, shown(at)),
        ExprKind::Reading(reading) => match reading {
            Reading::Volts { node, to: None } => format!("(volts {})", node.text),
            Reading::Volts { node, to: Some(to) } => format!("(volts {} {})", node.text, to.text),
            Reading::Drop(e) => format!("(drop {})", e.text),
            Reading::Amps(e) => format!("(amps {})", e.text),
            Reading::Power(e) => format!("(power {})", e.text),
        },
    }
}
