//! What the readings would be at a frequency that was not solved, from voltages and currents that
//! somebody else supplies.

use crate::circuit::{FormulaId, Measure, Operation, Phase};
use crate::number::{Ball, Balls, ComplexTwofold, Field, FieldError, Function};
use crate::study::engine::Engine;
use num_complex::Complex64;

/// One voltage or current that readings are made of.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Phasor {
    /// A voltage, or a current, read as it is.
    Plain(Measure),
    /// The drop of an element whose power is read; its current is the next phasor.
    DropOfPower(Measure),
    /// The current of an element whose power is read.
    AmpsOfPower(Measure),
}

/// The phasors behind the readings of a circuit, and the formulas between the two. Phasors are
/// rational functions of the frequency where the element values are; readings need not be.
#[derive(Clone, Debug)]
pub struct Probe {
    phasors: Vec<Phasor>,
    of_frequency: Vec<FormulaId>,
    of_solution: Vec<FormulaId>,
}

impl Probe {
    /// How many phasors there are.
    pub fn len(&self) -> usize {
        self.phasors.len()
    }

    /// True where the readings depend on nothing but the frequency.
    pub fn is_empty(&self) -> bool {
        self.phasors.is_empty()
    }
}

fn power_parts(measure: Measure) -> Option<(Measure, Measure)> {
    match measure {
        Measure::Power(id) => Some((Measure::Drop(id), Measure::Amps(id))),
        _ => None,
    }
}

impl Engine<'_> {
    /// Finds what the readings of the circuit are made of.
    pub fn probe(&self) -> Probe {
        let tape = &self.system.tape;
        let mut needed = vec![false; tape.len()];
        for read in &self.circuit.reads {
            needed[read.value.index()] = true;
        }
        let formulas: Vec<FormulaId> = tape.iter().map(|(id, _)| id).collect();
        // Operands stand before their use, so one pass backwards marks them all.
        for id in formulas.iter().rev() {
            if needed[id.index()] {
                tape.get(*id).operation.operands().for_each(|id| needed[id.index()] = true);
            }
        }
        let of = |phase| -> Vec<FormulaId> {
            let all = tape.of_phase(phase).into_iter();
            all.filter(|id| needed[id.index()]).collect()
        };
        let of_solution = of(Phase::Solution);
        let mut phasors = Vec::new();
        for &id in &of_solution {
            let Operation::Measure(measure) = tape.get(id).operation else { continue };
            let parts = match power_parts(measure) {
                None => vec![Phasor::Plain(measure)],
                Some(_) => vec![Phasor::DropOfPower(measure), Phasor::AmpsOfPower(measure)],
            };
            phasors.extend(
                parts.into_iter().filter(|part| !phasors.contains(part)).collect::<Vec<_>>(),
            );
        }
        Probe { phasors, of_frequency: of(Phase::Frequency), of_solution }
    }

    /// The phasors of the frequency solved last; not a number where one is not determined.
    pub fn phasors(&self, probe: &Probe) -> Vec<Complex64> {
        let value = |measure| {
            let found = self.measure(measure).map(|ball| ball.centre.to_complex());
            found.unwrap_or(Complex64::new(f64::NAN, f64::NAN))
        };
        let phasor = |phasor: &Phasor| match *phasor {
            Phasor::Plain(measure) => value(measure),
            Phasor::DropOfPower(measure) => value(power_parts(measure).map_or(measure, |p| p.0)),
            Phasor::AmpsOfPower(measure) => value(power_parts(measure).map_or(measure, |p| p.1)),
        };
        probe.phasors.iter().map(phasor).collect()
    }

    /// Evaluates the readings at a frequency from given phasors: [`Engine::value`] then tells them.
    pub fn predict(&mut self, probe: &Probe, frequency_hz: f64, phasors: &[Complex64]) {
        let ball = |value: Complex64| Ball::exact(ComplexTwofold::from(value));
        self.frequency = ball(Complex64::new(frequency_hz, 0.0));
        let tape = &self.system.tape;
        let nothing = |_| Err(FieldError::Undecided);
        tape.evaluate_phase(
            &Balls,
            &probe.of_frequency,
            &self.frequency,
            &mut self.values,
            nothing,
        );
        let given = |wanted: Phasor| -> Result<Ball, FieldError> {
            let at = probe.phasors.iter().position(|phasor| *phasor == wanted);
            at.map(|at| ball(phasors[at])).ok_or(FieldError::Undecided)
        };
        let measure = |measure: Measure| match power_parts(measure) {
            None => given(Phasor::Plain(measure)),
            Some(_) => {
                let current = given(Phasor::AmpsOfPower(measure))?;
                let conjugate = Balls.function(Function::Conj, &[current])?;
                Ok(Balls.mul(&given(Phasor::DropOfPower(measure))?, &conjugate))
            }
        };
        tape.evaluate_phase(&Balls, &probe.of_solution, &self.frequency, &mut self.values, measure);
    }
}
