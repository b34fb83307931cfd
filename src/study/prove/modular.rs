//! One circuit over a finite field: the same formulas and stamps as the numeric path.

use crate::circuit::island::Regime;
use crate::circuit::{
    Circuit, Drive, ElementId, Fault, FormulaId, Law, Measure, Operation, Phase, Values,
};
use crate::number::residues::{Sample, Size};
use crate::number::{Field, FieldError, Function, Residues};
use crate::quantity::{Decimal, Dimension};
use crate::source::Span;
use crate::study::pair::Quantity;
use crate::study::prove::eliminate;
use crate::system::{System, Through};

/// An independent source.
pub(super) struct Source {
    pub name: String,
    pub voltage: bool,
    /// Its value as written.
    pub written: FormulaId,
    /// The formula that drives it.
    pub drives: FormulaId,
}

/// A circuit with its equations.
pub(super) struct Modular {
    circuit: Circuit,
    system: System,
    pub sources: Vec<Source>,
    of_frequency: Vec<FormulaId>,
    of_solution: Vec<FormulaId>,
}

/// Why a circuit has no solution in a field.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Trouble {
    /// The determinant vanishes there.
    Singular,
    /// A value does not exist there.
    Fault(Fault),
}

/// A circuit solved in a field.
pub(super) struct Solved<'m> {
    model: &'m Modular,
    values: Values<Sample>,
    solution: Vec<Sample>,
}

/// The values of a circuit's formulas before it is solved.
pub(super) struct Ready {
    pub values: Values<Sample>,
}

/// How large the determinant is, and whether opaque values have a part in it or in the drives.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Extent {
    pub size: Size,
    pub matrix_opaque: bool,
    pub drives_opaque: bool,
}

impl Modular {
    pub(super) fn new(circuit: &Circuit) -> Self {
        let mut circuit = circuit.clone();
        let mut sources = Vec::new();
        let Circuit { elements, tape, .. } = &mut circuit;
        for element in elements {
            let voltage = matches!(element.law, Law::VoltageSource(_));
            let (Law::VoltageSource(drive) | Law::CurrentSource(drive)) = &mut element.law else {
                continue;
            };
            let Some(written) = drive.constant else { continue };
            // Each source is driven by a formula of its own, so that it can be given any value.
            let one = Operation::Number(Decimal { mantissa: 1, exponent: 0 });
            let drives = tape.push(one, Dimension::NONE, Span::default());
            drive.constant = Some(drives);
            sources.push(Source { name: element.name.clone(), voltage, written, drives });
        }
        let system = System::new(&circuit, Regime::Alternating);
        Modular {
            of_frequency: system.tape.of_phase(Phase::Frequency),
            of_solution: system.tape.of_phase(Phase::Solution),
            circuit,
            system,
            sources,
        }
    }

    /// The values of all formulas that do not read the solution.
    pub(super) fn ready(&self, field: &Residues) -> Ready {
        let mut values = self.system.tape.evaluate_constants(field);
        let f = field.frequency();
        self.system.tape.evaluate_phase(field, &self.of_frequency, &f, &mut values, |_| {
            Err(FieldError::Undecided)
        });
        for source in &self.sources {
            values[source.drives.index()] = values[source.written.index()].clone();
        }
        Ready { values }
    }

    /// Solves the circuit and evaluates its readings.
    pub(super) fn solve(
        &self,
        field: &Residues,
        ready: Ready,
    ) -> (Extent, Result<Solved<'_>, Trouble>) {
        let zero = field.decimal(Decimal { mantissa: 0, exponent: 0 });
        let n = self.system.unknowns.len();
        let mut entries = vec![zero.clone(); self.system.row.len()];
        let mut rhs = vec![zero; n];
        let Ready { values } = ready;
        if let Err(fault) = self.system.assemble(field, &values, &mut entries, &mut rhs) {
            return (Extent::default(), Err(Trouble::Fault(fault)));
        }
        let extent = self.extent(&entries, &rhs);
        let residues = |samples: &[Sample]| samples.iter().map(|s| s.residue).collect::<Vec<_>>();
        let solution = eliminate::solve(
            field.prime(),
            &self.system.column_start,
            &self.system.row,
            &residues(&entries),
            &residues(&rhs),
        );
        let Some(solution) = solution else { return (extent, Err(Trouble::Singular)) };
        let opaque = extent.matrix_opaque || extent.drives_opaque;
        let unknown = |residue| Sample { residue, exact: None, opaque, size: extent.size };
        let solution = solution.into_iter().map(unknown).collect();
        let mut solved = Solved { model: self, values, solution };
        solved.evaluate_readings(field);
        (extent, Ok(solved))
    }

    /// Rows are multiplied by the denominators of their entries, so each row's polynomials are no
    /// larger than the product of all in it; the determinant, also with one column replaced by the
    /// right-hand side, is a sum of products of one entry a row.
    fn extent(&self, entries: &[Sample], rhs: &[Sample]) -> Extent {
        let mut rows: Vec<(Size, f64)> = rhs.iter().map(|b| (b.size, 1.0)).collect();
        for (entry, &row) in entries.iter().zip(&self.system.row) {
            rows[row] = (rows[row].0.times(entry.size), rows[row].1 + 1.0);
        }
        let size = rows.iter().fold(Size::default(), |total, (row, count)| {
            total.times(Size { degree: row.degree, bits: row.bits + count.log2() })
        });
        Extent {
            size,
            matrix_opaque: entries.iter().any(|e| e.opaque),
            drives_opaque: rhs.iter().any(|b| b.opaque),
        }
    }

    /// The elements whose values, and the couplings whose windings, use measured data.
    pub(super) fn not_lumped(&self) -> Vec<String> {
        let tape = &self.circuit.tape;
        let mut measured = vec![false; tape.len()];
        for (id, formula) in tape.iter() {
            let inherited = formula.operation.operands().any(|o| measured[o.index()]);
            measured[id.index()] = inherited || matches!(formula.operation, Operation::Table(..));
        }
        // Sources stand for any value when they are the same in both circuits.
        let written = |id: FormulaId| {
            self.sources.iter().find(|s| s.drives == id).map_or(id, |source| source.written)
        };
        let mut names: Vec<_> = Vec::new();
        for element in &self.circuit.elements {
            if values_of(&element.law).into_iter().any(|id| measured[written(id).index()]) {
                names.push(element.name.clone());
            }
        }
        for coupling in &self.circuit.couplings {
            let values = std::iter::once(coupling.mutual).chain(coupling.resistance);
            if values.into_iter().any(|id| measured[id.index()]) {
                let name = |id: ElementId| &self.circuit.element(id).name;
                names.push(format!("{} with {}", name(coupling.first), name(coupling.second)));
            }
        }
        names
    }
}

fn values_of(law: &Law) -> Vec<FormulaId> {
    use crate::circuit::CapacitorLoss as Loss;
    match law {
        Law::Resistor { resistance } => vec![*resistance],
        Law::Conductance { conductance } => vec![*conductance],
        Law::Winding { inductance, series, .. } => {
            std::iter::once(*inductance).chain(*series).collect()
        }
        Law::Capacitor { capacitance, loss } => match loss {
            Loss::None => vec![*capacitance],
            Loss::Series(value) | Loss::Tangent(value) => vec![*capacitance, *value],
        },
        Law::VoltageSource(drive) | Law::CurrentSource(drive) => drive
            .constant
            .into_iter()
            .chain(drive.terms.iter().map(|(factor, _)| *factor))
            .collect(),
        Law::IdealWinding { turns, .. } => vec![*turns],
        Law::OpAmp { .. } => Vec::new(),
    }
}

impl Solved<'_> {
    fn evaluate_readings(&mut self, field: &Residues) {
        let f = field.frequency();
        let tape = &self.model.system.tape;
        for &id in &self.model.of_solution {
            let value = match tape.get(id).operation {
                Operation::Measure(measure) => {
                    self.measure(field, measure).map_err(|error| Fault { at: id, error })
                }
                _ => {
                    let no_measure = |_| Err(FieldError::Undecided);
                    tape.evaluate_phase(field, &[id], &f, &mut self.values, no_measure);
                    continue;
                }
            };
            self.values[id.index()] = value;
        }
    }

    /// The value of a quantity.
    pub(super) fn read(&self, field: &Residues, quantity: Quantity) -> Result<Sample, FieldError> {
        match quantity {
            Quantity::Measure(measure) => self.measure(field, measure),
            Quantity::Formula(id) => self.value(id),
        }
    }

    fn value(&self, id: FormulaId) -> Result<Sample, FieldError> {
        self.values[id.index()].clone().map_err(|fault| fault.error)
    }

    fn node(&self, field: &Residues, node: crate::circuit::NodeId) -> Sample {
        match self.model.system.of_node[node.index()] {
            Some(unknown) => self.solution[unknown as usize].clone(),
            None => field.decimal(Decimal { mantissa: 0, exponent: 0 }),
        }
    }

    fn between(
        &self,
        field: &Residues,
        a: crate::circuit::NodeId,
        b: crate::circuit::NodeId,
    ) -> Result<Sample, FieldError> {
        match self.model.system.islands.same(a, b) {
            true => Ok(field.sub(&self.node(field, a), &self.node(field, b))),
            false => Err(FieldError::Domain),
        }
    }

    fn measure(&self, field: &Residues, measure: Measure) -> Result<Sample, FieldError> {
        let drop = |id: ElementId| {
            let element = self.model.circuit.element(id);
            self.between(field, element.left, element.right)
        };
        match measure {
            Measure::Volts(node, None) => Ok(self.node(field, node)),
            Measure::Volts(node, Some(to)) => self.between(field, node, to),
            Measure::Drop(id) => drop(id),
            Measure::Amps(id) => self.current(field, id),
            Measure::Power(id) => {
                let conjugate = field.function(Function::Conj, &[self.current(field, id)?])?;
                Ok(field.mul(&drop(id)?, &conjugate))
            }
        }
    }

    fn current(&self, field: &Residues, id: ElementId) -> Result<Sample, FieldError> {
        let element = self.model.circuit.element(id);
        match (self.model.system.through[id.index()], &element.law) {
            (Through::Unknown(unknown), _) => Ok(self.solution[unknown as usize].clone()),
            (Through::Admittance(y), _) => {
                let drop = self.between(field, element.left, element.right)?;
                Ok(field.mul(&self.value(y)?, &drop))
            }
            (Through::Given, Law::CurrentSource(drive)) => self.given(field, drive),
            (Through::Given, _) => Err(FieldError::Undecided),
        }
    }

    fn given(&self, field: &Residues, drive: &Drive) -> Result<Sample, FieldError> {
        let mut sum = match drive.constant {
            Some(id) => self.value(id)?,
            None => field.decimal(Decimal { mantissa: 0, exponent: 0 }),
        };
        for &(factor, measure) in &drive.terms {
            let term = field.mul(&self.value(factor)?, &self.measure(field, measure)?);
            sum = field.add(&sum, &term);
        }
        Ok(if drive.end.sign() < 0 { field.neg(&sum) } else { sum })
    }
}
