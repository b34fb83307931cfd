//! Formulas as text: the value stays the same to the last digit.

use crate::circuit::print::names::Names;
use crate::circuit::{Circuit, Formula, FormulaId, Operation, Phase};
use crate::number::Function;
use crate::quantity::{Decimal, Dimension};
use std::collections::HashMap;

/// Formulas used in several places get a `let` of their own from this many operations on.
const SHARED_FROM: u64 = 6;

/// Formulas nested deeper than this get a `let` of their own.
const DEEPEST: u32 = 24;

/// How tightly a text holds together; what binds less is bracketed.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Binding {
    Sum,
    Product,
    /// A power, or a number with a unit.
    Tight,
    Atom,
}

/// Which formulas have names.
pub(super) struct Formulas<'c> {
    circuit: &'c Circuit,
    /// Name of each formula that has one.
    name_of: HashMap<FormulaId, String>,
    /// Generated `let`s, in an order in which each uses only those before it.
    made: Vec<(String, FormulaId)>,
}

/// A chain of operations of one kind that is written without brackets.
#[derive(Clone, Copy, PartialEq)]
enum Chain {
    Sum,
    Product,
    Fold(Function),
    None,
}

fn chain(operation: Operation) -> Chain {
    match operation {
        Operation::Sum(..) | Operation::Difference(..) => Chain::Sum,
        Operation::Product(..) | Operation::Quotient(..) => Chain::Product,
        Operation::Call2(function @ (Function::Min | Function::Max), ..) => Chain::Fold(function),
        _ => Chain::None,
    }
}

impl<'c> Formulas<'c> {
    pub(super) fn new(circuit: &'c Circuit, names: &Names, roots: &[FormulaId]) -> Self {
        let mut name_of = HashMap::new();
        for (position, (_, id)) in circuit.lets.iter().enumerate() {
            name_of.entry(*id).or_insert_with(|| names.let_name(position).to_owned());
        }
        let mut formulas = Formulas { circuit, name_of, made: Vec::new() };
        formulas.name_shared(names, roots);
        formulas
    }

    /// Gives names to what would be written out many times, or nested too deep.
    fn name_shared(&mut self, names: &Names, roots: &[FormulaId]) {
        let tape = &self.circuit.tape;
        let mut uses = vec![0u32; tape.len()];
        roots.iter().for_each(|id| uses[id.index()] += 1);
        let all: Vec<(FormulaId, Formula)> = tape.iter().map(|(id, f)| (id, *f)).collect();
        for (id, formula) in all.iter().rev() {
            if uses[id.index()] > 0 {
                formula.operation.operands().for_each(|o| uses[o.index()] += 1);
            }
        }
        let mut size = vec![1u64; tape.len()];
        let mut depth = vec![1u32; tape.len()];
        for (id, formula) in all.iter().filter(|(id, _)| uses[id.index()] > 0) {
            let own = chain(formula.operation);
            for (place, operand) in formula.operation.operands().enumerate() {
                if self.name_of.contains_key(&operand) {
                    continue;
                }
                let flat = place == 0 && own != Chain::None && own == self.chain_of(operand);
                let deeper = depth[operand.index()] + u32::from(!flat);
                depth[id.index()] = depth[id.index()].max(deeper);
                size[id.index()] = size[id.index()].saturating_add(size[operand.index()]);
            }
            let shared = uses[id.index()] > 1 && size[id.index()] >= SHARED_FROM;
            let deep = depth[id.index()] > DEEPEST;
            let known = formula.phase != Phase::Solution;
            if (shared || deep) && known && !self.name_of.contains_key(id) {
                let mut number = self.made.len() + 1;
                while !names.is_free_let(&format!("part_{number}")) {
                    number += all.len();
                }
                let name = format!("part_{number}");
                self.name_of.insert(*id, name.clone());
                self.made.push((name, *id));
            }
        }
    }

    fn chain_of(&self, id: FormulaId) -> Chain {
        chain(self.circuit.tape.get(id).operation)
    }

    /// Every `let` with its value.
    pub(super) fn lets(&self, names: &Names) -> Vec<(String, String)> {
        let own = self.circuit.lets.iter().enumerate().map(|(position, (_, id))| {
            let name = names.let_name(position);
            let value = match self.name_of.get(id) {
                Some(first) if first != name => first.clone(),
                _ => self.definition(names, *id),
            };
            (name.to_owned(), value)
        });
        let made = self.made.iter().map(|(name, id)| (name.clone(), self.definition(names, *id)));
        own.chain(made).collect()
    }

    pub(super) fn has_name(&self, id: FormulaId) -> bool {
        self.name_of.contains_key(&id)
    }

    pub(super) fn text(&self, names: &Names, id: FormulaId) -> String {
        self.bound(names, id, Binding::Sum)
    }

    /// As [`Self::text`], to stand in a product or beside a sum.
    pub(super) fn term(&self, names: &Names, id: FormulaId) -> String {
        self.bound(names, id, Binding::Product)
    }

    /// As [`Self::text`], to stand between colons.
    pub(super) fn factor(&self, names: &Names, id: FormulaId) -> String {
        self.bound(names, id, Binding::Atom)
    }

    /// As [`Self::text`]; a plain number is written in percent.
    pub(super) fn percent(&self, names: &Names, id: FormulaId) -> String {
        match self.circuit.tape.get(id).operation {
            Operation::Number(value) if !self.has_name(id) => {
                let exponent = value.exponent.saturating_add(2);
                format!("{}%", plain(Decimal { exponent, ..value }))
            }
            _ => self.text(names, id),
        }
    }

    pub(super) fn definition(&self, names: &Names, id: FormulaId) -> String {
        self.write(names, id).0
    }

    /// The frequency of 2π times a frequency.
    pub(super) fn frequency_of(&self, omega: FormulaId) -> Option<FormulaId> {
        let operation = |id| self.circuit.tape.get(id).operation;
        let two = |id| matches!(operation(id), Operation::Number(d) if d.to_f64() == 2.0);
        match operation(omega) {
            Operation::Product(turn, at) => match operation(turn) {
                Operation::Product(a, b) if two(a) && operation(b) == Operation::Pi => Some(at),
                _ => None,
            },
            _ => None,
        }
    }

    fn bound(&self, names: &Names, id: FormulaId, least: Binding) -> String {
        if let Some(name) = self.name_of.get(&id) {
            return name.clone();
        }
        let (text, binding) = self.write(names, id);
        if binding < least { format!("({text})") } else { text }
    }

    fn write(&self, names: &Names, id: FormulaId) -> (String, Binding) {
        use Operation as O;
        let tape = &self.circuit.tape;
        let formula = tape.get(id);
        match formula.operation {
            O::Number(value) => number(value, formula.dimension),
            O::Pi => ("pi".into(), Binding::Atom),
            O::ImaginaryUnit => ("j".into(), Binding::Atom),
            O::Frequency => ("f".into(), Binding::Atom),
            O::Negative(a) => (format!("-{}", self.bound(names, a, Binding::Tight)), Binding::Sum),
            O::Sum(..) | O::Difference(..) => (self.write_chain(names, id), Binding::Sum),
            O::Product(a, b) => {
                if let Some(phasor) = self.phasor(names, a, b) {
                    return (phasor, Binding::Tight);
                }
                if let Some(unit) = self.with_unit(names, a, b) {
                    return (unit, Binding::Tight);
                }
                (self.write_chain(names, id), Binding::Product)
            }
            O::Quotient(..) => match self.parallel(id) {
                Some(arguments) => {
                    let arguments: Vec<_> =
                        arguments.iter().map(|&a| self.text(names, a)).collect();
                    (format!("parallel({})", arguments.join(", ")), Binding::Atom)
                }
                None => (self.write_chain(names, id), Binding::Product),
            },
            O::WholePower(a, n) => {
                let exponent = if n < 0 { format!("({n})") } else { n.to_string() };
                (format!("{}^{exponent}", self.bound(names, a, Binding::Atom)), Binding::Tight)
            }
            O::Power(a, b) => {
                let [a, b] = [a, b].map(|id| self.bound(names, id, Binding::Atom));
                (format!("{a}^{b}"), Binding::Tight)
            }
            O::Call(function, a) => {
                (format!("{}({})", name_of(function), self.text(names, a)), Binding::Atom)
            }
            O::Call2(Function::Min | Function::Max, ..) => {
                (self.write_chain(names, id), Binding::Atom)
            }
            O::Call2(function, a, b) => {
                let [a, b] = [a, b].map(|id| self.text(names, id));
                (format!("{}({a}, {b})", name_of(function)), Binding::Atom)
            }
            O::Table(table, a) => {
                let file = &tape.tables[table.0 as usize].file;
                (format!("table(\"{file}\", {})", self.text(names, a)), Binding::Atom)
            }
            O::Measure(measure) => (names.measure(measure), Binding::Atom),
        }
    }

    /// A chain `a + b − c …`, `a · b / c …` or `min(a, b, …)`; it may be any length, so the stack
    /// is not used for it.
    fn write_chain(&self, names: &Names, id: FormulaId) -> String {
        use Operation as O;
        let kind = self.chain_of(id);
        let mut reversed = Vec::new();
        let mut at = id;
        let first = loop {
            let (left, sign, right) = match self.circuit.tape.get(at).operation {
                O::Sum(a, b) => (a, " + ", b),
                O::Difference(a, b) => (a, " - ", b),
                O::Product(a, b) => (a, " * ", b),
                O::Quotient(a, b) => (a, " / ", b),
                O::Call2(_, a, b) => (a, ", ", b),
                _ => break at,
            };
            reversed.push((sign, right));
            if self.has_name(left) || self.chain_of(left) != kind || self.is_special(left) {
                break left;
            }
            at = left;
        };
        let (least_first, least) = match kind {
            Chain::Sum => (Binding::Sum, Binding::Product),
            Chain::Product => (Binding::Product, Binding::Tight),
            _ => (Binding::Sum, Binding::Sum),
        };
        let mut out = self.bound(names, first, least_first);
        for (sign, right) in reversed.into_iter().rev() {
            out += sign;
            out += &self.bound(names, right, least);
        }
        match kind {
            Chain::Fold(function) => format!("{}({out})", name_of(function)),
            _ => out,
        }
    }

    /// Written in a way of its own, so no link of a chain.
    fn is_special(&self, id: FormulaId) -> bool {
        match self.circuit.tape.get(id).operation {
            Operation::Product(a, b) => self.is_phasor(a, b).is_some() || self.is_unit(a, b),
            Operation::Quotient(..) => self.parallel(id).is_some(),
            _ => false,
        }
    }

    /// The angle in degrees and whether it is negative, of size · exp(j · degrees · (π / 180)).
    fn is_phasor(&self, _size: FormulaId, turn: FormulaId) -> Option<(Decimal, bool)> {
        use Operation as O;
        let operation = |id| self.circuit.tape.get(id).operation;
        let unnamed = |id: &FormulaId| !self.has_name(*id);
        let O::Call(Function::Exp, power) = operation(Some(turn).filter(unnamed)?) else {
            return None;
        };
        let O::Product(j, angle) = operation(Some(power).filter(unnamed)?) else { return None };
        let (angle, negative) = match operation(Some(angle).filter(unnamed)?) {
            O::Negative(inner) => (Some(inner).filter(unnamed)?, true),
            _ => (angle, false),
        };
        let O::Product(value, degree) = operation(angle) else { return None };
        let (O::Number(value), O::Quotient(pi, half_turn)) = (operation(value), operation(degree))
        else {
            return None;
        };
        let half = matches!(operation(half_turn), O::Number(d) if d.to_f64() == 180.0);
        let matches = operation(j) == O::ImaginaryUnit && operation(pi) == O::Pi && half;
        matches.then_some((value, negative))
    }

    fn phasor(&self, names: &Names, size: FormulaId, turn: FormulaId) -> Option<String> {
        let (degrees, negative) = self.is_phasor(size, turn)?;
        let size = self.bound(names, size, Binding::Tight);
        let minus = if negative { "-" } else { "" };
        Some(format!("{size} ∠ {minus}{}°", plain(degrees)))
    }

    /// A plain value times one unit: `(3 + 4 * j) mΩ`.
    fn is_unit(&self, value: FormulaId, unit: FormulaId) -> bool {
        let tape = &self.circuit.tape;
        let none = Dimension::NONE;
        let (value_is_plain, formula) = (tape.get(value).dimension == none, tape.get(unit));
        let one = matches!(formula.operation, Operation::Number(d)
            if normal(d).mantissa == 1 && normal(d).exponent % 3 == 0);
        // Products go on: `2 * pi * 1 kHz`.
        let bare = match tape.get(value).operation {
            Operation::Number(_) => false,
            _ => self.has_name(value) || self.chain_of(value) != Chain::Product,
        };
        value_is_plain
            && one
            && bare
            && !self.has_name(unit)
            && formula.dimension != none
            && formula.dimension.usual_unit().is_some()
    }

    fn with_unit(&self, names: &Names, value: FormulaId, unit: FormulaId) -> Option<String> {
        if !self.is_unit(value, unit) {
            return None;
        }
        let formula = self.circuit.tape.get(unit);
        let Operation::Number(one) = formula.operation else { return None };
        let prefix = prefix(normal(one).exponent)?;
        let value = self.text(names, value);
        Some(format!("({value}) {prefix}{}", formula.dimension.usual_unit()?))
    }

    /// The arguments of a·b/(a + b), folded.
    fn parallel(&self, id: FormulaId) -> Option<Vec<FormulaId>> {
        let operation = |id| self.circuit.tape.get(id).operation;
        let mut reversed = Vec::new();
        let mut at = id;
        while reversed.is_empty() || !self.has_name(at) {
            let Operation::Quotient(product, sum) = operation(at) else { break };
            let (Operation::Product(a, b), Operation::Sum(c, d)) =
                (operation(product), operation(sum))
            else {
                break;
            };
            if (a, b) != (c, d) || self.has_name(product) || self.has_name(sum) {
                break;
            }
            reversed.push(b);
            at = a;
        }
        if reversed.is_empty() {
            return None;
        }
        reversed.push(at);
        reversed.reverse();
        Some(reversed)
    }
}

fn name_of(function: Function) -> &'static str {
    use Function as F;
    match function {
        F::Sqrt => "sqrt",
        F::Exp => "exp",
        F::Ln => "ln",
        F::Log10 => "log10",
        F::Abs => "abs",
        F::Arg => "arg",
        F::Re => "re",
        F::Im => "im",
        F::Conj => "conj",
        F::Min => "min",
        F::Max => "max",
        F::Sin => "sin",
        F::Cos => "cos",
        F::Tan => "tan",
        F::Asin => "asin",
        F::Acos => "acos",
        F::Atan => "atan",
        F::Atan2 => "atan2",
    }
}

/// Without zeros at the end.
fn normal(mut value: Decimal) -> Decimal {
    if value.mantissa == 0 {
        return Decimal { mantissa: 0, exponent: 0 };
    }
    while value.mantissa.is_multiple_of(10) {
        value.mantissa /= 10;
        value.exponent = value.exponent.saturating_add(1);
    }
    value
}

fn prefix(exponent: i32) -> Option<&'static str> {
    const PREFIXES: [&str; 10] = ["f", "p", "n", "µ", "m", "", "k", "M", "G", "T"];
    let place = (exponent.checked_add(15)?) / 3;
    (exponent % 3 == 0 && exponent >= -15).then(|| PREFIXES.get(place as usize).copied())?
}

/// A decimal with all its digits; with a power of ten only where it would be long.
fn plain(value: Decimal) -> String {
    let value = normal(value);
    let digits = value.mantissa.to_string();
    let point = i64::from(value.exponent) + digits.len() as i64;
    match point {
        _ if value.mantissa == 0 => "0".into(),
        -5..=0 => format!("0.{}{digits}", "0".repeat(-point as usize)),
        1..=15 if (point as usize) < digits.len() => {
            format!("{}.{}", &digits[..point as usize], &digits[point as usize..])
        }
        1..=15 => format!("{digits}{}", "0".repeat(point as usize - digits.len())),
        _ if digits.len() == 1 => format!("{digits}e{}", point - 1),
        _ => format!("{}.{}e{}", &digits[..1], &digits[1..], point - 1),
    }
}

/// A number with its unit, prefixed where the unit has a name of its own.
fn number(value: Decimal, dimension: Dimension) -> (String, Binding) {
    if dimension == Dimension::NONE {
        return (plain(value), Binding::Atom);
    }
    let value = normal(value);
    if let Some(unit) = dimension.usual_unit() {
        let digits = value.mantissa.to_string().len() as i64;
        let leading = i64::from(value.exponent) + digits - 1;
        let steps = if value.mantissa == 0 { 0 } else { 3 * leading.div_euclid(3) };
        if let Some(prefix) = i32::try_from(steps).ok().and_then(prefix) {
            let shifted = Decimal { exponent: value.exponent - steps as i32, ..value };
            return (format!("{} {prefix}{unit}", plain(shifted)), Binding::Tight);
        }
        return (format!("{} {unit}", plain(value)), Binding::Tight);
    }
    let over_metre = dimension.times(Dimension::LENGTH).and_then(Dimension::usual_unit);
    if let Some(unit) = over_metre.filter(|unit| !unit.is_empty()) {
        return (format!("{} {unit}/m", plain(value)), Binding::Tight);
    }
    let unit = dimension.to_string();
    match unit.strip_prefix("1/") {
        None => (format!("{} {unit}", plain(value)), Binding::Tight),
        Some(_) => {
            let below = Dimension::NONE.over(dimension).unwrap_or_default();
            (format!("{} / (1 {below})", plain(value)), Binding::Product)
        }
    }
}

#[cfg(test)]
mod tests {
    use crate::circuit::print::formula::{number, plain};
    use crate::quantity::{Decimal, Dimension};

    #[test]
    fn every_digit_of_a_number_is_written() {
        let decimal = |mantissa, exponent| Decimal { mantissa, exponent };
        assert_eq!(plain(decimal(240, 0)), "240");
        assert_eq!(plain(decimal(123, -2)), "1.23");
        assert_eq!(plain(decimal(123, -5)), "0.00123");
        assert_eq!(plain(decimal(123, -40)), "1.23e-38");
        assert_eq!(plain(decimal(u128::MAX, -38)), "3.40282366920938463463374607431768211455");
        assert_eq!(number(decimal(24, -5), Dimension::INDUCTANCE).0, "240 µH");
        assert_eq!(number(decimal(1, -30), Dimension::INDUCTANCE).0, "1e-30 H");
        assert_eq!(number(decimal(1, 9), Dimension::RESISTANCE).0, "1 GΩ");
        assert_eq!(number(decimal(0, 9), Dimension::RESISTANCE).0, "0 Ω");
        let per_metre = Dimension::INDUCTANCE.over(Dimension::LENGTH).unwrap();
        assert_eq!(number(decimal(1637, -9), per_metre).0, "0.000001637 H/m");
    }
}
