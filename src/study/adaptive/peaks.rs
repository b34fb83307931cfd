//! Puts a row on every peak and in every notch of a reading.

use crate::circuit::Circuit;
use crate::study::adaptive::learn::Learned;
use crate::study::adaptive::sampler::Sampler;
use crate::study::{StudyError, Value};

/// Steps of a golden section: the interval shrinks to less than a part in 10⁸.
const STEPS: usize = 40;

/// A gain below this part of the reading is none.
const NO_GAIN: f64 = 1e-13;

/// What is searched: the largest or the smallest values of one reading.
#[derive(Clone, Copy)]
struct Wanted {
    reading: usize,
    real: bool,
    /// +1 for peaks, −1 for notches.
    sign: f64,
}

impl Wanted {
    fn height(self, value: num_complex::Complex64) -> f64 {
        self.sign * if self.real { value.re } else { value.norm() }
    }
}

/// Adds a sample at each local extreme of a reading: of its magnitude, or of a real reading itself.
pub fn crown(
    circuit: &Circuit,
    sampler: &mut Sampler,
    learned: &Learned,
) -> Result<(), StudyError> {
    let numbers = sampler.between(f64::MIN_POSITIVE, f64::INFINITY);
    for (reading, read) in circuit.reads.iter().enumerate() {
        let real = circuit.tape.get(read.value).real;
        for sign in [1.0, -1.0] {
            let wanted = Wanted { reading, real, sign };
            for w in numbers.windows(3) {
                if let Some(frequency_hz) = extreme(sampler, learned, [w[0], w[1], w[2]], wanted)
                    && sampler.take(frequency_hz)?.is_none()
                {
                    return Ok(());
                }
            }
        }
    }
    Ok(())
}

/// The frequency of an extreme around the middle one of three neighbours, where the model knows
/// one that is better than the middle.
fn extreme(
    sampler: &mut Sampler,
    learned: &Learned,
    numbers: [usize; 3],
    wanted: Wanted,
) -> Option<f64> {
    let value = |number: usize| -> Value { sampler.get(number).values[wanted.reading] };
    let [low, middle, high] = numbers.map(value);
    let heights = [low, middle, high].map(|v| wanted.height(v.value));
    let doubt = low.error + middle.error + high.error;
    // Written so that what is no number is no extreme.
    let stands_out = heights[1] > heights[0] + doubt && heights[1] > heights[2] + doubt;
    let [low_hz, middle_hz, high_hz] = numbers.map(|n| sampler.get(n).frequency_hz);
    if !stands_out || learned.unbounded(low_hz, high_hz) {
        return None;
    }
    // The two intervals may lie in two parts, but each knows its own.
    let mut height = |frequency_hz: f64| {
        let model = match frequency_hz <= middle_hz {
            true => learned.model(low_hz, middle_hz),
            false => learned.model(middle_hz, high_hz),
        };
        if model.is_none() && sampler.has_phasors() {
            return f64::NAN;
        }
        wanted.height(sampler.predict(model, frequency_hz)[wanted.reading])
    };
    let (frequency_hz, found) = search(&mut height, low_hz, high_hz)?;
    let gain = found - heights[1];
    (gain > NO_GAIN * heights[1].abs() + middle.error).then_some(frequency_hz)
}

/// The highest place between two frequencies, by golden section and one parabola.
fn search(height: &mut dyn FnMut(f64) -> f64, low_hz: f64, high_hz: f64) -> Option<(f64, f64)> {
    let golden = 0.5 * (5f64.sqrt() - 1.0);
    let (mut a, mut b) = (low_hz, high_hz);
    let (mut c, mut d) = (b - golden * (b - a), a + golden * (b - a));
    let (mut at_c, mut at_d) = (height(c), height(d));
    for _ in 0..STEPS {
        if at_c.is_nan() || at_d.is_nan() {
            return None;
        }
        if at_c > at_d {
            (b, d, at_d) = (d, c, at_c);
            c = b - golden * (b - a);
            at_c = height(c);
        } else {
            (a, c, at_c) = (c, d, at_d);
            d = a + golden * (b - a);
            at_d = height(d);
        }
    }
    let top = 0.5 * (a + b);
    // Near a smooth top heights differ too little to tell places apart; a parabola through a
    // wider stretch does.
    let step = 1e-3 * (top - low_hz).min(high_hz - top);
    let [below, at, above] = [top - step, top, top + step].map(&mut *height);
    let bend = below - 2.0 * at + above;
    let vertex = top + 0.5 * step * (below - above) / bend;
    let vertex_height = if (vertex - top).abs() < step { height(vertex) } else { f64::NAN };
    let best = if vertex_height >= at { (vertex, vertex_height) } else { (top, at) };
    best.1.is_finite().then_some(best)
}
