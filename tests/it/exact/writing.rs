//! Writes a sketch as a circuit text, settling which end of each element is the left one.

use crate::exact::network::{Law, Network};
use crate::exact::sketch::{Part, Sketch, Statement};
use fastrand::Rng;

/// Longest path in links.
const LONGEST_PATH: usize = 5;

/// The text, and the network it describes.
pub fn write(sketch: Sketch) -> (String, Network) {
    let Sketch { mut rng, mut network, mut parts, mut statements, islands, .. } = sketch;
    statements.extend(paths(&mut rng, &network.nodes, &mut parts));
    let mut reference_order = vec![0];
    for nodes in islands.iter().skip(1) {
        if rng.bool() {
            let node = nodes[rng.usize(0..nodes.len())];
            let text = format!("reference {}", network.nodes[node]);
            statements.push(Statement { text, nodes: Vec::new() });
            reference_order.push(node);
        }
    }
    rng.shuffle(&mut statements);
    reference_order.extend(statements.iter().flat_map(|statement| statement.nodes.iter().copied()));
    network.reference_order = reference_order;
    network.branches = parts.into_iter().map(|part| part.branch).collect();
    (join(&mut rng, &statements), network)
}

/// Walks over all elements that stand in paths.
fn paths(rng: &mut Rng, names: &[String], parts: &mut [Part]) -> Vec<Statement> {
    let mut open: Vec<usize> =
        (0..parts.len()).filter(|part| parts[*part].text.is_some()).collect();
    let mut written = Vec::new();
    while !open.is_empty() {
        let first = &parts[open[rng.usize(0..open.len())]].branch;
        let mut here = if rng.bool() { first.left } else { first.right };
        let mut nodes = vec![here];
        let mut text = names[here].clone();
        for _ in 0..rng.usize(1..=LONGEST_PATH) {
            let touching = |part: &&usize| {
                let branch = &parts[**part].branch;
                branch.left == here || branch.right == here
            };
            let choices: Vec<usize> = open.iter().filter(touching).copied().collect();
            if choices.is_empty() {
                break;
            }
            let chosen = choices[rng.usize(0..choices.len())];
            let branch = &parts[chosen].branch;
            let there = if branch.left == here { branch.right } else { branch.left };
            let link = stack(rng, parts, &mut open, chosen, (here, there));
            let gap = ["", " "][rng.usize(0..2)];
            let fold = link != "==" && rng.u8(0..8) == 0;
            let (before, after) = match (fold, rng.bool()) {
                (true, true) => ("\n    ", gap),
                (true, false) => (gap, "\n    "),
                (false, _) => (gap, gap),
            };
            text += &format!("{before}{link}{after}{}", names[there]);
            nodes.push(there);
            here = there;
        }
        written.push(Statement { text, nodes });
    }
    written
}

/// The link of the chosen part, mostly together with the others between the same two nodes.
fn stack(
    rng: &mut Rng,
    parts: &mut [Part],
    open: &mut Vec<usize>,
    chosen: usize,
    (here, there): (usize, usize),
) -> String {
    let wire = |part: &Part| matches!(part.branch.law, Law::Wire);
    let mut together = vec![chosen];
    if !wire(&parts[chosen]) {
        for &other in open.iter().filter(|other| **other != chosen) {
            let branch = &parts[other].branch;
            let ends = (branch.left, branch.right);
            let beside = ends == (here, there) || ends == (there, here);
            if beside && !wire(&parts[other]) && rng.u8(0..4) > 0 {
                together.push(other);
            }
        }
    }
    open.retain(|part| !together.contains(part));
    let mut text = String::new();
    for index in together {
        let part = &mut parts[index];
        (part.branch.left, part.branch.right) = (here, there);
        let inner = part.text.as_deref().unwrap_or_default();
        if wire(part) {
            return inner.to_owned();
        }
        text += &format!("({inner})");
    }
    format!("-{text}-")
}

/// Statements on lines, a few behind a semicolon or with a remark.
fn join(rng: &mut Rng, statements: &[Statement]) -> String {
    let mut text = String::new();
    if rng.bool() {
        text += "# drawn at random\ntitle \"Test bench, αβγ\"\n\n";
    }
    for statement in statements {
        text += &statement.text;
        text += match rng.u8(0..8) {
            0 => "; ",
            1 => " # as on the bench\n",
            2 => "\n\n",
            _ => "\n",
        };
    }
    text
}
