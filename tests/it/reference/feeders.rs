//! Overhead lines and feeders: coupled conductors with earth return.

use crate::reference::{Check, c, degrees, polar, solve_set, with_gear};
use crate::support::{Solved, solve_with};
use num_complex::Complex64;

/// Ohms per mile: aa, ab, ac, bb, bc, cc.
type Matrix = [(f64, f64); 6];

const PAIRS: [(usize, usize); 6] = [(0, 0), (0, 1), (0, 2), (1, 1), (1, 2), (2, 2)];
const PHASES: [&str; 3] = ["a", "b", "c"];

/// Drives 1 A into each phase in turn and compares the voltages of all with the matrix.
#[track_caller]
fn compare_line(
    check: &mut Check,
    name: &str,
    set: &[(&str, &str)],
    neutral: &str,
    matrix: Matrix,
) {
    for (row, phase) in PHASES.iter().enumerate() {
        let gear = format!("{neutral}\ngnd -(> drive: 1 A )- {phase}");
        let solved = solve_with(&with_gear("e3_overhead_line", &gear), 60.0, set);
        for (pair, (r, x)) in PAIRS.into_iter().zip(matrix) {
            let column = match pair {
                (i, j) if i == row => j,
                (i, j) if j == row => i,
                _ => continue,
            };
            let z = solved.volts(PHASES[column]);
            check.real(&format!("{name} R {phase}{}", PHASES[column]), z.re, r);
            check.real(&format!("{name} X {phase}{}", PHASES[column]), z.im, x);
        }
    }
}

const GROUNDED: &str = "n == gnd";
/// The near end of the neutral left open: it carries nothing.
const OPEN: &str = "";

#[test]
fn line_impedances_from_geometry_are_those_of_the_ieee_test_feeders() {
    // Half a unit of the fourth decimal.
    let mut check = Check::new("E3 line impedances", "Ω/mile", 5.1e-5);
    let config_601 = [
        (0.3465, 1.0179),
        (0.1560, 0.5017),
        (0.1580, 0.4236),
        (0.3375, 1.0478),
        (0.1535, 0.3849),
        (0.3414, 1.0348),
    ];
    compare_line(&mut check, "601", &[], GROUNDED, config_601);
    let four_wire = [
        (0.4576, 1.0780),
        (0.1560, 0.5017),
        (0.1535, 0.3849),
        (0.4666, 1.0482),
        (0.1580, 0.4236),
        (0.4615, 1.0651),
    ];
    let linnet = [("phase_r", "0.306"), ("phase_gmr", "0.0244")];
    let in_order = [linnet[0], linnet[1], ("xa", "0"), ("xb", "2.5"), ("xc", "7")];
    compare_line(&mut check, "4-wire", &in_order, GROUNDED, four_wire);
    let three_wire = [
        (0.4013, 1.4133),
        (0.0953, 0.8515),
        (0.0953, 0.7266),
        (0.4013, 1.4133),
        (0.0953, 0.7802),
        (0.4013, 1.4133),
    ];
    compare_line(&mut check, "3-wire", &in_order, OPEN, three_wire);
    check.finish();
}

#[test]
fn configuration_602_has_the_published_self_impedance() {
    let set = [("phase_r", "0.592"), ("phase_gmr", "0.00814"), ("xb", "7"), ("xc", "0")];
    let gear = format!("{GROUNDED}\ngnd -(> drive: 1 A )- a");
    let z = solve_with(&with_gear("e3_overhead_line", &gear), 60.0, &set).volts("a");
    let mut check = Check::new("E3 configuration 602", "Ω/mile", 5.1e-5);
    check.real("R aa", z.re, 0.7526);
    check.real("X aa", z.im, 1.1814);
    check.finish();
}

/// One case of the four-node feeder; magnitudes and angles in degrees, phases a, b, c.
struct Case {
    name: &'static str,
    /// Load impedances from the published voltages.
    loads: [(f64, f64); 3],
    /// Watts and power factor of each phase, lagging.
    powers: [(f64, f64); 3],
    v2: [(f64, f64); 3],
    v3: [(f64, f64); 3],
    v4: [(f64, f64); 3],
    i12: [(f64, f64); 3],
    /// Currents of the second line, magnitude: published, and computed at the fixed point.
    i34: [(f64, f64); 3],
    /// V4 where the impedances take exactly the power.
    fixed_point_v4: [(f64, f64); 3],
    /// Those impedances.
    fixed_point_loads: [(f64, f64); 3],
}

const BALANCED: Case = Case {
    name: "balanced",
    loads: [(1.65543, 0.80176), (1.91147, 0.92577), (1.76596, 0.85529)],
    powers: [(1800e3, 0.9), (1800e3, 0.9), (1800e3, 0.9)],
    v2: [(7107.0, -0.3), (7140.0, -120.3), (7121.0, 119.6)],
    v3: [(2247.6, -3.7), (2269.0, -123.5), (2256.0, 116.4)],
    v4: [(1918.0, -9.1), (2061.0, -128.3), (1981.0, 110.9)],
    i12: [(347.9, -34.9), (323.7, -154.2), (336.8, 85.0)],
    i34: [(1042.8, 1042.9), (970.2, 970.3), (1009.6, 1009.7)],
    fixed_point_v4: [(1917.6851, -9.0738), (2061.3159, -128.3155), (1980.7101, 110.8558)],
    fixed_point_loads: [(1.654882, 0.801496), (1.912060, 0.926053), (1.765446, 0.855044)],
};

const UNBALANCED: Case = Case {
    name: "unbalanced",
    loads: [(2.68069, 1.66134), (1.67620, 0.81182), (1.27676, 0.41965)],
    powers: [(1275e3, 0.85), (1800e3, 0.90), (2375e3, 0.95)],
    v2: [(7164.0, -0.1), (7110.0, -120.2), (7082.0, 119.3)],
    v3: [(2305.0, -2.3), (2255.0, -123.6), (2203.0, 114.8)],
    v4: [(2175.0, -4.1), (1930.0, -126.8), (1833.0, 102.8)],
    i12: [(230.1, -35.9), (345.7, -152.6), (455.1, 84.7)],
    i34: [(689.7, 689.7), (1036.0, 1036.3), (1364.0, 1364.2)],
    fixed_point_v4: [(2174.9089, -4.1240), (1929.8708, -126.7980), (1832.5472, 102.8433)],
    fixed_point_loads: [(2.680463, 1.661202), (1.675981, 0.811714), (1.276127, 0.419443)],
};

#[track_caller]
fn feeder(loads: [Complex64; 3]) -> Solved {
    let text = |z: Complex64| format!("({} + {}j) ohm", z.re, z.im);
    let set = [("load_a", text(loads[0])), ("load_b", text(loads[1])), ("load_c", text(loads[2]))];
    solve_set("e4_four_node_feeder", 60.0, &set)
}

fn impedances(loads: [(f64, f64); 3]) -> [Complex64; 3] {
    loads.map(|(r, x)| c(r, x))
}

#[test]
fn the_four_node_feeder_has_its_published_voltages_and_currents() {
    let mut volts = Check::new("E4 four-node feeder, voltages", "V", 0.6);
    let mut amps = Check::new("E4 four-node feeder, currents", "A", 0.2);
    let mut angles = Check::new("E4 four-node feeder, angles", "°", 0.06);
    for case in [BALANCED, UNBALANCED] {
        let solved = feeder(impedances(case.loads));
        for (k, phase) in PHASES.iter().enumerate() {
            for (node, table) in [("2", case.v2), ("3", case.v3), ("4", case.v4)] {
                let v = solved.volts(&format!("{phase}{node}"));
                let at = format!("{}, V{node} {phase}", case.name);
                volts.real(&at, v.norm(), table[k].0);
                angles.angle(&at, degrees(v), table[k].1);
            }
            let i = solved.amps(&format!("far_{phase}"));
            let at = format!("{}, I12 {phase}", case.name);
            amps.real(&at, i.norm(), case.i12[k].0);
            angles.angle(&at, degrees(i), case.i12[k].1);
        }
    }
    volts.finish();
    amps.finish();
    angles.finish();
}

#[test]
fn the_four_node_feeder_settles_where_each_load_takes_its_power() {
    let mut volts = Check::new("E4 fixed point, voltages", "V", 0.01);
    let mut loads = Check::new("E4 fixed point, load impedances", "Ω", 2e-6);
    // Two of the published currents are whole amperes.
    let mut published = Check::new("E4 fixed point, published load currents", "A", 0.5);
    let mut amps = Check::new("E4 fixed point, load currents", "A", 0.051);
    for case in [BALANCED, UNBALANCED] {
        let power = case
            .powers
            .map(|(watts, factor): (f64, f64)| polar(watts / factor, factor.acos().to_degrees()));
        let mut z = impedances(case.loads);
        for _ in 0..25 {
            let solved = feeder(z);
            for (k, phase) in PHASES.iter().enumerate() {
                z[k] = solved.volts(&format!("{phase}4")).norm_sqr() / power[k].conj();
            }
        }
        let solved = feeder(z);
        for (k, phase) in PHASES.iter().enumerate() {
            let at = format!("{}, phase {phase}", case.name);
            let (magnitude, angle) = case.fixed_point_v4[k];
            volts.phasor(&at, solved.volts(&format!("{phase}4")), polar(magnitude, angle));
            let (r, x) = case.fixed_point_loads[k];
            loads.phasor(&at, z[k], c(r, x));
            let current = solved.amps(&format!("near_{phase}")).norm();
            published.real(&at, current, case.i34[k].0);
            amps.real(&at, current, case.i34[k].1);
        }
    }
    volts.finish();
    loads.finish();
    published.finish();
    amps.finish();
}

#[test]
fn configuration_601_has_the_published_shunt_susceptances() {
    // Microsiemens per mile: aa, ab, ac, bb, bc, cc.
    let published = [6.2998, -1.9958, -1.2595, 5.9597, -0.7417, 5.6386];
    let mut check = Check::new("E3 shunt susceptances of 601", "µS/mile", 5.1e-5);
    for (row, phase) in PHASES.iter().enumerate() {
        let excite = format!("excite_{phase}");
        let set = [(excite.as_str(), "1 V".to_owned())];
        let solved = solve_set("e3_line_capacitance", 60.0, &set);
        for (pair, susceptance) in PAIRS.into_iter().zip(published) {
            let column = match pair {
                (i, j) if i == row => j,
                (i, j) if j == row => i,
                _ => continue,
            };
            let current = solved.amps(&format!("source_{}", PHASES[column]));
            let at = format!("{phase}{}", PHASES[column]);
            check.phasor(&at, current * 1e6, c(0.0, susceptance));
        }
    }
    check.finish();
}
