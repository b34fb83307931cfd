//! Filter ladders from published prototype values, and attenuator pads.

use crate::reference::{Check, c, circuit, db, degrees, solve_set};
use crate::support::{Solved, solve};
use std::f64::consts::PI;

const CUTOFF_HZ: f64 = 1e6;

/// Solves the ladder with these prototype values at a multiple of its cutoff.
#[track_caller]
fn ladder(g: &[f64], load_ratio: f64, multiple: f64) -> Solved {
    let names: Vec<String> = (1..=g.len()).map(|k| format!("g{k}")).collect();
    let mut set: Vec<(&str, String)> =
        names.iter().zip(g).map(|(name, g)| (name.as_str(), g.to_string())).collect();
    set.push(("load_ratio", load_ratio.to_string()));
    solve_set(&format!("b_ladder_{}", g.len()), CUTOFF_HZ * multiple, &set)
}

/// Loss of the available power in decibels: source of 1 V, 50 Ω.
#[track_caller]
fn attenuation_db(solved: &Solved) -> f64 {
    let available = 1.0 / (4.0 * 50.0);
    10.0 * (available / solved.power("load").re).log10()
}

#[test]
fn the_butterworth_table_is_maximally_flat() {
    const TABLE: [&[f64]; 4] = [
        &[1.0, 2.0, 1.0],
        &[0.7654, 1.8478, 1.8478, 0.7654],
        &[0.6180, 1.6180, 2.0000, 1.6180, 0.6180],
        &[0.4450, 1.2470, 1.8019, 2.0000, 1.8019, 1.2470, 0.4450],
    ];
    let mut printed = Check::new("B1 Butterworth table against the law", "dB", 0.002);
    let mut exact = Check::new("B1 Butterworth values by formula", "dB", 1e-9);
    for table in TABLE {
        let n = table.len();
        let by_formula: Vec<f64> =
            (1..=n).map(|k| 2.0 * ((2 * k - 1) as f64 * PI / (2 * n) as f64).sin()).collect();
        for multiple in [0.3f64, 0.5, 0.8, 1.0, 1.25, 2.0, 3.0] {
            let law = 10.0 * (1.0 + multiple.powi(2 * n as i32)).log10();
            let at = format!("n = {n}, f/fc = {multiple}");
            printed.real(&at, attenuation_db(&ladder(table, 1.0, multiple)), law);
            exact.real(&at, attenuation_db(&ladder(&by_formula, 1.0, multiple)), law);
        }
    }
    printed.finish();
    exact.finish();
}

#[test]
fn the_butterworth_filter_at_1_mhz_has_its_published_attenuation() {
    let text = circuit("b1_butterworth_5");
    let mut check = Check::new("B1 Butterworth 1 MHz", "dB", 1e-7);
    for (mhz, decibels) in [(0.5, 0.004_239_087_6), (1.0, 3.010_299_956_6), (2.0, 30.107_238_653_9)]
    {
        check.real(&format!("{mhz} MHz"), attenuation_db(&solve(&text, mhz * 1e6)), decibels);
    }
    check.finish();
    let mut far = Check::new("B1 Butterworth 1 MHz, at 10 MHz", "dB", 1e-6);
    far.real("10 MHz", attenuation_db(&solve(&text, 1e7)), 100.000_000_000_4);
    far.finish();
    let mut phase = Check::new("B1 Butterworth 1 MHz, phase", "°", 5.1e-6);
    for (mhz, angle) in [(0.5, -96.12573), (1.0, 135.0)] {
        phase.angle(&format!("{mhz} MHz"), degrees(solve(&text, mhz * 1e6).volts("out")), angle);
    }
    phase.finish();
    const FOUR_DIGITS: [f64; 5] = [0.6180, 1.6180, 2.0000, 1.6180, 0.6180];
    let mut table = Check::new("B1 Butterworth 1 MHz from four digits", "dB", 5.1e-5);
    for (multiple, decibels) in [(1.0, 3.0102), (2.0, 30.1062)] {
        let found = attenuation_db(&ladder(&FOUR_DIGITS, 1.0, multiple));
        table.real(&format!("f/fc = {multiple}"), found, decibels);
    }
    table.finish();
}

/// One row of the table: ripple in decibels, prototype values, load, attenuation at 0.5, 0.8, 1,
/// 1.5, 2 and 3 times the cutoff, and the multiple at which half the power passes.
struct Chebyshev {
    ripple_db: f64,
    g: &'static [f64],
    load: f64,
    attenuation_db: [f64; 6],
    half_power: f64,
}

const MULTIPLES: [f64; 6] = [0.5, 0.8, 1.0, 1.5, 2.0, 3.0];

const CHEBYSHEV: [Chebyshev; 6] = [
    Chebyshev {
        ripple_db: 0.5,
        g: &[1.5963, 1.0967, 1.5963],
        load: 1.0,
        attenuation_db: [0.5, 0.06517, 0.5, 10.36768, 19.21606, 30.78059],
        half_power: 1.167_485_211_2,
    },
    Chebyshev {
        ripple_db: 0.5,
        g: &[1.6703, 1.1926, 2.3661, 0.8419],
        load: 1.9841,
        attenuation_db: [0.1305, 0.36131, 0.5, 18.34959, 30.60347, 46.08788],
        half_power: 1.093_101_941_8,
    },
    Chebyshev {
        ripple_db: 0.5,
        g: &[1.7058, 1.2296, 2.5408, 1.2296, 1.7058],
        load: 1.0,
        attenuation_db: [0.1305, 0.49728, 0.5, 26.65116, 42.0387, 61.3988],
        half_power: 1.059_259_147_2,
    },
    Chebyshev {
        ripple_db: 0.1,
        g: &[1.0316, 1.1474, 1.0316],
        load: 1.0,
        attenuation_db: [0.1, 0.01252, 0.1, 4.60407, 12.23913, 23.60394],
        half_power: 1.388_994_826_3,
    },
    Chebyshev {
        ripple_db: 0.1,
        g: &[1.1468, 1.3712, 1.9750, 1.3712, 1.1468],
        load: 1.0,
        attenuation_db: [0.02522, 0.09943, 0.1, 19.49877, 34.84785, 54.20681],
        half_power: 1.134_718_002_0,
    },
    Chebyshev {
        ripple_db: 3.0,
        g: &[3.3487, 0.7117, 3.3487],
        load: 1.0,
        attenuation_db: [3.0, 0.50502, 3.0, 19.11777, 28.28529, 39.89252],
        half_power: 1.000_264_050_7,
    },
];

/// Prototype values and load by the formulas of Matthaei, Young and Jones.
fn chebyshev_by_formula(ripple_db: f64, n: usize) -> (Vec<f64>, f64) {
    // β = ln coth(A/17.37) with the constant exact: 40/ln 10.
    let beta = (1.0 / (ripple_db * 10f64.ln() / 40.0).tanh()).ln();
    let gamma = (beta / (2 * n) as f64).sinh();
    let a = |k: usize| ((2 * k - 1) as f64 * PI / (2 * n) as f64).sin();
    let b = |k: usize| gamma.powi(2) + (k as f64 * PI / n as f64).sin().powi(2);
    let mut g = vec![2.0 * a(1) / gamma];
    for k in 2..=n {
        g.push(4.0 * a(k - 1) * a(k) / (b(k - 1) * g[k - 2]));
    }
    let load = if n % 2 == 1 { 1.0 } else { 1.0 / (beta / 4.0).tanh().powi(2) };
    (g, load)
}

/// Attenuation of the Chebyshev law at a multiple of the cutoff.
fn chebyshev_law_db(ripple_db: f64, n: usize, multiple: f64) -> f64 {
    let n = n as f64;
    let polynomial = match multiple {
        x if x <= 1.0 => (n * x.acos()).cos(),
        x => (n * x.acosh()).cosh(),
    };
    let epsilon_squared = 10f64.powf(ripple_db / 10.0) - 1.0;
    10.0 * (1.0 + epsilon_squared * polynomial * polynomial).log10()
}

#[test]
fn the_chebyshev_tables_have_their_ripple_and_their_published_attenuation() {
    let mut values = Check::new("B2 Chebyshev prototype values, table", "", 5.1e-5);
    let mut printed = Check::new("B2 Chebyshev from four digits", "dB", 0.0011);
    let mut table = Check::new("B2 Chebyshev from exact values, table", "dB", 5.1e-6);
    let mut law = Check::new("B2 Chebyshev from exact values, law", "dB", 1e-9);
    let mut half = Check::new("B2 Chebyshev half-power frequency", "dB", 1e-7);
    for row in CHEBYSHEV {
        let n = row.g.len();
        let (g, load) = chebyshev_by_formula(row.ripple_db, n);
        for (k, (exact, printed_g)) in g.iter().zip(row.g).enumerate() {
            values.real(&format!("{} dB, n = {n}, g{}", row.ripple_db, k + 1), *exact, *printed_g);
        }
        values.real(&format!("{} dB, n = {n}, load", row.ripple_db), load, row.load);
        for (multiple, decibels) in MULTIPLES.into_iter().zip(row.attenuation_db) {
            let at = format!("{} dB, n = {n}, f/fc = {multiple}", row.ripple_db);
            printed.real(&at, attenuation_db(&ladder(row.g, row.load, multiple)), decibels);
            // Even n: the load is 1/1.9841 when the ladder ends in a series winding; it is the
            // resistance itself after a shunt capacitor, as here.
            let exact = attenuation_db(&ladder(&g, load, multiple));
            table.real(&at, exact, decibels);
            law.real(&at, exact, chebyshev_law_db(row.ripple_db, n, multiple));
        }
        let found = attenuation_db(&ladder(&g, load, row.half_power));
        half.real(&format!("{} dB, n = {n}", row.ripple_db), found, 20.0 * 2f64.sqrt().log10());
    }
    values.finish();
    printed.finish();
    table.finish();
    law.finish();
    half.finish();
}

#[test]
fn chebyshev_ladders_of_three_reflect_nothing_where_the_law_is_zero() {
    let mut check = Check::new("B2 Chebyshev reflection at 0.866 fc", "", 1e-9);
    for ripple_db in [0.1, 0.5, 3.0] {
        let (g, load) = chebyshev_by_formula(ripple_db, 3);
        let solved = ladder(&g, load, 0.75f64.sqrt());
        // Matched: half the source voltage stands at the input.
        let reflection = 2.0 * solved.volts("n0") - 1.0;
        check.phasor(&format!("{ripple_db} dB"), reflection, c(0.0, 0.0));
    }
    check.finish();
}

/// Loss in decibels and input resistance of a pad between 50 Ω.
#[track_caller]
fn pad(name: &str, set: &[(&str, String)]) -> (f64, f64) {
    let solved = solve_set(name, 1000.0, set);
    let z_in = solved.volts("in") / solved.amps("inner");
    (attenuation_db(&solved), z_in.re)
}

fn ohms(value: f64) -> String {
    format!("{value} ohm")
}

#[test]
fn pads_of_the_tables_have_the_loss_they_are_named_for() {
    // Decibels; series and shunt of the T; shunt and series of the pi.
    const EXACT: [(f64, f64, f64, f64, f64); 4] = [
        (3.0, 8.549_867_867, 141.926_155_887, 292.402_179_64, 17.614_794_006),
        (6.0, 16.613_942_458, 66.931_040_648, 150.476_023_754, 37.351_877_034),
        (10.0, 25.974_692_665, 35.136_418_446, 96.247_529_557, 71.151_247_354),
        (20.0, 40.909_090_909, 10.101_010_101, 61.111_111_111, 247.5),
    ];
    let mut loss = Check::new("B5 pads, loss", "dB", 1e-9);
    let mut match_ = Check::new("B5 pads, input resistance", "", 1e-9);
    for (decibels, t_series, t_shunt, pi_shunt, pi_series) in EXACT {
        let t = [("series_r", ohms(t_series)), ("shunt_r", ohms(t_shunt))];
        let pi = [("series_r", ohms(pi_series)), ("shunt_r", ohms(pi_shunt))];
        for (name, set) in [("b5_pad_t", t), ("b5_pad_pi", pi)] {
            let (found, z_in) = pad(name, &set);
            loss.real(&format!("{name} {decibels} dB"), found, decibels);
            match_.share(&format!("{name} {decibels} dB"), z_in, 50.0);
        }
    }
    loss.finish();
    match_.finish();
}

#[test]
fn printed_pads_keep_their_loss_within_the_rounding_of_the_print() {
    let mut printed = Check::new("B5 printed pads of 1 and 10 dB", "dB", 0.002);
    printed.real("T, 10 dB", pad("b5_pad_t", &[]).0, 10.0);
    let t = [("series_r", ohms(2.88)), ("shunt_r", ohms(433.34))];
    printed.real("T, 1 dB", pad("b5_pad_t", &t).0, 1.0);
    printed.real("pi, 1 dB", pad("b5_pad_pi", &[]).0, 1.0);
    printed.real("bridged T, 1 dB", pad("b5_pad_bridged", &[]).0, 1.0);
    printed.finish();
    let (loss, z_in) = pad("b5_pad_t", &[]);
    let mut rounded = Check::new("B5 T of 25.97 and 35.14 Ω", "dB or Ω", 5.1e-7);
    rounded.real("loss", loss, 9.998_725);
    rounded.real("input resistance", z_in, 49.996_512);
    rounded.finish();
}

#[test]
fn the_minimum_loss_pad_matches_75_and_50_ohms() {
    let solved = solve(&circuit("b5_pad_minimum_loss"), 1000.0);
    let mut check = Check::new("B5 minimum-loss pad", "", 1e-9);
    check.relative("input resistance", solved.volts("in") / solved.amps("inner"), c(75.0, 0.0));
    check.share("series", (solved.drop("series") / solved.amps("series")).re, 43.301_270_189);
    check.share("shunt", (solved.drop("shunt") / solved.amps("shunt")).re, 86.602_540_378);
    let loss = 10.0 * (1.0 / (4.0 * 75.0) / solved.power("load").re).log10();
    check.share("loss in dB", loss, 5.719_475_475);
    check.finish();
    assert!(db(solved.volts("out")) < -5.0, "the loss is a loss");
}
