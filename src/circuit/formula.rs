//! Formulas on a tape: every operand stands before the operation that uses it, so any number of
//! them is evaluated in one pass, without recursion, over any [`Field`].

use crate::circuit::{ElementId, NodeId, TableId};
use crate::number::{Field, FieldError, Function};
use crate::quantity::{Decimal, Dimension};
use crate::source::Span;
use num_complex::Complex64;

/// Index of a formula on its [`Tape`].
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct FormulaId(u32);

impl FormulaId {
    /// Stands where a formula is still to come.
    pub(crate) const PLACEHOLDER: FormulaId = FormulaId(0);

    /// Position on the tape.
    pub fn index(self) -> usize {
        self.0 as usize
    }
}

/// A reading of the solved circuit.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Measure {
    /// Voltage of a node against another, or against the reference of its island.
    Volts(NodeId, Option<NodeId>),
    /// Left minus right of an element.
    Drop(ElementId),
    /// Current from left to right through an element.
    Amps(ElementId),
    /// Absorbed complex power of an element.
    Power(ElementId),
}

impl Measure {
    /// Gives the nodes of the reading new numbers.
    pub fn renumber_nodes(&mut self, renumber: impl Fn(&mut NodeId)) {
        if let Measure::Volts(node, to) = self {
            renumber(node);
            to.iter_mut().for_each(renumber);
        }
    }
}

/// One operation.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Operation {
    /// An exact decimal.
    Number(Decimal),
    /// π
    Pi,
    /// j
    ImaginaryUnit,
    /// The frequency being solved, in hertz.
    Frequency,
    /// −a
    Negative(FormulaId),
    /// a + b
    Sum(FormulaId, FormulaId),
    /// a − b
    Difference(FormulaId, FormulaId),
    /// a · b
    Product(FormulaId, FormulaId),
    /// a / b
    Quotient(FormulaId, FormulaId),
    /// a to a whole power.
    WholePower(FormulaId, i32),
    /// a to the power b.
    Power(FormulaId, FormulaId),
    /// A function of one argument.
    Call(Function, FormulaId),
    /// A function of two arguments.
    Call2(Function, FormulaId, FormulaId),
    /// Measured data, interpolated.
    Table(TableId, FormulaId),
    /// A reading of the solved circuit.
    Measure(Measure),
}

impl Operation {
    /// The formulas this operation uses.
    pub fn operands(self) -> impl Iterator<Item = FormulaId> {
        use Operation as O;
        let (a, b) = match self {
            O::Number(_) | O::Pi | O::ImaginaryUnit | O::Frequency | O::Measure(_) => (None, None),
            O::Negative(a) | O::WholePower(a, _) | O::Call(_, a) | O::Table(_, a) => {
                (Some(a), None)
            }
            O::Sum(a, b)
            | O::Difference(a, b)
            | O::Product(a, b)
            | O::Quotient(a, b)
            | O::Power(a, b)
            | O::Call2(_, a, b) => (Some(a), Some(b)),
        };
        a.into_iter().chain(b)
    }
}

/// What must be known before a formula has a value.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Phase {
    /// Nothing: a constant.
    Constant,
    /// The frequency.
    Frequency,
    /// The solution of the circuit.
    Solution,
}

/// A formula on the tape.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Formula {
    /// What it does.
    pub operation: Operation,
    /// What it measures.
    pub dimension: Dimension,
    /// When its value is known.
    pub phase: Phase,
    /// True where the value can only be real.
    pub real: bool,
    /// Where it was written.
    pub span: Span,
}

/// A value that could not be had, and the formula where that began.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Fault {
    /// The formula whose operation failed.
    pub at: FormulaId,
    /// Why.
    pub error: FieldError,
}

/// The value of each formula, or the first fault on its way.
pub type Values<N> = Vec<Result<N, Fault>>;

/// Measured data: a real argument and a complex value, arguments strictly increasing.
#[derive(Clone, Debug, PartialEq)]
pub struct Table {
    /// The file it was read from, as written.
    pub file: String,
    /// Arguments and values in SI units.
    pub points: Vec<(f64, Complex64)>,
}

/// All formulas of a circuit, operands first.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Tape {
    formulas: Vec<Formula>,
    /// The measured data that formulas read.
    pub tables: Vec<Table>,
}

impl Tape {
    /// Number of formulas.
    pub fn len(&self) -> usize {
        self.formulas.len()
    }

    /// True if there are none.
    pub fn is_empty(&self) -> bool {
        self.formulas.is_empty()
    }

    /// A formula.
    pub fn get(&self, id: FormulaId) -> &Formula {
        &self.formulas[id.index()]
    }

    /// Every formula with its number, operands first.
    pub fn iter(&self) -> impl Iterator<Item = (FormulaId, &Formula)> {
        self.formulas.iter().enumerate().map(|(i, f)| (FormulaId(i as u32), f))
    }

    /// Appends a formula whose operands stand on the tape already. The caller has checked the
    /// dimension; phase and realness follow from the operands.
    pub fn push(&mut self, operation: Operation, dimension: Dimension, span: Span) -> FormulaId {
        let own = match operation {
            Operation::Frequency => Phase::Frequency,
            Operation::Measure(_) => Phase::Solution,
            _ => Phase::Constant,
        };
        let phase = operation.operands().map(|id| self.get(id).phase).fold(own, Phase::max);
        let real = self.is_real(operation);
        self.formulas.push(Formula { operation, dimension, phase, real, span });
        FormulaId(self.formulas.len() as u32 - 1)
    }

    /// Gives the nodes of all readings new numbers.
    pub fn renumber_nodes(&mut self, renumber: impl Fn(&mut NodeId)) {
        for formula in &mut self.formulas {
            if let Operation::Measure(measure) = &mut formula.operation {
                measure.renumber_nodes(&renumber);
            }
        }
    }

    fn is_real(&self, operation: Operation) -> bool {
        use Function as F;
        match operation {
            Operation::ImaginaryUnit | Operation::Measure(_) => false,
            Operation::Call(F::Abs | F::Arg | F::Re | F::Im, _) => true,
            // A root, a logarithm or an arc of a real may leave the real line.
            Operation::Call(F::Sqrt | F::Ln | F::Log10 | F::Asin | F::Acos, a) => {
                self.is_nonnegative(a) && self.get(a).real
            }
            Operation::Power(..) => false,
            Operation::Table(id, _) => {
                self.tables[id.0 as usize].points.iter().all(|(_, v)| v.im == 0.0)
            }
            _ => operation.operands().all(|id| self.get(id).real),
        }
    }

    fn is_nonnegative(&self, id: FormulaId) -> bool {
        let both = |a, b| self.is_nonnegative_shallow(a) && self.is_nonnegative_shallow(b);
        match self.get(id).operation {
            Operation::Product(a, b) | Operation::Quotient(a, b) | Operation::Sum(a, b) => {
                both(a, b)
            }
            _ => self.is_nonnegative_shallow(id),
        }
    }

    fn is_nonnegative_shallow(&self, id: FormulaId) -> bool {
        matches!(
            self.get(id).operation,
            Operation::Number(_)
                | Operation::Pi
                | Operation::Frequency
                | Operation::Call(Function::Abs, _)
        )
    }

    /// Values of all formulas known before the frequency is; the others are left as they are.
    pub fn evaluate_constants<F: Field>(&self, field: &F) -> Values<F::Number> {
        let placeholder = field.decimal(Decimal { mantissa: 0, exponent: 0 });
        let mut values: Values<F::Number> = Vec::with_capacity(self.len());
        for (id, formula) in self.iter() {
            values.push(Ok(placeholder.clone()));
            if formula.phase == Phase::Constant {
                values[id.index()] =
                    self.evaluate_one(field, id, &values, &placeholder, |_| unreachable!());
            }
        }
        values
    }

    /// The formulas of one phase, operands first.
    pub fn of_phase(&self, phase: Phase) -> Vec<FormulaId> {
        self.iter().filter(|(_, f)| f.phase == phase).map(|(id, _)| id).collect()
    }

    /// Evaluates the formulas `which` (all of one phase, operands first) into `values`.
    pub fn evaluate_phase<F: Field>(
        &self,
        field: &F,
        which: &[FormulaId],
        frequency: &F::Number,
        values: &mut Values<F::Number>,
        mut measure: impl FnMut(Measure) -> Result<F::Number, FieldError>,
    ) {
        for &id in which {
            values[id.index()] = self.evaluate_one(field, id, values, frequency, &mut measure);
        }
    }

    fn evaluate_one<F: Field>(
        &self,
        field: &F,
        id: FormulaId,
        values: &Values<F::Number>,
        frequency: &F::Number,
        mut measure: impl FnMut(Measure) -> Result<F::Number, FieldError>,
    ) -> Result<F::Number, Fault> {
        use Operation as O;
        let value = |id: FormulaId| values[id.index()].as_ref().map_err(|fault| *fault);
        let result = match self.get(id).operation {
            O::Number(decimal) => Ok(field.decimal(decimal)),
            O::Pi => Ok(field.pi()),
            O::ImaginaryUnit => Ok(field.imaginary_unit()),
            O::Frequency => Ok(frequency.clone()),
            O::Negative(a) => Ok(field.neg(value(a)?)),
            O::Sum(a, b) => Ok(field.add(value(a)?, value(b)?)),
            O::Difference(a, b) => Ok(field.sub(value(a)?, value(b)?)),
            O::Product(a, b) => Ok(field.mul(value(a)?, value(b)?)),
            O::Quotient(a, b) => field.div(value(a)?, value(b)?),
            O::WholePower(a, n) => field.whole_power(value(a)?, n),
            O::Power(a, b) => field.power(value(a)?, value(b)?),
            O::Call(function, a) => field.function(function, &[value(a)?.clone()]),
            O::Call2(function, a, b) => {
                field.function(function, &[value(a)?.clone(), value(b)?.clone()])
            }
            O::Table(table, a) => {
                field.interpolate(&self.tables[table.0 as usize].points, value(a)?)
            }
            O::Measure(what) => measure(what),
        };
        result.map_err(|error| Fault { at: id, error })
    }
}
