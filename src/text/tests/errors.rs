//! Errors: their words, their places, and that one does not hide the next.

use crate::text::parse;
use crate::text::tests::{ID, errors};

/// Each text has one error: these words, at the part of the text between the two carets.
#[track_caller]
fn check(marked: &str, words: &str, help: &str) {
    let (before, rest) = marked.split_once('▸').expect("a start mark");
    let (inner, after) = rest.split_once('◂').expect("an end mark");
    let text = format!("{before}{inner}{after}");
    let found = errors(&text);
    assert_eq!(found.len(), 1, "{text}: {found:?}");
    let diagnostic = found[0].diagnostic();
    assert_eq!(diagnostic.message, words, "{text}");
    assert_eq!(diagnostic.help.join("; "), help, "{text}");
    let range = before.len()..before.len() + inner.len();
    assert_eq!(found[0].span().range(), range, "{text}: marked wrongly");
}

#[test]
fn common_slips_in_elements_are_told_with_their_fix() {
    let write = "write `-( name : value )-`";
    check(
        "a -( x ▸=◂ 1 Ω )- b",
        "an element takes `:` between its name and its value, not `=`",
        write,
    );
    check("a -( ▸5◂ Ω )- b", "this element has no name", write);
    check("a -( ▸◂)- b", "this element has no name", write);
    check("a -( ▸x◂ * 2 )- b", "this element has no name", write);
    check("a -( x ▸5◂ Ω )- b", "expected `:` after the element's name, found `5`", write);
    let value = "write a value with its unit, such as `4.7 kΩ`";
    check("a -( x:▸◂ )- b", "element `x` has no value", value);
    check("a -( x:▸◂ *)- b", "element `x` has no value", value);
    check("a -( x:▸◂, q 3 )- b", "element `x` has no value", value);
    let touch = "a mark touches its bracket, as in `*)` and `+)`";
    check("a -( x: 2 * ▸)◂- b", "expected a value after the operator, found `)`", touch);
    check("a -( x: 2 V + ▸)◂- b", "expected a value after the operator, found `)`", touch);
    check("a -( x: 2 A ▸>◂ )- b", "a mark touches its bracket", "write `>)`");
    check("a -( ▸*◂ x: 2 H )- b", "a mark touches its bracket", "write `(*`");
    let end = "write `)-` and the next node; parallel elements are joined by `)(`";
    check("a -( x: 2 Ω ▸)◂ - b", "an element ends with `)-`", end);
    check("a -( x: 2 Ω ▸)◂", "an element ends with `)-`", end);
    check("a -( x: (2 * ▸)◂ Ω )- b", "expected a value after the operator, found `)`", "");
    check(
        "a -( x: 4,▸7◂ Ω )- b",
        "expected an attribute: `q`, `esr`, `tand` or `tol`, found `7`",
        "a decimal point is written `.`",
    );
    check(
        "a -( x: 2 Ω, ▸ers◂ 3 Ω )- b",
        "expected an attribute: `q`, `esr`, `tand` or `tol`, found `ers`",
        "did you mean `esr`?",
    );
    check(
        "a -( x: 2 Ω, ▸Q◂ 3 )- b",
        "expected an attribute: `q`, `esr`, `tand` or `tol`, found `Q`",
        "did you mean `q`?",
    );
    check("a -( x: 2 Ω ▸3◂ )- b", "expected an operator, `,` or `)-`, found `3`", "");
}

#[test]
fn common_slips_in_paths_are_told_with_their_fix() {
    let link = "a link is `-( name : value )-`, its dash and bracket together, or `==`";
    check("a -( x: 1 )-▸◂", "expected a node after the link, found the end of the statement", "");
    let series =
        "between two elements in series stands a node; parallel elements are joined by `)(`";
    check("a -( x: 1 )-▸(◂ y: 2 )- b", "expected a node after the link, found `(`", series);
    check("a ▸-◂ ( x: 1 )- b", "expected a link after the node, found `-`", link);
    check("a ▸(◂ x: 1 )- b", "expected a link after the node, found `(`", link);
    check("a == b ▸c◂", "expected the end of the statement, found `c`", "");
    check("a -( x: 1 ▸）◂ )- b", "`）` is not a character of the language", "write `)`");
    check("▸−◂ == b", "`−` is not a character of the language", "write `-`");
    check("title ▸“◂a”", "`“` is not a character of the language", "write straight quotes: `\"`");
    check("let x = ▸\u{200b}◂1", "expected a value, found the invisible character U+200B", "");
    check("a -( load: 10 Ω ▸$◂ )- gnd", "expected an operator, `,` or `)-`, found `$`", "");
}

#[test]
fn common_slips_in_statements_are_told_with_their_fix() {
    check("let x ▸:◂ 3", "`let` takes `=`, not `:`", "write `let name = value`");
    check("let x =▸◂", "expected a value, found the end of the statement", "");
    check("let ▸3◂ = 3", "expected a name that starts with a letter, found `3`", "");
    check("let x =▸=◂ 3", "expected a value, found `=`", "one `=` is enough");
    check("▸x◂ = 3", "a value is named with `let`", "write `let x = …`");
    check("▸cuople◂ a, b : k 1", "`cuople` does not start a statement", "did you mean `couple`?");
    check(
        "▸LET◂ a",
        "`LET` does not start a statement",
        "a path starts with a node and a link: `node -( name : value )- node`",
    );
    check(
        "▸line◂ x : a b to c d",
        "`line` statements are reserved: they are not available yet",
        "take the statement out",
    );
    check("couple a, b : k ▸=◂ 0.98", "a coupling takes no `=`", "write `k value`");
    check(
        "couple ▸a :◂ k 0.98",
        "a coupling needs at least two windings",
        "write `couple a, b : …`",
    );
    check("couple a, b : ▸K◂ 0.9", "expected `k`, `M`, `leakage` or `aiding`, found `K`", "");
    check("couple a ▸b◂ : k 1", "expected `,` or `:`, found `b`", "write `couple a, b : k 0.98`");
    check(
        "couple a, b : leakage 2 µH▸◂",
        "expected `at`, found the end of the statement",
        "write `leakage 2.1 µH at dock`: the winding it was read at",
    );
    check(
        "couple a, b : aiding 2 µH▸◂",
        "expected the other reading, `aiding` or `opposing`, found the end of the statement",
        "write `aiding 41 µH, opposing 9 µH`",
    );
    check(
        "read ▸=◂ 3",
        "expected a name for the reading, found `=`",
        "write `read name = expression`",
    );
    check("read a = 3, ▸at◂ 3", "expected `least` or `most`, found `at`", "");
    check("title ▸x◂", "expected a text in quotes, found `x`", "write `title \"…\"`");
    check("title ▸\"◂x", "this quoted text does not end on its line", "close it with `\"`");
    check("reference▸◂", "expected the name of a node, found the end of the statement", "");
    check(
        "use c as d (a▸,◂ b)",
        "expected `;` or `)`, found `,`",
        "nodes are separated by blanks only",
    );
    check(
        "use c as d (a ; L▸)◂",
        "expected `=`, found `)`",
        "write `use block as name (nodes ; parameters)`",
    );
    check(
        "block c (a b)▸◂",
        "the block has no body",
        "write `{` on the block's own line, then its statements, then `}`",
    );
    check("block c (a) ▸{◂\n let x = 1", "this block body is never closed", "close it with `}`");
    check(
        "let x = 1 ▸{◂ }",
        "this brace belongs to no block",
        "a body belongs to `block name (nodes ; parameters) { … }`",
    );
    check(
        "let x = 1\n▸}◂",
        "this brace belongs to no block",
        "a body belongs to `block name (nodes ; parameters) { … }`",
    );
    check(
        "ideal t : a b | c▸,◂ turns 1",
        "expected the name of a node, found `,`",
        "write `ideal name : a b | c d, turns 10 : 1`",
    );
    check(
        "opamp t : a b▸◂",
        "expected the name of a node, found the end of the statement",
        "write `opamp name : plus minus out`",
    );
}

#[test]
fn words_of_the_language_do_not_name_values() {
    let help = "choose another name, for example with a suffix such as `_1`";
    let table = [
        ("mH", "is a unit (millihenry)"),
        ("m", "is a unit (metre)"),
        ("V", "is a unit (volt)"),
        ("ohm", "is a unit (ohm)"),
        ("j", "is the imaginary unit"),
        ("pi", "is the number π"),
        ("f", "is the frequency being solved"),
        ("omega", "is the angular frequency being solved"),
        ("sqrt", "is a function"),
        ("table", "reads measured data"),
        ("volts", "is a reading of the circuit"),
        ("ang", "is a word of the language"),
        ("least", "is a word of the language"),
    ];
    for (name, reason) in table {
        let words = format!("`{name}` cannot be a name here: it {reason}");
        check(&format!("let ▸{name}◂ = 1"), &words, help);
        check(&format!("use b as c (x ; ▸{name}◂ = 1)"), &words, help);
    }
    // No names of values: these may be called anything.
    let text = "read f = 1\nf -( V: 1 Ω )- sqrt\nreference mH";
    assert!(parse(ID, text).1.is_empty(), "{:?}", parse(ID, text).1);
}

#[test]
fn functions_are_told_from_other_names() {
    check("let x = ▸sqr◂(2)", "`sqr` is not a function", "did you mean `sqrt`?");
    check("let x = ▸zzz◂(2)", "`zzz` is not a function", "to multiply, write `*` before `(`");
    check("let x = ▸sqrt◂ * 2", "`sqrt` is a function and needs its brackets", "write `sqrt(…)`");
    check("let x = sqrt(▸)◂", "expected a value, found `)`", "");
    check("let x = volts(a ▸b◂)", "expected `to` or `)`, found `b`", "write `volts(a to b)`");
    check(
        "let x = table(▸f◂)",
        "expected a file name in quotes, found `f`",
        "write `table(\"file.csv\", f)`",
    );
    check("let x = (a ▸2◂)", "expected an operator or `)`, found `2`", "");
}

#[test]
fn brackets_without_a_partner_are_shown_where_they_stand() {
    let close = "close it with `)`; an element ends with `)-` outside all inner brackets";
    let words = "this bracket is never closed";
    check("let x = ▸(◂1 + 2\nlet y = 2", words, close);
    check("let x = ▸(◂1 + (2)\n\n", words, close);
    check("gnd -( r: 3 * ▸(◂4 + 5 )- b\nb == c", words, close);
    check("gnd -( r: sqrt▸(◂4 + (5) )- b\nb == c", words, close);
    check("gnd ▸-(◂ r: 3 * (4)- 5\nb == c", words, close);
    check("gnd -( r: ▸(◂((4 + 5)) Ω\n )- b -( s: 3 )- c\n", words, close);
    check("block c ▸(◂a b {\n a == b\n }", words, close);
    check(
        "let x = 1 ▸)◂",
        "this bracket closes nothing",
        "remove it, or open its partner before it",
    );
    check(
        "a -( t: table(▸\"◂x, f) )- b\nlet y = 1",
        "this quoted text does not end on its line",
        "close it with `\"`",
    );
    check("gnd ▸-(◂ a: 1\nb -( c: 2 )- d\n", words, close);
    // The line that is clearly a statement is one, whatever its brackets could close.
    let found = errors("let x = (1\nlet y = 2 ) * (3)\n");
    let places: Vec<_> = found.iter().map(|e| e.span().range()).collect();
    assert_eq!(places, [8..9, 21..22]);
}

#[test]
fn all_errors_of_a_text_are_reported_in_order() {
    let text = "let = 1\nlet a = (1\nfoo bar\na -( x: 3 Ohm )- b; let j = 1\n} title x\nblock b (a) {\nlet q = \n}\nlet ok = 1\n)";
    let found: Vec<_> = errors(text)
        .iter()
        .map(|e| &text[e.span().range()])
        .collect::<Vec<_>>()
        .iter()
        .map(|s| s.to_string())
        .collect();
    assert_eq!(found, ["=", "(", "foo", "Ohm", "j", "}", "x", "", ")"]);
    let (file, _) = parse(ID, text);
    assert_eq!(file.statements.len(), 2, "the block and the last `let` are kept");
}

#[test]
fn units_that_nobody_writes_may_be_names() {
    for name in ["Rs", "Gm", "Em", "Ts"] {
        assert_eq!(crate::text::reserved(name), None, "{name}");
    }
}
