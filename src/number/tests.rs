//! Twofold numbers and balls against exact rational arithmetic.

use crate::number::elementary;
use crate::number::{Ball, Balls, ComplexTwofold, Field, FieldError, Function, Twofold};
use crate::quantity::Decimal;
use num_bigint::BigInt;
use num_complex::Complex64;
use num_rational::BigRational;
use num_traits::{Signed, ToPrimitive, Zero};

/// 2^-106
const U_SQUARED: f64 = 1.0 / (1u128 << 106) as f64;

fn exact(value: Twofold) -> BigRational {
    let part = |part: f64| BigRational::from_float(part).expect("finite");
    part(value.hi) + part(value.lo)
}

/// |got − wanted| / |wanted|
fn relative_error(got: Twofold, wanted: &BigRational) -> f64 {
    ((exact(got) - wanted) / wanted).abs().to_f64().expect("in range")
}

fn random_twofold(dice: &mut fastrand::Rng) -> Twofold {
    let size = 10f64.powi(dice.i32(-12..12));
    let hi = (dice.f64() - 0.5) * size;
    Twofold::sum(hi, (dice.f64() - 0.5) * hi * 2f64.powi(-52))
}

fn random_complex(dice: &mut fastrand::Rng) -> ComplexTwofold {
    ComplexTwofold { re: random_twofold(dice), im: random_twofold(dice) }
}

#[test]
fn real_operations_stay_within_their_bounds() {
    let mut dice = fastrand::Rng::with_seed(1);
    for _ in 0..3000 {
        let (a, b) = (random_twofold(&mut dice), random_twofold(&mut dice));
        let (exact_a, exact_b) = (exact(a), exact(b));
        assert!(relative_error(a + b, &(&exact_a + &exact_b)) <= 3.0 * U_SQUARED);
        assert!(relative_error(a - b, &(&exact_a - &exact_b)) <= 3.0 * U_SQUARED);
        assert!(relative_error(a * b, &(&exact_a * &exact_b)) <= 7.0 * U_SQUARED);
        assert!(relative_error(a / b, &(&exact_a / &exact_b)) <= 16.0 * U_SQUARED);
        let root = a.abs().sqrt();
        assert!(relative_error(root * root, &exact_a.abs()) <= 24.0 * U_SQUARED);
        assert_eq!(a.partial_cmp(&b), exact_a.partial_cmp(&exact_b));
    }
}

#[test]
fn sums_that_cancel_keep_their_digits() {
    let mut dice = fastrand::Rng::with_seed(2);
    for _ in 0..1000 {
        let a = random_twofold(&mut dice);
        let near = Twofold::sum(a.hi, a.lo * (1.0 - 2f64.powi(dice.i32(-40..-1))));
        let wanted = exact(a) - exact(near);
        if wanted.is_zero() {
            assert_eq!(a - near, Twofold::ZERO);
        } else {
            assert!(relative_error(a - near, &wanted) <= 3.0 * U_SQUARED);
        }
    }
}

fn exact_decimal(decimal: Decimal) -> BigRational {
    let mantissa = BigRational::from_integer(BigInt::from(decimal.mantissa));
    mantissa * BigRational::from_integer(BigInt::from(10)).pow(decimal.exponent)
}

#[test]
fn decimals_convert_to_thirty_digits_over_the_whole_range() {
    let mut dice = fastrand::Rng::with_seed(3);
    for _ in 0..2000 {
        let mantissa = dice.u128(1..u128::MAX) >> dice.u32(0..127);
        let mantissa = mantissa.max(1);
        let digits = mantissa.ilog10() as i32;
        let exponent = dice.i32(-290 - digits..306 - digits);
        let decimal = Decimal { mantissa, exponent };
        let error = relative_error(Twofold::from_decimal(decimal), &exact_decimal(decimal));
        assert!(error <= 2f64.powi(-100), "{decimal:?} is off by {error:e}");
    }
}

#[test]
fn decimals_at_the_edges_convert_without_overflow_on_the_way() {
    let largest = Decimal { mantissa: 17976931348623157, exponent: 292 };
    assert_eq!(Twofold::from_decimal(largest).hi, f64::MAX);
    let smallest = Decimal { mantissa: 5, exponent: -324 };
    assert_eq!(Twofold::from_decimal(smallest).hi, 5e-324);
    let long = Decimal { mantissa: u128::MAX, exponent: -346 };
    assert_eq!(Twofold::from_decimal(long).hi, long.to_f64());
    assert_eq!(Twofold::from_u128(u128::MAX), Twofold { hi: 2f64.powi(128), lo: -1.0 });
}

#[test]
fn decimal_balls_hold_the_decimal_and_are_exact_where_they_can_be() {
    let mut dice = fastrand::Rng::with_seed(4);
    for _ in 0..1000 {
        let decimal = Decimal {
            mantissa: dice.u128(1..1 << 100) >> dice.u32(0..99),
            exponent: dice.i32(-45..12),
        };
        let ball = Ball::decimal(decimal);
        let distance = (exact(ball.centre.re) - exact_decimal(decimal)).abs();
        assert!(distance <= BigRational::from_float(ball.radius).unwrap(), "{decimal:?}");
    }
    for (mantissa, exponent) in [(48, 0), (85, 3), (5, -1), (125, -3), (1, 22), (0, -7)] {
        assert_eq!(Ball::decimal(Decimal { mantissa, exponent }).radius, 0.0);
    }
    assert!(Ball::decimal(Decimal { mantissa: 1, exponent: -1 }).radius > 0.0);
}

#[derive(Clone)]
struct ExactComplex(BigRational, BigRational);

impl ExactComplex {
    fn of(z: ComplexTwofold) -> Self {
        ExactComplex(exact(z.re), exact(z.im))
    }

    fn mul(&self, other: &Self) -> Self {
        ExactComplex(
            &self.0 * &other.0 - &self.1 * &other.1,
            &self.0 * &other.1 + &self.1 * &other.0,
        )
    }

    fn div(&self, other: &Self) -> Self {
        let square = &other.0 * &other.0 + &other.1 * &other.1;
        let above = self.mul(&ExactComplex(other.0.clone(), -other.1.clone()));
        ExactComplex(above.0 / &square, above.1 / &square)
    }

    fn add(&self, other: &Self) -> Self {
        ExactComplex(&self.0 + &other.0, &self.1 + &other.1)
    }

    /// Distance to the centre of `ball` over its radius; 0 where both are 0.
    #[track_caller]
    fn assert_inside(&self, ball: &Ball) {
        let centre = ExactComplex::of(ball.centre);
        let (re, im) = (&self.0 - centre.0, &self.1 - centre.1);
        let radius = BigRational::from_float(ball.radius).expect("finite radius");
        let distance_squared = &re * &re + &im * &im;
        assert!(distance_squared <= &radius * &radius, "{ball:?}");
    }
}

#[test]
fn balls_contain_the_exact_result_of_any_value_they_stand_for() {
    let mut dice = fastrand::Rng::with_seed(5);
    for round in 0..2000 {
        let mut pick = || {
            let centre = random_complex(&mut dice);
            let radius = [0.0, 1e-20, 1e-3][round % 3] * centre.norm();
            let turn = dice.f64() * 6.0;
            let off = Complex64::from_polar(radius * 0.999, turn);
            let exact = ExactComplex::of(centre).add(&ExactComplex::of(off.into()));
            (Ball { centre, radius }, exact)
        };
        let ((a, exact_a), (b, exact_b)) = (pick(), pick());
        exact_a.add(&exact_b).assert_inside(&a.add(&b));
        exact_a.mul(&exact_b).assert_inside(&a.mul(&b));
        exact_a.div(&exact_b).assert_inside(&a.div(&b).unwrap());
        exact_a.mul(&exact_a).mul(&exact_a).assert_inside(&a.whole_power(3).unwrap());
        if round % 3 == 0 {
            let bound = 1e-29 * a.centre.norm() * b.centre.norm();
            assert!(a.mul(&b).radius <= bound, "needlessly wide");
        }
    }
}

#[test]
fn the_root_squared_contains_the_number() {
    let mut dice = fastrand::Rng::with_seed(6);
    for _ in 0..1000 {
        let centre = random_complex(&mut dice);
        let root = Ball::exact(centre).sqrt().unwrap();
        assert!(root.centre.re.hi >= 0.0);
        assert!(root.radius <= 1e-29 * root.centre.norm());
        ExactComplex::of(centre).assert_inside(&root.mul(&root));
    }
    let minus_four = Ball::exact((-4.0).into());
    assert_eq!(minus_four.sqrt().unwrap(), Ball::exact(Complex64::new(0.0, 2.0).into()));
    let near_zero = Ball { centre: ComplexTwofold::ZERO, radius: 1e-20 };
    let root = near_zero.sqrt().unwrap();
    assert!(root.radius >= 1e-10 && root.radius < 1e-9);
    // Either root may be meant on the cut.
    let on_cut = Ball { centre: Complex64::new(-1.0, 1e-20).into(), radius: 1e-19 };
    assert!(on_cut.sqrt().unwrap().radius >= 2.0);
}

#[test]
fn division_neither_overflows_nor_underflows_on_the_way() {
    for size in [1e-300, 1e-160, 1.0, 1e160, 1e300] {
        let a: ComplexTwofold = Complex64::new(3.0 * size, 4.0 * size).into();
        let quotient = a / a;
        assert!((quotient - ComplexTwofold::ONE).norm() < 1e-15, "{size:e}: {quotient:?}");
        assert!((a.abs().hi / size - 5.0).abs() < 1e-14);
        let root = a.sqrt();
        assert!(((root * root) / a - ComplexTwofold::ONE).norm() < 1e-15);
    }
}

#[test]
fn elementary_functions_agree_with_known_digits() {
    let off = |got: Twofold, hi: f64, lo: f64| (got - Twofold { hi, lo }).hi.abs();
    // e, 1/e, sin 1, cos 1, ln 3 as the nearest two doubles; the series were summed in rationals.
    let cases = [
        (elementary::exp(Twofold::ONE), std::f64::consts::E, 1.4456468917292502e-16),
        (elementary::exp(-Twofold::ONE), 0.36787944117144233, -1.2428753672788363e-17),
        (elementary::sin_cos(Twofold::ONE).0, 0.8414709848078965, 1.776845092935536e-18),
        (elementary::sin_cos(Twofold::ONE).1, 0.5403023058681398, -4.760954612604417e-17),
        (elementary::ln(Twofold::new(3.0)), 1.0986122886681098, -9.07129723500153e-17),
        (elementary::ln(Twofold::new(10.0)), Twofold::LN_10.hi, Twofold::LN_10.lo),
    ];
    for (index, (got, hi, lo)) in cases.into_iter().enumerate() {
        assert!(off(got, hi, lo) < 1e-29, "case {index}: {got:?}");
    }
}

#[test]
fn elementary_functions_undo_each_other() {
    let mut dice = fastrand::Rng::with_seed(7);
    for _ in 0..300 {
        let x = Twofold::sum((dice.f64() - 0.5) * 1200.0, dice.f64() * 1e-15);
        let back = elementary::ln(elementary::exp(x));
        assert!((back - x).hi.abs() <= 2e-29 * (1.0 + x.hi.abs()), "{x:?}");
        let angle = Twofold::sum((dice.f64() - 0.5) * 6.2, dice.f64() * 1e-18);
        let (im, re) = elementary::sin_cos(angle);
        assert!((elementary::angle(ComplexTwofold { re, im }) - angle).hi.abs() <= 1e-29);
        assert!((im * im + re * re - Twofold::ONE).hi.abs() <= 1e-30);
    }
}

#[test]
fn complex_functions_agree_with_the_double_ones_within_both_errors() {
    let mut dice = fastrand::Rng::with_seed(8);
    type Reference = fn(Complex64) -> Complex64;
    let cases: [(Function, Reference); 9] = [
        (Function::Sqrt, |z| z.sqrt()),
        (Function::Exp, |z| z.exp()),
        (Function::Ln, |z| z.ln()),
        (Function::Sin, |z| z.sin()),
        (Function::Cos, |z| z.cos()),
        (Function::Tan, |z| z.tan()),
        (Function::Asin, |z| z.asin()),
        (Function::Acos, |z| z.acos()),
        (Function::Atan, |z| z.atan()),
    ];
    for round in 0..500 {
        let im = if round % 3 == 0 { 0.0 } else { dice.f64() * 3.0 - 1.5 };
        let z = Complex64::new(dice.f64() * 1.9 - 0.95, im);
        for (function, reference) in cases {
            let ball = Ball::function(function, &[Ball::exact(z.into())]).unwrap();
            let off = (ball.centre.to_complex() - reference(z)).norm();
            assert!(off <= 1e-14 * (1.0 + reference(z).norm()), "{function:?} {z} {ball:?}");
            assert!(ball.radius <= 1e-27 * (1.0 + ball.centre.norm()), "{function:?} {z} {ball:?}");
        }
    }
}

#[test]
fn functions_of_a_ball_contain_the_functions_of_its_values() {
    let mut dice = fastrand::Rng::with_seed(9);
    let functions = [
        Function::Sqrt,
        Function::Exp,
        Function::Ln,
        Function::Log10,
        Function::Abs,
        Function::Arg,
        Function::Sin,
        Function::Cos,
        Function::Tan,
        Function::Asin,
        Function::Atan,
    ];
    for _ in 0..500 {
        let centre = Complex64::new(dice.f64() * 2.0 - 1.0, dice.f64() * 2.0 - 1.0);
        let radius = 10f64.powf(-1.0 - 8.0 * dice.f64());
        let point = centre + Complex64::from_polar(radius * 0.999, dice.f64() * 6.3);
        for function in functions {
            let ball = Ball { centre: centre.into(), radius };
            let exact = Ball::function(function, &[Ball::exact(point.into())]).unwrap();
            let Ok(image) = Ball::function(function, &[ball]) else { continue };
            let off = (image.centre - exact.centre).norm();
            assert!(off <= image.radius + exact.radius, "{function:?} {ball:?} {point}");
        }
    }
}

#[test]
fn what_is_not_defined_says_why() {
    let ball = |re: f64, im: f64| Ball::exact(Complex64::new(re, im).into());
    let apply = Ball::function;
    assert_eq!(ball(1.0, 0.0).div(&Ball::ZERO), Err(FieldError::DivisionByZero));
    let about_zero = Ball { centre: 1e-30.into(), radius: 1e-29 };
    assert_eq!(Ball::ONE.div(&about_zero), Err(FieldError::DivisionByZero));
    assert_eq!(Ball::ZERO.whole_power(-1), Err(FieldError::DivisionByZero));
    assert_eq!(apply(Function::Ln, &[Ball::ZERO]), Err(FieldError::Domain));
    assert_eq!(apply(Function::Max, &[ball(1.0, 1.0), Ball::ONE]), Err(FieldError::Domain));
    assert_eq!(apply(Function::Atan2, &[Ball::ONE, Ball::J]), Err(FieldError::Domain));
    assert_eq!(apply(Function::Exp, &[ball(1e4, 0.0)]), Err(FieldError::Overflow));
    assert_eq!(ball(1e200, 0.0).whole_power(2), Err(FieldError::Overflow));
    assert_eq!(apply(Function::Sqrt, &[]), Err(FieldError::Domain));
}

#[test]
fn powers_agree_with_roots_and_products() {
    let ball = |value: f64| Ball::exact(value.into());
    assert_eq!(ball(3.0).power(&ball(4.0)).unwrap(), ball(81.0));
    assert_eq!(ball(9.0).power(&ball(0.5)).unwrap(), ball(3.0));
    assert_eq!(Ball::ZERO.power(&ball(1.5)).unwrap(), Ball::ZERO);
    assert_eq!(Ball::ZERO.power(&ball(-1.5)), Err(FieldError::Domain));
    let by_logarithm = ball(2.0).power(&ball(1.5)).unwrap();
    let by_root = ball(8.0).sqrt().unwrap();
    let off = (by_logarithm.centre - by_root.centre).norm();
    assert!(off <= by_logarithm.radius + by_root.radius && by_logarithm.radius < 1e-27);
}

#[test]
fn interpolation_is_linear_between_the_points_and_refuses_the_outside() {
    let points = [
        (1.0, Complex64::new(10.0, 0.0)),
        (2.0, Complex64::new(20.0, 4.0)),
        (4.0, Complex64::new(20.0, 0.0)),
    ];
    let at = |x: f64, radius: f64| Balls.interpolate(&points, &Ball { centre: x.into(), radius });
    let value = |x: f64| at(x, 0.0).unwrap().centre.to_complex();
    assert_eq!(value(1.0), Complex64::new(10.0, 0.0));
    assert_eq!(value(1.5), Complex64::new(15.0, 2.0));
    assert_eq!(value(2.0), Complex64::new(20.0, 4.0));
    assert_eq!(value(3.0), Complex64::new(20.0, 2.0));
    assert_eq!(value(4.0), Complex64::new(20.0, 0.0));
    assert_eq!(at(0.999, 0.0), Err(FieldError::Domain));
    assert_eq!(at(4.001, 0.0), Err(FieldError::Domain));
    assert_eq!(Balls.interpolate(&points, &Ball::J), Err(FieldError::Domain));
    assert_eq!(Balls.interpolate(&[], &Ball::ONE), Err(FieldError::Domain));
    assert!(at(4.0 + 1e-12, 1e-11).is_ok(), "rounding at the end is forgiven");
    assert!(at(1.0, 0.1).unwrap().radius >= 1.0, "the slope widens the ball");
}
