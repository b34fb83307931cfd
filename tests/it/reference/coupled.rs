//! Two coupled windings: connections, twins, resonators, links, k towards 1.

use crate::reference::{Check, c, circuit, degrees, omega, solve_set};
use crate::support::solve;

/// The frequency at which ω = 1000 rad/s.
const KILO_RADIAN_HZ: f64 = 1000.0 / std::f64::consts::TAU;

#[test]
fn aiding_and_opposing_connections_have_their_inductances_however_coupling_is_stated() {
    let solved = solve(&circuit("c3_connections"), KILO_RADIAN_HZ);
    let mut check = Check::new("C3 aiding and opposing", "", 1e-12);
    for (node, millihenry) in [
        ("series_aiding", 19.0),
        ("series_opposing", 7.0),
        ("parallel_aiding", 27.0 / 7.0),
        ("parallel_opposing", 27.0 / 19.0),
    ] {
        // 1 A and 1000 rad/s: one volt a millihenry.
        check.relative(node, solved.volts(node), c(0.0, millihenry));
    }
    check.finish();
}

#[test]
fn a_coupled_pair_its_tee_and_its_pi_have_one_solution() {
    let solved = solve(&circuit("c3_twins"), KILO_RADIAN_HZ);
    let v1 = c(3.831_726_639_305, 4.397_728_357_354);
    let v2 = c(3.579_268_874_678, 2.090_293_022_812);
    let mut check = Check::new("C3 pair, tee and pi", "V", 2e-12);
    for form in ["pair", "tee", "pi"] {
        check.phasor(form, solved.volts(&format!("{form}1")), v1);
        check.phasor(form, solved.volts(&format!("{form}2")), v2);
    }
    // Turning one winding turns V2 alone; its tee has a negative leg.
    for form in ["turned", "neg"] {
        check.phasor(form, solved.volts(&format!("{form}1")), v1);
        check.phasor(form, solved.volts(&format!("{form}2")), -v2);
    }
    check.finish();
}

#[test]
fn coupling_and_leakage_factors_give_the_open_and_shorted_readings() {
    let frequency = 10e3;
    let solved = solve(&circuit("c3_coefficients"), frequency);
    let mut check = Check::new("C3 coupling and leakage factors", "", 1e-9);
    check.relative("open ratio", solved.volts("open2"), c(0.4, 0.0));
    let shorted = solved.volts("short1") / solved.amps("short_a") / c(0.0, omega(frequency));
    check.relative("shorted inductance", shorted, c(0.72e-3, 0.0));
    let real = solved.volts("real2");
    check.relative("leakage on the second side", solved.volts("first3"), real);
    check.relative("leakage on the first side", solved.volts("second3"), real);
    let entering = solved.amps("source5");
    check.relative("current, leakage on the second side", solved.amps("source3"), entering);
    check.relative("current, leakage on the first side", solved.amps("source4"), entering);
    check.finish();
}

#[test]
fn two_coupled_resonators_ring_at_f0_over_the_root_of_1_plus_and_minus_k() {
    let f0 = 1.0 / omega((100e-6f64 * 1e-9).sqrt());
    let (low, high) = (f0 / 1.2f64.sqrt(), f0 / 0.8f64.sqrt());
    let mut frequencies = Check::new("C4 resonances", "", 1e-12);
    frequencies.share("f0", f0, 503_292.121_045);
    frequencies.share("low", low, 459_440.746_185);
    frequencies.share("high", high, 562_697.697_598);
    frequencies.finish();
    let text = circuit("c4_two_resonators");
    let mut current = Check::new("C4 secondary current at resonance", "", 1e-9);
    let mut phase = Check::new("C4 secondary phase at resonance", "°", 0.001);
    for (frequency, angle) in [(low, 180.0), (high, 0.0)] {
        let secondary = solve(&text, frequency).amps("coil2");
        current.share(&format!("{frequency} Hz"), secondary.norm(), 500.0);
        phase.angle(&format!("{frequency} Hz"), degrees(secondary), angle);
    }
    current.finish();
    phase.finish();
    // The same circuit is far from resonance at f0 itself, so the peaks are peaks.
    let between = solve(&text, f0).amps("coil2").norm();
    assert!(between < 0.1, "{between} A at f0");
}

#[test]
fn critical_coupling_passes_most_current_at_resonance() {
    let mut check = Check::new("C5 critical coupling", "", 1e-10);
    let at = |times: f64| {
        solve_set("c5_critical_coupling", 1e6, &[("times_critical", times.to_string())])
    };
    let critical = at(1.0);
    check.share("r1", (critical.drop("r1") / critical.amps("r1")).re, 12.566_370_614);
    check.share("r2", (critical.drop("r2") / critical.amps("r2")).re, 15.707_963_268);
    let largest = critical.amps("r2").norm();
    check.share("current at k_c", largest, 35.588_127_171e-3);
    let z_in = critical.volts("in") / critical.amps("r1");
    check.relative("input impedance", z_in, c(2.0 * 12.566_370_614_359, 0.0));
    for (times, ratio) in [(0.5, 0.8), (2.0, 0.8), (3.0, 0.6)] {
        check.share(&format!("k = {times} k_c"), at(times).amps("r2").norm() / largest, ratio);
    }
    check.finish();
}

/// The frequency of the largest value of `height` between two frequencies (golden section).
fn peak_hz(mut low: f64, mut high: f64, height: impl Fn(f64) -> f64) -> f64 {
    let golden = (5f64.sqrt() - 1.0) / 2.0;
    let (mut a, mut b) = (high - golden * (high - low), low + golden * (high - low));
    let (mut at_a, mut at_b) = (height(a), height(b));
    while high - low > 1e-3 {
        if at_a > at_b {
            (high, b, at_b) = (b, a, at_a);
            a = high - golden * (high - low);
            at_a = height(a);
        } else {
            (low, a, at_a) = (a, b, at_b);
            b = low + golden * (high - low);
            at_b = height(b);
        }
    }
    (low + high) / 2.0
}

#[test]
fn above_critical_coupling_two_peaks_of_equal_height_stand_apart() {
    let mut place = Check::new("C5 place of the two peaks", "Hz", 0.01);
    let mut height = Check::new("C5 height of the two peaks", "", 1e-8);
    let mut handbook = Check::new("C5 peaks, handbook approximation", "", 0.0004);
    for (times, found, approximate) in [
        (2.0, [991_474.98, 1_008_800.10], [991_339.7, 1_008_660.3]),
        (3.0, [986_174.92, 1_014_475.51], [985_857.9, 1_014_142.1]),
    ] {
        let set = [("times_critical", format!("{times}")), ("quality2", "100".to_owned())];
        let current = |f: f64| solve_set("c5_critical_coupling", f, &set).amps("r2").norm();
        for (expected, approximate) in found.into_iter().zip(approximate) {
            let at = format!("k = {times} k_c");
            let peak = peak_hz(expected - 3000.0, expected + 3000.0, current);
            place.real(&at, peak, expected);
            height.share(&at, current(peak), 45.944_074_618e-3);
            handbook.share(&at, peak, approximate);
        }
    }
    place.finish();
    height.finish();
    handbook.finish();
}

#[test]
fn a_compensated_link_feeds_a_constant_current_at_f0_and_a_constant_voltage_beside_it() {
    let f0 = 100e3;
    let mut check = Check::new("C7 series-series link", "", 1e-9);
    for (ohms, z_in) in [(1.0, 123.370_055_0), (10.0, 12.337_005_5), (100.0, 1.233_700_55)] {
        let load = [("resistance", format!("{ohms} ohm"))];
        let at = |what: &str| format!("{what}, {ohms} Ω");
        let tuned = solve_set("c7_compensated_link", f0, &load);
        check.relative(&at("current"), tuned.amps("load"), c(0.0, 9.003_163_161_571));
        let found = tuned.read("input_impedance");
        check.relative(&at("input impedance"), found, c(z_in, 0.0));
        for (k, ratio) in [(0.25, -0.5f64.sqrt()), (-0.25, 0.5f64.sqrt())] {
            let solved = solve_set("c7_compensated_link", f0 / (1.0f64 + k).sqrt(), &load);
            check.relative(&at("voltage ratio"), solved.volts("out") / 100.0, c(ratio, 0.0));
        }
    }
    check.finish();
}

#[test]
fn coupled_windings_tend_to_the_ideal_transformer_as_k_tends_to_1() {
    let mut check = Check::new("C8 k towards 1", "V", 5.1e-10);
    for (coupling, expected) in [
        ("0.9999", c(0.492_226_983, -0.061_656_123)),
        ("0.999999999", c(0.499_999_921, 0.000_198_315)),
    ] {
        let solved = solve_set("c8_towards_ideal", 1e4, &[("coupling", coupling.to_owned())]);
        check.phasor(coupling, solved.volts("pair2"), expected);
    }
    check.finish();
    let mut ideal = Check::new("C8 ideal transformer", "", 1e-12);
    let solved = solve_set("c8_towards_ideal", 1e4, &[("coupling", "1".to_owned())]);
    ideal.relative("first side", solved.volts("ideal1"), c(5.0, 0.0));
    ideal.relative("second side", solved.volts("ideal2"), c(0.5, 0.0));
    // k = 1 leaves only the magnetising current of L1: V2 = 0.1 V1, V1 = 10 Z/(50 + Z) with
    // Z = jωL1 beside 50 Ω.
    let magnetising = c(0.0, omega(1e4));
    let z = magnetising * 50.0 / (magnetising + 50.0);
    ideal.relative("k = 1 exactly", solved.volts("pair2"), z / (50.0 + z));
    ideal.finish();
}
