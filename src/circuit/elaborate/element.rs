//! Elements: the dimension of the value says what they are; marks and attributes are checked.

use crate::circuit::elaborate::{Elaborator, ScopeId, functions};
use crate::circuit::error::CircuitError;
use crate::circuit::formula::{FormulaId, Measure, Operation, Phase};
use crate::circuit::{CapacitorLoss, Drive, ElementId, End, Law};
use crate::quantity::{Decimal, Dimension};
use crate::source::Span;
use crate::text::ast::{self, AttributeKind, Mark, MarkKind};

/// A dependent value that unfolds into more terms than this is refused: `let`s that use each
/// other twice would double it at every step.
const MOST_TERMS: usize = 100_000;

/// A loss attribute, lowered.
enum Loss {
    Series(FormulaId),
    Quality { q: FormulaId, at: Option<FormulaId> },
    Tangent(FormulaId),
}

impl<'a> Elaborator<'a> {
    pub(super) fn lower_element(
        &mut self,
        scope: ScopeId,
        element: &'a ast::Element,
        id: ElementId,
    ) {
        let span = element.value.span;
        let value = self.lower(scope, &element.value);
        let loss = self.lower_attributes(scope, element, id);
        let Some(value) = value else { return };
        let dimension = self.tape.get(value).dimension;
        let source = dimension == Dimension::VOLTAGE || dimension == Dimension::CURRENT;
        if self.tape.get(value).phase == Phase::Solution && !source {
            return self.errors.push(CircuitError::DependentValue { dimension, span });
        }
        let winding = dimension == Dimension::INDUCTANCE;
        if let Some((_, at)) = &loss
            && !winding
            && dimension != Dimension::CAPACITANCE
        {
            self.errors.push(CircuitError::AttributeNotHere { span: *at });
        }
        let loss = loss.map(|(loss, _)| loss);
        let law = match dimension {
            Dimension::RESISTANCE => Some(Law::Resistor { resistance: value }),
            Dimension::CONDUCTANCE => Some(Law::Conductance { conductance: value }),
            Dimension::INDUCTANCE => {
                let dot = self.mark(element, &[MarkKind::Dot]).map(|(end, _)| end);
                let series = loss.and_then(|loss| self.winding_loss(loss, value, span));
                return self.set_law(id, Law::Winding { inductance: value, series, dot });
            }
            Dimension::CAPACITANCE => {
                let loss =
                    loss.map_or(CapacitorLoss::None, |l| self.capacitor_loss(l, value, span));
                Some(Law::Capacitor { capacitance: value, loss })
            }
            Dimension::VOLTAGE => {
                let mark = self.mark(element, &[MarkKind::Plus]);
                if mark.is_none() && !has_mark(element) {
                    self.errors.push(CircuitError::MissingPlus { span: element.span });
                }
                let Some((end, _)) = mark else { return };
                let Some(drive) = self.drive(value, end) else { return };
                return self.set_law(id, Law::VoltageSource(drive));
            }
            Dimension::CURRENT => {
                let mark = self.mark(element, &[MarkKind::Rightward, MarkKind::Leftward]);
                if mark.is_none() && !has_mark(element) {
                    self.errors.push(CircuitError::MissingArrow { span: element.span });
                }
                let Some((_, mark)) = mark else { return };
                let end = if mark.kind == MarkKind::Rightward { End::Left } else { End::Right };
                let Some(drive) = self.drive(value, end) else { return };
                return self.set_law(id, Law::CurrentSource(drive));
            }
            _ => None,
        };
        // Only resistors, conductances and capacitors come here: they take no mark.
        self.mark(element, &[]);
        match law {
            Some(law) => self.set_law(id, law),
            None => self.errors.push(CircuitError::NoSuchElement { dimension, span }),
        }
    }

    fn set_law(&mut self, id: ElementId, law: Law) {
        self.elements[id.index()].law = law;
        self.known_law[id.index()] = true;
    }

    /// The mark of an element, with the end it stands at; says so if it does not belong there.
    fn mark(&mut self, element: &ast::Element, allowed: &[MarkKind]) -> Option<(End, Mark)> {
        let left = element.left_mark.map(|m| (End::Left, m));
        let right = element.right_mark.map(|m| (End::Right, m));
        let (end, mark) = match (left, right) {
            (Some((_, first)), Some((_, second))) => {
                let (first, second) = (first.span, second.span);
                self.errors.push(CircuitError::TwoMarks { first, second });
                return None;
            }
            (one, other) => one.or(other)?,
        };
        if !allowed.contains(&mark.kind) {
            self.errors.push(CircuitError::WrongMark { kind: mark.kind, span: mark.span });
            return None;
        }
        Some((end, mark))
    }

    fn lower_attributes(
        &mut self,
        scope: ScopeId,
        element: &'a ast::Element,
        id: ElementId,
    ) -> Option<(Loss, Span)> {
        let mut loss: Option<(Loss, Span)> = None;
        for attribute in &element.attributes {
            let span = attribute.span;
            let found = match &attribute.kind {
                AttributeKind::Tolerance(value) => {
                    let value = self.lower_as(scope, value, Dimension::NONE);
                    if self.elements[id.index()].tolerance.is_some() {
                        self.errors.push(CircuitError::AttributeTwice { span });
                    }
                    self.elements[id.index()].tolerance = value;
                    continue;
                }
                AttributeKind::Quality { value, at } => {
                    let q = self.lower_as(scope, value, Dimension::NONE);
                    let at = match at {
                        None => None,
                        Some(at) => match self.lower_as(scope, at, Dimension::FREQUENCY) {
                            None => continue,
                            found => found,
                        },
                    };
                    q.map(|q| Loss::Quality { q, at })
                }
                AttributeKind::SeriesResistance(value) => {
                    self.lower_as(scope, value, Dimension::RESISTANCE).map(Loss::Series)
                }
                AttributeKind::LossTangent(value) => {
                    self.lower_as(scope, value, Dimension::NONE).map(Loss::Tangent)
                }
            };
            let Some(found) = found else { continue };
            if loss.replace((found, span)).is_some() {
                self.errors.push(CircuitError::AttributeTwice { span });
            }
        }
        loss
    }

    /// Series resistance of a winding: R, or ωL/Q at the frequency of the measurement or at every
    /// frequency.
    fn winding_loss(&mut self, loss: Loss, inductance: FormulaId, span: Span) -> Option<FormulaId> {
        match loss {
            Loss::Series(resistance) => Some(resistance),
            Loss::Quality { q, at } => {
                let f = at.unwrap_or_else(|| {
                    self.tape.push(Operation::Frequency, Dimension::FREQUENCY, span)
                });
                let omega = functions::angular(&mut self.tape, f, span);
                let reactance = self.product(omega, inductance, span)?;
                self.quotient(reactance, q, span)
            }
            Loss::Tangent(_) => {
                self.errors.push(CircuitError::TangentOfWinding { span });
                None
            }
        }
    }

    fn capacitor_loss(&mut self, loss: Loss, capacitance: FormulaId, span: Span) -> CapacitorLoss {
        let quotient_of_one = |work: &mut Self, below| {
            let one = Operation::Number(Decimal { mantissa: 1, exponent: 0 });
            let one = work.tape.push(one, Dimension::NONE, span);
            work.quotient(one, below, span)
        };
        match loss {
            Loss::Series(resistance) => CapacitorLoss::Series(resistance),
            Loss::Tangent(tangent) => CapacitorLoss::Tangent(tangent),
            Loss::Quality { q, at: None } => {
                quotient_of_one(self, q).map_or(CapacitorLoss::None, CapacitorLoss::Tangent)
            }
            Loss::Quality { q, at: Some(f) } => {
                let omega = functions::angular(&mut self.tape, f, span);
                let resistance = self
                    .product(omega, capacitance, span)
                    .and_then(|susceptance| self.product(susceptance, q, span))
                    .and_then(|below| quotient_of_one(self, below));
                resistance.map_or(CapacitorLoss::None, CapacitorLoss::Series)
            }
        }
    }

    /// Splits a source's value into a constant and parts in proportion to readings.
    fn drive(&mut self, value: FormulaId, end: End) -> Option<Drive> {
        let mut drive = Drive { constant: None, terms: Vec::new(), end };
        // What is left to unfold: a formula and the factor before it.
        let mut waiting = vec![(value, None)];
        let mut steps = 0;
        while let Some((id, factor)) = waiting.pop() {
            let formula = *self.tape.get(id);
            let span = formula.span;
            steps += 1;
            if steps > MOST_TERMS {
                self.errors.push(CircuitError::TooManyTerms { most: MOST_TERMS, span });
                return None;
            }
            if formula.phase != Phase::Solution {
                let term = self.scaled(factor, id, span)?;
                let dimension = self.tape.get(term).dimension;
                drive.constant = Some(match drive.constant {
                    None => term,
                    Some(sum) => self.tape.push(Operation::Sum(sum, term), dimension, span),
                });
                continue;
            }
            let solved = |id: FormulaId| self.tape.get(id).phase == Phase::Solution;
            match formula.operation {
                Operation::Sum(a, b) => waiting.extend([(b, factor), (a, factor)]),
                Operation::Difference(a, b) => {
                    let minus = self.negative(factor, span);
                    waiting.extend([(b, Some(minus)), (a, factor)]);
                }
                Operation::Negative(a) => {
                    let minus = self.negative(factor, span);
                    waiting.push((a, Some(minus)));
                }
                Operation::Product(a, b) if !solved(a) => {
                    waiting.push((b, Some(self.scaled(factor, a, span)?)));
                }
                Operation::Product(a, b) if !solved(b) => {
                    waiting.push((a, Some(self.scaled(factor, b, span)?)));
                }
                Operation::Quotient(a, b) if !solved(b) => {
                    let factor = self.scaled_one(factor, span);
                    waiting.push((a, Some(self.quotient(factor, b, span)?)));
                }
                Operation::WholePower(a, 1) => waiting.push((a, factor)),
                Operation::Measure(
                    measure @ (Measure::Volts(..) | Measure::Drop(_) | Measure::Amps(_)),
                ) => drive.terms.push((self.scaled_one(factor, span), measure)),
                _ => {
                    let whole = self.tape.get(value).span;
                    self.errors.push(CircuitError::NotLinear { span, whole });
                    return None;
                }
            }
        }
        Some(drive)
    }

    fn scaled(
        &mut self,
        factor: Option<FormulaId>,
        id: FormulaId,
        span: Span,
    ) -> Option<FormulaId> {
        match factor {
            None => Some(id),
            Some(factor) => self.product(factor, id, span),
        }
    }

    fn scaled_one(&mut self, factor: Option<FormulaId>, span: Span) -> FormulaId {
        factor.unwrap_or_else(|| {
            let one = Operation::Number(Decimal { mantissa: 1, exponent: 0 });
            self.tape.push(one, Dimension::NONE, span)
        })
    }

    fn negative(&mut self, factor: Option<FormulaId>, span: Span) -> FormulaId {
        let factor = self.scaled_one(factor, span);
        let dimension = self.tape.get(factor).dimension;
        self.tape.push(Operation::Negative(factor), dimension, span)
    }

    pub(super) fn lower_turns(
        &mut self,
        scope: ScopeId,
        turns: &'a [ast::Expr],
        windings: &[ElementId],
    ) {
        for (expr, &id) in turns.iter().zip(windings) {
            let Some(value) = self.lower_as(scope, expr, Dimension::NONE) else { continue };
            if let Law::IdealWinding { turns, .. } = &mut self.elements[id.index()].law {
                *turns = value;
            }
        }
    }
}

fn has_mark(element: &ast::Element) -> bool {
    element.left_mark.is_some() || element.right_mark.is_some()
}
