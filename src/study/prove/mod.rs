//! Decides whether two circuits agree at every frequency above zero.
//!
//! The responses are fractions of polynomials in the frequency, π and the source values, so both
//! circuits are solved exactly in random finite fields at random points (Schwartz, 1980; Zippel,
//! 1979). A disagreement there is certain; agreement in enough fields is as good as certain, with
//! a bound on the chance of error that is reported. `docs/proof.md` derives it.

mod eliminate;
mod modular;
mod showing;

use crate::circuit::Circuit;
use crate::number::exact::Basis;
use crate::number::residues::Size;
use crate::number::{Field, FieldError, Residues};
use crate::study::pair::Matched;
pub use crate::study::prove::showing::Showing;
use modular::{Extent, Modular, Ready, Solved, Trouble};
use rand::SeedableRng;
use rand::rngs::StdRng;
use std::collections::BTreeSet;
use std::rc::Rc;

/// The chance of error asked for, as a binary logarithm.
const WANTED_BOUND: f64 = -100.0;

/// A round whose bound is above this (as a binary logarithm) says too little: the formulas are
/// monstrous.
const WORST_ROUND: f64 = -4.0;

/// Binary logarithm of the smallest prime.
const PRIME_BITS: f64 = 60.0;

/// Binary logarithm of a lower bound on how many primes there are to draw: a quarter of the primes
/// between 2^60 and 2^61 is more than 2^52.6 (explicit form of the prime number theorem in
/// progressions: Bennett, Martin, O'Bryant and Rechnitzer, 2018).
const PRIMES_BITS: f64 = 52.0;

/// Draws in which a value does not exist by chance are practically never; more mean it never does.
const MOST_FAULTY_DRAWS: usize = 4;

/// How to decide.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Options {
    /// Seed of the random draws; nothing: from the operating system.
    pub seed: Option<u64>,
    /// Where to look for the frequency that shows a difference best, in hertz, ascending; empty:
    /// 1 Hz to 1 GHz.
    pub frequencies_hz: Vec<f64>,
}

/// What was decided.
#[derive(Clone, Debug, PartialEq)]
pub enum Verdict {
    /// The circuits agree at every frequency above zero at which both have a solution.
    Identical {
        /// They agree for any values of the sources they share, not only for those written.
        for_any_sources: bool,
    },
    /// They do not.
    Different(Difference),
    /// It could not be decided, for the reason given.
    Undecided(String),
}

/// In what two circuits differ.
#[derive(Clone, Debug, PartialEq)]
pub enum Difference {
    /// In this quantity, at almost every frequency.
    Quantity {
        /// Its name.
        name: String,
        /// Where a difference shows best; nothing if it is too small to show in numbers.
        shows_best: Option<Showing>,
    },
    /// Only one has solutions.
    Solvable {
        /// It is the first.
        first: bool,
    },
}

/// A verdict and what it rests on.
#[derive(Clone, Debug, PartialEq)]
pub struct Proof {
    /// What was decided.
    pub verdict: Verdict,
    /// Binary logarithm of a bound on the chance that the verdict is wrong; minus infinity for
    /// verdicts that cannot be.
    pub log2_error_bound: f64,
    /// How many random fields were solved in.
    pub rounds: usize,
    /// Quantities that have a value in neither circuit, so that nothing is said about them.
    pub without_value: Vec<String>,
}

/// Decides whether the quantities agree at every frequency above zero.
pub fn decide(first: &Circuit, second: &Circuit, matched: &[Matched], options: &Options) -> Proof {
    let models = [Modular::new(first), Modular::new(second)];
    let mut names: Vec<_> = models.iter().flat_map(Modular::not_lumped).collect();
    names.dedup();
    if !names.is_empty() {
        let names = BTreeSet::from_iter(names).into_iter().collect::<Vec<_>>().join(", ");
        let why = format!("measured data has no formula to compare: {names}");
        return Proof::new(Verdict::Undecided(why));
    }
    if matched.is_empty() {
        return Proof::new(Verdict::Undecided("the circuits share no quantity".into()));
    }
    let random = match options.seed {
        Some(seed) => StdRng::seed_from_u64(seed),
        None => rand::make_rng(),
    };
    let mut prover = Prover::new(&models, matched, random);
    let mut end = prover.run(Drives::Any);
    let mut general = None;
    // A difference may vanish for the source values written, in a balanced bridge, say.
    if let End::Disagree { .. } = end
        && prover.replaced
    {
        general = Some(end);
        end = prover.run(Drives::Written);
    }
    let look = || showing::find(first, second, matched, &options.frequencies_hz);
    let networks_differ = matches!(general, Some(End::Disagree { opaque: false, .. }));
    let verdict = match end {
        End::Agree => Verdict::Identical { for_any_sources: prover.all_replaced },
        End::Disagree { quantity, opaque: false } => Verdict::of(&matched[quantity], look()),
        // Only the values of the sources are beyond the field: numbers can settle it.
        End::Disagree { quantity, opaque: true } => {
            let shows = networks_differ.then(look).flatten();
            match shows.filter(|showing| showing.beyond_error) {
                Some(shows) => Verdict::of(&matched[quantity], Some(shows)),
                None => Verdict::Undecided(format!(
                    "`{}` does not agree formally, but functions other than arithmetic and square \
                     roots of constants take part in it",
                    matched[quantity].name
                )),
            }
        }
        End::OneSolves { first, opaque: false } => {
            Verdict::Different(Difference::Solvable { first })
        }
        End::OneSolves { .. } => {
            Verdict::Undecided("one of the circuits may have no solution at any frequency".into())
        }
        End::Undecided(why) => Verdict::Undecided(why),
    };
    let by_chance = match verdict {
        Verdict::Identical { .. } | Verdict::Different(Difference::Solvable { .. }) => prover.bound,
        _ => f64::NEG_INFINITY,
    };
    Proof {
        verdict,
        log2_error_bound: by_chance,
        rounds: prover.rounds,
        without_value: prover.without_value.into_iter().collect(),
    }
}

impl Verdict {
    fn of(matched: &Matched, shows_best: Option<Showing>) -> Self {
        let name = matched.name.clone();
        Verdict::Different(Difference::Quantity { name, shows_best })
    }
}

impl Proof {
    fn new(verdict: Verdict) -> Self {
        let log2_error_bound = f64::NEG_INFINITY;
        Proof { verdict, log2_error_bound, rounds: 0, without_value: Vec::new() }
    }
}

/// What drives the circuits.
#[derive(Clone, Copy, PartialEq)]
enum Drives {
    /// Sources that are the same in both circuits have random values.
    Any,
    /// All sources have the values written.
    Written,
}

/// How a series of rounds ended.
#[derive(Clone, Debug, PartialEq)]
enum End {
    Agree,
    Disagree { quantity: usize, opaque: bool },
    OneSolves { first: bool, opaque: bool },
    Undecided(String),
}

struct Prover<'m> {
    models: &'m [Modular; 2],
    matched: &'m [Matched],
    random: StdRng,
    basis: Rc<Basis>,
    rounds: usize,
    bound: f64,
    without_value: BTreeSet<String>,
    /// Some sources had random values, or all of them.
    replaced: bool,
    all_replaced: bool,
}

/// What one draw showed.
enum Round {
    /// The basis was too coarse; it has been refined.
    Again,
    Agree(f64),
    Disagree {
        quantity: usize,
        opaque: bool,
    },
    /// Which of them have no solution there, the chance that this is chance, and whether the
    /// other's matrix has opaque values.
    Singular {
        which: [bool; 2],
        bound: f64,
        opaque: bool,
    },
    Fault(FieldError),
    OneSided(usize),
}

impl<'m> Prover<'m> {
    fn new(models: &'m [Modular; 2], matched: &'m [Matched], random: StdRng) -> Self {
        Prover {
            models,
            matched,
            random,
            basis: Rc::default(),
            rounds: 0,
            bound: 0.0,
            without_value: BTreeSet::new(),
            replaced: false,
            all_replaced: false,
        }
    }

    fn run(&mut self, drives: Drives) -> End {
        self.bound = 0.0;
        self.without_value.clear();
        // For each circuit: it had a solution in some field; bound on the chance that it has none
        // in the others although it has solutions.
        let mut solved = [false; 2];
        let mut singular_bound = [0.0; 2];
        let mut faulty = 0;
        loop {
            let found = self.round(drives);
            self.rounds += usize::from(!matches!(found, Round::Again));
            match found {
                Round::Again => {}
                Round::Disagree { quantity, opaque } => return End::Disagree { quantity, opaque },
                Round::OneSided(quantity) => {
                    let name = &self.matched[quantity].name;
                    return End::Undecided(format!("`{name}` has a value in one circuit only"));
                }
                Round::Fault(FieldError::DivisionByZero) if faulty < MOST_FAULTY_DRAWS => {
                    faulty += 1;
                }
                Round::Fault(error) => {
                    return End::Undecided(format!("a value of the circuits: {error}"));
                }
                Round::Agree(bound) | Round::Singular { bound, .. } if bound > WORST_ROUND => {
                    let why = "the formulas are too large for a useful bound";
                    return End::Undecided(why.into());
                }
                Round::Agree(bound) => {
                    solved = [true; 2];
                    self.bound += bound;
                    if self.bound <= WANTED_BOUND {
                        return End::Agree;
                    }
                }
                Round::Singular { which, bound, opaque } => {
                    for i in 0..2 {
                        solved[i] |= !which[i];
                        singular_bound[i] += if which[i] { bound } else { 0.0 };
                    }
                    let never = |i: usize| !solved[i] && singular_bound[i] <= WANTED_BOUND;
                    if never(0) && never(1) {
                        let why = "neither circuit has a solution at any frequency";
                        return End::Undecided(why.into());
                    }
                    if let Some(i) = (0..2).find(|&i| never(i) && solved[1 - i]) {
                        self.bound = singular_bound[i];
                        return End::OneSolves { first: i == 1, opaque };
                    }
                }
            }
        }
    }

    fn round(&mut self, drives: Drives) -> Round {
        let field = Residues::draw(&mut self.random, &self.basis);
        let [mut first, mut second] = [0, 1].map(|i| self.models[i].ready(&field));
        let mut largest = Size::default();
        if drives == Drives::Any {
            largest = self.replace_sources(&field, &mut first, &mut second);
        } else {
            self.all_replaced = false;
        }
        let (first_extent, first) = self.models[0].solve(&field, first);
        let (second_extent, second) = self.models[1].solve(&field, second);
        let missing = field.missing();
        if !missing.is_empty() {
            let mut finer = Basis::clone(&self.basis);
            missing.into_iter().for_each(|radicand| finer.refine(radicand));
            self.basis = Rc::new(finer);
            return Round::Again;
        }
        let extents = [first_extent, second_extent];
        match (first, second) {
            (Err(Trouble::Fault(fault)), _) | (_, Err(Trouble::Fault(fault))) => {
                Round::Fault(fault.error)
            }
            (Ok(first), Ok(second)) => self.compare(&field, [&first, &second], largest),
            (first, second) => singular([first.is_err(), second.is_err()], extents, &field),
        }
    }

    /// Gives every source that stands in both circuits with one value a random value, the same in
    /// both; returns how large the values compared were.
    fn replace_sources(&mut self, field: &Residues, first: &mut Ready, second: &mut Ready) -> Size {
        let mut largest = Size::default();
        let mut count = 0;
        for own in &self.models[0].sources {
            let other = self.models[1]
                .sources
                .iter()
                .find(|other| other.name == own.name && other.voltage == own.voltage);
            let Some(other) = other else { continue };
            let values =
                (&first.values[own.written.index()], &second.values[other.written.index()]);
            let (Ok(a), Ok(b)) = values else { continue };
            let difference = field.sub(a, b);
            if difference.residue.is_zero() {
                largest = largest.max(difference.size);
                let any = field.variable();
                first.values[own.drives.index()] = Ok(any.clone());
                second.values[other.drives.index()] = Ok(any);
                count += 1;
            }
        }
        self.replaced = count > 0;
        self.all_replaced = self.models.iter().all(|model| model.sources.len() == count);
        largest
    }

    fn compare(&mut self, field: &Residues, solved: [&Solved; 2], mut largest: Size) -> Round {
        let mut opaque_disagreement = None;
        for (i, matched) in self.matched.iter().enumerate() {
            let first = solved[0].read(field, matched.first);
            let second = solved[1].read(field, matched.second);
            let (a, b) = match (first, second) {
                (Ok(a), Ok(b)) => (a, b),
                (Err(_), Err(_)) => {
                    self.without_value.insert(matched.name.clone());
                    continue;
                }
                _ => return Round::OneSided(i),
            };
            let difference = field.sub(&a, &b);
            if difference.residue.is_zero() {
                largest = largest.max(difference.size);
            } else if difference.opaque {
                opaque_disagreement.get_or_insert(i);
            } else {
                return Round::Disagree { quantity: i, opaque: false };
            }
        }
        match opaque_disagreement {
            Some(quantity) => Round::Disagree { quantity, opaque: true },
            None => Round::Agree(bound(largest, field)),
        }
    }
}

fn singular(which: [bool; 2], extents: [Extent; 2], field: &Residues) -> Round {
    let size = extents[0].size.max(extents[1].size);
    let opaque = extents.iter().any(|extent| extent.matrix_opaque);
    Round::Singular { which, bound: bound(size, field), opaque }
}

/// Binary logarithm of a bound on the chance that a polynomial that is not zero, no larger than
/// `size`, is zero in a round.
fn bound(size: Size, field: &Residues) -> f64 {
    let one = |size: Size| {
        // The point is a zero of what is left in the field, or all coefficients vanish in it.
        size.degree * (-2.0 * PRIME_BITS).exp2() + size.bits / PRIME_BITS * (-PRIMES_BITS).exp2()
    };
    let (pairs, argument) = field.opaque_pairs();
    let pairs = if pairs > 0.0 { pairs * one(argument) } else { 0.0 };
    // Rounds in which a determinant vanished by chance are drawn again, which at most doubles it.
    1.0 + (one(size) + pairs).max(f64::MIN_POSITIVE).log2()
}
