//! Circuits of the trade whose laws are published: nulls, bridges, three-phase and telephone work.

use crate::reference::{Check, c, circuit, omega, polar, solve_set};
use crate::support::solve;
use num_complex::Complex64;

#[test]
fn campbells_null_lies_where_mutual_reactance_and_capacitance_cancel() {
    let null_hz = 1.0 / omega((25e-3f64 * 100e-9).sqrt());
    let text = circuit("k1_campbell_null");
    let solved = solve(&text, null_hz);
    let current = solved.amps("inner");
    let mut check = Check::new("K1 Campbell null", "V", 1e-12);
    check.phasor("at the null", solved.volts("detector"), c(0.0, 0.0));
    check.finish();
    assert!(current.norm() > 1e-3, "the primary carries current: {current}");
    let mut law = Check::new("K1 detector beside the null", "", 1e-11);
    for frequency in [0.5 * null_hz, 0.99 * null_hz, 1.01 * null_hz, 3.0 * null_hz] {
        let solved = solve(&text, frequency);
        let w = omega(frequency);
        // The secondary carries nothing: only M and the capacitor act on the detector.
        let found = (solved.volts("detector") / solved.amps("inner")).im;
        law.share(&format!("{frequency} Hz"), found, w * 25e-3 - 1.0 / (w * 100e-9));
    }
    law.finish();
}

#[test]
fn the_maxwell_wien_bridge_balances_at_every_frequency() {
    let mut check = Check::new("K2 Maxwell-Wien bridge", "V", 1e-12);
    for frequency in [50.0, 1e3, 1592.0, 20e3] {
        let balanced = solve_set("k2_maxwell_wien_bridge", frequency, &[]);
        check.phasor(&format!("{frequency} Hz"), balanced.drop("detector"), c(0.0, 0.0));
        let off =
            solve_set("k2_maxwell_wien_bridge", frequency, &[("standard_c", "11 nF".to_owned())]);
        assert!(off.drop("detector").norm() > 1e-3, "out of balance at {frequency} Hz");
    }
    check.finish();
}

#[test]
fn the_wien_network_passes_a_third_in_phase() {
    let f0 = 1.0 / omega(10e3 * 10e-9);
    let mut check = Check::new("K3 Wien network", "", 1e-12);
    for multiple in [0.1, 0.5, 1.0, 2.0, 10.0] {
        let solved = solve(&circuit("k3_wien_network"), f0 * multiple);
        let law = 1.0 / c(3.0, multiple - 1.0 / multiple);
        check.relative(&format!("f/f0 = {multiple}"), solved.volts("out") / 3.0, law);
    }
    check.finish();
}

#[test]
fn the_twin_t_stops_its_notch_frequency() {
    let f0 = 1.0 / omega(10e3 * 10e-9);
    let mut check = Check::new("K4 twin-T notch", "V", 1e-12);
    for multiple in [0.1, 0.9, 1.0, 1.1, 10.0] {
        let solved = solve(&circuit("k4_twin_t"), f0 * multiple);
        let pass = 1.0 - multiple * multiple;
        let law = pass / c(pass, 4.0 * multiple);
        check.phasor(&format!("f/f0 = {multiple}"), solved.volts("out"), law);
    }
    check.finish();
}

#[test]
fn zobels_network_is_600_ohms_at_every_frequency() {
    let mut check = Check::new("K5 constant resistance", "", 1e-12);
    for frequency in [1.0, 300.0, 2652.582, 3400.0, 1e6] {
        let solved = solve(&circuit("k5_constant_resistance"), frequency);
        check.relative(&format!("{frequency} Hz"), solved.volts("port"), c(600.0, 0.0));
    }
    check.finish();
}

#[test]
fn the_resonant_tee_drives_one_current_through_any_load() {
    let mut check = Check::new("K6 constant-current tee", "", 1e-12);
    for ohms in ["0.01", "1", "10", "1000"] {
        let load = [("resistance", format!("{ohms} ohm"))];
        let current = solve_set("k6_constant_current", 50.0, &load).amps("load");
        // E/(jX), X = 25 Ω.
        check.relative(&format!("{ohms} Ω"), current, c(0.0, -230.0 / 25.0));
    }
    check.finish();
}

#[test]
fn a_ground_fault_follows_the_symmetrical_components() {
    let mut check = Check::new("K7 line-to-ground fault", "", 1e-12);
    for fault in [0.001, 0.5, 20.0] {
        let set = [("fault_r", format!("{fault} ohm"))];
        let solved = solve_set("k7_ground_fault", 50.0, &set);
        let (own, mutual) = (c(0.4, 3.0), c(0.1, 0.8));
        let (z1, z0) = (own - mutual, own + 2.0 * mutual);
        let current = 3.0 * 6350.0 / (2.0 * z1 + z0 + 3.0 * fault);
        check.relative(&format!("{fault} Ω fault"), solved.amps("arc"), current);
        // The sound phases see the fault current through the mutual impedance alone.
        let sound = polar(6350.0, -120.0) - current * mutual;
        check.relative(&format!("{fault} Ω sound phase"), solved.volts("b"), sound);
    }
    check.finish();
}

#[test]
fn the_star_point_stands_where_millmans_theorem_puts_it() {
    let solved = solve(&circuit("k8_star_point"), 50.0);
    let (e, z) = (
        [polar(230.0, 0.0), polar(230.0, -120.0), polar(230.0, 120.0)],
        [c(10.0, 5.0), c(20.0, 0.0), c(4.0, -12.0)],
    );
    let driven: Complex64 = e.iter().zip(z).map(|(e, z)| e / z).sum();
    let total: Complex64 = z.iter().map(|z| 1.0 / z).sum();
    let mut check = Check::new("K8 star point", "", 1e-12);
    check.relative("star", solved.volts("star"), driven / total);
    check.finish();
}

#[test]
fn equal_two_phase_loads_behind_scotts_transformers_draw_balanced_currents() {
    let solved = solve(&circuit("k9_two_phase_from_three"), 50.0);
    let mut check = Check::new("K9 two phases from three", "", 1e-12);
    // Main: half the line voltage b-c a half winding; teaser: 1.5 phase voltages at sqrt(3) : 1.
    let (p, q) = (solved.volts("p"), solved.volts("q"));
    check.relative("main phase", p, (polar(230.0, -120.0) - polar(230.0, 120.0)) / 2.0);
    check.relative("teaser phase", q, c(230.0 * 3f64.sqrt() / 2.0, 0.0));
    check.relative("quadrature", p / q, c(0.0, -1.0));
    let load = 2.0 * q.norm_sqr() / c(3.0, 1.0).conj();
    let line = (load / 3.0 / 230.0).conj();
    for (phase, angle) in [("a", 0.0), ("b", -120.0), ("c", 120.0)] {
        // The meters are sources written from ground towards the load: current runs with them.
        check.relative(phase, solved.amps(&format!("meter_{phase}")), line * polar(1.0, angle));
    }
    check.finish();
}

#[test]
fn a_choke_in_a_pair_of_wires_shows_its_two_inductances() {
    let solved = solve(&circuit("k10_two_wire_choke"), 10e3);
    let (l, m) = (2e-3, 0.995 * 2e-3);
    let reactance = |inductance: f64| c(0.0, omega(10e3) * inductance);
    let mut check = Check::new("K10 choke in a pair of wires", "", 1e-12);
    check.relative("common mode", solved.volts("both"), reactance((l + m) / 2.0));
    check.relative("differential", solved.volts("d_in"), reactance(2.0 * (l - m)));
    check.finish();
}

#[test]
fn a_current_transformer_follows_its_ratio_and_its_error() {
    let mut check = Check::new("K11 current transformer", "", 1e-12);
    for burden in [0.5, 10.0, 300.0] {
        let set = [("burden_r", format!("{burden} ohm"))];
        let solved = solve_set("k11_current_transformer", 50.0, &set);
        let w = omega(50.0);
        let law = c(0.0, w * 4e-3) * 100.0 / c(2.0 + burden, w * 0.8);
        check.relative(&format!("{burden} Ω"), solved.amps("burden"), law);
    }
    check.finish();
    let light = solve_set("k11_current_transformer", 50.0, &[("burden_r", "0.5 ohm".to_owned())]);
    let ratio = 100.0 / light.amps("burden").norm();
    assert!((ratio / 200.0 - 1.0).abs() < 1e-3, "the ratio is near 1 : 200: {ratio}");
}

#[test]
fn the_hybrid_keeps_transmitter_and_receiver_apart() {
    let mut check = Check::new("K12 hybrid", "V", 1e-12);
    let sent = solve_set("k12_hybrid", 1e3, &[]);
    check.phasor("sent, balance port", sent.volts("centre"), c(0.0, 0.0));
    // Matched: half of 2 V at the port, each line takes half the available power of 1/600 W.
    check.phasor("sent, port", sent.volts("port"), c(1.0, 0.0));
    for line in ["west", "east"] {
        check.real("sent, power in a line times 1 kΩ", sent.power(line).re * 1e3, 1e3 / 1200.0);
    }
    let back = [("transmit", "0 V".to_owned()), ("receive", "2 V".to_owned())];
    check.phasor("received, port", solve_set("k12_hybrid", 1e3, &back).volts("port"), c(0.0, 0.0));
    check.finish();
    let uneven = solve_set("k12_hybrid", 1e3, &[("line2", "700 ohm".to_owned())]);
    assert!(uneven.volts("centre").norm() > 0.01, "an uneven line upsets the balance");
}

#[test]
fn a_tapped_winding_with_perfect_coupling_is_an_ideal_autotransformer() {
    let solved = solve(&circuit("k13_autotransformer"), 60.0);
    // Turns as the roots of the inductances: 3 to 5 (0.9 : 2.5 = 9 : 25).
    let ratio = 8.0 / 5.0;
    let open = omega(60.0) * (0.9 + 2.5 + 2.0 * (0.9f64 * 2.5).sqrt());
    let mut check = Check::new("K13 autotransformer", "", 1e-12);
    check.relative("tap", solved.volts("tap"), c(240.0 / ratio, 0.0));
    let supply = 240.0 / (30.0 * ratio * ratio) + 240.0 / c(0.0, open);
    check.relative("supply current", solved.amps("source"), supply);
    check.finish();
}
