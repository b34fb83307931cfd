//! Stand-in for the circuit and study interfaces until they are merged: every call refuses.
//! To wire: `sed -i 's/crate::cli::pending::/crate::/' src/cli/*.rs`, drop `mod pending`, delete
//! this file.

use crate::diag::Diagnostic;

fn refused() -> Diagnostic {
    Diagnostic::error("this build reads no circuits yet")
}

pub mod circuit {
    use crate::source::Span;

    pub struct Circuit {
        pub title: Option<String>,
        pub nodes: Vec<()>,
        pub elements: Vec<()>,
        pub couplings: Vec<()>,
        pub reads: Vec<Read>,
    }

    pub struct Read {
        pub name: String,
        pub span: Span,
    }

    pub mod island {
        pub enum Regime {
            Alternating,
        }

        pub struct Islands {
            pub reference: Vec<()>,
        }

        impl Islands {
            pub fn find(_: &crate::cli::pending::circuit::Circuit, _: Regime) -> Self {
                Islands { reference: Vec::new() }
            }
        }
    }

    pub mod program {
        use crate::cli::pending::circuit::Circuit;
        use crate::cli::pending::refused;
        use crate::diag::Diagnostic;
        use crate::quantity::Dimension;
        use crate::source::Sources;
        use std::path::Path;

        #[derive(Clone, Debug, Default, PartialEq, Eq)]
        pub struct Call {
            pub set: Vec<(String, String)>,
            pub reads: Vec<String>,
        }

        #[derive(Clone, Debug, Default)]
        pub struct Program {
            pub sources: Sources,
        }

        impl Program {
            pub fn load(
                name: &str,
                text: String,
                _: &Path,
                _: &Call,
                _: &dyn Fn(&Path) -> std::io::Result<Vec<u8>>,
            ) -> (Program, Vec<Diagnostic>) {
                let mut program = Program::default();
                program.sources.add(name, text);
                (program, vec![refused()])
            }

            pub fn circuit(&self) -> (Option<Circuit>, Vec<Diagnostic>) {
                (None, vec![refused()])
            }

            pub fn constant(&mut self, _: &str, _: &str) -> Result<(f64, Dimension), Diagnostic> {
                Err(refused())
            }
        }
    }
}

pub mod study {
    use crate::diag::Diagnostic;

    pub enum StudyError {
        Refused(Vec<Diagnostic>),
        NoSolution(Vec<Diagnostic>),
    }

    pub mod point {
        use crate::cli::pending::circuit::Circuit;
        use crate::cli::pending::refused;
        use crate::cli::pending::study::StudyError;
        use crate::study::Solution;

        pub fn solve(_: &Circuit, _: f64) -> Result<Solution, StudyError> {
            Err(StudyError::Refused(vec![refused()]))
        }
    }

    pub mod sweep {
        use crate::cli::pending::circuit::program::Program;
        use crate::cli::pending::refused;
        use crate::cli::pending::study::StudyError;
        use crate::quantity::Dimension;
        use crate::study::{SweepHead, SweepRow};
        use std::ops::ControlFlow;

        pub struct Vary {
            pub name: String,
            pub from: f64,
            pub to: f64,
            pub count: usize,
            pub dimension: Dimension,
        }

        pub struct Plan {
            pub frequencies_hz: Vec<f64>,
            pub vary: Vec<Vary>,
        }

        pub enum Event<'e> {
            Head(&'e SweepHead),
            Row(&'e SweepRow),
        }

        pub fn run(
            _: &mut Program,
            _: &Plan,
            _: &mut dyn FnMut(Event) -> ControlFlow<()>,
        ) -> Result<(), StudyError> {
            Err(StudyError::Refused(vec![refused()]))
        }
    }
}
