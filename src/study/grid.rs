//! Frequency lists: a number of points per decade, a number of points, or as given.

use thiserror::Error;

/// More points than this are a slip of the keyboard: ten million rows are close to a gigabyte.
pub const MOST_POINTS: usize = 10_000_000;

/// How the frequencies between two ends are placed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Spacing {
    /// So many points in every factor of ten, both ends included.
    PerDecade(usize),
    /// So many points at equal ratios, both ends included.
    Logarithmic(usize),
    /// So many points at equal distances, both ends included.
    Linear(usize),
}

/// Why there is no such list.
#[derive(Clone, Copy, Debug, PartialEq, Error)]
pub enum GridError {
    /// A frequency below zero.
    #[error("a frequency cannot be negative, and this one is {frequency_hz} Hz")]
    Negative {
        /// What was given.
        frequency_hz: f64,
    },
    /// A frequency that is no number.
    #[error("a frequency has to be a finite number")]
    NotFinite,
    /// The ends are the wrong way round.
    #[error("the band starts at {from_hz} Hz, above its end at {to_hz} Hz; swap the two")]
    Backwards {
        /// The start given.
        from_hz: f64,
        /// The end given.
        to_hz: f64,
    },
    /// Zero points.
    #[error("a list of frequencies needs at least one point")]
    NoPoints,
    /// A logarithmic list cannot begin at zero.
    #[error("equal ratios cannot start at 0 Hz; start above 0, or space the points evenly")]
    ZeroStart,
    /// Too many points.
    #[error("that would be more than {MOST_POINTS} points")]
    TooMany,
}

fn judged(frequency_hz: f64) -> Result<f64, GridError> {
    if !frequency_hz.is_finite() {
        return Err(GridError::NotFinite);
    }
    // −0 Hz is 0 Hz.
    if frequency_hz < 0.0 {
        Err(GridError::Negative { frequency_hz })
    } else {
        Ok(frequency_hz.abs())
    }
}

/// The frequencies in hertz from `from_hz` to `to_hz`, ascending. The two ends are exact.
pub fn band(from_hz: f64, to_hz: f64, spacing: Spacing) -> Result<Vec<f64>, GridError> {
    let (from_hz, to_hz) = (judged(from_hz)?, judged(to_hz)?);
    if from_hz > to_hz {
        return Err(GridError::Backwards { from_hz, to_hz });
    }
    let (Spacing::PerDecade(count) | Spacing::Logarithmic(count) | Spacing::Linear(count)) =
        spacing;
    match count {
        0 => return Err(GridError::NoPoints),
        MOST_POINTS.. if count > MOST_POINTS => return Err(GridError::TooMany),
        _ => {}
    }
    match spacing {
        Spacing::Linear(_) => {}
        _ if from_hz == 0.0 => return Err(GridError::ZeroStart),
        _ => {}
    }
    if from_hz == to_hz {
        return Ok(vec![from_hz]);
    }
    match spacing {
        Spacing::PerDecade(per_decade) => per_decade_points(from_hz, to_hz, per_decade),
        Spacing::Logarithmic(count) => {
            let decades = to_hz.log10() - from_hz.log10();
            let at = |part: f64| from_hz * 10f64.powf(decades * part);
            Ok(spread(from_hz, to_hz, count, at))
        }
        Spacing::Linear(count) => {
            Ok(spread(from_hz, to_hz, count, |part| from_hz + (to_hz - from_hz) * part))
        }
    }
}

/// `count` points at equal parts of the way; one point is the start.
fn spread(from_hz: f64, to_hz: f64, count: usize, at: impl Fn(f64) -> f64) -> Vec<f64> {
    let steps = count.saturating_sub(1);
    let point = |i: usize| match i {
        0 => from_hz,
        _ if i == steps => to_hz,
        _ => at(i as f64 / steps as f64),
    };
    (0..count).map(point).collect()
}

/// Points at `from · 10^(i/n)`, then the end itself.
fn per_decade_points(from_hz: f64, to_hz: f64, per_decade: usize) -> Result<Vec<f64>, GridError> {
    /// A point this close below the end, as part of one step, is the end itself.
    const SAME_POINT: f64 = 1e-6;
    let steps = (to_hz.log10() - from_hz.log10()) * per_decade as f64;
    if steps > MOST_POINTS as f64 {
        return Err(GridError::TooMany);
    }
    let before_end = (steps - SAME_POINT).floor() as usize;
    // The power of ten of whole decades is exact, so round frequencies stay round.
    let at = |i: usize| {
        let part = (i % per_decade) as f64 / per_decade as f64;
        from_hz * 10f64.powi((i / per_decade) as i32) * 10f64.powf(part)
    };
    let mut points: Vec<f64> = (0..=before_end).map(at).collect();
    points.push(to_hz);
    Ok(points)
}

/// A list as given, in the order given.
pub fn given(frequencies_hz: &[f64]) -> Result<Vec<f64>, GridError> {
    if frequencies_hz.is_empty() {
        return Err(GridError::NoPoints);
    }
    frequencies_hz.iter().map(|&f| judged(f)).collect()
}

#[cfg(test)]
mod tests {
    use crate::study::grid::{GridError, Spacing, band, given};

    #[test]
    fn points_per_decade_include_both_ends_exactly() {
        let points = band(10e3, 1e6, Spacing::PerDecade(10)).unwrap();
        assert_eq!(points.len(), 21);
        assert_eq!((points[0], points[10], points[20]), (10e3, 100e3, 1e6));
        assert!((points[1] / 10e3 - 10f64.powf(0.1)).abs() < 1e-15);
    }

    #[test]
    fn an_end_off_the_raster_is_one_more_point() {
        let points = band(1.0, 50.0, Spacing::PerDecade(1)).unwrap();
        assert_eq!(points, [1.0, 10.0, 50.0]);
    }

    #[test]
    fn points_are_strictly_ascending() {
        for spacing in [Spacing::PerDecade(37), Spacing::Logarithmic(501), Spacing::Linear(501)] {
            for (from, to) in [(3.0, 7.1e6), (49.9, 50.1), (1e-3, 1e3), (20.0, 20e3)] {
                let points = band(from, to, spacing).unwrap();
                assert!(points.windows(2).all(|w| w[0] < w[1]), "{spacing:?} {from} {to}");
                assert_eq!((points[0], *points.last().unwrap()), (from, to));
            }
        }
    }

    #[test]
    fn linear_points_may_start_at_zero() {
        assert_eq!(band(0.0, 4.0, Spacing::Linear(5)).unwrap(), [0.0, 1.0, 2.0, 3.0, 4.0]);
        assert_eq!(band(0.0, 4.0, Spacing::Logarithmic(5)), Err(GridError::ZeroStart));
        assert_eq!(band(0.0, 4.0, Spacing::PerDecade(5)), Err(GridError::ZeroStart));
    }

    #[test]
    fn one_point_is_the_start_and_an_empty_band_is_one_point() {
        assert_eq!(band(5.0, 9.0, Spacing::Logarithmic(1)).unwrap(), [5.0]);
        assert_eq!(band(5.0, 5.0, Spacing::PerDecade(20)).unwrap(), [5.0]);
    }

    #[test]
    fn a_band_that_makes_no_sense_is_refused() {
        let backwards = GridError::Backwards { from_hz: 9.0, to_hz: 5.0 };
        assert_eq!(band(9.0, 5.0, Spacing::Linear(3)), Err(backwards));
        assert_eq!(band(5.0, 9.0, Spacing::Linear(0)), Err(GridError::NoPoints));
        assert_eq!(band(5.0, 9.0, Spacing::Linear(10_000_001)), Err(GridError::TooMany));
        assert_eq!(band(1.0, 1e9, Spacing::PerDecade(5_000_000)), Err(GridError::TooMany));
        assert_eq!(band(1e-320, 1e300, Spacing::PerDecade(usize::MAX)), Err(GridError::TooMany));
        assert_eq!(
            band(-1.0, 9.0, Spacing::Linear(2)),
            Err(GridError::Negative { frequency_hz: -1.0 })
        );
        assert_eq!(band(1.0, f64::INFINITY, Spacing::Linear(2)), Err(GridError::NotFinite));
    }

    #[test]
    fn a_given_list_keeps_its_order() {
        assert_eq!(given(&[50.0, 10.0, 0.0]).unwrap(), [50.0, 10.0, 0.0]);
        assert_eq!(given(&[]), Err(GridError::NoPoints));
    }
}
