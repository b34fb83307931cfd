//! Sweeps whose points are chosen by the response, judged by true solutions between their rows.

use crate::support;
use bifilar::study::adaptive::{self, Axis, Refine, Resonance};
use bifilar::study::grid::{Spacing, band};
use bifilar::study::sweep::{self, Event, Plan};
use bifilar::study::{SweepHead, SweepRow};
use num_complex::Complex64;
use std::f64::consts::PI;
use std::ops::ControlFlow;
use std::path::Path;

/// What a refined sweep delivered.
struct Swept {
    head: SweepHead,
    rows: Vec<SweepRow>,
    resonances: Vec<Resonance>,
    unsolved: Vec<f64>,
    full: bool,
}

const USUAL: Refine = Refine {
    tolerance: adaptive::USUAL_TOLERANCE,
    most: adaptive::USUAL_MOST,
    axis: Axis::Logarithmic,
};

#[track_caller]
fn swept_as(text: &str, frequencies_hz: Vec<f64>, refine: Option<Refine>) -> Swept {
    let (_, mut program) = support::circuit(text, Path::new("."), &[]).expect("the text is sound");
    let head = SweepHead { varied: Vec::new(), readings: Vec::new(), rows: 0 };
    let mut swept = Swept { head, rows: vec![], resonances: vec![], unsolved: vec![], full: false };
    let mut sink = |event: Event| {
        match event {
            Event::Tally(_) => {}
            Event::Head(head) => swept.head = head.clone(),
            Event::Row(row) => swept.rows.push(row.clone()),
            Event::Unsolved { frequency_hz, .. } => swept.unsolved.push(frequency_hz),
            Event::Resonance(resonance) => swept.resonances.push(resonance.clone()),
            Event::Full { .. } => swept.full = true,
        }
        ControlFlow::Continue(())
    };
    let plan = Plan { frequencies_hz, vary: Vec::new() };
    let ended = match refine {
        Some(refine) => adaptive::run(&mut program, &plan, &refine, &mut sink),
        None => sweep::run(&mut program, &plan, &mut sink),
    };
    ended.expect("the sweep runs to its end");
    swept
}

#[track_caller]
fn refined(text: &str, from_hz: f64, to_hz: f64) -> Swept {
    let frequencies_hz = band(from_hz, to_hz, Spacing::PerDecade(2)).expect("a band");
    let swept = swept_as(text, frequencies_hz, Some(USUAL));
    assert!(swept.rows.windows(2).all(|w| w[0].frequency_hz < w[1].frequency_hz));
    let ends = (swept.rows[0].frequency_hz, swept.rows[swept.rows.len() - 1].frequency_hz);
    assert_eq!(ends, (from_hz, to_hz));
    assert!(!swept.full);
    eprintln!("{} solved from {from_hz} Hz to {to_hz} Hz", swept.rows.len());
    swept
}

/// Solves `count` frequencies between the rows, and some near every resonance, and asserts that the
/// straight line is within the tolerance there.
#[track_caller]
fn lines_hold(text: &str, swept: &Swept, axis: Axis, tolerance: f64, count: usize) {
    let mut random = fastrand::Rng::with_seed(7);
    let (low, high) = (swept.rows[0].frequency_hz, swept.rows[swept.rows.len() - 1].frequency_hz);
    let mut tried: Vec<f64> = (0..count)
        .map(|i| match i % 3 {
            // Over the band, and between rows wherever they stand.
            0 => low * (high / low).powf(random.f64()),
            _ => {
                let pair = random.usize(0..swept.rows.len() - 1);
                let (a, b) = (swept.rows[pair].frequency_hz, swept.rows[pair + 1].frequency_hz);
                a + (b - a) * random.f64()
            }
        })
        .collect();
    for resonance in swept.resonances.iter().filter(|r| r.q.is_finite()) {
        for _ in 0..50 {
            let widths = 6.0 * (random.f64() - 0.5);
            let f = resonance.frequency_hz * (1.0 + widths / resonance.q);
            tried.push(f.clamp(low, high));
        }
    }
    let truth = swept_as(text, tried, None);
    let x = |f: f64| if axis == Axis::Linear { f } else { f.ln() };
    for true_row in &truth.rows {
        let f = true_row.frequency_hz;
        let at = swept.rows.partition_point(|row| row.frequency_hz <= f).min(swept.rows.len() - 1);
        let (a, b) = (&swept.rows[at - 1], &swept.rows[at]);
        // What jumps does so between two rows that nothing tells apart.
        if b.frequency_hz - a.frequency_hz < 1e-12 * f {
            continue;
        }
        let part = (x(f) - x(a.frequency_hz)) / (x(b.frequency_hz) - x(a.frequency_hz));
        for (i, value) in true_row.values.iter().enumerate() {
            let [a, b] = [a, b].map(|row| row.values[i].value);
            let off = (a * (1.0 - part) + b * part - value.value).norm();
            let size = a.norm().max(b.norm()).max(1e-15 * peak(swept, i).0);
            assert!(off <= tolerance * size, "reading {i} at {f} Hz is {:e} off", off / size);
        }
    }
}

#[track_caller]
fn peak(swept: &Swept, reading: usize) -> (f64, f64) {
    let rows = swept.rows.iter().map(|row| (row.values[reading].value.norm(), row.frequency_hz));
    rows.max_by(|a, b| a.0.total_cmp(&b.0)).expect("there are rows")
}

/// A series resonance of a given quality, with its natural frequency in hertz.
fn series(natural_hz: f64, q: f64) -> String {
    format!(
        "let f0 = {natural_hz} Hz
         let L = 1 mH
         gnd -( drive: 1 V +)- a -( r: 2*pi*f0*L/{q} )- b -( coil: L )- c -( tune: 1/((2*pi*f0)^2*L) )- gnd
         read current = amps(coil)
         read height = volts(c)"
    )
}

#[test]
fn a_resonance_of_q_100_000_is_found_in_four_decades() {
    for natural_hz in [123_456.789, 1_234.5, 8.7654321e6, 31_622.0] {
        let text = series(natural_hz, 1e5);
        let swept = refined(&text, 1e3, 1e7);
        let (height, at_hz) = peak(&swept, 0);
        let expected = 1e5 / (2.0 * PI * natural_hz * 1e-3);
        assert!((height / expected - 1.0).abs() < 1e-9, "{height} {expected}");
        assert!((at_hz / natural_hz - 1.0).abs() < 1e-11, "{at_hz}");
        let [resonance] = &swept.resonances[..] else { panic!("{:?}", swept.resonances) };
        assert!((resonance.q / 1e5 - 1.0).abs() < 1e-4, "{resonance:?}");
        lines_hold(&text, &swept, Axis::Logarithmic, 1e-3, 2000);
        assert!(swept.rows.len() < 700, "{}", swept.rows.len());
    }
}

#[test]
fn the_voltage_of_a_resonance_has_a_row_on_its_own_peak() {
    // At low Q the voltage across the capacitor peaks beside the natural frequency, at
    // f0·√(1 − 1/(2Q²)), with the height Q/√(1 − 1/(4Q²)).
    let (f0, q) = (50e3, 3.0f64);
    let swept = refined(&series(f0, q), 1e3, 1e6);
    let (height, at_hz) = peak(&swept, 1);
    let expected = q / (1.0 - 0.25 / (q * q)).sqrt();
    assert!((height / expected - 1.0).abs() < 1e-12, "{height}");
    assert!((at_hz / (f0 * (1.0 - 0.5 / (q * q)).sqrt()) - 1.0).abs() < 1e-7, "{at_hz}");
}

#[test]
fn two_close_peaks_of_coupled_resonators_are_told_apart() {
    let text = "let f0 = 100 kHz
        let L = 200 µH
        gnd -( drive: 1 V +)- a -( ra: 2*pi*f0*L/20000 )- b -( ca: 1/((2*pi*f0)^2*L) )- c -(* la: L )- gnd
        gnd -(* lb: L )- d -( cb: 1/((2*pi*f0)^2*L) )- e -( rb: 2*pi*f0*L/20000 )- gnd
        couple la, lb : k 0.001
        read first = amps(la)
        read second = amps(lb)";
    let swept = refined(text, 1e3, 1e7);
    // Split by the coupling to f0/√(1 ± k).
    assert_eq!(swept.resonances.len(), 2, "{:?}", swept.resonances);
    for (resonance, k) in swept.resonances.iter().zip([1e-3f64, -1e-3]) {
        let expected = 100e3 / (1.0 + k).sqrt();
        assert!((resonance.frequency_hz / expected - 1.0).abs() < 1e-8, "{resonance:?}");
    }
    lines_hold(text, &swept, Axis::Logarithmic, 1e-3, 2000);
    assert!(swept.rows.len() < 1000, "{}", swept.rows.len());
}

/// How few straight lines over log f follow a closed form, each as long as it can be: the number
/// of points that are really needed.
fn needed(from_hz: f64, to_hz: f64, reading: impl Fn(f64) -> Complex64) -> usize {
    let holds = |a: f64, b: f64| {
        let (ya, yb) = (reading(a), reading(b));
        (1..8).all(|i| {
            let part = f64::from(i) / 8.0;
            let y = reading(a * (b / a).powf(part));
            let complex = (ya * (1.0 - part) + yb * part - y).norm();
            let size = ya.norm() * (1.0 - part) + yb.norm() * part - y.norm();
            complex.max(size.abs()) <= 1e-3 * ya.norm().max(yb.norm())
        })
    };
    let (mut at, mut points, mut length) = (from_hz, 1, 1e-3f64);
    while at < to_hz {
        while !holds(at, at * (1.0 + length)) {
            length *= 0.98;
        }
        while holds(at, at * (1.0 + 1.01 * length)) && length < 1.0 {
            length *= 1.01;
        }
        at *= 1.0 + length;
        points += 1;
    }
    points
}

#[test]
fn hardly_more_points_are_solved_than_are_needed() {
    let corner = |f: f64| Complex64::new(1.0, 2.0 * PI * f * 1e-5).inv();
    let text = "gnd -( drive: 1 V +)- a -( r: 1 kΩ )- out -( c: 10 nF )- gnd
        read out = volts(out)";
    let (solved, least) = (refined(text, 10.0, 1e7).rows.len(), needed(10.0, 1e7, corner));
    eprintln!("a corner: {solved} solved, {least} needed");
    assert!(4 * solved <= 5 * least, "{solved} {least}");
    let natural_hz = 123_456.789;
    let resonance = |f: f64| {
        let ratio = f / natural_hz;
        Complex64::new(1e-5, (ratio - 1.0) * (1.0 + 1.0 / ratio)).inv()
    };
    let text = series(natural_hz, 1e5).replace("read height = volts(c)", "");
    let (solved, least) = (refined(&text, 1e3, 1e7).rows.len(), needed(1e3, 1e7, resonance));
    eprintln!("a resonance: {solved} solved, {least} needed");
    assert!(4 * solved <= 5 * least, "{solved} {least}");
}

#[test]
fn a_plain_corner_needs_few_points() {
    let text = "gnd -( drive: 1 V +)- a -( r: 1 kΩ )- out -( c: 10 nF )- gnd
        read out = volts(out)";
    let swept = refined(text, 10.0, 1e7);
    lines_hold(text, &swept, Axis::Logarithmic, 1e-3, 2000);
    assert!(swept.rows.len() < 130, "{}", swept.rows.len());
}

#[test]
fn a_band_without_any_feature_needs_next_to_nothing() {
    let text = "gnd -( drive: 1 V +)- a -( r: 1 kΩ )- out -( s: 1 kΩ )- gnd
        read out = volts(out)
        read lost = re(power(r))";
    let swept = refined(text, 10.0, 1e7);
    lines_hold(text, &swept, Axis::Logarithmic, 1e-3, 2000);
    assert!(swept.rows.len() <= 40, "{}", swept.rows.len());
    assert_eq!(swept.resonances, []);
}

/// A Chebyshev ladder of five branches with 0.5 dB ripple and a corner at 1 MHz (element values of
/// the low-pass prototype: 1.7058, 1.2296, 2.5408, 1.2296, 1.7058).
const LADDER: &str = "let R = 50 Ω
    let w = 2*pi*1 MHz
    gnd -( drive: 2 V +)- s -( rs: R )- a -( c1: 1.7058/(R*w) )- gnd
    a -( l2: 1.2296*R/w )- b -( c3: 2.5408/(R*w) )- gnd
    b -( l4: 1.2296*R/w )- out -( c5: 1.7058/(R*w) )- gnd
    out -( load: R )- gnd
    read out = volts(out)
    read level = abs(volts(out))
    read angle = arg(volts(out))
    read in = volts(a)/amps(rs)
    read balance = re(power(load))/-re(power(drive))";

#[test]
fn a_ladder_with_ripple_and_readings_that_are_not_rational() {
    let swept = refined(LADDER, 1e4, 1e8);
    lines_hold(LADDER, &swept, Axis::Logarithmic, 1e-3, 2000);
    assert!(swept.rows.len() < 800, "{}", swept.rows.len());
    // The ripple's tops and bottoms are rows: the bottoms lie 0.5 dB below the tops.
    let level = |row: &SweepRow| row.values[1].value.re;
    let inside: Vec<_> = swept.rows.iter().filter(|row| row.frequency_hz < 0.99e6).collect();
    let turns: Vec<f64> = inside
        .windows(3)
        .filter(|w| (level(w[1]) - level(w[0])) * (level(w[2]) - level(w[1])) < 0.0)
        .map(|w| 20.0 * level(w[1]).log10())
        .collect();
    assert_eq!(turns.len(), 4, "{turns:?}");
    for (i, turn) in turns.iter().enumerate() {
        let expected = if i % 2 == 0 { -0.5 } else { 0.0 };
        assert!((turn - expected).abs() < 1e-3, "{turns:?}");
    }
}

#[test]
fn an_angle_that_jumps_does_so_between_two_rows() {
    let swept = refined(LADDER, 1e4, 1e8);
    let angle = |row: &SweepRow| row.values[2].value.re;
    let jumps: Vec<_> =
        swept.rows.windows(2).filter(|w| (angle(&w[1]) - angle(&w[0])).abs() > 6.0).collect();
    assert_eq!(jumps.len(), 1);
    for w in jumps {
        assert!(w[1].frequency_hz - w[0].frequency_hz < 1e-12 * w[0].frequency_hz);
    }
}

#[test]
fn a_linear_band_is_refined_over_the_frequency_itself() {
    let text = series(30e3, 200.0);
    let refine = Refine { axis: Axis::Linear, tolerance: 1e-2, ..USUAL };
    let points = band(0.0, 100e3, Spacing::Linear(5)).expect("a band");
    let swept = swept_as(&text, points, Some(refine));
    let (height, _) = peak(&swept, 0);
    let expected = 200.0 / (2.0 * PI * 30e3 * 1e-3);
    assert!((height / expected - 1.0).abs() < 1e-9, "{height} {expected}");
    let above = Swept { rows: swept.rows[1..].to_vec(), ..swept };
    lines_hold(&text, &above, Axis::Linear, 1e-2, 1000);
    assert!(above.rows.len() < 250, "{}", above.rows.len());
}

#[test]
fn values_that_follow_a_root_of_the_frequency_are_followed() {
    let text = "gnd -( drive: 1 V +)- a -( skin: 0.01 Ω * sqrt(f/1 kHz) )- b -( coil: 1 mH )- c -( tune: 1 nF )- gnd
        c -( load: 1 MΩ )- gnd
        read out = volts(c)
        read heat = re(power(skin))";
    let swept = refined(text, 1e3, 1e7);
    lines_hold(text, &swept, Axis::Logarithmic, 1e-3, 2000);
    assert_eq!(swept.resonances.len(), 1, "{:?}", swept.resonances);
    assert!(swept.rows.len() < 900, "{}", swept.rows.len());
}

#[test]
fn the_number_of_rows_has_a_limit() {
    let refine = Refine { most: 60, ..USUAL };
    let points = band(1e3, 1e7, Spacing::PerDecade(2)).expect("a band");
    let swept = swept_as(&series(123_456.0, 1e5), points, Some(refine));
    assert!(swept.full);
    assert_eq!(swept.rows.len(), 60);
}

/// Natural frequency 1/(2π√(L·C)) with √(L·C) = 1/(2π·1 kHz), without any loss.
const TANK: &str = "gnd -(> drive: 1 A )- top -( coil: 1 mH/(2*pi) )- gnd
    top -( tune: 1 mF/(2*pi) )- gnd
    read top = volts(top)";

#[test]
fn a_resonance_without_loss_is_one_row_without_values() {
    let swept = swept_as(TANK, vec![500.0, 1000.0, 2000.0], None);
    assert_eq!(swept.unsolved, [1000.0]);
    let defined: Vec<_> = swept.rows.iter().map(|row| row.values[0].value.is_finite()).collect();
    assert_eq!(defined, [true, false, true]);
}

#[test]
fn a_resonance_without_loss_is_refined_up_to_a_millionth_of_it() {
    let swept = refined(TANK, 10.0, 1e5);
    let [resonance] = &swept.resonances[..] else { panic!("{:?}", swept.resonances) };
    assert_eq!(resonance.q, f64::INFINITY);
    assert!((resonance.frequency_hz / 1e3 - 1.0).abs() < 1e-11, "{resonance:?}");
    assert!(swept.rows.len() < 900, "{}", swept.rows.len());
    let truth = swept_as(TANK, vec![999.9, 999.99, 1000.01, 1000.1], None);
    for row in &truth.rows {
        let at = swept.rows.partition_point(|r| r.frequency_hz <= row.frequency_hz);
        let (a, b) = (&swept.rows[at - 1], &swept.rows[at]);
        let part =
            (row.frequency_hz / a.frequency_hz).ln() / (b.frequency_hz / a.frequency_hz).ln();
        let line: Complex64 = a.values[0].value * (1.0 - part) + b.values[0].value * part;
        support::close(line, row.values[0].value, 1e-3);
    }
}
