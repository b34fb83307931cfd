//! A rational model of many phasors at once, in barycentric form: the AAA algorithm (Nakatsukasa,
//! Sète and Trefethen, 2018) with support points and weights shared by all phasors.

use crate::solve::dense;
use num_complex::Complex64;

/// Relative misfit at which a model is as good as its data.
const FULL_PRECISION: f64 = 1e-13;

/// Phasors that are fitted as they are; more are fitted through this many mixtures of them.
const MOST_FITTED: usize = 6;

/// Parts of the largest magnitude below which a phasor counts as nothing.
const NOTHING: f64 = 1e-12;

/// Samples that a fit leaves over to be judged by.
const SPARE: usize = 3;

/// Half widths below this part of the frequency are none: Q above 10¹⁰.
pub const LOSSLESS: f64 = 0.5e-10;

/// Around a resonance without loss nothing nearer than this part of its frequency is resolved.
pub const LOSSLESS_GAP: f64 = 1e-6;

/// A solved frequency.
#[derive(Clone, Copy, Debug)]
pub struct Known<'s> {
    /// In hertz, above 0.
    pub frequency_hz: f64,
    /// Its phasors.
    pub phasors: &'s [Complex64],
}

/// A natural frequency that the response shows.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pole {
    /// Complex frequency in hertz.
    pub at: Complex64,
}

impl Pole {
    /// The natural frequency in hertz.
    pub fn frequency_hz(&self) -> f64 {
        self.at.norm()
    }

    /// Half the width of the resonance at half power, in hertz.
    pub fn half_width_hz(&self) -> f64 {
        self.at.im.abs()
    }

    /// No loss can be told.
    pub fn is_lossless(&self) -> bool {
        self.half_width_hz() <= LOSSLESS * self.frequency_hz()
    }

    /// The quality factor.
    pub fn q(&self) -> f64 {
        0.5 * self.at.norm() / self.at.im.abs()
    }
}

/// All phasors as rational functions of the frequency with the same poles.
#[derive(Clone, Debug)]
pub struct Model {
    supports_hz: Vec<f64>,
    values: Vec<Vec<Complex64>>,
    weights: Vec<Complex64>,
    /// Largest relative misfit at the samples it was fitted to.
    pub misfit: f64,
}

/// The data of a fit, scaled, and mixed where there are many phasors.
struct Data {
    frequency_hz: Vec<f64>,
    /// `width` numbers a sample.
    values: Vec<Complex64>,
    /// One over the magnitude of each.
    weight: Vec<f64>,
    width: usize,
}

impl Data {
    fn new(known: &[Known]) -> Data {
        let count = known.first().map_or(0, |k| k.phasors.len());
        let largest: Vec<f64> = (0..count)
            .map(|q| known.iter().map(|k| k.phasors[q].norm()).fold(0.0, f64::max))
            .collect();
        let shown: Vec<usize> = (0..count).filter(|&q| largest[q] > 0.0).collect();
        let mixed = shown.len() > MOST_FITTED;
        let width = if mixed { MOST_FITTED } else { shown.len() };
        let mut values = Vec::with_capacity(width * known.len());
        for k in known {
            for row in 0..width {
                values.push(match mixed {
                    false => k.phasors[shown[row]] / largest[shown[row]],
                    true => {
                        let mix = |&q: &usize| k.phasors[q] / largest[q] * phase(row, q);
                        shown.iter().map(mix).sum()
                    }
                });
            }
        }
        let mut top = vec![0.0f64; width];
        for (i, value) in values.iter().enumerate() {
            top[i % width] = top[i % width].max(value.norm());
        }
        let floor = |i: usize| NOTHING * top[i % width];
        let weight = values.iter().enumerate().map(|(i, v)| 1.0 / v.norm().max(floor(i)));
        Data {
            frequency_hz: known.iter().map(|k| k.frequency_hz).collect(),
            weight: weight.collect(),
            values,
            width,
        }
    }

    fn value(&self, sample: usize, row: usize) -> Complex64 {
        self.values[sample * self.width + row]
    }
}

/// A fixed number of magnitude 1 that looks drawn at random.
fn phase(row: usize, column: usize) -> Complex64 {
    let mixed = (row as u64 + 1).wrapping_mul(0x9e37_79b9_7f4a_7c15)
        ^ (column as u64 + 1).wrapping_mul(0xd1b5_4a32_d192_ed03);
    let mixed = (mixed ^ (mixed >> 29)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    Complex64::cis((mixed >> 11) as f64 / (1u64 << 53) as f64 * std::f64::consts::TAU)
}

/// Barycentric weights of given supports, by least squares over all other samples.
fn weights(data: &Data, supports: &[usize], others: &[usize]) -> Option<Vec<Complex64>> {
    let rows = others.len() * data.width;
    // Differences of frequencies are scaled to be near 1.
    let scale = data.frequency_hz.iter().copied().fold(0.0, f64::max);
    dense::weakest_direction(rows, supports.len(), |i, j| {
        let (sample, row) = (others[i / data.width], i % data.width);
        let support = supports[j];
        let apart = (data.frequency_hz[sample] - data.frequency_hz[support]) / scale;
        (data.value(sample, row) - data.value(support, row)) / apart
            * data.weight[sample * data.width + row]
    })
}

/// The sample that the fit misses most, and by how much.
fn worst(data: &Data, supports: &[usize], others: &[usize], weights: &[Complex64]) -> (f64, usize) {
    let mut found = (0.0, others[0]);
    for &sample in others {
        let factor: Vec<Complex64> = supports
            .iter()
            .zip(weights)
            .map(|(&s, w)| w / (data.frequency_hz[sample] - data.frequency_hz[s]))
            .collect();
        let below: Complex64 = factor.iter().sum();
        for row in 0..data.width {
            let above: Complex64 =
                factor.iter().zip(supports).map(|(c, &s)| c * data.value(s, row)).sum();
            let off = (above / below - data.value(sample, row)).norm()
                * data.weight[sample * data.width + row];
            // Not a number is the worst of all.
            if off.is_nan() {
                return (f64::INFINITY, sample);
            }
            if off > found.0 {
                found = (off, sample);
            }
        }
    }
    found
}

impl Model {
    /// Fits samples of ascending, different frequencies. Supports are added until the fit is as
    /// good as the data, or `most_supports` are used; those of an earlier fit may be given to begin
    /// with. `None` where there is nothing to fit.
    pub fn fit(known: &[Known], begin_hz: &[f64], most_supports: usize) -> Option<Model> {
        let data = Data::new(known);
        if data.width == 0 || known.len() < 2 + SPARE {
            return None;
        }
        let at = |f: &f64| data.frequency_hz.binary_search_by(|g| g.total_cmp(f)).ok();
        let mut supports: Vec<usize> = begin_hz.iter().filter_map(at).collect();
        if supports.is_empty() {
            supports.push(known.len() / 2);
        }
        let mut best: Option<(f64, Vec<usize>, Vec<Complex64>)> = None;
        loop {
            let others: Vec<usize> =
                (0..known.len()).filter(|sample| !supports.contains(sample)).collect();
            let enough = others.len() >= SPARE
                && others.len() * data.width >= supports.len() + 2
                && supports.len() <= most_supports;
            if !enough {
                break;
            }
            let Some(weights) = weights(&data, &supports, &others) else { break };
            let (misfit, sample) = worst(&data, &supports, &others, &weights);
            if best.as_ref().is_none_or(|(least, _, _)| misfit < *least) {
                best = Some((misfit, supports.clone(), weights));
            }
            if misfit <= FULL_PRECISION {
                break;
            }
            supports.push(sample);
        }
        let (misfit, supports, weights) = best?;
        Some(Model {
            supports_hz: supports.iter().map(|&s| data.frequency_hz[s]).collect(),
            values: supports.iter().map(|&s| known[s].phasors.to_vec()).collect(),
            weights,
            misfit,
        })
    }

    /// The supports in hertz, to begin a later fit with.
    pub fn supports_hz(&self) -> &[f64] {
        &self.supports_hz
    }

    /// The phasors at a frequency in hertz.
    pub fn at(&self, frequency_hz: f64) -> Vec<Complex64> {
        if let Some(at) = self.supports_hz.iter().position(|&f| f == frequency_hz) {
            return self.values[at].clone();
        }
        let mut above = vec![Complex64::ZERO; self.values[0].len()];
        let mut below = Complex64::ZERO;
        for ((support, weight), values) in
            self.supports_hz.iter().zip(&self.weights).zip(&self.values)
        {
            let factor = weight / (frequency_hz - support);
            below += factor;
            above.iter_mut().zip(values).for_each(|(sum, value)| *sum += factor * value);
        }
        above.iter_mut().for_each(|sum| *sum /= below);
        above
    }

    /// Zeros of the denominator in hertz, each with the residue of every phasor.
    fn all_poles(&self) -> Vec<(Complex64, Vec<Complex64>)> {
        let m = self.supports_hz.len();
        if m < 2 {
            return Vec::new();
        }
        let scale = self.supports_hz.iter().copied().fold(0.0, f64::max);
        // In u = 1/(z − c) the zeros of Σ w/(z − z_j) are those of Σ w·u_j/(u − u_j), and c can be
        // chosen so that no zero is far off.
        let centre = Complex64::new(0.45, 0.61) * scale;
        let u: Vec<Complex64> =
            self.supports_hz.iter().map(|f| (Complex64::from(*f) - centre).inv() * scale).collect();
        let v: Vec<Complex64> = self.weights.iter().zip(&u).map(|(w, u)| w * u).collect();
        let sum: Complex64 = v.iter().sum();
        let found = dense::eigenvalues(m, |i, j| {
            let own = if i == j { u[j] } else { Complex64::ZERO };
            own - v[j] * u[j] / sum
        });
        let tiny = 1e-9;
        let zeros = found.unwrap_or_default().into_iter().filter(|u| u.norm() > tiny);
        zeros.map(|u| self.polish(u.inv() * scale + centre)).filter(|p| p.0.is_finite()).collect()
    }

    /// Newton's steps towards a zero of the denominator, and the residues there.
    fn polish(&self, mut at: Complex64) -> (Complex64, Vec<Complex64>) {
        const STEPS: usize = 8;
        let mut residue = vec![Complex64::ZERO; self.values[0].len()];
        for step in 0..=STEPS {
            let (mut below, mut slope) = (Complex64::ZERO, Complex64::ZERO);
            residue.fill(Complex64::ZERO);
            for ((support, weight), values) in
                self.supports_hz.iter().zip(&self.weights).zip(&self.values)
            {
                let factor = weight / (at - support);
                below += factor;
                slope -= factor / (at - support);
                residue.iter_mut().zip(values).for_each(|(sum, value)| *sum += factor * value);
            }
            residue.iter_mut().for_each(|sum| *sum /= slope);
            let correction = below / slope;
            let sound = correction.norm() <= 0.1 * at.norm();
            if step == STEPS || !sound {
                break;
            }
            at -= correction;
        }
        (at, residue)
    }

    /// The poles that make a resonance between two frequencies in hertz, ascending, each with at
    /// least `least_part` of some phasor.
    pub fn poles(&self, from_hz: f64, to_hz: f64, least_part: f64) -> Vec<Pole> {
        // What is smaller than this is made of rounding.
        let noise = 10.0 * self.misfit.max(10.0 * FULL_PRECISION);
        let mut found = Vec::new();
        for (at, residue) in self.all_poles() {
            let top = at.norm();
            if !(from_hz..=to_hz).contains(&top) || at.im.abs() > 0.5 * at.re {
                continue;
            }
            let half = if at.im.abs() > LOSSLESS * top { at.im.abs() } else { LOSSLESS_GAP * top };
            let near = self.at(top + half);
            let parts = residue.iter().zip(&near).filter(|(_, near)| near.norm() > 0.0);
            let part = parts.map(|(r, near)| r.norm() / half / near.norm()).fold(0.0, f64::max);
            if part >= least_part && part * half >= noise * top {
                found.push(Pole { at });
            }
        }
        found.sort_by(|a, b| a.frequency_hz().total_cmp(&b.frequency_hz()));
        found
    }
}
