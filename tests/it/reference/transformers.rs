//! Transformers with three and four windings, and open-circuit and short-circuit tests.

use crate::reference::{Check, c, omega, solve_set, with_gear};
use crate::support::{Solved, solve, solve_with};

/// Reactance in ohms seen by a source of 1 V called `drive`.
#[track_caller]
fn reactance(solved: &Solved) -> f64 {
    // The drop is left minus right, so minus the voltage of the driven terminal.
    (-solved.drop("drive") / solved.amps("drive")).im
}

/// The gear of a short-circuit test: one terminal driven, another shorted.
fn driven_and_shorted(driven: &str, shorted: &str) -> String {
    format!("gnd -( drive: 1 V +)- {driven}\ngnd -( short: 0 V +)- {shorted}")
}

#[test]
fn the_star_of_a_three_winding_transformer_returns_its_measured_pairs() {
    let mut check = Check::new("D1 three-winding star", "", 1e-12);
    for (pair, per_unit) in [(("p", "s"), 0.2081), (("p", "t"), 1.0045), (("s", "t"), 0.7530)] {
        let gear = driven_and_shorted(pair.0, pair.1);
        let solved = solve(&with_gear("d1_star", &gear), 50.0);
        check.share(&format!("{}-{}", pair.0, pair.1), reactance(&solved), per_unit);
    }
    check.finish();
    let solved = solve(&with_gear("d1_star", &driven_and_shorted("p", "s")), 50.0);
    let with_t = solve(&with_gear("d1_star", &driven_and_shorted("p", "t")), 50.0);
    let mut arms = Check::new("D1 arms of the star", "", 1e-12);
    let arm = |solved: &Solved, name| (solved.drop(name) / solved.amps(name)).im;
    arms.share("p", arm(&solved, "arm_p"), 0.2298);
    arms.share("s", arm(&solved, "arm_s"), -0.0217);
    arms.share("t", arm(&with_t, "arm_t"), 0.7747);
    arms.finish();
}

#[test]
fn star_and_coupled_windings_agree_with_the_magnetising_branch_in_place() {
    let mut printed = Check::new("D1 with magnetising branch", "", 5.1e-9);
    let mut alike = Check::new("D1 star against coupled windings", "", 1e-10);
    for (pair, per_unit) in
        [(("p", "s"), 0.208_095_290), (("p", "t"), 0.998_544_536), (("s", "t"), 0.747_044_536)]
    {
        let at = format!("{}-{}", pair.0, pair.1);
        let gear = driven_and_shorted(pair.0, pair.1);
        let coupled = reactance(&solve(&with_gear("d1_matrix", &gear), 50.0));
        let branch = format!("star -( magnetising: 100 * unit_l )- gnd\n{gear}");
        let star = reactance(&solve(&with_gear("d1_star", &branch), 50.0));
        printed.share(&at, coupled, per_unit);
        alike.share(&at, star, coupled);
    }
    printed.finish();
    alike.finish();
}

/// What is read in a test of the four-winding transformer.
enum Read {
    /// Inductance at the driven winding.
    Henry,
    /// Voltage of a winding over that of the driven one.
    Ratio(usize),
}

#[test]
fn a_four_winding_transformer_passes_all_18_published_tests() {
    use Read::{Henry, Ratio};
    // Name, driven winding, shorted winding, what is read, expected.
    let tests: [(&str, usize, Option<usize>, Read, f64); 18] = [
        ("m1", 1, None, Henry, 250e-6),
        ("m2", 1, None, Ratio(2), 0.5),
        ("m3", 1, None, Ratio(3), 2.0),
        ("m4", 1, None, Ratio(4), 0.25),
        ("m5", 1, Some(4), Ratio(2), 0.25),
        ("m6", 1, Some(4), Ratio(3), 0.75),
        ("m7", 1, Some(3), Ratio(2), 1.0 / 6.0),
        ("m8", 1, Some(3), Ratio(4), 0.09375),
        ("m9", 1, Some(2), Ratio(3), 2.0 / 3.0),
        ("m10", 1, Some(2), Ratio(4), 0.125),
        ("m11", 2, Some(1), Henry, 0.6e-6),
        ("m12", 3, Some(1), Henry, 9.6e-6),
        ("m13", 4, Some(1), Henry, 0.15e-6),
        ("m14", 2, Some(1), Ratio(3), 8.0 / 3.0),
        ("m15", 2, Some(1), Ratio(4), 0.25),
        ("m16", 3, Some(1), Ratio(2), 1.0 / 6.0),
        ("m17", 3, Some(1), Ratio(4), 0.078125),
        ("m18", 4, Some(1), Ratio(2), 1.0),
    ];
    let frequency = 20e3;
    let mut check = Check::new("D2 four windings, 18 tests", "", 1e-9);
    for (name, driven, shorted, read, expected) in tests {
        let mut gear = format!("gnd -( drive: 1 V +)- p{driven}");
        if let Some(shorted) = shorted {
            gear += &format!("\ngnd -( short: 0 V +)- p{shorted}");
        }
        let solved = solve(&with_gear("d2_four_windings", &gear), frequency);
        let found = match read {
            Henry => c(1.0, 0.0) / solved.amps("drive") / c(0.0, omega(frequency)),
            Ratio(winding) => solved.volts(&format!("p{winding}")),
        };
        check.relative(name, found, c(expected, 0.0));
    }
    check.finish();
}

/// Test data of a transformer: volts, amperes, watts, with the turns ratio of the side the
/// short-circuit test was read at to the side the open-circuit test was read at.
struct Nameplate {
    name: &'static str,
    open: (f64, f64, f64),
    short: (f64, f64, f64),
    ratio: f64,
}

const NAMEPLATES: [Nameplate; 3] = [
    Nameplate {
        name: "50 kVA",
        open: (240.0, 5.41, 186.0),
        short: (48.0, 20.8, 617.0),
        ratio: 10.0,
    },
    Nameplate { name: "4 kVA", open: (200.0, 0.8, 70.0), short: (20.0, 10.0, 80.0), ratio: 2.0 },
    Nameplate {
        name: "50 MVA",
        open: (8e3, 62.1, 206e3),
        short: (674.0, 6250.0, 187e3),
        ratio: 1.0,
    },
];

impl Nameplate {
    fn solve(&self, gear: &str) -> Solved {
        let set = [
            ("open_v", format!("{} V", self.open.0)),
            ("open_a", format!("{} A", self.open.1)),
            ("open_w", format!("{} W", self.open.2)),
            ("short_v", format!("{} V", self.short.0)),
            ("short_a", format!("{} A", self.short.1)),
            ("short_w", format!("{} W", self.short.2)),
            ("ratio", self.ratio.to_string()),
        ];
        let set: Vec<(&str, &str)> = set.iter().map(|(n, v)| (*n, v.as_str())).collect();
        solve_with(&with_gear("e2_transformer", gear), 60.0, &set)
    }

    fn open_test(&self) -> Solved {
        self.solve(&format!("gnd -( tester: {} V +)- x", self.open.0))
    }

    fn short_test(&self) -> Solved {
        self.solve(&format!("gnd -( tester: {} V +)- h\nx -( short: 0 V +)- gnd", self.short.0))
    }

    /// Full load at x as an impedance, supplied at h with 1 V.
    fn full_load(&self, volt_amperes: f64, power_factor: f64) -> Solved {
        let z = self.open.0 * self.open.0 / volt_amperes;
        let (r, x) = (z * power_factor, z * (1.0 - power_factor * power_factor).sqrt());
        self.solve(&format!("gnd -( supply: 1 V +)- h\nx -( load: ({r} + {x}j) ohm )- gnd"))
    }

    /// The same transformer with next to no core, as where its exciting current is neglected.
    fn without_core(&self) -> Nameplate {
        Nameplate { open: (self.open.0, 1e-12, 1e-12), ..*self }
    }
}

#[test]
fn a_transformer_made_from_its_tests_returns_its_tests() {
    let mut check = Check::new("E2 open- and short-circuit tests returned", "", 1e-12);
    for plate in NAMEPLATES {
        let at = |what: &str| format!("{} {what}", plate.name);
        let open = plate.open_test();
        check.share(&at("open amperes"), open.amps("tester").norm(), plate.open.1);
        check.share(&at("open watts"), -open.power("tester").re, plate.open.2);
        let short = plate.short_test();
        check.share(&at("short amperes"), short.amps("tester").norm(), plate.short.1);
        check.share(&at("short watts"), -short.power("tester").re, plate.short.2);
    }
    check.finish();
}

#[test]
fn the_equivalent_circuits_have_the_published_impedances() {
    // Series R, X; core R, X.
    let expected = [
        [1.426_127_959, 1.814_277_496, 309.677_419, 44.824_610],
        [0.8, 1.833_030_278, 571.428_571, 278.019_219],
        [0.004_787_2, 0.107_733_692, 310.679_612, 141.568_587],
    ];
    let mut check = Check::new("E2 equivalent circuits", "", 2e-8);
    for (plate, expected) in NAMEPLATES.iter().zip(expected) {
        let (open, short) = (plate.open_test(), plate.short_test());
        let z = |solved: &Solved, name| solved.drop(name) / solved.amps(name);
        let found = [
            z(&short, "winding_r").re,
            z(&short, "winding_x").im,
            z(&open, "core_loss").re,
            z(&open, "core_flux").im,
        ];
        let names = ["R", "X", "core R", "core X"];
        for (what, (found, expected)) in names.iter().zip(found.iter().zip(expected)) {
            check.share(&format!("{} {what}", plate.name), *found, expected);
        }
    }
    check.finish();
    let mut book = Check::new("E2 50 kVA, impedances of the book", "Ω", 0.0065);
    let short = NAMEPLATES[0].short_test();
    let z = -short.drop("tester") / short.amps("tester");
    book.real("Z", z.norm(), 2.31);
    book.real("R", z.re, 1.42);
    book.real("X", z.im, 1.82);
    book.finish();
}

#[test]
fn regulation_and_efficiency_at_full_load_are_those_published() {
    let regulation = |plate: &Nameplate, volt_amperes| {
        let solved = plate.without_core().full_load(volt_amperes, 0.8);
        100.0 * (1.0 / (plate.ratio * solved.volts("x").norm()) - 1.0)
    };
    // The exciting current's own copper loss is neglected, as it is in the published figures.
    let efficiency = |plate: &Nameplate, volt_amperes: f64| {
        let solved = plate.without_core().full_load(volt_amperes, 0.8);
        let copper = solved.power("winding_r").re / solved.power("load").re;
        let core = -plate.open_test().power("tester").re / (0.8 * volt_amperes);
        100.0 / (1.0 + copper + core)
    };
    let [big, small, _] = &NAMEPLATES;
    let mut book = Check::new("E2 50 kVA, regulation of the book", "points", 0.02);
    book.real("regulation", regulation(big, 50e3), 1.92);
    book.finish();
    let mut percent = Check::new("E2 50 kVA, efficiency of the book", "points", 0.05);
    percent.real("efficiency", efficiency(big, 50e3), 98.0);
    percent.finish();
    let mut exact = Check::new("E2 regulation and efficiency, computed", "points", 5.1e-5);
    exact.real("50 kVA regulation", regulation(big, 50e3), 1.9366);
    exact.real("4 kVA regulation", regulation(small, 4e3), 4.378_682);
    exact.real("4 kVA efficiency", efficiency(small, 4e3), 95.522_388);
    exact.finish();
    let magnetising = small.open_test().amps("core_flux").norm();
    let mut current = Check::new("E2 4 kVA magnetising current", "A", 5.1e-10);
    current.real("open test", magnetising, 0.719_374_728);
    current.finish();
}

#[test]
fn the_primary_voltage_at_full_load_is_that_of_the_worked_example() {
    let solved = NAMEPLATES[0].without_core().full_load(50e3, 0.8);
    let mut check = Check::new("E2 50 kVA, primary voltage", "V", 5.1e-7);
    let (primary, secondary) = (solved.volts("h"), solved.volts("x"));
    check.phasor("at 240 V", 240.0 * primary / secondary, c(2_446.447_268, 12.411_359));
    check.finish();
}

#[test]
fn a_transformer_shorted_at_rated_current_shows_its_short_circuit_voltage() {
    let mut check = Check::new("E2 short-circuit voltage of 1000 kVA", "", 1e-9);
    for (line_kv, z, r, x) in
        [(0.4, 9.6e-3, 1.68e-3, 9.451_856_960e-3), (20.0, 24.0, 4.2, 23.629_642_401)]
    {
        let set = [("line_v", format!("{line_kv} kV"))];
        let solved = solve_set("e2_short_circuit_voltage", 50.0, &set);
        let at = |what: &str| format!("{line_kv} kV {what}");
        let impedance = solved.volts("terminal") / solved.amps("rated");
        check.share(&at("Z"), impedance.norm(), z);
        check.share(&at("R"), impedance.re, r);
        check.share(&at("X"), impedance.im, x);
        let phase_v = line_kv * 1e3 / 3f64.sqrt();
        check.share(&at("u_k"), solved.volts("terminal").norm() / phase_v, 0.06);
        check.share(&at("u_r"), solved.drop("r").norm() / phase_v, 0.0105);
        check.share(&at("u_x"), solved.drop("x").norm() / phase_v, 0.059_074_106_00);
        check.share(&at("load loss"), 3.0 * solved.power("r").re, 10.5e3);
    }
    check.finish();
}
