//! Formulas made while couplings are replaced: exact, and short where a part is zero.

use crate::circuit::{FormulaId, Operation, Phase, Tape, Values};
use crate::number::{Ball, Balls, FieldError, Function};
use crate::quantity::{Decimal, Dimension};
use crate::source::Span;

/// A value, or zero.
pub(crate) type Maybe = Option<FormulaId>;

/// A tape with the values of its constants.
pub(crate) struct Algebra {
    pub tape: Tape,
    values: Values<Ball>,
    /// A dimension left its range; what was made since is of no use.
    pub overflow: bool,
}

impl Algebra {
    pub(crate) fn new(tape: Tape) -> Self {
        let values = tape.evaluate_constants(&Balls);
        Algebra { tape, values, overflow: false }
    }

    fn push(&mut self, operation: Operation, dimension: Option<Dimension>) -> FormulaId {
        self.overflow |= dimension.is_none();
        let span = operation.operands().next().map_or(Span::default(), |id| self.tape.get(id).span);
        let id = self.tape.push(operation, dimension.unwrap_or_default(), span);
        self.values.push(Ok(Ball::ZERO));
        if self.tape.get(id).phase == Phase::Constant {
            let nothing = |_| Err(FieldError::Undecided);
            self.tape.evaluate_phase(&Balls, &[id], &Ball::ZERO, &mut self.values, nothing);
        }
        id
    }

    pub(crate) fn dimension(&self, id: FormulaId) -> Dimension {
        self.tape.get(id).dimension
    }

    /// The constant value of a formula.
    pub(crate) fn ball(&self, id: FormulaId) -> Option<Ball> {
        let constant = self.tape.get(id).phase == Phase::Constant;
        if constant { self.values[id.index()].ok() } else { None }
    }

    /// The constant real value of a formula.
    pub(crate) fn real(&self, id: FormulaId) -> Option<f64> {
        let ball = self.ball(id).filter(Ball::may_be_real)?;
        Some(ball.centre.to_complex().re).filter(|value| value.is_finite())
    }

    /// The constant real value; zero for what is left out.
    pub(crate) fn real_or_zero(&self, id: Maybe) -> Option<f64> {
        id.map_or(Some(0.0), |id| self.real(id))
    }

    /// Nothing, where the value is constant and cannot be told from zero.
    pub(crate) fn unless_zero(&self, id: FormulaId) -> Maybe {
        let zero = self.ball(id).is_some_and(|ball| ball.contains_zero());
        (!zero).then_some(id)
    }

    pub(crate) fn number(&mut self, value: f64, dimension: Dimension) -> FormulaId {
        self.decimal(Decimal::from_f64(value), value < 0.0, dimension)
    }

    pub(crate) fn decimal(
        &mut self,
        value: Decimal,
        negative: bool,
        dimension: Dimension,
    ) -> FormulaId {
        let id = self.push(Operation::Number(value), Some(dimension));
        if negative { self.negative(id) } else { id }
    }

    pub(crate) fn one(&mut self) -> FormulaId {
        self.number(1.0, Dimension::NONE)
    }

    pub(crate) fn negative(&mut self, a: FormulaId) -> FormulaId {
        if let Operation::Negative(inner) = self.tape.get(a).operation {
            return inner;
        }
        let dimension = self.dimension(a);
        self.push(Operation::Negative(a), Some(dimension))
    }

    pub(crate) fn signed(&mut self, negative: bool, a: FormulaId) -> FormulaId {
        if negative { self.negative(a) } else { a }
    }

    pub(crate) fn product(&mut self, a: FormulaId, b: FormulaId) -> FormulaId {
        let dimension = self.dimension(a).times(self.dimension(b));
        self.push(Operation::Product(a, b), dimension)
    }

    pub(crate) fn quotient(&mut self, a: FormulaId, b: FormulaId) -> FormulaId {
        let dimension = self.dimension(a).over(self.dimension(b));
        self.push(Operation::Quotient(a, b), dimension)
    }

    pub(crate) fn square(&mut self, a: FormulaId) -> FormulaId {
        let dimension = self.dimension(a).times(self.dimension(a));
        self.push(Operation::WholePower(a, 2), dimension)
    }

    pub(crate) fn sqrt(&mut self, a: FormulaId) -> FormulaId {
        let dimension = self.dimension(a).power(0.5);
        self.push(Operation::Call(Function::Sqrt, a), dimension)
    }

    /// a + b, where either may be zero, and the sum then may be, too.
    pub(crate) fn sum(&mut self, a: Maybe, b: Maybe) -> Maybe {
        let (Some(left), Some(right)) = (a, b) else { return a.or(b) };
        if let Operation::Negative(inner) = self.tape.get(right).operation {
            return self.difference(a, Some(inner));
        }
        let dimension = self.dimension(left);
        let sum = self.push(Operation::Sum(left, right), Some(dimension));
        self.unless_zero(sum)
    }

    /// a − b, where either may be zero, and the difference then may be, too.
    pub(crate) fn difference(&mut self, a: Maybe, b: Maybe) -> Maybe {
        let Some(right) = b else { return a };
        let Some(left) = a else { return Some(self.negative(right)) };
        if left == right {
            return None;
        }
        if let Operation::Negative(inner) = self.tape.get(right).operation {
            return self.sum(a, Some(inner));
        }
        let dimension = self.dimension(left);
        let difference = self.push(Operation::Difference(left, right), Some(dimension));
        self.unless_zero(difference)
    }

    /// j · 2π · f
    pub(crate) fn j_omega(&mut self) -> FormulaId {
        let f = self.push(Operation::Frequency, Some(Dimension::FREQUENCY));
        let two = self.number(2.0, Dimension::NONE);
        let pi = self.push(Operation::Pi, Some(Dimension::NONE));
        let j = self.push(Operation::ImaginaryUnit, Some(Dimension::NONE));
        let turn = self.product(j, two);
        let turn = self.product(turn, pi);
        self.product(turn, f)
    }
}
