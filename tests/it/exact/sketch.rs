//! Draws a whole circuit: islands, elements between nodes, couplings, ideal parts.

use crate::exact::network::{Branch, Law, Network, Sense, Term};
use crate::exact::number::Exact;
use crate::exact::parts::{Setting, Valued};
use crate::exact::values;
use fastrand::Rng;

/// Most elements a circuit may have, so that exact numbers stay short.
const MOST_ELEMENTS: usize = 14;
/// Fewest elements.
const FEWEST_ELEMENTS: usize = 5;

const NODE_NAMES: [&str; 16] = [
    "bus", "in", "out", "keel", "a", "b", "mast", "0", "7a", "3", "größe", "βάση", "read", "tap_2",
    "mid", "X",
];
const ELEMENT_NAMES: [&str; 14] = [
    "load",
    "stay",
    "lamp",
    "trap",
    "dämpfer",
    "πηνίο",
    "шина",
    "damp_a",
    "cell",
    "pad",
    "choke",
    "feed",
    "horn",
    "relay",
];

/// An element as it stands in a path, or `None` in the text for what stands elsewhere.
pub struct Part {
    /// Text between the brackets with its marks; `None` for parts of `ideal` and `opamp`.
    pub text: Option<String>,
    pub branch: Branch,
}

/// A statement that is no path, with the nodes it names in order.
pub struct Statement {
    pub text: String,
    pub nodes: Vec<usize>,
}

/// A circuit while it is drawn.
pub struct Sketch {
    pub rng: Rng,
    pub setting: Setting,
    pub network: Network,
    pub parts: Vec<Part>,
    pub statements: Vec<Statement>,
    /// Nodes of each island; the first island has `gnd`.
    pub islands: Vec<Vec<usize>>,
}

impl Sketch {
    pub fn draw(mut rng: Rng) -> Self {
        let setting = Setting::draw(&mut rng);
        let network = Network::default();
        let mut sketch = Sketch {
            rng,
            setting,
            network,
            parts: Vec::new(),
            statements: Vec::new(),
            islands: Vec::new(),
        };
        sketch.draw_islands();
        sketch.draw_source();
        let coupled = sketch.rng.u8(0..4) > 0;
        if coupled {
            sketch.draw_coupled_set();
        }
        let lonely = sketch.islands.len() > 1 && !coupled;
        if lonely || sketch.rng.u8(0..4) == 0 {
            sketch.draw_ideal();
        }
        if sketch.rng.u8(0..4) == 0 {
            sketch.draw_amplifier();
        }
        for _ in 0..sketch.rng.u8(0..3) {
            sketch.draw_dependent();
        }
        if sketch.rng.u8(0..3) == 0 {
            sketch.draw_source();
        }
        if sketch.rng.u8(0..3) == 0 {
            sketch.draw_wire();
        }
        while sketch.elements() < FEWEST_ELEMENTS || (sketch.room(2) && sketch.rng.u8(0..3) == 0) {
            sketch.draw_beside();
        }
        sketch
    }

    /// How many elements there are.
    fn elements(&self) -> usize {
        self.parts.iter().filter(|part| part.branch.name.is_some()).count()
    }

    /// Whether so many more elements may be drawn.
    pub fn room(&self, more: usize) -> bool {
        self.elements() + more <= MOST_ELEMENTS
    }

    fn node(&mut self, island: usize) -> usize {
        let index = self.network.nodes.len();
        let pick = NODE_NAMES[self.rng.usize(0..NODE_NAMES.len())];
        let taken = self.network.nodes.iter().any(|name| name == pick);
        let name = if taken { format!("n{index}") } else { pick.to_owned() };
        self.network.nodes.push(name);
        self.islands[island].push(index);
        index
    }

    /// A free element name.
    pub fn name(&mut self) -> String {
        let pick = ELEMENT_NAMES[self.rng.usize(0..ELEMENT_NAMES.len())];
        let taken = self.parts.iter().any(|part| part.branch.name.as_deref() == Some(pick));
        if taken { format!("{pick}{}", self.parts.len()) } else { pick.to_owned() }
    }

    fn draw_islands(&mut self) {
        let count = [1, 1, 2, 2, 3][self.rng.usize(0..5)];
        for island in 0..count {
            self.islands.push(Vec::new());
            if island == 0 {
                self.network.nodes.push("gnd".to_owned());
                self.islands[0].push(0);
            } else {
                self.node(island);
            }
            let more = if island == 0 { self.rng.usize(1..=3) } else { self.rng.usize(1..=2) };
            for _ in 0..more {
                let from = self.any(island);
                let node = self.node(island);
                self.passive(from, node);
            }
        }
    }

    pub fn any(&mut self, island: usize) -> usize {
        let nodes = &self.islands[island];
        nodes[self.rng.usize(0..nodes.len())]
    }

    /// Two different nodes of an island.
    pub fn pair(&mut self, island: usize) -> (usize, usize) {
        loop {
            let (a, b) = (self.any(island), self.any(island));
            if a != b {
                return (a, b);
            }
        }
    }

    /// Adds an element between two nodes; which is left is settled when paths are written.
    pub fn add(&mut self, name: String, valued: Valued, marks: (&str, &str), ends: (usize, usize)) {
        let Valued { text, law } = valued;
        let roomy = self.rng.u8(0..4) > 0;
        let (left, right) = marks;
        let text = if roomy {
            format!("{left} {name}: {text} {right}")
        } else {
            format!("{left}{name}:{text}{right}")
        };
        let branch = Branch { name: Some(name), left: ends.0, right: ends.1, law };
        self.parts.push(Part { text: Some(text), branch });
    }

    fn passive(&mut self, a: usize, b: usize) {
        let mut valued = self.setting.passive(&mut self.rng);
        if !valued.text.contains(',') && self.rng.u8(0..8) == 0 {
            let name = format!("stock_{}", self.statements.len());
            let text = format!("let {name} = {}", valued.text);
            self.statements.push(Statement { text, nodes: Vec::new() });
            valued.text = name;
        }
        let name = self.name();
        let dotted = matches!(valued.law, Law::Winding { .. }) && self.rng.bool();
        let marks = if dotted { dot(&valued.law) } else { ("", "") };
        self.add(name, valued, marks, (a, b));
    }

    fn draw_beside(&mut self) {
        let island = self.rng.usize(0..self.islands.len());
        let (a, b) = self.pair(island);
        self.passive(a, b);
    }

    /// Ends for an element that would rather not be in parallel with its like: mostly a new node
    /// with something passive behind it.
    pub fn ends(&mut self, island: usize) -> (usize, usize) {
        let (a, b) = self.pair(island);
        if !self.room(2) || self.rng.u8(0..4) == 0 {
            return (a, b);
        }
        let between = self.node(island);
        self.passive(between, b);
        (a, between)
    }

    fn draw_source(&mut self) {
        if !self.room(2) {
            return;
        }
        let island = if self.rng.u8(0..4) > 0 { 0 } else { self.rng.usize(0..self.islands.len()) };
        let decades = -2.0 + 4.0 * self.rng.f64();
        if self.rng.u8(0..3) > 0 {
            let (text, value) = values::phasor(&mut self.rng, decades, "V");
            let ends = self.ends(island);
            let name = self.name();
            let (marks, sign) = self.plus();
            let law = Law::Voltage(&value * &sign);
            self.add(name, Valued { text, law }, marks, ends);
        } else {
            let decades = decades - self.setting.level;
            let (text, value) = values::phasor(&mut self.rng, decades, "A");
            let ends = self.pair(island);
            let name = self.name();
            let (marks, sign) = self.arrow();
            let law = Law::Current(&value * &sign);
            self.add(name, Valued { text, law }, marks, ends);
        }
    }

    /// A positive end, and the sign it gives the drop.
    fn plus(&mut self) -> ((&'static str, &'static str), Exact) {
        if self.rng.bool() {
            (("+", ""), Exact::whole(1, 0))
        } else {
            (("", "+"), Exact::whole(-1, 0))
        }
    }

    /// An arrow, and the sign it gives the current.
    fn arrow(&mut self) -> ((&'static str, &'static str), Exact) {
        let sign = Exact::whole(1, 0);
        match self.rng.u8(0..4) {
            0 => ((">", ""), sign),
            1 => (("", ">"), sign),
            2 => (("<", ""), -&sign),
            _ => (("", "<"), -&sign),
        }
    }

    fn draw_dependent(&mut self) {
        if !self.room(2) {
            return;
        }
        let island = self.rng.usize(0..self.islands.len());
        let voltage = self.rng.bool();
        let ends = if voltage { self.ends(island) } else { self.pair(island) };
        let mut text = String::new();
        let mut terms = Vec::new();
        for index in 0..[1, 1, 2][self.rng.usize(0..3)] {
            let minus = index > 0 && self.rng.bool();
            if index > 0 {
                text += if minus { " - " } else { " + " };
            }
            let (part, mut term) = self.term(voltage);
            if minus {
                term.factor = -&term.factor;
            }
            text += &part;
            terms.push(term);
        }
        let (marks, sign) = if voltage { self.plus() } else { self.arrow() };
        for term in &mut terms {
            term.factor = (&term.factor * &sign).reduced();
        }
        let law = if voltage { Law::VoltageOf(terms) } else { Law::CurrentOf(terms) };
        let name = self.name();
        self.add(name, Valued { text, law }, marks, ends);
    }

    /// A reading and whether it is a voltage.
    fn sense(&mut self) -> (String, Sense, bool) {
        let listed: Vec<usize> =
            (0..self.parts.len()).filter(|index| self.parts[*index].text.is_some()).collect();
        let part = listed[self.rng.usize(0..listed.len())];
        let named = self.parts[part].branch.name.clone();
        match (self.rng.u8(0..4), named) {
            (0, Some(name)) => (format!("drop({name})"), Sense::Drop(part), true),
            (1, Some(name)) => (format!("amps({name})"), Sense::Amps(part), false),
            (2, _) => {
                let island = self.rng.usize(0..self.islands.len());
                let (a, b) = self.pair(island);
                let text = format!("volts({} to {})", self.network.nodes[a], self.network.nodes[b]);
                (text, Sense::Volts(a, Some(b)), true)
            }
            _ => {
                let island = self.rng.usize(0..self.islands.len());
                let node = self.any(island);
                (format!("volts({})", self.network.nodes[node]), Sense::Volts(node, None), true)
            }
        }
    }

    /// A factor times a reading, that together are volts or amperes.
    fn term(&mut self, voltage: bool) -> (String, Term) {
        let (reading, sense, volts) = self.sense();
        let decades = self.rng.f64() - 0.5;
        let level = self.setting.level;
        let rng = &mut self.rng;
        let (text, factor) = match (voltage, volts) {
            (true, true) | (false, false) => values::factor(rng, decades),
            (true, false) => values::complex_or_real(rng, decades + level, "Ω"),
            (false, true) => values::complex_or_real(rng, decades - level, "S"),
        };
        let text = match self.rng.u8(0..4) {
            // A factor with a leading minus cannot stand after the sign.
            0 if !text.starts_with('-') && !text.contains('*') => format!("{reading}*{text}"),
            _ => format!("{text} * {reading}"),
        };
        (text, Term { factor, sense })
    }

    /// A wire to a new node, and something passive from there.
    fn draw_wire(&mut self) {
        if !self.room(1) {
            return;
        }
        let island = self.rng.usize(0..self.islands.len());
        let from = self.any(island);
        let to = self.any(island);
        let node = self.node(island);
        let branch = Branch { name: None, left: from, right: node, law: Law::Wire };
        self.parts.push(Part { text: Some("==".to_owned()), branch });
        self.passive(node, to);
    }

    fn draw_ideal(&mut self) {
        let windings = self.rng.usize(2..=3);
        if !self.room(windings + 1) {
            return;
        }
        let name = self.name();
        let (mut pairs, mut turns, mut nodes) = (Vec::new(), Vec::new(), Vec::new());
        for winding in 0..windings {
            let island = if winding < self.islands.len() {
                winding
            } else {
                self.rng.usize(0..self.islands.len())
            };
            let (left, right) = if winding == 0 { self.pair(island) } else { self.ends(island) };
            let count = self.rng.i64(1..=12) * if self.rng.u8(0..4) == 0 { -1 } else { 1 };
            pairs.push(format!("{} {}", self.network.nodes[left], self.network.nodes[right]));
            turns.push(count.to_string());
            nodes.extend([left, right]);
            let law = Law::Turns { transformer: 0, turns: Exact::whole(count, 0) };
            let name = Some(format!("{name}.{}", winding + 1));
            self.parts.push(Part { text: None, branch: Branch { name, left, right, law } });
        }
        let text = format!("ideal {name} : {}, turns {}", pairs.join(" | "), turns.join(" : "));
        self.statements.push(Statement { text, nodes });
    }

    /// An amplifier with feedback from its output to its inverting input.
    fn draw_amplifier(&mut self) {
        if !self.room(4) {
            return;
        }
        let name = self.name();
        let (from, plus) = (self.any(0), self.any(0));
        let (minus, out) = (self.node(0), self.node(0));
        let input = Branch { name: None, left: plus, right: minus, law: Law::AmplifierInput };
        let law = Law::AmplifierOutput;
        let output = Branch { name: Some(name.clone()), left: out, right: 0, law };
        self.parts.push(Part { text: None, branch: input });
        self.parts.push(Part { text: None, branch: output });
        self.passive(from, minus);
        self.passive(minus, out);
        let named = |node: usize| &self.network.nodes[node];
        let text = format!("opamp {name} : {} {} {}", named(plus), named(minus), named(out));
        self.statements.push(Statement { text, nodes: vec![plus, minus, out] });
    }
}

/// The mark of a winding's dot.
pub fn dot(law: &Law) -> (&'static str, &'static str) {
    match law {
        Law::Winding { dot_left: true, .. } => ("*", ""),
        _ => ("", "*"),
    }
}
