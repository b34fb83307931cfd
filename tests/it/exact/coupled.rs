//! Draws sets of coupled windings whose inductance matrix is positive definite.

use crate::exact::network::{Law, Mutual};
use crate::exact::number::Exact;
use crate::exact::parts::Valued;
use crate::exact::sketch::{Sketch, Statement, dot};
use crate::exact::values::{self, Decimal};

/// A set of windings, in units of `10^exponent` henries.
struct Set {
    exponent: i32,
    own: Vec<i64>,
}

impl Sketch {
    pub fn draw_coupled_set(&mut self) {
        let size = [2, 2, 2, 3, 3, 4, 5][self.rng.usize(0..7)];
        if !self.room(size) {
            return;
        }
        let decades = self.setting.level - 0.5 + self.rng.f64() - self.setting.omega_decades();
        let exponent = decades.round() as i32 - 1;
        match self.rng.u8(0..4) {
            0 => self.draw_by_factor(size, exponent),
            1 if size == 2 => self.draw_by_leakage(exponent),
            _ => self.draw_by_matrix(size, exponent),
        }
    }

    /// One `k` for all pairs. Inductances are squares, so that √(La·Lb) is a decimal.
    fn draw_by_factor(&mut self, size: usize, exponent: i32) {
        let roots: Vec<i64> = (0..size).map(|_| self.rng.i64(2..=9)).collect();
        let own = roots.iter().map(|root| root * root).collect();
        let windings = self.add_windings(&Set { exponent, own }, None);
        let k = self.rng.i64(5..=99);
        for a in 0..size {
            for b in a + 1..size {
                let m = Exact::decimal(k * roots[a] * roots[b], exponent - 2);
                self.mutual(windings[a], windings[b], &m, &Exact::zero());
            }
        }
        let names = windings.iter().map(|winding| self.element(*winding)).collect::<Vec<_>>();
        let space = ["", " "][self.rng.usize(0..2)];
        let k = if self.rng.bool() { format!("{k}%") } else { values::plain(k, -2) };
        self.couple(&format!("{}{space}: k {k}", names.join(&format!(",{space}"))));
    }

    /// `leakage … at a`: La − M²/Lb is a decimal where Lb is 1, 4 or 25.
    fn draw_by_leakage(&mut self, exponent: i32) {
        let (a, b) = (self.rng.i64(2..=9), [1, 2, 5][self.rng.usize(0..3)]);
        let m = self.rng.i64(1..a * b);
        let windings = self.add_windings(&Set { exponent, own: vec![a * a, b * b] }, None);
        self.mutual(windings[0], windings[1], &Exact::decimal(m, exponent), &Exact::zero());
        let leakage = 100 * a * a - m * m * (100 / (b * b));
        let leakage = Decimal { mantissa: leakage, exponent: exponent - 2 };
        let leakage = values::with_unit(&mut self.rng, leakage, "H");
        let (at, other) = (self.element(windings[0]), self.element(windings[1]));
        let pair = if self.rng.bool() { [&at, &other] } else { [&other, &at] };
        self.couple(&format!("{}, {} : leakage {leakage} at {at}", pair[0], pair[1]));
    }

    /// L = BᵀB + D with whole entries, so every matrix of it is positive definite. Stated as M,
    /// as M and R, or as two readings in series.
    fn draw_by_matrix(&mut self, size: usize, exponent: i32) {
        let rows: Vec<Vec<i64>> =
            (0..size).map(|_| (0..size).map(|_| self.rng.i64(-3..=4)).collect()).collect();
        let entry = |a: usize, b: usize| rows.iter().map(|row| row[a] * row[b]).sum::<i64>();
        let own = (0..size).map(|a| entry(a, a) + self.rng.i64(1..=4)).collect();
        let set = Set { exponent, own };
        let resistive = self.rng.u8(0..3) == 0;
        // Own resistances of 10 to 99 units and mutual ones of 1 or 2 stay positive definite.
        let decades = self.setting.level - 3.0 + self.rng.f64();
        let unit = decades.round() as i32;
        let windings = self.add_windings(&set, resistive.then_some(unit));
        for a in 0..size {
            for b in a + 1..size {
                let m = Decimal { mantissa: entry(a, b), exponent };
                if m.mantissa == 0 {
                    continue;
                }
                let sum = set.own[a] + set.own[b];
                let (first, second) = (self.element(windings[a]), self.element(windings[b]));
                let mut resistance = Exact::zero();
                let how = if resistive {
                    let r = Decimal { mantissa: self.rng.i64(1..=2), exponent: unit };
                    resistance = r.exact();
                    let (m, r) = (self.henries(m), values::with_unit(&mut self.rng, r, "Ω"));
                    format!("M {m}, R {r}")
                } else if m.mantissa > 0 && self.rng.u8(0..3) == 0 {
                    let series = |sign: i64| sum + sign * 2 * m.mantissa;
                    let aiding = self.henries(Decimal { mantissa: series(1), exponent });
                    let opposing = self.henries(Decimal { mantissa: series(-1), exponent });
                    format!("aiding {aiding}, opposing {opposing}")
                } else {
                    format!("M {}", self.henries(m))
                };
                self.mutual(windings[a], windings[b], &m.exact(), &resistance);
                self.couple(&format!("{first}, {second} : {how}"));
            }
        }
    }

    fn henries(&mut self, value: Decimal) -> String {
        values::with_unit(&mut self.rng, value, "H")
    }

    fn element(&self, part: usize) -> String {
        self.parts[part].branch.name.clone().unwrap_or_default()
    }

    fn couple(&mut self, how: &str) {
        self.statements.push(Statement { text: format!("couple {how}"), nodes: Vec::new() });
    }

    fn mutual(&mut self, first: usize, second: usize, m: &Exact, resistance: &Exact) {
        let impedance = (&self.setting.reactance(m) + resistance).reduced();
        self.network.mutuals.push(Mutual { first, second, impedance });
    }

    /// The windings, the first ones on an island each; with series resistances of 10 to 99 units
    /// where a power of ten of ohms is given.
    fn add_windings(&mut self, set: &Set, resistance_unit: Option<i32>) -> Vec<usize> {
        let mut added = Vec::new();
        for (index, own) in set.own.iter().enumerate() {
            let island = if index < self.islands.len() {
                index
            } else {
                self.rng.usize(0..self.islands.len())
            };
            let inductance = Decimal { mantissa: *own, exponent: set.exponent };
            let valued = match resistance_unit {
                None => self.setting.winding_of(&mut self.rng, inductance),
                Some(exponent) => self.resistive_winding(inductance, exponent),
            };
            let ends = self.pair(island);
            let name = self.name();
            let marks = dot(&valued.law);
            self.add(name, valued, marks, ends);
            added.push(self.parts.len() - 1);
        }
        added
    }

    fn resistive_winding(&mut self, inductance: Decimal, exponent: i32) -> Valued {
        let esr = Decimal { mantissa: self.rng.i64(10..=99), exponent };
        let henries = self.henries(inductance);
        let text = format!("{henries}, esr {}", values::with_unit(&mut self.rng, esr, "Ω"));
        let own = (&self.setting.reactance(&inductance.exact()) + &esr.exact()).reduced();
        Valued { text, law: Law::Winding { own, dot_left: self.rng.bool() } }
    }
}
