//! Couplings: every way of stating one becomes a mutual inductance for currents into the dots.

use crate::circuit::elaborate::{Elaborator, ScopeId};
use crate::circuit::error::CircuitError;
use crate::circuit::formula::{FormulaId, Operation};
use crate::circuit::{Coupling, ElementId, Law, Stated};
use crate::number::Function;
use crate::quantity::{Decimal, Dimension};
use crate::source::Span;
use crate::text::ast::{self, Couple};

/// A coupling as stated, lowered.
enum How {
    Factor(FormulaId),
    Mutual { inductance: FormulaId, resistance: Option<FormulaId> },
    Leakage { value: FormulaId, at: ElementId },
    Series { aiding: FormulaId, opposing: FormulaId },
}

impl<'a> Elaborator<'a> {
    pub(super) fn lower_couple(&mut self, scope: ScopeId, couple: &'a Couple, span: Span) {
        match couple {
            Couple::Stated { windings, how } => self.lower_stated(scope, windings, how, span),
            Couple::FromFile(file) => self.lower_from_file(scope, file),
        }
    }

    fn lower_stated(
        &mut self,
        scope: ScopeId,
        names: &'a [ast::Name],
        how: &'a ast::Coupling,
        span: Span,
    ) {
        let windings: Vec<_> = names.iter().map(|name| self.winding(scope, name)).collect();
        let Some(how) = self.lower_how(scope, how) else { return };
        let Some(windings) = windings.into_iter().collect::<Option<Vec<_>>>() else { return };
        if matches!(how, How::Leakage { .. } | How::Series { .. }) && windings.len() != 2 {
            return self.errors.push(CircuitError::ReadingOfPair { given: windings.len(), span });
        }
        for (i, &first) in windings.iter().enumerate() {
            for &second in &windings[i + 1..] {
                self.couple_pair(first, second, &how, span);
            }
        }
    }

    fn lower_how(&mut self, scope: ScopeId, how: &'a ast::Coupling) -> Option<How> {
        use ast::Coupling as C;
        let inductance = Dimension::INDUCTANCE;
        Some(match how {
            C::Factor(k) => How::Factor(self.lower_as(scope, k, Dimension::NONE)?),
            C::Mutual { inductance: value, resistance } => {
                let value = self.lower_as(scope, value, inductance);
                let resistance = match resistance {
                    None => None,
                    Some(r) => Some(self.lower_as(scope, r, Dimension::RESISTANCE)?),
                };
                How::Mutual { inductance: value?, resistance }
            }
            C::Leakage { value, at } => {
                let value = self.lower_as(scope, value, inductance);
                How::Leakage { at: self.known_element(scope, at)?, value: value? }
            }
            C::Series { aiding, opposing } => {
                let aiding = self.lower_as(scope, aiding, inductance);
                let opposing = self.lower_as(scope, opposing, inductance);
                How::Series { aiding: aiding?, opposing: opposing? }
            }
        })
    }

    /// The winding a name means; says so if it is none, or lacks its dot.
    fn winding(&mut self, scope: ScopeId, name: &ast::Name) -> Option<(ElementId, FormulaId)> {
        let id = self.known_element(scope, name)?;
        let element = &self.elements[id.index()];
        match element.law {
            Law::Winding { inductance, dot: Some(_), .. } => return Some((id, inductance)),
            Law::Winding { .. } => {
                let (name, span) = (element.name.clone(), element.span);
                let said = |e: &CircuitError| matches!(e, CircuitError::MissingDot { span: s, .. } if *s == span);
                if !self.errors.iter().any(said) {
                    self.errors.push(CircuitError::MissingDot { name, span });
                }
            }
            // Its value was wrong, and has been reported.
            _ if !self.known_law[id.index()] => {}
            _ => {
                let (element_name, defined) = (element.name.clone(), element.span);
                let span = name.span;
                self.errors.push(CircuitError::NotAWinding { name: element_name, span, defined });
            }
        }
        None
    }

    fn couple_pair(
        &mut self,
        (first, l_first): (ElementId, FormulaId),
        (second, l_second): (ElementId, FormulaId),
        how: &How,
        span: Span,
    ) {
        if first == second {
            let name = self.elements[first.index()].name.clone();
            return self.errors.push(CircuitError::CoupledToItself { name, span });
        }
        let pair = (first.min(second), first.max(second));
        if let Some(&old) = self.coupled.get(&pair) {
            let name = |id: ElementId| self.elements[id.index()].name.clone();
            let (a, b) = (name(first), name(second));
            return self.errors.push(CircuitError::CoupledTwice { a, b, span, first: old });
        }
        self.coupled.insert(pair, span);
        let made = match *how {
            How::Mutual { inductance, resistance } => {
                Some((inductance, resistance, Stated::Mutual))
            }
            How::Factor(k) => self
                .mean_inductance(l_first, l_second, span)
                .and_then(|mean| self.product(k, mean, span))
                .map(|m| (m, None, Stated::Factor(k))),
            How::Leakage { at, .. } if at != first && at != second => {
                let name = self.elements[at.index()].name.clone();
                return self.errors.push(CircuitError::LeakageElsewhere { name, span });
            }
            How::Leakage { value, at } => {
                let (here, other) =
                    if at == first { (l_first, l_second) } else { (l_second, l_first) };
                let inductance = Dimension::INDUCTANCE;
                let left = self.tape.push(Operation::Difference(here, value), inductance, span);
                self.mean_inductance(other, left, span)
                    .map(|m| (m, None, Stated::Leakage { value, at }))
            }
            How::Series { aiding, opposing } => {
                let inductance = Dimension::INDUCTANCE;
                let fourfold =
                    self.tape.push(Operation::Difference(aiding, opposing), inductance, span);
                let four = Operation::Number(Decimal { mantissa: 4, exponent: 0 });
                let four = self.tape.push(four, Dimension::NONE, span);
                self.quotient(fourfold, four, span)
                    .map(|m| (m, None, Stated::Series { aiding, opposing }))
            }
        };
        if let Some((mutual, resistance, stated)) = made {
            self.couplings.push(Coupling { first, second, mutual, resistance, stated, span });
        }
    }

    /// √(a·b)
    fn mean_inductance(&mut self, a: FormulaId, b: FormulaId, span: Span) -> Option<FormulaId> {
        let square = self.product(a, b, span)?;
        let root = Operation::Call(Function::Sqrt, square);
        Some(self.tape.push(root, Dimension::INDUCTANCE, span))
    }

    fn lower_from_file(&mut self, scope: ScopeId, file: &'a ast::Text) {
        let Some(&source) = self.input.data.get(&file.span) else { return };
        let rows = match crate::circuit::table::read_couplings(source, self.input.sources) {
            Ok(rows) => rows,
            Err(error) => return self.errors.push(error),
        };
        for row in rows {
            let name = |text: &str| ast::Name { text: text.into(), span: row.span };
            let first = self.winding(scope, &name(&row.first));
            let second = self.winding(scope, &name(&row.second));
            let (Some(first), Some(second)) = (first, second) else { continue };
            let number = Operation::Number(Decimal::from_f64(row.mutual));
            let inductance = Dimension::INDUCTANCE;
            let mut mutual = self.tape.push(number, inductance, row.span);
            if row.mutual < 0.0 {
                mutual = self.tape.push(Operation::Negative(mutual), inductance, row.span);
            }
            let how = How::Mutual { inductance: mutual, resistance: None };
            self.couple_pair(first, second, &how, row.span);
        }
    }
}
