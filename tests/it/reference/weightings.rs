//! Weighting curves of published standards.

use crate::reference::{Check, c, circuit, db, degrees, omega, solve_set};
use crate::support::solve;
use num_complex::Complex64;

/// IEC 61672-1: the tables of A and C at 1000·10^(n/10) Hz, n from -20.
const A_AND_C_DB: [(f64, f64); 34] = [
    (-70.4, -14.3),
    (-63.4, -11.2),
    (-56.7, -8.5),
    (-50.5, -6.2),
    (-44.7, -4.4),
    (-39.4, -3.0),
    (-34.6, -2.0),
    (-30.2, -1.3),
    (-26.2, -0.8),
    (-22.5, -0.5),
    (-19.1, -0.3),
    (-16.1, -0.2),
    (-13.4, -0.1),
    (-10.9, 0.0),
    (-8.6, 0.0),
    (-6.6, 0.0),
    (-4.8, 0.0),
    (-3.2, 0.0),
    (-1.9, 0.0),
    (-0.8, 0.0),
    (0.0, 0.0),
    (0.6, 0.0),
    (1.0, -0.1),
    (1.2, -0.2),
    (1.3, -0.3),
    (1.2, -0.5),
    (1.0, -0.8),
    (0.5, -1.3),
    (-0.1, -2.0),
    (-1.1, -3.0),
    (-2.5, -4.4),
    (-4.3, -6.2),
    (-6.6, -8.5),
    (-9.3, -11.2),
];

/// The two weightings by the formulas of annex E, unnormalised.
fn weightings_by_formula(frequency_hz: f64) -> (Complex64, Complex64) {
    // The poles follow from f_r = 1000, f_L = 10^1.5, f_H = 10^3.9, f_A = 10^2.45 Hz, D² = 1/2.
    let (reference, low, high) = (1e3, 10f64.powf(1.5), 10f64.powf(3.9));
    let d = 0.5f64.sqrt();
    let b = (reference * reference + low * low * high * high / (reference * reference)
        - d * (low * low + high * high))
        / (1.0 - d);
    let product = low * low * high * high;
    let root = (b * b - 4.0 * product).sqrt();
    let (f1, f4) = (((-b - root) / 2.0).sqrt(), ((-b + root) / 2.0).sqrt());
    let corner = 10f64.powf(2.45);
    let f2 = (3.0 - 5f64.sqrt()) / 2.0 * corner;
    let f3 = (3.0 + 5f64.sqrt()) / 2.0 * corner;
    let s = c(0.0, frequency_hz);
    let weighted_c = (s / (s + f1)).powi(2) * (f4 / (s + f4)).powi(2);
    (weighted_c * s * s / ((s + f2) * (s + f3)), weighted_c)
}

#[test]
fn a_and_c_weighting_agree_with_all_68_values_of_iec_61672_1() {
    let mut table = Check::new("A1 A and C weighting, table", "dB", 0.05);
    let mut formula = Check::new("A1 A and C weighting, formula", "dB", 1e-6);
    let text = circuit("a1_weighting");
    let at_1khz = solve(&text, 1000.0);
    let gains = |s: &crate::support::Solved| (db(s.volts("weighted_a")), db(s.volts("weighted_c")));
    let (a0, c0) = gains(&at_1khz);
    for (row, (a_table, c_table)) in A_AND_C_DB.into_iter().enumerate() {
        let frequency = 1000.0 * 10f64.powf((row as f64 - 20.0) / 10.0);
        let (a, c) = gains(&solve(&text, frequency));
        let at = |curve| format!("{curve} at {frequency:.4} Hz");
        table.real(&at("A"), a - a0, a_table);
        table.real(&at("C"), c - c0, c_table);
        let (a_formula, c_formula) = weightings_by_formula(frequency);
        formula.real(&at("A"), a, db(a_formula));
        formula.real(&at("C"), c, db(c_formula));
    }
    table.finish();
    formula.finish();
}

#[test]
fn a_and_c_weighting_have_the_published_gain_at_1_khz() {
    let at_1khz = solve(&circuit("a1_weighting"), 1000.0);
    let (a, c) = (at_1khz.volts("weighted_a"), at_1khz.volts("weighted_c"));
    let mut printed = Check::new("A1 gain at 1 kHz, printed", "dB", 0.0005);
    printed.real("A", db(a), -2.000);
    printed.real("C", db(c), -0.062);
    printed.finish();
    let mut gain = Check::new("A1 gain at 1 kHz", "dB", 1e-6);
    gain.real("A", db(a), -1.999_655_536);
    gain.real("C", db(c), -0.061_901_857);
    gain.finish();
    let mut phase = Check::new("A1 phase at 1 kHz", "°", 1e-6);
    phase.angle("A", degrees(a), 35.550_507_518);
    phase.angle("C", degrees(c), -7.016_086_845);
    phase.finish();
}

/// IEC 60098: frequency, listed dB, computed dB, phase in degrees, dB with the 7950 µs high-pass.
const REPLAY: [(f64, f64, f64, f64, f64); 25] = [
    (20.0, 19.274, 19.2741, -20.0338, 16.2614),
    (30.0, 18.592, 18.5926, -28.3188, 16.9947),
    (40.0, 17.792, 17.7920, -35.1430, 16.8229),
    (50.0, 16.946, 16.9457, -40.6168, 16.3017),
    (60.0, 16.102, 16.1006, -44.9504, 15.6439),
    (80.0, 14.506, 14.5060, -51.0469, 14.2440),
    (100.0, 13.088, 13.0885, -54.8114, 12.9195),
    (150.0, 10.272, 10.2706, -58.9077, 10.1956),
    (200.0, 8.219, 8.2195, -59.5525, 8.1779),
    (300.0, 5.484, 5.4844, -57.6362, 5.4669),
    (400.0, 3.781, 3.7837, -54.9103, 3.7746),
    (500.0, 2.648, 2.6476, -52.5700, 2.6424),
    (600.0, 1.844, 1.8406, -50.8527, 1.8375),
    (800.0, 0.752, 0.7514, -49.1067, 0.7504),
    (1000.0, 0.000, 0.0000, -48.9538, 0.0000),
    (1500.0, -1.400, -1.3953, -51.7956, -1.3943),
    (2000.0, -2.589, -2.5885, -55.9197, -2.5872),
    (3000.0, -4.740, -4.7401, -63.2417, -4.7386),
    (4000.0, -6.605, -6.6052, -68.4683, -6.6036),
    (5000.0, -8.210, -8.2096, -72.1456, -8.2080),
    (6000.0, -9.598, -9.5989, -74.8128, -9.5972),
    (8000.0, -11.894, -11.8941, -78.3653, -11.8924),
    (10000.0, -13.734, -13.7343, -80.5976, -13.7326),
    (15000.0, -17.157, -17.1569, -83.6676, -17.1552),
    (20000.0, -19.620, -19.6203, -85.2335, -19.6186),
];

#[test]
fn the_replay_network_follows_the_curve_of_iec_60098() {
    let mut listed = Check::new("A2 record replay, listing", "dB", 0.005);
    let mut computed = Check::new("A2 record replay, four decimals", "dB or °", 5.1e-5);
    let mut formula = Check::new("A2 record replay, formula", "dB", 1e-6);
    let text = circuit("a2_record_replay");
    let curve = |frequency_hz: f64| {
        let s = c(0.0, omega(frequency_hz));
        (1.0 + 318e-6 * s) / ((1.0 + 3180e-6 * s) * (1.0 + 75e-6 * s))
    };
    let reference = solve(&text, 1000.0);
    let (out0, amended0) = (db(reference.volts("out")), db(reference.volts("amended")));
    formula.real("gain at 1 kHz", out0, -19.911_018_419);
    for (frequency, listing, decibels, phase, amended) in REPLAY {
        let solved = solve(&text, frequency);
        let at = format!("{frequency} Hz");
        let gain = db(solved.volts("out")) - out0;
        listed.real(&at, gain, listing);
        computed.real(&at, gain, decibels);
        computed.angle(&at, degrees(solved.volts("out")), phase);
        computed.real(&at, db(solved.volts("amended")) - amended0, amended);
        formula.real(&at, gain, db(curve(frequency)) - db(curve(1000.0)));
    }
    listed.finish();
    computed.finish();
    formula.finish();
}

/// CISPR 16-1-2: node of the circuit, frequency, listed ohms and degrees (where both are
/// recalled), computed ohms and degrees.
type Mains = (&'static str, f64, Option<(f64, f64)>, f64, f64);

const MAINS: [Mains; 48] = [
    ("a", 9e3, Some((5.22, 26.55)), 5.2150, 26.5447),
    ("a", 15e3, Some((6.22, 38.41)), 6.2233, 38.4067),
    ("a", 20e3, Some((7.25, 44.97)), 7.2527, 44.9709),
    ("a", 25e3, Some((8.38, 49.39)), 8.3791, 49.3915),
    ("a", 30e3, Some((9.56, 52.33)), 9.5597, 52.3296),
    ("a", 35e3, None, 10.7678, 54.2419),
    ("a", 40e3, Some((11.99, 55.43)), 11.9862, 55.4330),
    ("a", 50e3, Some((14.41, 56.40)), 14.4098, 56.4039),
    ("a", 60e3, Some((16.77, 56.23)), 16.7710, 56.2264),
    ("a", 70e3, Some((19.04, 55.40)), 19.0369, 55.3973),
    ("a", 80e3, Some((21.19, 54.19)), 21.1883, 54.1898),
    ("a", 90e3, Some((23.22, 52.77)), 23.2148, 52.7648),
    ("a", 100e3, Some((25.11, 51.22)), 25.1115, 51.2220),
    ("a", 150e3, Some((32.72, 43.35)), 32.7146, 43.3535),
    ("b", 0.15e6, Some((34.29, 46.70)), 34.2933, 46.6962),
    ("b", 0.17e6, Some((36.50, 43.11)), 36.5004, 43.1129),
    ("b", 0.2e6, Some((39.12, 38.51)), 39.1239, 38.5119),
    ("b", 0.25e6, Some((42.18, 32.48)), 42.1782, 32.4816),
    ("b", 0.3e6, Some((44.17, 27.95)), 44.1692, 27.9467),
    ("b", 0.35e6, Some((45.52, 24.45)), 45.5152, 24.4526),
    ("b", 0.4e6, Some((46.46, 21.70)), 46.4576, 21.6970),
    ("b", 0.5e6, Some((47.65, 17.66)), 47.6445, 17.6568),
    ("b", 0.6e6, Some((48.33, 14.86)), 48.3287, 14.8561),
    ("b", 0.7e6, Some((48.76, 12.81)), 48.7557, 12.8092),
    ("b", 0.8e6, Some((49.04, 11.25)), 49.0390, 11.2517),
    ("b", 0.9e6, Some((49.24, 10.03)), 49.2361, 10.0284),
    ("b", 1e6, Some((49.38, 9.04)), 49.3785, 9.0431),
    ("b", 1.2e6, Some((49.57, 7.56)), 49.5660, 7.5550),
    ("b", 1.5e6, Some((49.72, 6.06)), 49.7209, 6.0566),
    ("b", 2e6, Some((49.84, 4.55)), 49.8424, 4.5499),
    ("b", 2.5e6, Some((49.90, 3.64)), 49.8990, 3.6426),
    ("b", 3e6, Some((49.93, 3.04)), 49.9298, 3.0368),
    ("b", 4e6, Some((49.96, 2.28)), 49.9605, 2.2785),
    ("b", 5e6, Some((49.98, 1.82)), 49.9747, 1.8232),
    ("b", 7e6, Some((49.99, 1.30)), 49.9871, 1.3025),
    ("b", 10e6, Some((49.99, 0.91)), 49.9937, 0.9118),
    ("b", 15e6, Some((50.00, 0.61)), 49.9972, 0.6079),
    ("b", 20e6, Some((50.00, 0.46)), 49.9984, 0.4559),
    ("b", 30e6, Some((50.00, 0.30)), 49.9993, 0.3040),
    ("c", 0.15e6, None, 4.7028, 72.7401),
    ("c", 0.3e6, None, 9.1371, 73.4733),
    ("c", 0.5e6, None, 14.7475, 69.2386),
    ("c", 1e6, None, 26.2371, 56.5438),
    ("c", 2e6, None, 38.8260, 38.1541),
    ("c", 5e6, None, 47.5572, 17.6226),
    ("c", 10e6, None, 49.3542, 9.0385),
    ("c", 30e6, None, 49.9270, 3.0366),
    ("c", 100e6, None, 49.9934, 0.9118),
];

#[test]
fn mains_networks_have_the_nominal_impedances_of_cispr_16_1_2() {
    let mut listed = Check::new("A7 mains networks, listing", "Ω or °", 0.01);
    let mut computed = Check::new("A7 mains networks, four decimals", "Ω or °", 5.1e-5);
    let mut formula = Check::new("A7 mains networks, formula", "", 1e-9);
    for (node, frequency, listing, ohms, angle) in MAINS {
        let z = solve_set("a7_mains_network", frequency, &[]).volts(node);
        let at = format!("{node} at {frequency} Hz");
        if let Some((listed_ohms, listed_angle)) = listing {
            listed.real(&at, z.norm(), listed_ohms);
            listed.angle(&at, degrees(z), listed_angle);
        }
        computed.real(&at, z.norm(), ohms);
        computed.angle(&at, degrees(z), angle);
        let (r, l) = match node {
            "a" => (5.0, 50e-6),
            "b" => (0.0, 50e-6),
            _ => (1.0, 5e-6),
        };
        let series = c(r, omega(frequency) * l);
        formula.relative(&at, z, 50.0 * series / (50.0 + series));
    }
    listed.finish();
    computed.finish();
    formula.finish();
}
