//! Every tolerance and limit of the solver.

/// Rounding unit of a double, 2^-53.
pub const UNIT: f64 = f64::EPSILON / 2.0;

/// Passes of scaling by mean logarithms. On random systems whose rows and columns were scaled
/// apart by 2^±50, five bring the condition within a factor of a few of the unscaled one.
pub const MEAN_PASSES: usize = 5;

/// Passes of scaling by largest entries; each halves the logarithm of what is left to even out.
pub const LARGEST_PASSES: usize = 6;

/// Scale factors from mean logarithms stay within 2^±this, so that products of two are finite.
pub const LARGEST_SCALE_LOGARITHM: f64 = 450.0;

/// A pivot below this part of the largest one in the scaled matrix: zeroing what is left of its
/// column would change no entry by more than it was rounded, so the matrix is singular to working
/// precision.
pub const LEAST_PIVOT_RATIO: f64 = UNIT;

/// From this size on two column orders are tried at the first factorisation; below it fill does
/// not matter.
pub const LEAST_SIZE_FOR_ORDER_TRIAL: usize = 16;

/// Up to this size both orders are tried whatever the values: the worse one costs a fraction of a
/// second, once.
pub const LARGEST_SIZE_FOR_ORDER_TRIAL: usize = 1500;

/// Above that size the symmetric order is tried only if no more than this part of the columns has
/// its largest entry off the diagonal. On grids of nodes alone it then saves a third of the fill;
/// with windings among them it triples it.
pub const LARGEST_PART_OFF_DIAGONAL: f64 = 0.02;

/// Largest condition (Skeel, of the scaled matrix) taken as solvable is this over √n · 2^-52:
/// beyond it the double factors hold no digit. The root is the usual growth of rounding errors
/// with size; singular matrices come out some times above 2^53.
pub const LARGEST_CONDITION_PART: f64 = 0.5;

/// Solves the condition estimator may take; it usually stops after two rounds (Higham 1988).
pub const ESTIMATOR_ROUNDS: usize = 5;

/// The estimator's lower bound is rarely off by more than three (Higham 1988).
pub const ESTIMATOR_SAFETY: f64 = 3.0;

/// Corrections that shrink more slowly than this show factors that no longer fit the matrix.
pub const SLOWEST_CONTRACTION: f64 = 0.5;

/// A near-null vector of the factors that the exact matrix leaves in place by more than this
/// part: the smallest singular value is lost in rounding.
pub const LARGEST_PROBE_CONTRACTION: f64 = 0.25;

/// Refinement ends where what is left of the error is below this part of every component: beyond
/// what any reader of doubles sees, well above twofold rounding.
pub const SMALL_CORRECTION: f64 = 1e-20;

/// Components this far below the largest (in scaled unknowns) need not meet
/// [`SMALL_CORRECTION`] by themselves.
pub const NEGLIGIBLE_COMPONENT: f64 = 1e-14;

/// Where the bound from the norm alone is above this part of any component, a second one is
/// computed that weighs components by their size.
pub const GOOD_BOUND: f64 = 1e-18;

/// Corrections that stop shrinking are accepted below this part of the solution.
pub const ACCEPTABLE_CORRECTION: f64 = 1e-12;

/// Refinement steps: at the slowest contraction taken seriously (0.25) fifteen give nine digits
/// more, and healthy matrices need two or three.
pub const REFINEMENT_STEPS: usize = 15;

/// Contractions observed on one right-hand side may be lucky; bounds count this much more.
pub const CONTRACTION_SAFETY: f64 = 4.0;

/// The contraction to expect is this times the condition: rounding the entries costs one 2^-53,
/// factoring a few more. In about 6,000 random networks solved exactly no error passed a quarter of the
/// bound this leads to.
pub const EXPECTED_CONTRACTION: f64 = 4.0 * UNIT;

/// Bounds divide by 1 − contraction; a solution accepted although its corrections stopped
/// shrinking (below [`ACCEPTABLE_CORRECTION`]) gets ten times its last one.
pub const LARGEST_CONTRACTION: f64 = 0.9;

/// Rounding of one twofold complex multiply-subtract, 2^-101, about twice what
/// `number::twofold` states for its parts.
pub const TWOFOLD_STEP: f64 = 1.0 / (1u128 << 101) as f64;

/// Where the twofold sum x + d itself rounds.
pub const TWOFOLD_SUM: f64 = 1.0 / (1u128 << 103) as f64;

/// Low parts of products underflow near 1e-300; errors of that kind stay below this.
pub const UNDERFLOW: f64 = 1e-300;

/// Size of the diagonal perturbation (scaled matrix) that makes a singular matrix factorable:
/// far below anything that counts as participation, far above rounding.
pub const NULL_PERTURBATION: f64 = 1e-12;

/// Rounds of inverse iteration; each multiplies the wanted direction by at least 10^12.
pub const NULL_ROUNDS: usize = 3;

/// Components of a null vector (scaled) below this part of the largest are rounding: set to 0.
pub const NULL_NOISE: f64 = 1e-8;
