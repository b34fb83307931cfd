//! Second pass: expressions to formulas, with their dimensions checked.

use crate::circuit::elaborate::{Elaborator, LetId, LetState, ScopeId, functions};
use crate::circuit::error::CircuitError;
use crate::circuit::formula::{FormulaId, Measure, Operation};
use crate::circuit::{Read, ReadLimit, TableId};
use crate::diag::did_you_mean;
use crate::number::Function;
use crate::quantity::{Conversion, Decimal, Dimension, Unit};
use crate::source::Span;
use crate::text::ast::{self, Expr, ExprKind, ProductOperator, Reading, SumOperator};

/// Whole powers up to this are carried out by multiplication; beyond it, as exp(b·ln a).
const LARGEST_WHOLE_POWER: f64 = 1024.0;

impl<'a> Elaborator<'a> {
    /// Lowers every `let`, each after those it uses. The stack is our own, so a chain of any
    /// length is fine.
    pub(super) fn lower_lets(&mut self) {
        for first in 0..self.lets.len() {
            let mut stack = vec![first];
            while let Some(&top) = stack.last() {
                if matches!(self.lets[top].state, LetState::Done(_) | LetState::Failed) {
                    stack.pop();
                    continue;
                }
                self.lets[top].state = LetState::Open;
                match self.next_needed(top) {
                    Some(needed) if self.lets[needed].state == LetState::Open => {
                        self.report_cycle(&stack, needed);
                    }
                    Some(needed) => stack.push(needed),
                    None => {
                        let (scope, value) = (self.lets[top].scope, self.lets[top].value);
                        self.lets[top].state = match self.lower(scope, value) {
                            Some(id) => LetState::Done(id),
                            None => LetState::Failed,
                        };
                        stack.pop();
                    }
                }
            }
        }
    }

    /// Says so where a value from the command line measures something else than the circuit's own.
    pub(super) fn overrides_fit(&mut self) -> bool {
        let mut fit = true;
        for (id, own) in std::mem::take(&mut self.overridden) {
            let LetState::Done(given) = self.lets[id].state else { continue };
            let Some(own) = self.lower(0, own) else { continue };
            let (value, name) = (self.lets[id].value, self.lets[id].full_name.clone());
            let (given, own) = (self.tape.get(given).dimension, self.tape.get(own).dimension);
            if given != own {
                fit = false;
                let span = value.span;
                self.errors.push(CircuitError::OverrideDimension { name, given, own, span });
            }
        }
        fit
    }

    fn report_cycle(&mut self, stack: &[LetId], needed: LetId) {
        let start = stack.iter().position(|&id| id == needed).unwrap_or(0);
        let around = &stack[start..];
        let names = around.iter().map(|&id| self.lets[id].full_name.clone()).collect();
        let spans = around.iter().map(|&id| self.lets[id].name.span).collect();
        self.errors.push(CircuitError::CyclicLet { names, spans });
        for &id in around {
            self.lets[id].state = LetState::Failed;
        }
    }

    /// A `let` that the value of this one uses and that is not lowered yet.
    fn next_needed(&self, id: LetId) -> Option<LetId> {
        let entry = &self.lets[id];
        let mut waiting = vec![entry.value];
        while let Some(expr) = waiting.pop() {
            if let ExprKind::Name(name) = &expr.kind
                && let Some(found) = self.find_let(entry.scope, &name.text)
                && matches!(self.lets[found].state, LetState::Waiting | LetState::Open)
            {
                return Some(found);
            }
            waiting.extend(children(expr));
        }
        None
    }

    fn find_let(&self, scope: ScopeId, name: &str) -> Option<LetId> {
        let mut at = Some(scope);
        while let Some(here) = at {
            if let Some(&id) = self.scopes[here].lets.get(name) {
                return Some(id);
            }
            at = self.scopes[here].parent;
        }
        None
    }

    pub(super) fn lower_read(
        &mut self,
        scope: ScopeId,
        name: String,
        value: &'a Expr,
        limits: &'a [ast::Limit],
        span: Span,
    ) {
        if let Some(old) = self.reads.iter().find(|r| r.name == name) {
            let first = old.span;
            return self.duplicate(crate::circuit::error::Thing::Read, &name, span, first);
        }
        let Some(value) = self.lower(scope, value) else { return };
        let mut kept = Vec::new();
        for limit in limits {
            let Some(id) = self.lower(scope, &limit.value) else { continue };
            if self.expect(id, self.tape.get(value).dimension, limit.value.span) {
                kept.push(ReadLimit { kind: limit.kind, value: id });
            }
        }
        self.reads.push(Read { name, value, limits: kept, span });
    }

    /// Says so if a formula has not the dimension wanted.
    pub(super) fn expect(&mut self, id: FormulaId, wanted: Dimension, span: Span) -> bool {
        let found = self.tape.get(id).dimension;
        if found != wanted {
            self.errors.push(CircuitError::WrongDimension { found, wanted, span });
        }
        found == wanted
    }

    /// Lowers an expression that must have a dimension and must not depend on the solution.
    pub(super) fn lower_as(
        &mut self,
        scope: ScopeId,
        expr: &'a Expr,
        wanted: Dimension,
    ) -> Option<FormulaId> {
        let id = self.lower(scope, expr)?;
        if self.tape.get(id).phase == crate::circuit::Phase::Solution {
            self.errors.push(CircuitError::ReadingNotAllowed { span: expr.span });
            return None;
        }
        self.expect(id, wanted, expr.span).then_some(id)
    }

    /// Lowers an expression; `None` if it was found wrong and said so. The grammar caps how deep
    /// expressions nest.
    pub(super) fn lower(&mut self, scope: ScopeId, expr: &'a Expr) -> Option<FormulaId> {
        let span = expr.span;
        match &expr.kind {
            ExprKind::Number { value, unit } => Some(self.number(*value, *unit, span)),
            ExprKind::Imaginary(value) => {
                let number = self.number(*value, None, span);
                let unit = self.tape.push(Operation::ImaginaryUnit, Dimension::NONE, span);
                self.product(number, unit, span)
            }
            ExprKind::Name(name) => self.lower_name(scope, name),
            ExprKind::Negative(inner) => {
                let id = self.lower(scope, inner)?;
                let dimension = self.tape.get(id).dimension;
                Some(self.tape.push(Operation::Negative(id), dimension, span))
            }
            ExprKind::Sum(first, rest) => self.lower_sum(scope, first, rest),
            ExprKind::Product(first, rest) => self.lower_product(scope, first, rest),
            ExprKind::Power(base, exponent) => self.lower_power(scope, base, exponent, span),
            ExprKind::Phasor(size, angle) => {
                let size = self.lower(scope, size);
                let id = self.lower(scope, angle)?;
                let id = self.expect(id, Dimension::NONE, angle.span).then_some(id)?;
                let unit = self.tape.push(Operation::ImaginaryUnit, Dimension::NONE, span);
                let turn = self.product(unit, id, span)?;
                let turn =
                    self.tape.push(Operation::Call(Function::Exp, turn), Dimension::NONE, span);
                self.product(size?, turn, span)
            }
            ExprKind::WithUnit(inner, unit) => {
                let id = self.lower(scope, inner)?;
                let found = self.tape.get(id).dimension;
                if found != Dimension::NONE {
                    self.errors.push(CircuitError::UnitTwice { found, span });
                    return None;
                }
                let one = Decimal { mantissa: 1, exponent: 0 };
                let unit = self.number(one, Some(*unit), span);
                self.product(id, unit, span)
            }
            ExprKind::Call(name, arguments) => {
                let arguments: Vec<_> =
                    arguments.iter().map(|a| self.lower(scope, a).map(|id| (id, a.span))).collect();
                let arguments = arguments.into_iter().collect::<Option<Vec<_>>>()?;
                functions::call(&mut self.tape, name, &arguments, span)
                    .map_err(|error| self.errors.push(error))
                    .ok()
            }
            ExprKind::Table(file, argument) => {
                let argument = self.lower(scope, argument);
                let table = self.table(file);
                let operation = Operation::Table(table?, argument?);
                Some(self.tape.push(operation, Dimension::NONE, span))
            }
            ExprKind::Reading(reading) => self.lower_reading(scope, reading, span),
        }
    }

    pub(super) fn number(&mut self, value: Decimal, unit: Option<Unit>, span: Span) -> FormulaId {
        let Some(unit) = unit else {
            return self.tape.push(Operation::Number(value), Dimension::NONE, span);
        };
        let exponent = value.exponent.saturating_add(unit.power_of_ten);
        let number = Operation::Number(Decimal { exponent, ..value });
        let id = self.tape.push(number, unit.dimension, span);
        let plain = |mantissa| Operation::Number(Decimal { mantissa, exponent: 0 });
        let none = Dimension::NONE;
        match unit.conversion {
            Conversion::Plain => id,
            Conversion::Degrees => {
                let pi = self.tape.push(Operation::Pi, none, span);
                let half_turn = self.tape.push(plain(180), none, span);
                let degree = self.tape.push(Operation::Quotient(pi, half_turn), none, span);
                self.tape.push(Operation::Product(id, degree), none, span)
            }
            Conversion::Peak => {
                let two = self.tape.push(plain(2), none, span);
                let root = self.tape.push(Operation::Call(Function::Sqrt, two), none, span);
                self.tape.push(Operation::Quotient(id, root), unit.dimension, span)
            }
        }
    }

    fn lower_name(&mut self, scope: ScopeId, name: &'a ast::Name) -> Option<FormulaId> {
        let span = name.span;
        match &*name.text {
            "pi" => return Some(self.tape.push(Operation::Pi, Dimension::NONE, span)),
            "j" => return Some(self.tape.push(Operation::ImaginaryUnit, Dimension::NONE, span)),
            "f" => return Some(self.tape.push(Operation::Frequency, Dimension::FREQUENCY, span)),
            "omega" => {
                let f = self.tape.push(Operation::Frequency, Dimension::FREQUENCY, span);
                return Some(functions::angular(&mut self.tape, f, span));
            }
            _ => {}
        }
        match self.find_let(scope, &name.text).map(|id| self.lets[id].state) {
            Some(LetState::Done(id)) => Some(id),
            // Said already, where the `let` stands.
            Some(_) => None,
            None => {
                let known = self.scopes[scope].lets.keys().chain(self.scopes[0].lets.keys());
                let near = did_you_mean(&name.text, known.copied()).map(str::to_owned);
                let element = format!("{}{}", self.scopes[scope].prefix, name.text);
                let element = self.element_of.contains_key(&element);
                let name = name.text.to_string();
                self.errors.push(CircuitError::UnknownName { name, near, element, span });
                None
            }
        }
    }

    fn lower_sum(
        &mut self,
        scope: ScopeId,
        first: &'a Expr,
        rest: &'a [(SumOperator, Expr)],
    ) -> Option<FormulaId> {
        let mut so_far = self.lower(scope, first);
        let mut span = first.span;
        for (operator, term) in rest {
            let next = self.lower(scope, term);
            let (Some(a), Some(b)) = (so_far, next) else {
                so_far = None;
                continue;
            };
            let (left, right) = (self.tape.get(a).dimension, self.tape.get(b).dimension);
            if left != right {
                self.errors.push(CircuitError::MixedSum {
                    left,
                    right,
                    left_span: span,
                    right_span: term.span,
                    minus: *operator == SumOperator::Minus,
                });
                so_far = None;
                continue;
            }
            span = span.to(term.span);
            let operation = match operator {
                SumOperator::Plus => Operation::Sum(a, b),
                SumOperator::Minus => Operation::Difference(a, b),
            };
            so_far = Some(self.tape.push(operation, left, span));
        }
        so_far
    }

    fn lower_product(
        &mut self,
        scope: ScopeId,
        first: &'a Expr,
        rest: &'a [(ProductOperator, Expr)],
    ) -> Option<FormulaId> {
        let mut so_far = self.lower(scope, first);
        let mut span = first.span;
        for (operator, factor) in rest {
            let next = self.lower(scope, factor);
            let (Some(a), Some(b)) = (so_far, next) else {
                so_far = None;
                continue;
            };
            span = span.to(factor.span);
            so_far = match operator {
                ProductOperator::Times => self.product(a, b, span),
                ProductOperator::Over => self.quotient(a, b, span),
            };
        }
        so_far
    }

    pub(super) fn product(&mut self, a: FormulaId, b: FormulaId, span: Span) -> Option<FormulaId> {
        let dimension = self.tape.get(a).dimension.times(self.tape.get(b).dimension);
        self.with_dimension(Operation::Product(a, b), dimension, span)
    }

    pub(super) fn quotient(&mut self, a: FormulaId, b: FormulaId, span: Span) -> Option<FormulaId> {
        let dimension = self.tape.get(a).dimension.over(self.tape.get(b).dimension);
        self.with_dimension(Operation::Quotient(a, b), dimension, span)
    }

    fn with_dimension(
        &mut self,
        operation: Operation,
        dimension: Option<Dimension>,
        span: Span,
    ) -> Option<FormulaId> {
        if dimension.is_none() {
            self.errors.push(CircuitError::DimensionTooLarge { span });
        }
        Some(self.tape.push(operation, dimension?, span))
    }

    fn lower_power(
        &mut self,
        scope: ScopeId,
        base: &'a Expr,
        exponent: &'a Expr,
        span: Span,
    ) -> Option<FormulaId> {
        let base = self.lower(scope, base);
        let power = self.lower_as(scope, exponent, Dimension::NONE)?;
        let base = base?;
        let dimension = self.tape.get(base).dimension;
        let plain = functions::plain_number(&self.tape, power);
        let dimension = match (dimension == Dimension::NONE, plain) {
            (true, _) => Some(Dimension::NONE),
            (false, Some(number)) => dimension.power(number),
            (false, None) => {
                self.errors.push(CircuitError::ExponentUnknown { dimension, span: exponent.span });
                return None;
            }
        };
        let operation = match plain {
            Some(n) if n.fract() == 0.0 && n.abs() <= LARGEST_WHOLE_POWER => {
                Operation::WholePower(base, n as i32)
            }
            _ => Operation::Power(base, power),
        };
        self.with_dimension(operation, dimension, span)
    }

    fn lower_reading(
        &mut self,
        scope: ScopeId,
        reading: &'a Reading,
        span: Span,
    ) -> Option<FormulaId> {
        let (measure, dimension) = match reading {
            Reading::Volts { node, to } => {
                let first = self.known_node(scope, node);
                let second = to.as_ref().map(|to| self.known_node(scope, to));
                let second = match second {
                    Some(missing @ None) => {
                        return missing.map(|_: crate::circuit::NodeId| unreachable!());
                    }
                    Some(found) => found,
                    None => None,
                };
                (Measure::Volts(first?, second), Dimension::VOLTAGE)
            }
            Reading::Drop(name) => {
                (Measure::Drop(self.known_element(scope, name)?), Dimension::VOLTAGE)
            }
            Reading::Amps(name) => {
                (Measure::Amps(self.known_element(scope, name)?), Dimension::CURRENT)
            }
            Reading::Power(name) => {
                (Measure::Power(self.known_element(scope, name)?), Dimension::POWER)
            }
        };
        Some(self.tape.push(Operation::Measure(measure), dimension, span))
    }

    fn table(&mut self, file: &ast::Text) -> Option<TableId> {
        let source = *self.input.data.get(&file.span)?;
        if let Some(&known) = self.tables.get(&source) {
            return known;
        }
        let table = match crate::circuit::table::read(source, self.input.sources, &file.text) {
            Ok(table) => {
                self.tape.tables.push(table);
                Some(TableId(self.tape.tables.len() as u32 - 1))
            }
            Err(error) => {
                self.errors.push(error);
                None
            }
        };
        self.tables.insert(source, table);
        table
    }
}

/// The expressions directly inside one.
pub(crate) fn children(expr: &Expr) -> Vec<&Expr> {
    match &expr.kind {
        ExprKind::Number { .. }
        | ExprKind::Imaginary(_)
        | ExprKind::Name(_)
        | ExprKind::Reading(_) => Vec::new(),
        ExprKind::Negative(a) | ExprKind::WithUnit(a, _) | ExprKind::Table(_, a) => vec![a],
        ExprKind::Sum(first, rest) => {
            std::iter::once(&**first).chain(rest.iter().map(|(_, e)| e)).collect()
        }
        ExprKind::Product(first, rest) => {
            std::iter::once(&**first).chain(rest.iter().map(|(_, e)| e)).collect()
        }
        ExprKind::Power(a, b) | ExprKind::Phasor(a, b) => vec![a, b],
        ExprKind::Call(_, arguments) => arguments.iter().collect(),
    }
}
