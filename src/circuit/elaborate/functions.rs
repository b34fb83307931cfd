//! The functions a formula may call, with how many arguments they take and of what dimension.

use crate::circuit::error::CircuitError;
use crate::circuit::formula::{FormulaId, Operation, Tape};
use crate::diag::did_you_mean;
use crate::number::Function;
use crate::quantity::{Decimal, Dimension};
use crate::source::Span;
use crate::text::ast::Name;

/// What a function does with dimensions.
#[derive(Clone, Copy)]
enum Rule {
    /// Plain number to plain number.
    Plain,
    /// Keeps the dimension.
    Keep,
    /// Halves the dimension.
    Root,
    /// Any dimension to a plain number.
    Forget,
    /// Two or more of one dimension, folded in pairs.
    Fold,
    /// Two of one dimension to a plain number.
    Ratio,
    /// Two or more of one dimension, in parallel: 1/(1/a + 1/b + …).
    Parallel,
}

const FUNCTIONS: [(&str, Option<Function>, Rule); 19] = [
    ("sqrt", Some(Function::Sqrt), Rule::Root),
    ("exp", Some(Function::Exp), Rule::Plain),
    ("ln", Some(Function::Ln), Rule::Plain),
    ("log10", Some(Function::Log10), Rule::Plain),
    ("abs", Some(Function::Abs), Rule::Keep),
    ("arg", Some(Function::Arg), Rule::Forget),
    ("re", Some(Function::Re), Rule::Keep),
    ("im", Some(Function::Im), Rule::Keep),
    ("conj", Some(Function::Conj), Rule::Keep),
    ("min", Some(Function::Min), Rule::Fold),
    ("max", Some(Function::Max), Rule::Fold),
    ("sin", Some(Function::Sin), Rule::Plain),
    ("cos", Some(Function::Cos), Rule::Plain),
    ("tan", Some(Function::Tan), Rule::Plain),
    ("asin", Some(Function::Asin), Rule::Plain),
    ("acos", Some(Function::Acos), Rule::Plain),
    ("atan", Some(Function::Atan), Rule::Plain),
    ("atan2", Some(Function::Atan2), Rule::Ratio),
    ("parallel", None, Rule::Parallel),
];

/// Puts a call on the tape. `arguments` have their places for messages.
pub(super) fn call(
    tape: &mut Tape,
    name: &Name,
    arguments: &[(FormulaId, Span)],
    span: Span,
) -> Result<FormulaId, CircuitError> {
    let Some(&(_, function, rule)) = FUNCTIONS.iter().find(|(n, ..)| *n == &*name.text) else {
        let near = did_you_mean(&name.text, FUNCTIONS.iter().map(|(n, ..)| *n));
        let (near, name) = (near.map(str::to_owned), name.text.to_string());
        return Err(CircuitError::UnknownFunction { name, near, span });
    };
    let (least, most) = match rule {
        Rule::Plain | Rule::Keep | Rule::Root | Rule::Forget => (1, 1),
        Rule::Ratio => (2, 2),
        Rule::Fold | Rule::Parallel => (2, usize::MAX),
    };
    if arguments.len() < least || arguments.len() > most {
        let (given, more) = (arguments.len(), most > least);
        let name = name.text.to_string();
        return Err(CircuitError::ArgumentCount { name, wanted: least, more, given, span });
    }
    let (first, first_span) = arguments[0];
    let dimension = tape.get(first).dimension;
    for &(argument, at) in &arguments[1..] {
        let right = tape.get(argument).dimension;
        if right != dimension {
            return Err(CircuitError::MixedArguments {
                left: dimension,
                right,
                left_span: first_span,
                right_span: at,
            });
        }
    }
    let none = Dimension::NONE;
    let one_argument = |tape: &mut Tape, result| match function {
        Some(function) => Ok(tape.push(Operation::Call(function, first), result, span)),
        None => Ok(first),
    };
    match (rule, function) {
        (Rule::Plain, _) if dimension != none => {
            Err(CircuitError::WrongDimension { found: dimension, wanted: none, span: first_span })
        }
        (Rule::Plain | Rule::Forget, _) => one_argument(tape, none),
        (Rule::Keep, _) => one_argument(tape, dimension),
        (Rule::Root, _) => match dimension.power(0.5) {
            Some(half) => one_argument(tape, half),
            None => Err(CircuitError::DimensionTooLarge { span }),
        },
        (Rule::Ratio, Some(function)) => {
            Ok(tape.push(Operation::Call2(function, first, arguments[1].0), none, span))
        }
        (Rule::Fold, Some(function)) => Ok(arguments[1..].iter().fold(first, |so_far, (b, _)| {
            tape.push(Operation::Call2(function, so_far, *b), dimension, span)
        })),
        (Rule::Ratio | Rule::Fold | Rule::Parallel, _) => parallel(tape, arguments, span),
    }
}

/// a·b/(a + b), folded: unlike the sum of reciprocals it allows a zero among the arguments.
fn parallel(
    tape: &mut Tape,
    arguments: &[(FormulaId, Span)],
    span: Span,
) -> Result<FormulaId, CircuitError> {
    let first = arguments[0].0;
    let dimension = tape.get(first).dimension;
    let too_large = || CircuitError::DimensionTooLarge { span };
    let square = dimension.times(dimension).ok_or_else(too_large)?;
    Ok(arguments[1..].iter().fold(first, |a, &(b, _)| {
        let product = tape.push(Operation::Product(a, b), square, span);
        let sum = tape.push(Operation::Sum(a, b), dimension, span);
        tape.push(Operation::Quotient(product, sum), dimension, span)
    }))
}

/// 2π times a frequency in hertz: the angular frequency in radians a second.
pub(crate) fn angular(tape: &mut Tape, frequency: FormulaId, span: Span) -> FormulaId {
    let none = Dimension::NONE;
    let two = tape.push(Operation::Number(Decimal { mantissa: 2, exponent: 0 }), none, span);
    let pi = tape.push(Operation::Pi, none, span);
    let turn = tape.push(Operation::Product(two, pi), none, span);
    tape.push(Operation::Product(turn, frequency), Dimension::FREQUENCY, span)
}

/// The value of a formula that is a number, a negative number, or a ratio of such.
pub(super) fn plain_number(tape: &Tape, id: FormulaId) -> Option<f64> {
    let leaf = |id: FormulaId| match tape.get(id).operation {
        Operation::Number(decimal) => Some(decimal.to_f64()),
        Operation::Negative(inner) => match tape.get(inner).operation {
            Operation::Number(decimal) => Some(-decimal.to_f64()),
            _ => None,
        },
        _ => None,
    };
    match tape.get(id).operation {
        Operation::Quotient(a, b) => Some(leaf(a)? / leaf(b)?),
        Operation::Negative(inner) => match tape.get(inner).operation {
            Operation::Quotient(a, b) => Some(-(leaf(a)? / leaf(b)?)),
            _ => leaf(id),
        },
        _ => leaf(id),
    }
}

#[cfg(test)]
mod tests {
    use crate::circuit::elaborate::functions::FUNCTIONS;

    #[test]
    fn the_language_and_its_meaning_know_the_same_functions() {
        let mut own: Vec<_> = FUNCTIONS.iter().map(|(name, ..)| *name).collect();
        let mut known = crate::text::FUNCTIONS.to_vec();
        own.sort_unstable();
        known.sort_unstable();
        assert_eq!(own, known);
    }
}
