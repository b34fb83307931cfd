//! Circuits drawn at random, and their solution in exact arithmetic.
//!
//! The reference shares nothing with the library: another formulation (sparse tableau), other
//! numbers (Gaussian rationals), and its own notion of every element, taken from the language.
//!
//! - `number`: exact complex numbers
//! - `network`: branches and their laws
//! - `tableau`: the equations and their exact solution
//! - `values`, `parts`, `coupled`, `sketch`, `writing`: the draw, from single values to the text
//! - `tests`: the reference by itself, and the library against it

mod coupled;
mod network;
mod number;
mod parts;
mod sketch;
mod tableau;
mod tests;
mod values;
mod writing;

pub use tableau::ExactSolution;

use fastrand::Rng;

/// A singular circuit is drawn again, but not for ever.
const MOST_TRIES: u64 = 40;

/// A circuit drawn at random.
pub struct Drawn {
    /// The circuit text.
    pub text: String,
    /// The frequency at which it is to be solved.
    pub frequency_hz: f64,
    /// How many circuits drawn before this one were singular.
    pub singular: u64,
    network: network::Network,
    solution: ExactSolution,
}

impl Drawn {
    /// The exact solution.
    pub fn solve(&self) -> &ExactSolution {
        &self.solution
    }

    /// How many elements the solution lists.
    pub fn elements(&self) -> usize {
        self.network.branches.iter().filter(|branch| branch.name.is_some()).count()
    }
}

/// The circuit of a seed: always the same one, and never singular.
pub fn draw(seed: u64) -> Drawn {
    for singular in 0..MOST_TRIES {
        let sketch = sketch::Sketch::draw(Rng::with_seed(seed * MOST_TRIES + singular));
        let frequency_hz = sketch.setting.frequency_hz as f64;
        let (text, network) = writing::write(sketch);
        if let Some(solution) = tableau::solve(&network) {
            return Drawn { text, frequency_hz, singular, network, solution };
        }
    }
    panic!("seed {seed}: {MOST_TRIES} singular circuits in a row");
}
