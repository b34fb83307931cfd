//! stub
#![allow(missing_docs)]
pub mod lanes;
use crate::number::ComplexTwofold;
use num_complex::Complex64;
pub struct Pattern {
    pub n: usize,
    pub column_start: Vec<usize>,
    pub row: Vec<usize>,
}
pub struct Solver;
#[derive(Default)]
pub struct Trust;
pub struct Health;
#[derive(Debug)]
pub enum SolveError {
    A,
}
impl SolveError {
    pub fn column(&self) -> Option<usize> {
        None
    }
    pub fn is_singular(&self) -> bool {
        true
    }
}
impl Solver {
    pub fn new(_: Pattern) -> Result<Self, SolveError> {
        todo!()
    }
    pub fn factor(&mut self, _: &[Complex64]) -> Result<Health, SolveError> {
        todo!()
    }
    pub fn solve_in_place(&mut self, _: &mut [Complex64]) {
        todo!()
    }
    pub fn solve_refined(
        &mut self,
        _: &[ComplexTwofold],
        _: &[ComplexTwofold],
        _: &mut [ComplexTwofold],
        _: &mut [f64],
    ) -> Result<Trust, SolveError> {
        todo!()
    }
    pub fn null_vector(&mut self) -> Vec<Complex64> {
        todo!()
    }
}
