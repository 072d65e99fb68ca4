//! Conjunctions of half-spaces. At an instant, the greatest least value of their functions over mixtures of trajectories is the
//! least support function of weighted means of them (a game): either some mean is negative along all trajectories, or a mixture
//! of extreme trajectories is in all half-spaces.

use super::approx::ApproxSupport;
use super::game;
use super::prove::rounded;
use super::scan::Scan;
use crate::enclosure::approx_value;
use keepout_checker::number::Rational;
use keepout_checker::statement::{Atom, Formula, Relation};
use num_traits::Zero;

/// A half-space: a polynomial of the zone, and whether it is to be positive.
pub(crate) type Half = (usize, bool);

/// Conjunctions of a zone at most.
const MAX_CONJUNCTIONS: usize = 256;

/// Means and rounds of the game at most.
const MAX_MEANS: usize = 40;
const MAX_ROUNDS: usize = 60;

/// The sizes below which a value, relative to the functions', counts as zero, and that of an error that does not matter.
const NEAR: f64 = 1e-9;

/// The conjunctions whose disjunction a formula is, in half-spaces alone (`position`: of an atom's polynomial; an inequation is left
/// out). `None`: they are too many.
pub(crate) fn conjunctions(formula: &Formula, position: &dyn Fn(&Atom) -> usize) -> Option<Vec<Vec<Half>>> {
    let all: Vec<Vec<Half>> = match formula {
        Formula::Atom(atom) => {
            let index = position(atom);
            vec![match atom.relation {
                Relation::Positive | Relation::NonNegative => vec![(index, true)],
                Relation::Negative | Relation::NonPositive => vec![(index, false)],
                Relation::Zero => vec![(index, true), (index, false)],
                Relation::NonZero => Vec::new(),
            }]
        }
        Formula::Or(parts) => {
            let own = parts.iter().map(|p| conjunctions(p, position)).collect::<Option<Vec<_>>>()?;
            own.into_iter().flatten().collect()
        }
        Formula::And(parts) => {
            let mut all: Vec<Vec<Half>> = vec![Vec::new()];
            for part in parts {
                let own = conjunctions(part, position)?;
                let joined =
                    |a: &Vec<Half>| own.iter().map(|b| a.iter().chain(b).copied().collect()).collect::<Vec<_>>();
                all = all.iter().flat_map(joined).collect();
                if all.len() > MAX_CONJUNCTIONS {
                    return None;
                }
            }
            all
        }
    };
    (all.len() <= MAX_CONJUNCTIONS).then_some(all)
}

/// Shares of trajectories, each the worst for the mean with these weights.
pub(crate) type Mixture = Vec<(f64, Vec<f64>)>;

/// What is known of a conjunction.
pub(crate) enum Separation {
    /// At each instant one of these means is negative: the weights of the half-spaces.
    Apart(Vec<Vec<Rational>>),
    /// A mixture of trajectories, each the worst of a mean, is in all half-spaces at an instant.
    Meets { at: f64, mixture: Mixture },
    /// Too near to tell.
    Unclear,
}

/// A conjunction along a scan.
pub(crate) struct Conjunction<'a> {
    scan: &'a Scan,
    /// The half-spaces' support functions in the scan.
    parts: Vec<usize>,
    /// The sizes of the functions.
    scales: Vec<f64>,
    /// The sizes of the signals.
    sizes: &'a [f64],
    from: f64,
}

/// A mean along the scan's instants.
struct Mean {
    weights: Vec<f64>,
    along: Scan,
}

/// What a game says of an instant: the least mean is between two numbers.
struct Played {
    upper: f64,
    mean: Mean,
    lower: f64,
    mixture: Mixture,
}

impl<'a> Conjunction<'a> {
    pub(crate) fn new(scan: &'a Scan, parts: Vec<usize>, sizes: &'a [f64], from: f64) -> Self {
        let scale = |part: &usize| scan.samples.iter().fold(0.0_f64, |s, sample| s.max(sample.values[*part].abs()));
        let scales = parts.iter().map(|p| scale(p).max(1e-300)).collect();
        Self { scan, parts, scales, sizes, from }
    }

    /// Means for all instants of the window, or an instant at which no mean will do.
    pub(crate) fn separate(&self, effort: &mut u64) -> Separation {
        let unit = |i: usize| (0..self.parts.len()).map(|j| if i == j { 1.0 } else { 0.0 }).collect::<Vec<f64>>();
        let mut means: Vec<Mean> = (0..self.parts.len()).map(|i| self.mean(unit(i))).collect();
        while means.len() < MAX_MEANS {
            let (worst, at) = self.worst(&means);
            if worst < -NEAR {
                return Separation::Apart(self.chosen(means));
            }
            let Some(rest) = effort.checked_sub(10) else { return Separation::Unclear };
            *effort = rest;
            let at = if at.is_finite() { at } else { self.scan.samples.last().map_or(0.0, |s| s.t) };
            let Some(played) = self.at_instant(at) else { return Separation::Unclear };
            if played.lower > NEAR {
                return Separation::Meets { at, mixture: played.mixture };
            }
            let mean = played.mean;
            // The same again: nothing is gained.
            let is_new = mean.along.value_at(0, at) < worst - 1e-3 * worst.abs() - 1e-12;
            if !is_new {
                return Separation::Unclear;
            }
            means.push(mean);
        }
        Separation::Unclear
    }

    /// The mean with these weights of the scaled functions.
    fn mean(&self, weights: Vec<f64>) -> Mean {
        let supports = self.parts.iter().zip(weights.iter().zip(&self.scales));
        let weighted: Vec<(f64, &ApproxSupport)> =
            supports.map(|(p, (w, scale))| (w / scale, &self.scan.supports[*p])).collect();
        let along = self.scan.along(ApproxSupport::mixed(&weighted), self.sizes.to_vec());
        Mean { weights, along }
    }

    /// The scan of the mean with these weights, of which it is the only function.
    pub(crate) fn along(&self, weights: &[f64]) -> Scan {
        self.mean(weights.to_vec()).along
    }

    /// The greatest over time of the least of the means, with its instant (infinity: in the limit).
    fn worst(&self, means: &[Mean]) -> (f64, f64) {
        let least = |value: &dyn Fn(&Mean) -> f64| means.iter().map(value).fold(f64::INFINITY, f64::min);
        let mut best = (f64::NEG_INFINITY, self.from);
        let last = self.scan.samples.len().saturating_sub(1);
        for (index, sample) in self.scan.samples.iter().enumerate().filter(|(_, s)| s.t >= self.from) {
            let here = least(&|mean| mean.along.samples[index].values[0]);
            if here > best.0 {
                best = (here, sample.t);
            }
        }
        // Between the samples around it.
        let position = self.scan.samples.partition_point(|s| s.t < best.1);
        let low = self.scan.samples[position.saturating_sub(1)].t.max(self.from);
        let high = self.scan.samples[(position + 1).min(last)].t;
        for i in 1..32 {
            let t = low + (high - low) * f64::from(i) / 32.0;
            let here = least(&|mean| mean.along.value_at(0, t));
            if here > best.0 {
                best = (here, t);
            }
        }
        if self.scan.limits.iter().any(Option::is_some) {
            let late = least(&|mean| mean.along.limits[0].unwrap_or(f64::INFINITY));
            if late > best.0 {
                best = (late, f64::INFINITY);
            }
        }
        best
    }

    /// The mean that is nearly least at an instant, and a mixture of trajectories that shows how small it can be at most.
    fn at_instant(&self, t: f64) -> Option<Played> {
        let count = self.parts.len();
        let mut mean = self.mean(vec![1.0 / count as f64; count]);
        let mut rows: Vec<Vec<f64>> = Vec::new();
        let mut weights: Vec<Vec<f64>> = Vec::new();
        let mut best: Option<Played> = None;
        for _ in 0..MAX_ROUNDS {
            let upper = mean.along.value_at(0, t);
            rows.push(self.values_of_worst(&mean, t));
            weights.push(mean.weights.clone());
            let solution = game::solve(&rows)?;
            let next = self.mean(solution.columns.clone());
            let tried = std::mem::replace(&mut mean, next);
            let known = best.get_or_insert_with(|| Played {
                upper: f64::INFINITY,
                mean: self.mean(tried.weights.clone()),
                lower: f64::NEG_INFINITY,
                mixture: Vec::new(),
            });
            if upper < known.upper {
                (known.upper, known.mean) = (upper, tried);
            }
            let against = |i: usize| rows.iter().zip(&solution.rows).map(|(row, w)| row[i] * w).sum::<f64>();
            let lower = (0..count).map(against).fold(f64::INFINITY, f64::min);
            if lower > known.lower {
                let pairs = solution.rows.iter().zip(&weights).filter(|(w, _)| **w > 0.0);
                (known.lower, known.mixture) = (lower, pairs.map(|(w, mean)| (*w, mean.clone())).collect());
            }
            // Near enough: the sign is clear, and a tenth of the size is not to be had.
            let near = 0.1 * known.upper.abs().min(known.lower.abs());
            if known.upper - known.lower <= near.max(1e-12) {
                break;
            }
        }
        best
    }

    /// The values of the scaled functions at an instant along the trajectory that is the worst for a mean there.
    fn values_of_worst(&self, mean: &Mean, t: f64) -> Vec<f64> {
        let shape = &self.scan.shape;
        let support = &mean.along.supports[0];
        let responses: Vec<f64> = support.responses.iter().map(|f| f.value(t)).collect();
        let factors = super::approx::worst_factors(shape, &responses);
        let value = |(part, scale): (&usize, &f64)| {
            let own = &self.scan.supports[*part];
            let started: f64 = own.responses.iter().zip(&factors).map(|(f, x)| f.value(t) * x).sum();
            let signals = (0..self.sizes.len()).filter(|k| self.sizes[*k] > 0.0);
            let moved: f64 =
                signals.map(|k| self.sizes[k] * mean.along.integral_against(0, k, &own.signals[k], t)).sum();
            (own.central.value(t) + own.direct + started + moved) / scale
        };
        self.parts.iter().zip(&self.scales).map(value).collect()
    }

    /// Weights in short numbers for some of the means: as few as nearly do what all do.
    fn chosen(&self, mut means: Vec<Mean>) -> Vec<Vec<Rational>> {
        let whole = self.worst(&means).0;
        let enough = |means: &[Mean]| !means.is_empty() && self.worst(means).0 <= whole / 2.0;
        let mut index = 0;
        while index < means.len() {
            let left_out = means.remove(index);
            if !enough(&means) {
                means.insert(index, left_out);
                index += 1;
            }
        }
        for bits in [6, 12, 24] {
            let grain = 2.0_f64.powi(-bits);
            let short = |mean: &Mean| -> Vec<Rational> {
                let weight = |(w, scale): (&f64, &f64)| {
                    if *w < grain / 64.0 { Rational::zero() } else { rounded(w / scale, w / scale * grain) }
                };
                mean.weights.iter().zip(&self.scales).map(weight).collect()
            };
            let weights: Vec<Vec<Rational>> = means.iter().map(short).collect();
            let scaled = |w: &Vec<Rational>| w.iter().zip(&self.scales).map(|(x, s)| approx_value(x) * s).collect();
            let rounded: Vec<Mean> = weights.iter().map(|w| self.mean(scaled(w))).collect();
            if self.worst(&rounded).0 <= whole / 3.0 || bits == 24 {
                return weights;
            }
        }
        Vec::new()
    }
}
