//! A circuit text with everything it includes, ready to be elaborated under given overrides.

use crate::circuit::elaborate::{self, Input};
use crate::circuit::error::CircuitError;
use crate::circuit::{Circuit, judge};
use crate::diag::{Diagnostic, Severity};
use crate::quantity::{Conversion, Decimal, Dimension, Unit};
use crate::source::{SourceId, Sources, Span};
use crate::text::{self, ast};
use std::collections::{HashMap, HashSet};
use std::io;
use std::path::{Component, Path, PathBuf};

/// Files that include files deeper than this are taken for a mistake.
const DEEPEST_INCLUDES: usize = 64;

/// What the command line adds to a circuit.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Call {
    /// `--set`: name and value, as typed.
    pub set: Vec<(String, String)>,
    /// `--read`: expressions or `name=expression`, as typed.
    pub reads: Vec<String>,
}

/// The texts of a circuit, parsed.
#[derive(Clone, Debug, Default)]
pub struct Program {
    /// Every text read, for drawing diagnostics.
    pub sources: Sources,
    files: Vec<ast::File>,
    /// File and statement, includes spliced in.
    order: Vec<(usize, usize)>,
    data: HashMap<Span, SourceId>,
    overrides: Vec<(ast::Name, ast::Expr)>,
    reads: Vec<(String, ast::Expr)>,
}

struct Loader<'r> {
    program: Program,
    errors: Vec<Diagnostic>,
    /// Files open above the one being read.
    open: Vec<PathBuf>,
    included: HashSet<PathBuf>,
    data_files: HashMap<PathBuf, SourceId>,
    read: &'r dyn Fn(&Path) -> io::Result<Vec<u8>>,
}

impl Program {
    /// Parses a text and every file it includes or names. `folder` is where relative paths in the
    /// text start; `read` loads a file. The program is of use only if no diagnostic is an error;
    /// its sources always are.
    pub fn load(
        name: &str,
        text: String,
        folder: &Path,
        call: &Call,
        read: &dyn Fn(&Path) -> io::Result<Vec<u8>>,
    ) -> (Program, Vec<Diagnostic>) {
        let mut loader = Loader {
            program: Program::default(),
            errors: Vec::new(),
            open: vec![normal(&folder.join(Path::new(name).file_name().unwrap_or_default()))],
            included: HashSet::new(),
            data_files: HashMap::new(),
            read,
        };
        loader.parse(name, text, folder);
        loader.take_call(call);
        loader.add_circuit_errors();
        (loader.program, loader.errors)
    }

    /// The flat circuit with remarks, or `None` with what is wrong.
    pub fn circuit(&self) -> (Option<Circuit>, Vec<Diagnostic>) {
        match elaborate::elaborate(&self.input()) {
            Err(errors) => (None, errors.iter().map(CircuitError::diagnostic).collect()),
            Ok(circuit) if circuit.elements.is_empty() => {
                let error = Diagnostic::error("there is no element in this circuit")
                    .at(Span::default(), "")
                    .help("a path puts one between two nodes: `gnd -( drive: 12 V +)- in`");
                (None, vec![error])
            }
            Ok(circuit) => {
                let found = judge::judge(&circuit);
                let wrong = found.iter().any(|d| d.severity == Severity::Error);
                ((!wrong).then_some(circuit), found)
            }
        }
    }

    fn input(&self) -> Input<'_> {
        let statements =
            self.order.iter().map(|&(file, i)| &self.files[file].statements[i]).collect();
        Input {
            sources: &self.sources,
            statements,
            overrides: &self.overrides,
            reads: &self.reads,
            data: &self.data,
        }
    }

    /// Gives a `let` of the circuit a value, in SI units; says so if there is no such `let`.
    pub fn set(&mut self, name: &str, value: f64, dimension: Dimension) {
        let span = match self.overrides.iter().find(|(n, _)| &*n.text == name) {
            Some((known, _)) => known.span,
            None => {
                let source = self.sources.add("--vary", name);
                Span::new(source, 0, name.len())
            }
        };
        let unit = Unit { dimension, power_of_ten: 0, conversion: Conversion::Plain };
        let unit = (dimension != Dimension::NONE).then_some(unit);
        let kind = ast::ExprKind::Number { value: Decimal::from_f64(value), unit };
        let mut expr = ast::Expr { kind, span };
        if value < 0.0 {
            expr = ast::Expr { kind: ast::ExprKind::Negative(Box::new(expr)), span };
        }
        self.overrides.retain(|(n, _)| &*n.text != name);
        self.overrides.push((ast::Name { text: name.into(), span }, expr));
    }

    /// A constant expression given on the command line, such as `85 kHz`: its real value in SI
    /// units with its dimension.
    pub fn constant(&mut self, option: &str, text: &str) -> Result<(f64, Dimension), Diagnostic> {
        let source = self.sources.add(option, text);
        let expr = text::parse_expression(source, text).map_err(|e| e.diagnostic())?;
        let reads = [(String::from("value"), expr)];
        let input = Input {
            sources: &self.sources,
            statements: Vec::new(),
            overrides: &[],
            reads: &reads,
            data: &HashMap::new(),
        };
        let circuit = elaborate::elaborate(&input).map_err(|errors| errors[0].diagnostic())?;
        let id = circuit.reads[0].value;
        let dimension = circuit.dimension(id);
        let span = Span::new(source, 0, text.len());
        match judge::real_constant(&circuit, id) {
            Some(value) => Ok((value, dimension)),
            None => Err(Diagnostic::error("a real constant is needed here").at(span, "")),
        }
    }
}

impl Loader<'_> {
    fn parse(&mut self, name: &str, text: String, folder: &Path) {
        let source = self.program.sources.add(name, text);
        let (file, errors) = text::parse(source, &self.program.sources.get(source).text);
        self.errors.extend(errors.iter().map(|e| e.diagnostic()));
        let index = self.program.files.len();
        // Its place is kept: included files come after it in the list, in the order of the text.
        self.program.files.push(ast::File::default());
        for (i, statement) in file.statements.iter().enumerate() {
            match &statement.kind {
                ast::StatementKind::Include(path) => self.include(path, folder),
                _ => self.program.order.push((index, i)),
            }
            let mut found = Vec::new();
            data_files(statement, &mut found);
            found.iter().for_each(|file| self.data(file, folder));
        }
        self.program.files[index] = file;
    }

    fn include(&mut self, file: &ast::Text, folder: &Path) {
        let path = normal(&folder.join(&file.text));
        let span = file.span;
        if self.open.contains(&path) {
            let file = file.text.clone();
            return self.fail(CircuitError::IncludeCycle { file, span });
        }
        if self.open.len() >= DEEPEST_INCLUDES {
            return self.fail(CircuitError::IncludesTooDeep { most: DEEPEST_INCLUDES, span });
        }
        // A file that two others include is read once.
        if !self.included.insert(path.clone()) {
            return;
        }
        let Some(text) = self.load(file, &path) else { return };
        let folder = path.parent().map(Path::to_owned).unwrap_or_default();
        self.open.push(path.clone());
        self.parse(&path.to_string_lossy(), text, &folder);
        self.open.pop();
    }

    fn data(&mut self, file: &ast::Text, folder: &Path) {
        let path = normal(&folder.join(&file.text));
        let source = match self.data_files.get(&path) {
            Some(&known) => known,
            None => {
                let Some(text) = self.load(file, &path) else { return };
                let source = self.program.sources.add(path.to_string_lossy(), text);
                self.data_files.insert(path, source);
                source
            }
        };
        self.program.data.insert(file.span, source);
    }

    fn load(&mut self, file: &ast::Text, path: &Path) -> Option<String> {
        let problem = match (self.read)(path).map(String::from_utf8) {
            Ok(Ok(text)) => return Some(text),
            Ok(Err(error)) => {
                format!("it is not UTF-8 (at byte {})", error.utf8_error().valid_up_to())
            }
            Err(error) => error.to_string(),
        };
        self.fail(CircuitError::Unreadable { file: file.text.clone(), problem, span: file.span });
        None
    }

    fn fail(&mut self, error: CircuitError) {
        self.errors.push(error.diagnostic());
    }

    /// After a fault in the text, says what else is wrong in the statements that could be read,
    /// except for names that may be missing because their own statement could not.
    fn add_circuit_errors(&mut self) {
        if self.errors.is_empty() {
            return;
        }
        if let Err(errors) = elaborate::elaborate(&self.program.input()) {
            let own = errors.iter().filter(|error| !error.may_follow_from_others());
            self.errors.extend(own.map(CircuitError::diagnostic));
        }
    }

    fn take_call(&mut self, call: &Call) {
        for (name, value) in &call.set {
            let option = format!("--set {name}");
            let source = self.program.sources.add(option, format!("{name}={value}"));
            // The value is parsed on its own, in a text of the same name.
            let value_source = self.program.sources.add(format!("--set {name}"), value.clone());
            let span = Span::new(source, 0, name.len());
            match text::parse_expression(value_source, value) {
                Ok(expr) => {
                    let name = ast::Name { text: name.as_str().into(), span };
                    self.program.overrides.retain(|(n, _)| n.text != name.text);
                    self.program.overrides.push((name, expr));
                }
                Err(error) => self.errors.push(error.diagnostic()),
            }
        }
        for read in &call.reads {
            let source = self.program.sources.add("--read", read.clone());
            match text::parse_read(source, read) {
                Ok((name, expr)) => {
                    let name = name.map_or_else(|| read.trim().to_owned(), |n| n.text.to_string());
                    self.program.reads.push((name, expr));
                }
                Err(error) => self.errors.push(error.diagnostic()),
            }
        }
    }
}

/// A path without `.` and `..`, so that one file has one name.
fn normal(path: &Path) -> PathBuf {
    let mut out = PathBuf::new();
    for part in path.components() {
        match part {
            Component::CurDir => {}
            Component::ParentDir
                if matches!(out.components().next_back(), Some(Component::Normal(_))) =>
            {
                out.pop();
            }
            other => out.push(other),
        }
    }
    out
}

/// The data files a statement names, those inside blocks too.
fn data_files<'s>(statement: &'s ast::Statement, found: &mut Vec<&'s ast::Text>) {
    use ast::StatementKind as S;
    let mut expressions: Vec<&ast::Expr> = Vec::new();
    match &statement.kind {
        S::Couple(ast::Couple::FromFile(file)) => found.push(file),
        S::Block { body, parameters, .. } => {
            expressions.extend(parameters.iter().filter_map(|(_, value)| value.as_ref()));
            // The grammar caps how deep blocks nest.
            body.iter().for_each(|inner| data_files(inner, found));
        }
        S::Let { value, .. } | S::Read { value, .. } => expressions.push(value),
        S::Path(path) => {
            for (link, _) in &path.steps {
                let ast::Link::Elements(elements) = link else { continue };
                for element in elements {
                    expressions.push(&element.value);
                    expressions.extend(element.attributes.iter().flat_map(attribute_values));
                }
            }
        }
        S::Use { parameters, .. } => expressions.extend(parameters.iter().map(|(_, e)| e)),
        S::Ideal { turns, .. } => expressions.extend(turns),
        S::Couple(ast::Couple::Stated { how, .. }) => match how {
            ast::Coupling::Factor(a) | ast::Coupling::Leakage { value: a, .. } => {
                expressions.push(a);
            }
            ast::Coupling::Mutual { inductance, resistance } => {
                expressions.push(inductance);
                expressions.extend(resistance);
            }
            ast::Coupling::Series { aiding, opposing } => expressions.extend([aiding, opposing]),
        },
        S::Title(_) | S::Reference(_) | S::Opamp { .. } | S::Include(_) => {}
    }
    while let Some(expr) = expressions.pop() {
        if let ast::ExprKind::Table(file, _) = &expr.kind {
            found.push(file);
        }
        expressions.extend(elaborate::children(expr));
    }
}

fn attribute_values(attribute: &ast::Attribute) -> Vec<&ast::Expr> {
    use ast::AttributeKind as A;
    match &attribute.kind {
        A::Quality { value, at } => std::iter::once(value).chain(at).collect(),
        A::SeriesResistance(value) | A::LossTangent(value) | A::Tolerance(value) => vec![value],
    }
}
