//! Cuts an interval with the help of its model alone: from its low end on, each piece as long as a
//! straight line allows.

/// Two places closer than this part of the interval are one: what jumps, jumps between them.
const SAME: f64 = 1e-13;

/// Lengths tried for one piece before a jump is suspected.
const TRIES: usize = 12;

/// Pieces planned at once; what is left is an interval of its own.
const MOST_PIECES: usize = 4000;

/// The ends of the pieces strictly inside the interval, as parts of its length, ascending.
///
/// `error` tells the error of a straight line between two parts, over what is allowed; pieces are
/// cut so that it stays below `target`. `guess` is a length to begin with.
pub fn cuts(guess: f64, target: f64, error: &mut dyn FnMut(f64, f64) -> f64) -> Vec<f64> {
    let mut found = Vec::new();
    let (mut at, mut length) = (0.0, guess);
    while found.len() < MOST_PIECES {
        let piece = longest(at, length, target, error);
        // Where no length at all will do, the model is no help.
        if piece.good == 0.0 {
            break;
        }
        length = piece.good;
        for end in piece.ends() {
            at = end;
            if end < 1.0 {
                found.push(end);
            }
        }
        if at >= 1.0 {
            break;
        }
    }
    found
}

/// The longest piece found.
struct Piece {
    at: f64,
    /// Length within the target; 0 if none is.
    good: f64,
    /// The shortest length known to be beyond it, where the reading jumps before that.
    jump: Option<f64>,
}

impl Piece {
    /// Where the piece ends, and where the next one begins after a jump.
    fn ends(&self) -> impl Iterator<Item = f64> {
        let good = (self.good > 0.0).then_some(self.at + self.good);
        let jump = self.jump.map(|jump| self.at + jump);
        // Nothing found at all: go on by the smallest step there is.
        let stuck = (good.is_none() && jump.is_none()).then_some(self.at + SAME);
        good.into_iter()
            .chain(jump)
            .chain(stuck)
            .map(|end| if end > 1.0 - SAME { 1.0 } else { end })
    }
}

fn longest(at: f64, guess: f64, target: f64, error: &mut dyn FnMut(f64, f64) -> f64) -> Piece {
    /// A piece that uses this part of the target is long enough.
    const ENOUGH: f64 = 0.85;
    let rest = 1.0 - at;
    let (mut good, mut bad) = (0.0f64, f64::INFINITY);
    let mut excess = 0.0f64;
    let mut length = guess.min(rest);
    for _ in 0..TRIES {
        let found = error(at, at + length);
        if found <= target {
            good = good.max(length);
            if found >= ENOUGH * target || length >= rest {
                return Piece { at, good, jump: None };
            }
        } else {
            bad = bad.min(length);
            excess = found;
        }
        // The error of a straight line grows with the square of its length.
        let step = (0.93 * target / found).sqrt().clamp(0.1, 4.0);
        length = (length * step).min(rest);
        if length >= bad || length <= good {
            length = if bad.is_finite() { 0.5 * (good + bad) } else { rest };
        }
        if bad.is_finite() && bad - good <= 0.02 * bad {
            break;
        }
    }
    // Errors that stay high however near the good length comes are a jump: close in on it.
    while excess > 4.0 * target && bad - good > SAME {
        let middle = 0.5 * (good + bad);
        let found = error(at, at + middle);
        if found <= target {
            good = middle;
        } else {
            (bad, excess) = (middle, found);
        }
    }
    let jump = (good > 0.0 && excess > 4.0 * target).then_some(bad);
    Piece { at, good, jump }
}

#[cfg(test)]
mod tests {
    use crate::study::adaptive::march::cuts;

    #[test]
    fn a_parabola_is_cut_evenly() {
        let mut error = |a: f64, b: f64| 100.0 * (b - a) * (b - a);
        let found = cuts(0.5, 1.0, &mut error);
        assert!((9..=11).contains(&found.len()), "{found:?}");
    }

    #[test]
    fn a_jump_is_enclosed_by_two_cuts() {
        let place = 0.312_345_678_9;
        let mut error = |a: f64, b: f64| if a < place && place <= b { 1e3 } else { 0.0 };
        let found = cuts(0.7, 1.0, &mut error);
        assert_eq!(found.len(), 2, "{found:?}");
        assert!(found[0] < place && place <= found[1] && found[1] - found[0] < 1e-12);
    }

    #[test]
    fn an_error_that_is_nowhere_small_ends_all_the_same() {
        assert!(cuts(0.5, 1.0, &mut |_, _| f64::INFINITY).is_empty());
        assert!(cuts(0.5, 1.0, &mut |_, _| f64::NAN).is_empty());
    }
}
