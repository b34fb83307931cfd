//! Draws single elements: their text between the brackets and their law.

use crate::exact::network::Law;
use crate::exact::number::Exact;
use crate::exact::values::{self, Decimal};
use fastrand::Rng;

/// The frequency the circuit is solved at, and how large its impedances usually are.
pub struct Setting {
    pub frequency_hz: i64,
    pub omega: Exact,
    /// Usual impedance as a power of ten, in ohms.
    pub level: f64,
}

/// Text of a value with its attributes, and the law of the element.
pub struct Valued {
    pub text: String,
    pub law: Law,
}

impl Setting {
    pub fn draw(rng: &mut Rng) -> Self {
        const FREQUENCIES_HZ: [i64; 8] = [50, 60, 400, 1000, 12_500, 85_000, 1_000_000, 13_560_000];
        let frequency_hz = FREQUENCIES_HZ[rng.usize(0..FREQUENCIES_HZ.len())];
        let omega = Exact::omega(frequency_hz);
        Setting { frequency_hz, omega, level: 4.0 * rng.f64() }
    }

    /// Power of ten of one element's impedance: mostly near the level, seldom far from it.
    fn decades(&self, rng: &mut Rng) -> f64 {
        match rng.u8(0..20) {
            0 => -3.0 + 12.0 * rng.f64(),
            _ => self.level - 1.5 + 3.0 * rng.f64(),
        }
    }

    /// log10 of ω.
    pub fn omega_decades(&self) -> f64 {
        (self.frequency_hz as f64 * std::f64::consts::TAU).log10()
    }

    /// Any passive element.
    pub fn passive(&self, rng: &mut Rng) -> Valued {
        match rng.u8(0..12) {
            0..4 => self.resistor(rng),
            4 => self.conductance(rng),
            5 => {
                let decades = self.decades(rng);
                let (text, z) = values::complex_with_unit(rng, decades, "Ω");
                Valued { text, law: Law::Impedance(z) }
            }
            6 => self.formula(rng),
            7..10 => self.capacitor(rng),
            _ => self.winding(rng),
        }
    }

    pub fn resistor(&self, rng: &mut Rng) -> Valued {
        let decades = self.decades(rng);
        let value = Decimal::near(rng, decades);
        Valued { text: values::with_unit(rng, value, "Ω"), law: Law::Impedance(value.exact()) }
    }

    fn conductance(&self, rng: &mut Rng) -> Valued {
        let decades = self.decades(rng);
        let value = Decimal::near(rng, -decades);
        Valued { text: values::with_unit(rng, value, "S"), law: Law::Admittance(value.exact()) }
    }

    /// Values that are computed, with the frequency in some of them.
    fn formula(&self, rng: &mut Rng) -> Valued {
        let decades = self.decades(rng);
        let (a, b) = (Decimal::near(rng, decades), Decimal::near(rng, decades));
        let (ohms_a, ohms_b) = (values::with_unit(rng, a, "Ω"), values::with_unit(rng, b, "Ω"));
        let (text, z) = match rng.u8(0..5) {
            0 => (format!("{ohms_a} + {ohms_b}"), &a.exact() + &b.exact()),
            1 => {
                let product = &a.exact() * &b.exact();
                let z = &product * &(&a.exact() + &b.exact()).inverse();
                (format!("parallel({ohms_a}, {ohms_b})"), z)
            }
            2 => {
                let ratio = Exact::decimal(self.frequency_hz, -3);
                (format!("{ohms_a}*(1 + f / 1 kHz)"), &a.exact() * &(&Exact::whole(1, 0) + &ratio))
            }
            3 => {
                let l = Decimal::near(rng, decades - self.omega_decades());
                let text = format!("{ohms_a} + j*omega*{}", values::with_unit(rng, l, "H"));
                (text, &a.exact() + &self.reactance(&l.exact()))
            }
            _ => {
                let c = Decimal::near(rng, -decades - self.omega_decades());
                let text = format!("1/(2j*pi * f * {})", values::with_unit(rng, c, "F"));
                (text, self.reactance(&c.exact()).inverse())
            }
        };
        Valued { text, law: Law::Impedance(z.reduced()) }
    }

    /// `jωx`
    pub fn reactance(&self, x: &Exact) -> Exact {
        (&self.omega * x).times_j()
    }

    fn capacitor(&self, rng: &mut Rng) -> Valued {
        let decades = self.decades(rng);
        let c = Decimal::near(rng, -decades - self.omega_decades());
        let text = values::with_unit(rng, c, "F");
        let admittance = self.reactance(&c.exact()).reduced();
        match rng.u8(0..3) {
            0 => Valued { text, law: Law::Admittance(admittance) },
            1 => {
                let esr = Decimal::near(rng, decades - 2.0);
                let text = format!("{text}, esr {}", values::with_unit(rng, esr, "Ω"));
                let z = &admittance.inverse() + &esr.exact();
                Valued { text, law: Law::Impedance(z.reduced()) }
            }
            _ => {
                let (loss, value) = match rng.u8(0..3) {
                    0 => ("0.2%", Exact::decimal(2, -3)),
                    1 => ("0.05", Exact::decimal(5, -2)),
                    _ => ("0.0015", Exact::decimal(15, -4)),
                };
                let size = (&self.omega * &c.exact()).inverse();
                let z = &size * &(&value - &Exact::whole(0, 1));
                Valued { text: format!("{text},tand {loss}"), law: Law::Impedance(z.reduced()) }
            }
        }
    }

    fn winding(&self, rng: &mut Rng) -> Valued {
        let decades = self.decades(rng) - self.omega_decades();
        let value = Decimal::near(rng, decades);
        self.winding_of(rng, value)
    }

    /// A winding of a given inductance with one of the ways to state its resistance.
    pub fn winding_of(&self, rng: &mut Rng, inductance: Decimal) -> Valued {
        let text = values::with_unit(rng, inductance, "H");
        let reactance = self.reactance(&inductance.exact());
        let q = [20, 64, 180, 210][rng.usize(0..4)];
        let over_q = Exact::whole(q, 0).inverse();
        let (text, resistance) = match rng.u8(0..4) {
            0 => (text, Exact::zero()),
            1 => {
                let decades = self.level - 2.0 + rng.f64();
                let esr = Decimal::near(rng, decades);
                (format!("{text}, esr {}", values::with_unit(rng, esr, "Ω")), esr.exact())
            }
            2 => {
                let size = &self.omega * &inductance.exact();
                (format!("{text}, q {q}"), &size * &over_q)
            }
            _ => {
                let f0 = Decimal { mantissa: [3, 25, 80][rng.usize(0..3)], exponent: 3 };
                let omega0 = Exact::omega(f0.mantissa * 1000);
                let at = values::with_unit(rng, f0, "Hz");
                let size = &omega0 * &inductance.exact();
                (format!("{text}, q {q} at {at}"), &size * &over_q)
            }
        };
        let own = (&reactance + &resistance).reduced();
        Valued { text, law: Law::Winding { own, dot_left: rng.bool() } }
    }
}
