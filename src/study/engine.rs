//! A circuit made ready to be solved at many frequencies.

pub mod predict;

use crate::circuit::island::Regime;
use crate::circuit::{
    Circuit, Drive, ElementId, Fault, FormulaId, Law, Measure, NodeId, Operation, Phase, Values,
    judge,
};
use crate::number::{Ball, Balls};
use crate::number::{ComplexTwofold, Field, FieldError};
use crate::solve::{Pattern, SolveError, Solver, Trust};
use crate::study::{StudyError, Value, explain};
use crate::system::{System, Through};
use num_complex::Complex64;

/// Values whose relative radius is below this need no allowance of their own: it is far below
/// what a double can show.
const EXACT_ENOUGH: f64 = 1e-22;

/// A circuit in one regime with everything that is kept from one frequency to the next.
pub struct Engine<'c> {
    circuit: &'c Circuit,
    system: System,
    solver: Option<Solver>,
    /// The formulas to evaluate at each frequency, and after each solution.
    of_frequency: Vec<FormulaId>,
    of_solution: Vec<(FormulaId, Option<Measure>)>,
    measured: Vec<Option<Result<Ball, FieldError>>>,
    values: Values<Ball>,
    frequency: Ball,
    entries: Vec<Ball>,
    rhs: Vec<Ball>,
    exact_entries: Vec<ComplexTwofold>,
    exact_rhs: Vec<ComplexTwofold>,
    rounded: Vec<Complex64>,
    solution: Vec<ComplexTwofold>,
    error: Vec<f64>,
    input_radius: Vec<f64>,
    input_change: Vec<Complex64>,
}

impl<'c> Engine<'c> {
    /// Finds the equations and their pattern. Fails where they cannot have one solution.
    pub fn new(circuit: &'c Circuit, regime: Regime) -> Result<Self, StudyError> {
        let system = System::new(circuit, regime);
        let found = explain::graph(circuit, &system.islands, regime);
        if !found.is_empty() {
            return Err(StudyError::NoSolution(found));
        }
        let n = system.unknowns.len();
        let measure = |id: FormulaId| match system.tape.get(id).operation {
            Operation::Measure(measure) => Some(measure),
            _ => None,
        };
        let of_solution =
            system.tape.of_phase(Phase::Solution).into_iter().map(|id| (id, measure(id))).collect();
        let zero = Ball::exact(ComplexTwofold::ZERO);
        let entries = system.row.len();
        Ok(Engine {
            circuit,
            of_frequency: system.tape.of_phase(Phase::Frequency),
            of_solution,
            measured: Vec::new(),
            input_change: Vec::new(),
            input_radius: Vec::new(),
            values: system.tape.evaluate_constants(&Balls),
            frequency: zero,
            entries: vec![zero; entries],
            rhs: vec![zero; n],
            exact_entries: vec![ComplexTwofold::ZERO; entries],
            exact_rhs: vec![ComplexTwofold::ZERO; n],
            rounded: vec![Complex64::default(); entries],
            solution: vec![ComplexTwofold::ZERO; n],
            error: vec![0.0; n],
            system,
            solver: None,
        })
    }

    /// The equations.
    pub fn system(&self) -> &System {
        &self.system
    }

    /// Solves at one frequency and evaluates the readings.
    pub fn solve(&mut self, frequency_hz: f64) -> Result<(), StudyError> {
        self.frequency = Ball::exact(ComplexTwofold::from(Complex64::new(frequency_hz, 0.0)));
        let tape = &self.system.tape;
        tape.evaluate_phase(&Balls, &self.of_frequency, &self.frequency, &mut self.values, |_| {
            Err(FieldError::Undecided)
        });
        self.system
            .assemble(&Balls, &self.values, &mut self.entries, &mut self.rhs)
            .map_err(|fault| self.refuse(fault, frequency_hz))?;
        let exact = |balls: &[Ball], out: &mut [ComplexTwofold]| {
            balls.iter().zip(out).for_each(|(ball, out)| *out = ball.centre);
        };
        exact(&self.entries, &mut self.exact_entries);
        exact(&self.rhs, &mut self.exact_rhs);
        for (rounded, entry) in self.rounded.iter_mut().zip(&self.exact_entries) {
            *rounded = entry.to_complex();
        }
        if let Err(error) = self.factor_and_refine() {
            return Err(self.explain(error, frequency_hz));
        }
        self.allow_for_inputs();
        self.evaluate_readings();
        Ok(())
    }

    /// Takes over `unknowns` of a solution found elsewhere, each with its bound, and evaluates the
    /// readings. `needed` are the formulas of the frequency that they rest on.
    pub(crate) fn adopt(
        &mut self,
        frequency_hz: f64,
        needed: &[FormulaId],
        unknowns: &[u32],
        solution: impl Fn(usize) -> (ComplexTwofold, f64),
    ) {
        self.evaluate_at(frequency_hz, needed);
        for &unknown in unknowns {
            let at = unknown as usize;
            (self.solution[at], self.error[at]) = solution(at);
        }
        self.evaluate_readings();
    }

    /// Evaluates some formulas of the frequency.
    pub(crate) fn evaluate_at(&mut self, frequency_hz: f64, which: &[FormulaId]) {
        self.frequency = Ball::exact(ComplexTwofold::from(Complex64::new(frequency_hz, 0.0)));
        let none = |_| Err(FieldError::Undecided);
        let (tape, frequency) = (&self.system.tape, &self.frequency);
        tape.evaluate_phase(&Balls, which, frequency, &mut self.values, none);
    }

    /// The formulas of the frequency that the readings and the formulas `besides` rest on,
    /// operands first.
    pub(crate) fn needed_of_frequency(&self, besides: &[FormulaId]) -> Vec<FormulaId> {
        let tape = &self.system.tape;
        let mut waiting: Vec<FormulaId> = besides.to_vec();
        for read in &self.circuit.reads {
            waiting.push(read.value);
            waiting.extend(read.limits.iter().map(|limit| limit.value));
        }
        let mut seen = vec![false; tape.len()];
        while let Some(id) = waiting.pop() {
            if std::mem::replace(&mut seen[id.index()], true) {
                continue;
            }
            let operation = tape.get(id).operation;
            waiting.extend(operation.operands());
            if let Operation::Measure(measure) = operation {
                self.measure_rests_on(measure, &mut waiting);
            }
        }
        self.of_frequency.iter().copied().filter(|id| seen[id.index()]).collect()
    }

    fn measure_rests_on(&self, measure: Measure, formulas: &mut Vec<FormulaId>) {
        let (Measure::Amps(id) | Measure::Power(id)) = measure else { return };
        match self.system.through[id.index()] {
            Through::Unknown(_) => {}
            Through::Admittance(y) => formulas.push(y),
            Through::Given => {
                if let Law::CurrentSource(drive) = &self.circuit.element(id).law {
                    formulas.extend(drive.constant);
                    formulas.extend(drive.terms.iter().map(|(factor, _)| *factor));
                    // What drives a source may itself be a current, but one with an unknown.
                }
            }
        }
    }

    fn refuse(&self, fault: Fault, frequency_hz: f64) -> StudyError {
        // Formulas made for stamps carry the place of the value they were made from.
        let mut circuit = self.circuit.clone();
        circuit.tape = self.system.tape.clone();
        let mut error = judge::fault(&circuit, fault);
        error.message = format!("at {frequency_hz} Hz {}", error.message);
        StudyError::Refused(vec![error])
    }

    fn factor_and_refine(&mut self) -> Result<Option<Trust>, SolveError> {
        if self.system.unknowns.is_empty() {
            return Ok(None);
        }
        // Made when it is first needed: a sweep in lanes may never need it.
        let solver = match &mut self.solver {
            Some(solver) => solver,
            none => none.insert(Solver::new(Pattern {
                n: self.system.unknowns.len(),
                column_start: self.system.column_start.clone(),
                row: self.system.row.clone(),
            })?),
        };
        solver.factor(&self.rounded)?;
        solver
            .solve_refined(
                &self.exact_entries,
                &self.exact_rhs,
                &mut self.solution,
                &mut self.error,
            )
            .map(Some)
    }

    fn explain(&mut self, error: SolveError, frequency_hz: f64) -> StudyError {
        let null = self.solver.as_mut().map(Solver::null_vector);
        StudyError::NoSolution(explain::singular(
            self.circuit,
            &self.system,
            Some(frequency_hz),
            &error,
            null.as_deref(),
        ))
    }

    /// Widens the bounds where values are known only to a radius (a sine, a measured law): the
    /// change of the solution is A⁻¹·(δb − δA·x), estimated with two patterns of signs.
    fn allow_for_inputs(&mut self) {
        let loose = |ball: &Ball| ball.radius > EXACT_ENOUGH * ball.centre.norm();
        if !self.entries.iter().chain(&self.rhs).any(loose) {
            return;
        }
        let Some(solver) = &mut self.solver else { return };
        let n = self.solution.len();
        let off = &mut self.input_radius;
        off.clear();
        off.extend(self.rhs.iter().map(|ball| ball.radius));
        for column in 0..n {
            let size = self.solution[column].norm();
            for at in self.system.column_start[column]..self.system.column_start[column + 1] {
                off[self.system.row[at]] += self.entries[at].radius * size;
            }
        }
        for pattern in 0..2usize {
            let sign = |i: usize| if (i >> pattern) & 1 == 0 { 1.0 } else { -1.0 };
            let change = &mut self.input_change;
            change.clear();
            change.extend(off.iter().enumerate().map(|(i, r)| Complex64::new(sign(i) * r, 0.0)));
            solver.solve_in_place(change);
            for (error, change) in self.error.iter_mut().zip(change) {
                *error += 2.0 * change.norm();
            }
        }
    }

    fn evaluate_readings(&mut self) {
        // Measures read constants and admittances out of `values`, so all of them are taken
        // before the first formula of the solution is written there.
        let mut measured = std::mem::take(&mut self.measured);
        measured.clear();
        for &(_, measure) in &self.of_solution {
            measured.push(measure.map(|measure| self.measure(measure)));
        }
        let tape = &self.system.tape;
        for (&(id, _), measured) in self.of_solution.iter().zip(&measured) {
            match measured {
                Some(result) => {
                    self.values[id.index()] = result.map_err(|error| Fault { at: id, error });
                }
                None => {
                    tape.evaluate_phase(&Balls, &[id], &self.frequency, &mut self.values, |_| {
                        Err(FieldError::Undecided)
                    })
                }
            }
        }
        self.measured = measured;
    }

    /// The value of a formula at the frequency solved last.
    pub fn value(&self, id: FormulaId) -> Result<Ball, Fault> {
        self.values[id.index()]
    }

    /// Voltage of a node against the reference of its island.
    pub fn node(&self, node: NodeId) -> Ball {
        match self.system.of_node[node.index()] {
            Some(unknown) => self.unknown(unknown),
            None => Ball::exact(ComplexTwofold::ZERO),
        }
    }

    fn unknown(&self, unknown: u32) -> Ball {
        let at = unknown as usize;
        Ball { centre: self.solution[at], radius: self.error[at] }
    }

    /// The highest voltage anywhere: of a node against its reference, or across an element.
    pub fn highest_volts(&self) -> f64 {
        self.highest_volts_of(|unknown| self.solution[unknown as usize].to_complex())
    }

    /// The same of a solution found elsewhere, unknown by unknown.
    pub(crate) fn highest_volts_of(&self, solution: impl Fn(u32) -> Complex64) -> f64 {
        let node = |id: NodeId| self.system.of_node[id.index()].map_or(Complex64::ZERO, &solution);
        let nodes = (0..self.circuit.nodes.len()).map(|i| node(NodeId(i as u32)).norm_sqr());
        let tied = self
            .circuit
            .elements
            .iter()
            .filter(|element| self.system.islands.same(element.left, element.right));
        let drops = tied.map(|element| (node(element.left) - node(element.right)).norm_sqr());
        nodes.chain(drops).fold(0.0, f64::max).sqrt()
    }

    /// The unknowns that the readings, and what they measure, rest on.
    pub(crate) fn needed_unknowns(&self) -> Vec<u32> {
        let mut needed = Vec::new();
        for &(_, measure) in &self.of_solution {
            if let Some(measure) = measure {
                self.unknowns_of(measure, &mut needed);
            }
        }
        needed.sort_unstable();
        needed.dedup();
        needed
    }

    fn unknowns_of(&self, measure: Measure, needed: &mut Vec<u32>) {
        let node = |id: NodeId| self.system.of_node[id.index()];
        let ends = |id: ElementId| {
            let element = self.circuit.element(id);
            [node(element.left), node(element.right)].into_iter().flatten()
        };
        match measure {
            Measure::Volts(a, b) => needed.extend(node(a).into_iter().chain(b.and_then(node))),
            Measure::Drop(id) => needed.extend(ends(id)),
            Measure::Amps(id) | Measure::Power(id) => {
                needed.extend(ends(id));
                match (self.system.through[id.index()], &self.circuit.element(id).law) {
                    (Through::Unknown(unknown), _) => needed.push(unknown),
                    // What drives it is a voltage, or a current that is an unknown.
                    (Through::Given, Law::CurrentSource(drive)) => {
                        drive.terms.iter().for_each(|(_, term)| self.unknowns_of(*term, needed));
                    }
                    _ => {}
                }
            }
        }
    }

    /// Left minus right of an element; `None` where nothing ties its ends.
    pub fn drop(&self, id: ElementId) -> Option<Ball> {
        let element = self.circuit.element(id);
        self.between(element.left, element.right)
    }

    fn between(&self, a: NodeId, b: NodeId) -> Option<Ball> {
        let tied = self.system.islands.same(a, b);
        tied.then(|| Balls.sub(&self.node(a), &self.node(b)))
    }

    /// Current from left to right through an element.
    pub fn current(&self, id: ElementId) -> Result<Ball, FieldError> {
        match self.system.through[id.index()] {
            Through::Unknown(unknown) => Ok(self.unknown(unknown)),
            Through::Admittance(y) => {
                let y = self.value(y).map_err(|fault| fault.error)?;
                // An open capacitor between two islands at f = 0 carries nothing.
                let drop = self.drop(id).unwrap_or(Ball::exact(ComplexTwofold::ZERO));
                Ok(Balls.mul(&y, &drop))
            }
            Through::Given => match &self.circuit.element(id).law {
                Law::CurrentSource(drive) => self.given(drive),
                _ => Err(FieldError::Undecided),
            },
        }
    }

    fn given(&self, drive: &Drive) -> Result<Ball, FieldError> {
        let value = |id| self.value(id).map_err(|fault: Fault| fault.error);
        let mut sum = match drive.constant {
            Some(id) => value(id)?,
            None => Ball::exact(ComplexTwofold::ZERO),
        };
        for &(factor, measure) in &drive.terms {
            sum = Balls.add(&sum, &Balls.mul(&value(factor)?, &self.measure(measure)?));
        }
        Ok(if drive.end.sign() < 0 { Balls.neg(&sum) } else { sum })
    }

    /// Absorbed complex power of an element.
    pub fn power(&self, id: ElementId) -> Result<Ball, FieldError> {
        let current = self.current(id)?;
        let drop = self.drop(id).unwrap_or(Ball::exact(ComplexTwofold::ZERO));
        let conjugate = Balls.function(crate::number::Function::Conj, &[current])?;
        Ok(Balls.mul(&drop, &conjugate))
    }

    /// Any reading.
    pub fn measure(&self, measure: Measure) -> Result<Ball, FieldError> {
        match measure {
            Measure::Volts(node, None) => Ok(self.node(node)),
            Measure::Volts(node, Some(to)) => self.between(node, to).ok_or(FieldError::Domain),
            Measure::Drop(id) => self.drop(id).ok_or(FieldError::Domain),
            Measure::Amps(id) => self.current(id),
            Measure::Power(id) => self.power(id),
        }
    }
}

impl From<Ball> for Value {
    fn from(ball: Ball) -> Self {
        let value = ball.centre.to_complex();
        // Rounding to double moves each part by at most half a unit in the last place.
        Value { value, error: ball.radius + 0.5 * f64::EPSILON * value.norm() }
    }
}
