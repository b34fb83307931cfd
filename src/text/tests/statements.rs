//! Statements, and how lines make them up.

use crate::source::Span;
use crate::text::ast::{
    AttributeKind, Couple, Coupling, LimitKind, Link, MarkKind, Name, StatementKind,
};
use crate::text::tests::{ID, good, shown};

/// The only statement of a text.
#[track_caller]
fn one(text: &str) -> StatementKind {
    let mut statements = good(text).statements;
    assert_eq!(statements.len(), 1, "{text}");
    statements.remove(0).kind
}

fn texts(names: &[Name]) -> Vec<&str> {
    names.iter().map(|name| &*name.text).collect()
}

/// A path as its nodes and the names of its elements with their marks.
#[track_caller]
fn path(text: &str) -> String {
    let StatementKind::Path(path) = one(text) else { panic!("{text} is no path") };
    let mark = |kind: MarkKind| match kind {
        MarkKind::Dot => "*",
        MarkKind::Plus => "+",
        MarkKind::Rightward => ">",
        MarkKind::Leftward => "<",
    };
    let mut drawn = path.first.text.to_string();
    for (link, node) in &path.steps {
        let link = match link {
            Link::Wire(_) => "==".to_owned(),
            Link::Elements(all) => {
                let all: Vec<_> = all
                    .iter()
                    .map(|e| {
                        let left = e.left_mark.map_or("", |m| mark(m.kind));
                        let right = e.right_mark.map_or("", |m| mark(m.kind));
                        format!("{left}{}:{}{right}", e.name.text, shown(&e.value))
                    })
                    .collect();
                all.join("|")
            }
        };
        drawn = format!("{drawn} {link} {}", node.text);
    }
    drawn
}

#[test]
fn paths_alternate_nodes_and_links() {
    let table = [
        ("gnd -( drive: 48 V +)- in", "gnd drive:48[V]+ in"),
        ("a -(* dock: L_dock *)- b", "a *dock:L_dock* b"),
        ("a-(x:1 Ω)-b-(y:2 F)-c", "a x:1[Ω] b y:2[F] c"),
        ("a -( x: 1 Ω )( y: 2 H *)- b", "a x:1[Ω]|y:2[H]* b"),
        ("a -( x: 1 Ω ) (> y: 2 A )- b", "a x:1[Ω]|>y:2[A] b"),
        ("a -(< y: 2 A )- b -(z : 1 A>)- c", "a <y:2[A] b z:1[A]> c"),
        ("a == b == 0", "a == b == 0"),
        ("1st -( x: 1 Ω )- cm1.out", "1st x:1[Ω] cm1.out"),
        ("read -( x: 1 Ω )- let", "read x:1[Ω] let"),
        ("line == b", "line == b"),
        ("a -( x: 2 - (3)-1 )- b", "a x:(- (- 2 3) 1) b"),
        ("a -( x: 2 Ω*)- b", "a x:2[Ω]* b"),
        ("a -( x: 2 *\n  3 )-\n\n# words\n b", "a x:(* 2 3) b"),
        ("a\n  # words\n\n -( x: 2 )- b\n-( y: 3 )- c", "a x:2 b y:3 c"),
        ("\u{feff}a -( x: 1 )- b\r\n", "a x:1 b"),
        ("\ta\t-(\tx\t:\t1\t)-\tb", "a x:1 b"),
        ("a -(> gm: 2 mS * volts(a to b) )- b", "a >gm:(* 2[Se-3] (volts a b)) b"),
    ];
    for (text, expected) in table {
        assert_eq!(path(text), expected, "{text}");
    }
}

#[test]
fn elements_keep_their_attributes_and_places() {
    let text = "a -(* x: 2 mH, q 180 at 85 kHz, esr 20 mΩ, tol 5% *)- b";
    let StatementKind::Path(path) = one(text) else { panic!("a path") };
    let Link::Elements(elements) = &path.steps[0].0 else { panic!("elements") };
    let element = &elements[0];
    assert_eq!(&text[element.span.range()], "(* x: 2 mH, q 180 at 85 kHz, esr 20 mΩ, tol 5% *)");
    let kept: Vec<_> = element.attributes.iter().map(|a| &text[a.span.range()]).collect();
    assert_eq!(kept, ["q 180 at 85 kHz", "esr 20 mΩ", "tol 5%"]);
    let AttributeKind::Quality { value, at: Some(at) } = &element.attributes[0].kind else {
        panic!("a quality with its frequency");
    };
    assert_eq!((&*shown(value), &*shown(at)), ("180", "85[Hze3]"));
    let mark = element.right_mark.expect("a mark");
    assert_eq!(&text[mark.span.range()], "*");
    let StatementKind::Path(path) = one("a -( c: 1 nF, tand 0.002, q 30 )- b") else {
        panic!("a path")
    };
    let Link::Elements(elements) = &path.steps[0].0 else { panic!("elements") };
    assert!(matches!(elements[0].attributes[0].kind, AttributeKind::LossTangent(_)));
    assert!(matches!(elements[0].attributes[1].kind, AttributeKind::Quality { at: None, .. }));
}

#[test]
fn couplings_are_stated_as_measured() {
    let how = |text: &str| match one(text) {
        StatementKind::Couple(Couple::Stated { windings, how }) => {
            (texts(&windings).join(" "), how)
        }
        other => panic!("{other:?}"),
    };
    let (windings, Coupling::Factor(k)) = how("couple a, b.x, c : k 0.97") else { panic!() };
    assert_eq!((&*windings, &*shown(&k)), ("a b.x c", "0.97"));
    let (_, Coupling::Mutual { inductance, resistance: Some(r) }) =
        how("couple a, b : M 1.3 mH, R 59 mΩ")
    else {
        panic!()
    };
    assert_eq!((&*shown(&inductance), &*shown(&r)), ("1.3[He-3]", "59[Ωe-3]"));
    let (_, Coupling::Mutual { resistance: None, .. }) = how("couple a, b : M 4.2 mH") else {
        panic!()
    };
    let (_, Coupling::Leakage { at, .. }) = how("couple a, b : leakage 2.1 µH at dock") else {
        panic!()
    };
    assert_eq!(&*at.text, "dock");
    for text in
        ["couple a, b : aiding 41 µH, opposing 9 µH", "couple a,b:opposing 9uH, aiding 41uH"]
    {
        let (_, Coupling::Series { aiding, opposing }) = how(text) else { panic!() };
        assert_eq!((&*shown(&aiding), &*shown(&opposing)), ("41[He-6]", "9[He-6]"));
    }
    let StatementKind::Couple(Couple::FromFile(file)) = one("couple from \"coil pairs.csv\"")
    else {
        panic!()
    };
    assert_eq!(file.text, "coil pairs.csv");
    assert_eq!(how("couple from, b : k 0.5").0, "from b");
}

#[test]
fn values_readings_and_words_are_statements() {
    let StatementKind::Let { name, value } = one("let L_dock = 240 µH # words") else { panic!() };
    assert_eq!((&*name.text, &*shown(&value)), ("L_dock", "240[He-6]"));
    for name in ["L", "C", "k", "R", "M", "title", "letter", "gnd", "at_1"] {
        good(&format!("let {name} = 1"));
    }
    let StatementKind::Read { name, value, limits } =
        one("read eta = re(power(a)) / 2, least 0.85, most 1")
    else {
        panic!()
    };
    assert_eq!((&*name.text, &*shown(&value)), ("eta", "(/ (re (power a)) 2)"));
    let kinds: Vec<_> = limits.iter().map(|l| (l.kind, shown(&l.value))).collect();
    assert_eq!(kinds, [(LimitKind::Least, "0.85".into()), (LimitKind::Most, "1".into())]);
    assert_eq!(limits[0].span.range(), 29..39);
    assert!(
        matches!(one("title \"a # b; ( c\""), StatementKind::Title(t) if t.text == "a # b; ( c")
    );
    assert!(matches!(one("include \"x.bfl\""), StatementKind::Include(t) if t.text == "x.bfl"));
    assert!(matches!(one("reference keel"), StatementKind::Reference(n) if &*n.text == "keel"));
}

#[test]
fn devices_name_their_nodes() {
    let StatementKind::Ideal { name, windings, turns } =
        one("ideal step : a b | c d | e f, turns 10 : 1 : n^2")
    else {
        panic!()
    };
    assert_eq!(&*name.text, "step");
    let pairs: Vec<_> = windings.iter().map(|(a, b)| (&*a.text, &*b.text)).collect();
    assert_eq!(pairs, [("a", "b"), ("c", "d"), ("e", "f")]);
    assert_eq!(turns.iter().map(shown).collect::<Vec<_>>(), ["10", "1", "(^ n 2)"]);
    let StatementKind::Opamp { plus, minus, out, .. } = one("opamp buf : p 1 cm1.out") else {
        panic!()
    };
    assert_eq!(texts(&[plus, minus, out]), ["p", "1", "cm1.out"]);
}

#[test]
fn blocks_hold_statements() {
    let text = "block choke (a b c ; L = 2 mH, k) {\n  a -(* x: L )- b\n\n  couple x, y : k k; }\nlet z = 1";
    let file = good(text);
    assert_eq!(file.statements.len(), 2);
    let StatementKind::Block { name, nodes, parameters, body } = &file.statements[0].kind else {
        panic!()
    };
    assert_eq!((&*name.text, texts(nodes)), ("choke", vec!["a", "b", "c"]));
    let given: Vec<_> = parameters.iter().map(|(n, v)| (&*n.text, v.is_some())).collect();
    assert_eq!(given, [("L", true), ("k", false)]);
    assert_eq!(body.len(), 2);
    let end = text.find('}').expect("a brace") + 1;
    assert_eq!(file.statements[0].span, Span::new(ID, 0, end));
    let StatementKind::Use { block, name, nodes, parameters } =
        one("use choke as cm1 (line_in cm0.x 3 ; L = 4.7 mH,\n k = 1)")
    else {
        panic!()
    };
    assert_eq!((&*block.text, &*name.text), ("choke", "cm1"));
    assert_eq!((texts(&nodes), parameters.len()), (vec!["line_in", "cm0.x", "3"], 2));
    good("block a () { block b (x) { x == y } }; use a as a1 ()");
}

#[test]
fn semicolons_part_statements_outside_brackets() {
    let file = good(";; let a = 1; let b = 2;\n;let c = (3\n + 4); a == b;");
    assert_eq!(file.statements.len(), 4);
    let text = "let a = 1 ; let b = 2  # words";
    let spans: Vec<_> = good(text).statements.iter().map(|s| &text[s.span.range()]).collect();
    assert_eq!(spans, ["let a = 1", "let b = 2"]);
    assert!(good("").statements.is_empty());
    assert!(good("\u{feff} # only words").statements.is_empty());
}
