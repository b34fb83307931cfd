//! Which entries follow a straight line over frequency: nearly all of a circuit's do, and their
//! values at any frequency are one multiplication and one addition away. The stamps that do not
//! are listed, to be evaluated frequency by frequency.

use crate::circuit::{Fault, FormulaId, Operation, Phase, Tape};
use crate::number::{Affine, Balls, ComplexTwofold};
use crate::system::{DriveStamp, Quantity, Stamp, System};

/// Relative radius up to which a constant counts as known: far below what a double can show.
const EXACT_ENOUGH: f64 = 1e-22;

/// The equations of a system, split.
#[derive(Clone, Debug)]
pub struct AffineSystem {
    /// The straight part of each entry of the matrix.
    pub entries: Vec<Affine>,
    /// The straight part of each row of the right-hand side.
    pub right: Vec<Affine>,
    /// What the matrix gets besides.
    pub bent_stamps: Vec<Stamp>,
    /// What the right-hand side gets besides.
    pub bent_drives: Vec<DriveStamp>,
}

impl AffineSystem {
    /// Splits the equations of a system. Fails where a constant that is needed has no value.
    pub fn new(system: &System) -> Result<Self, Fault> {
        let constants = system.tape.evaluate_constants(&Balls);
        let straight = straight(&system.tape);
        let mut out = AffineSystem {
            entries: vec![Affine::default(); system.row.len()],
            right: vec![Affine::default(); system.unknowns.len()],
            bent_stamps: Vec::new(),
            bent_drives: Vec::new(),
        };
        let value = |id: FormulaId| match system.tape.get(id).phase {
            // A constant without a value fails here rather than at every frequency.
            Phase::Constant => constants[id.index()].as_ref().map_err(|fault| *fault).map(|_| ()),
            _ => Ok(()),
        };
        for stamp in &system.stamps {
            let affine = match stamp.quantity {
                Quantity::One => Some(Affine::constant(ComplexTwofold::ONE)),
                Quantity::Formula(id) => {
                    value(id)?;
                    straight[id.index()]
                }
            };
            match affine {
                Some(affine) => add(&mut out.entries[stamp.slot as usize], affine, stamp.negative),
                None => out.bent_stamps.push(*stamp),
            }
        }
        for drive in &system.drives {
            value(drive.formula)?;
            match straight[drive.formula.index()] {
                Some(affine) => add(&mut out.right[drive.row as usize], affine, drive.negative),
                None => out.bent_drives.push(*drive),
            }
        }
        Ok(out)
    }
}

fn add(to: &mut Affine, value: Affine, negative: bool) {
    let value = if negative { negated(value) } else { value };
    *to = sum(*to, value);
}

/// The straight line of each formula of a tape that follows one and is known well enough.
pub fn straight(tape: &Tape) -> Vec<Option<Affine>> {
    let constants = tape.evaluate_constants(&Balls);
    let mut out: Vec<Option<Affine>> = Vec::with_capacity(tape.len());
    for (id, formula) in tape.iter() {
        let line = match formula.phase {
            Phase::Constant => constants[id.index()].as_ref().ok().and_then(|ball| {
                let known = ball.radius <= EXACT_ENOUGH * ball.centre.norm();
                known.then(|| Affine::constant(ball.centre))
            }),
            Phase::Frequency => operation(formula.operation, &out),
            Phase::Solution => None,
        };
        out.push(line.filter(|line| line.constant.is_finite() && line.slope.is_finite()));
    }
    out
}

fn operation(operation: Operation, known: &[Option<Affine>]) -> Option<Affine> {
    use Operation as O;
    let line = |id: FormulaId| known[id.index()];
    match operation {
        O::Frequency => Some(Affine { constant: ComplexTwofold::ZERO, slope: ComplexTwofold::ONE }),
        O::Negative(a) => Some(negated(line(a)?)),
        O::Sum(a, b) => Some(sum(line(a)?, line(b)?)),
        O::Difference(a, b) => Some(sum(line(a)?, negated(line(b)?))),
        O::Product(a, b) => {
            let (a, b) = (line(a)?, line(b)?);
            let (line, factor) = if b.slope.is_zero() { (a, b) } else { (b, a) };
            factor.slope.is_zero().then(|| Affine {
                constant: line.constant * factor.constant,
                slope: line.slope * factor.constant,
            })
        }
        O::Quotient(a, b) => {
            let (a, b) = (line(a)?, line(b)?);
            (b.slope.is_zero() && !b.constant.is_zero())
                .then(|| Affine { constant: a.constant / b.constant, slope: a.slope / b.constant })
        }
        _ => None,
    }
}

fn sum(a: Affine, b: Affine) -> Affine {
    Affine { constant: a.constant + b.constant, slope: a.slope + b.slope }
}

fn negated(a: Affine) -> Affine {
    Affine { constant: -a.constant, slope: -a.slope }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::{Decimal, Dimension};
    use crate::source::Span;

    /// A tape of the given operations, each with its number.
    fn tape(operations: &[fn(&[FormulaId]) -> Operation]) -> (Tape, Vec<FormulaId>) {
        let (mut tape, mut ids) = (Tape::default(), Vec::new());
        for operation in operations {
            let id = tape.push(operation(&ids), Dimension::NONE, Span::default());
            ids.push(id);
        }
        (tape, ids)
    }

    fn number(mantissa: u128) -> Operation {
        Operation::Number(Decimal { mantissa, exponent: 0 })
    }

    #[test]
    fn sums_products_and_quotients_by_constants_stay_straight() {
        let (tape, ids) = tape(&[
            |_| number(6),
            |_| Operation::Frequency,
            |id| Operation::Product(id[0], id[1]),    // 6·f
            |id| Operation::Difference(id[0], id[2]), // 6 − 6·f
            |_| number(3),
            |id| Operation::Quotient(id[3], id[4]), // 2 − 2·f
            |id| Operation::Negative(id[5]),
        ]);
        let lines = straight(&tape);
        let line = lines[ids[6].index()].expect("a straight line");
        assert_eq!((line.constant.re.hi, line.slope.re.hi), (-2.0, 2.0));
        assert_eq!(line.at(10.0).to_complex().re, 18.0);
    }

    #[test]
    fn what_bends_is_left_over() {
        let (tape, ids) = tape(&[
            |_| Operation::Frequency,
            |id| Operation::Product(id[0], id[0]),
            |_| number(2),
            |id| Operation::Quotient(id[2], id[0]),
            |id| Operation::Call(crate::number::Function::Sqrt, id[0]),
            |id| Operation::Sum(id[2], id[4]),
        ]);
        let lines = straight(&tape);
        for bent in [1, 3, 4, 5] {
            assert_eq!(lines[ids[bent].index()], None, "formula {bent}");
        }
        assert!(lines[ids[2].index()].is_some());
    }
}
