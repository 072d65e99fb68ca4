//! Support functions along time in floating point: where they are greatest, and where the responses change their signs.

use super::approx::{ApproxForm, ApproxSupport};
use super::plan::Plan;
use keepout_checker::support::Shape;

/// Cells are so short that the fastest active exponent turns by about this much on half of one.
pub(crate) const REACH: f64 = 2.0;

/// Samples of one stride.
const SAMPLES: usize = 8;

/// The most strides of a scan.
const MAX_STRIDES: usize = 40_000;

/// Nodes and weights of the Gauss-Legendre rule of order 8 on [-1, 1].
const GAUSS: [(f64, f64); 4] = [
    (0.339_981_043_584_856_26, 0.652_145_154_862_546_1),
    (0.861_136_311_594_052_6, 0.347_854_845_137_453_85),
    (-0.339_981_043_584_856_26, 0.652_145_154_862_546_1),
    (-0.861_136_311_594_052_6, 0.347_854_845_137_453_85),
];

/// One instant of a scan.
#[derive(Clone, Debug)]
pub(crate) struct Sample {
    pub(crate) t: f64,
    /// The values of the support functions.
    pub(crate) values: Vec<f64>,
    /// For each of them the integrals of the sizes of the signals' responses.
    pub(crate) integrals: Vec<Vec<f64>>,
}

/// All that a scan finds.
pub(crate) struct Scan {
    pub(crate) supports: Vec<ApproxSupport>,
    pub(crate) shape: Shape,
    pub(crate) sizes: Vec<f64>,
    pub(crate) samples: Vec<Sample>,
    /// For each support function and signal the instants at which the response changes its sign.
    pub(crate) crossings: Vec<Vec<Vec<f64>>>,
    /// The limit superior for large times, where there is one and the scan came there.
    pub(crate) limits: Vec<Option<f64>>,
    /// The size of the numbers.
    pub(crate) scale: f64,
    /// Exponents of real part above minus this last.
    pub(crate) marginal: f64,
}

impl Scan {
    /// Scans a plan up to the window's end, or until nothing changes any more. `sizes`: of the signals.
    pub(crate) fn new(plan: &Plan, sizes: Vec<f64>, until: Option<f64>, enough: impl Fn(&Sample) -> bool) -> Self {
        let supports: Vec<ApproxSupport> = plan.supports.iter().map(ApproxSupport::new).collect();
        let fastest = supports.iter().flat_map(|s| s.all()).map(|f| f.speed(0.0, 0.0)).fold(1e-300, f64::max);
        let crossings = supports.iter().map(|s| vec![Vec::new(); s.signals.len()]).collect();
        let shape = plan.inputs.shape.clone();
        let limits = vec![None; supports.len()];
        let marginal = 1e-12 * fastest;
        let mut scan = Self { supports, shape, sizes, samples: Vec::new(), crossings, limits, scale: 0.0, marginal };
        scan.run(until, enough);
        scan
    }

    fn run(&mut self, until: Option<f64>, enough: impl Fn(&Sample) -> bool) {
        let integrals: Vec<Vec<f64>> = self.supports.iter().map(|s| vec![0.0; s.signals.len()]).collect();
        let first = self.sample(0.0, integrals);
        self.grow_scale(&first);
        self.samples.push(first);
        for _ in 0..MAX_STRIDES {
            let t = self.samples.last().map_or(0.0, |s| s.t);
            if until.is_some_and(|end| t >= end) || (until.is_none() && self.is_settled(t)) {
                break;
            }
            let step = until.map_or(self.stride(t), |end| self.stride(t).min(end - t));
            let mut found = false;
            for k in 1..=SAMPLES {
                let next = t + step * k as f64 / SAMPLES as f64;
                let next =
                    if k == SAMPLES && until.is_some_and(|end| t + step >= end) { until.unwrap_or(next) } else { next };
                let sample = self.advance(next);
                self.grow_scale(&sample);
                found |= enough(&sample);
                self.samples.push(sample);
            }
            if found {
                break;
            }
        }
        let settled = self.samples.last().is_some_and(|s| self.is_settled(s.t));
        if until.is_none() && settled {
            self.limits = (0..self.supports.len()).map(|i| self.limit(i)).collect();
        }
    }

    /// Another support function at the same instants.
    pub(crate) fn along(&self, support: ApproxSupport, sizes: Vec<f64>) -> Self {
        let signals = support.signals.len();
        let mut scan = Self {
            supports: vec![support],
            shape: self.shape.clone(),
            sizes,
            samples: Vec::new(),
            crossings: vec![vec![Vec::new(); signals]],
            limits: vec![None],
            scale: 0.0,
            marginal: self.marginal,
        };
        for sample in &self.samples {
            let next = if scan.samples.is_empty() {
                scan.sample(sample.t, vec![vec![0.0; signals]])
            } else {
                scan.advance(sample.t)
            };
            scan.grow_scale(&next);
            scan.samples.push(next);
        }
        if self.limits.iter().any(Option::is_some) {
            scan.limits = vec![scan.limit(0)];
        }
        scan
    }

    /// The integral up to an instant of another function against the sign of a signal's response.
    pub(crate) fn integral_against(&self, index: usize, signal: usize, other: &ApproxForm, to: f64) -> f64 {
        let form = &self.supports[index].signals[signal];
        let crossings = &self.crossings[index][signal];
        let mut ends: Vec<f64> = self.samples.iter().map(|s| s.t).chain(crossings.iter().copied()).collect();
        ends.retain(|t| *t < to);
        ends.push(to);
        ends.sort_by(f64::total_cmp);
        let f = |t: f64| other.value(t);
        let one = |w: &[f64]| {
            let sign = if form.value((w[0] + w[1]) / 2.0) >= 0.0 { 1.0 } else { -1.0 };
            sign * gauss(&f, w[0], w[1])
        };
        ends.windows(2).map(one).sum()
    }

    /// Values and limits for new sizes of the signals.
    pub(crate) fn renew(&mut self) {
        let samples = std::mem::take(&mut self.samples);
        let renewed: Vec<Sample> = samples.into_iter().map(|s| self.sample(s.t, s.integrals)).collect();
        renewed.iter().for_each(|s| self.grow_scale(s));
        self.samples = renewed;
        if self.limits.iter().any(Option::is_some) {
            self.limits = (0..self.supports.len()).map(|i| self.limit(i)).collect();
        }
    }

    /// The greatest size of a support function and of that of the negated function, at the samples.
    pub(crate) fn largest(&self, index: usize, from: f64) -> f64 {
        let above = self.samples.iter().filter(|s| s.t >= from).map(|s| {
            let central = self.supports[index].central.value(s.t);
            s.values[index].max(s.values[index] - 2.0 * central)
        });
        let limit = self.limits[index].map_or(f64::NEG_INFINITY, |l| l.abs());
        above.fold(limit, f64::max)
    }

    fn grow_scale(&mut self, sample: &Sample) {
        self.scale = sample.values.iter().fold(self.scale, |s, v| s.max(v.abs()));
        for (support, integrals) in self.supports.iter().zip(&sample.integrals) {
            self.scale = self.scale.max(support.central.value(sample.t).abs());
            let added: f64 = integrals.iter().zip(&self.sizes).map(|(i, w)| i * w).sum();
            self.scale = self.scale.max(added);
        }
    }

    /// The length of a cell that begins at t.
    pub(crate) fn stride(&self, t: f64) -> f64 {
        let mut speed = 0.0_f64;
        let least = 1e-14 * self.scale.max(1e-300);
        for support in &self.supports {
            for form in std::iter::once(&support.central).chain(&support.responses) {
                speed = speed.max(form.speed(t, least));
            }
            for (form, size) in support.signals.iter().zip(&self.sizes) {
                // Also those of size 0, whose sizes are not known yet.
                let weight = if *size > 0.0 { *size } else { 1.0 };
                speed = speed.max(form.speed(t, least / weight * 1e-2));
            }
        }
        if speed > 0.0 { (2.0 * REACH / speed).min(t.max(2.0 * REACH / speed) * 4.0) } else { t.max(1.0) }
    }

    /// Whether all that decays has done so.
    fn is_settled(&self, t: f64) -> bool {
        t > 0.0 && (0..self.supports.len()).all(|i| self.rest(i, t) <= 1e-11 * self.scale)
    }

    /// A bound of what is still to come after t, waves that last aside.
    pub(crate) fn rest(&self, index: usize, t: f64) -> f64 {
        let support = &self.supports[index];
        let forms = std::iter::once(&support.central).chain(&support.responses);
        let decaying: f64 = forms.map(|f| f.rest(t, self.marginal)).sum();
        let signals = support.signals.iter().zip(&self.sizes).filter(|(_, w)| **w > 0.0);
        decaying + signals.map(|(f, w)| w * f.integral_from(t, self.marginal)).sum::<f64>()
    }

    fn sample(&self, t: f64, integrals: Vec<Vec<f64>>) -> Sample {
        let value = |(i, support): (usize, &ApproxSupport)| {
            let added: f64 = integrals[i].iter().zip(&self.sizes).map(|(x, w)| x * w).sum();
            support.central.value(t) + support.direct + support.starts(&self.shape, t) + added
        };
        let values = self.supports.iter().enumerate().map(value).collect();
        Sample { t, values, integrals }
    }

    fn advance(&mut self, to: f64) -> Sample {
        let Some(last) = self.samples.last().cloned() else { return self.sample(to, Vec::new()) };
        let mut integrals = last.integrals;
        for (i, support) in self.supports.iter().enumerate() {
            for (k, form) in support.signals.iter().enumerate() {
                let f = |t: f64| form.value(t);
                let (a, b) = (f(last.t), f(to));
                let middle = (last.t + to) / 2.0;
                let mut ends = vec![last.t];
                for (x, y) in [(last.t, middle), (middle, to)] {
                    let (u, v) = if x == last.t { (a, f(middle)) } else { (f(middle), b) };
                    if u * v < 0.0 {
                        let root = bisect(&f, x, y);
                        self.crossings[i][k].push(root);
                        ends.push(root);
                    }
                }
                ends.push(to);
                integrals[i][k] += ends.windows(2).map(|w| gauss(&f, w[0], w[1]).abs()).sum::<f64>();
            }
        }
        self.sample(to, integrals)
    }

    /// The value of a support function at an instant, from the nearest sample before it.
    pub(crate) fn value_at(&self, index: usize, t: f64) -> f64 {
        let position = self.samples.partition_point(|s| s.t <= t).saturating_sub(1);
        let sample = &self.samples[position];
        let support = &self.supports[index];
        let mut added = 0.0;
        for (k, form) in support.signals.iter().enumerate() {
            let f = |t: f64| form.value(t);
            let mut ends = vec![sample.t];
            ends.extend(self.crossings[index][k].iter().filter(|c| **c > sample.t && **c < t));
            ends.push(t);
            let more: f64 = ends.windows(2).map(|w| gauss(&f, w[0], w[1]).abs()).sum();
            added += self.sizes[k] * (sample.integrals[index][k] + more);
        }
        support.central.value(t) + support.direct + support.starts(&self.shape, t) + added
    }

    /// The integral of the size of a signal's response between two instants not far apart.
    pub(crate) fn integral(&self, index: usize, signal: usize, from: f64, to: f64) -> f64 {
        let form = &self.supports[index].signals[signal];
        let f = |t: f64| form.value(t);
        let mut ends = vec![from];
        let crossings = &self.crossings[index][signal];
        let first = crossings.partition_point(|c| *c <= from);
        ends.extend(crossings[first..].iter().take_while(|c| **c < to));
        ends.push(to);
        let halves = ends.windows(2).flat_map(|w| [(w[0], (w[0] + w[1]) / 2.0), ((w[0] + w[1]) / 2.0, w[1])]);
        halves.map(|(a, b)| gauss(&f, a, b).abs()).sum()
    }

    /// The greatest value in the window from an instant on, with its time (infinity: only approached).
    pub(crate) fn supremum(&self, index: usize, from: f64) -> (f64, f64) {
        let inside = || self.samples.iter().enumerate().filter(|(_, s)| s.t >= from);
        let best = inside().max_by(|a, b| a.1.values[index].total_cmp(&b.1.values[index])).map(|(i, _)| i);
        let Some(best) = best else { return (f64::NEG_INFINITY, from) };
        let (mut low, mut high) =
            (self.samples[best.saturating_sub(1)].t.max(from), self.samples[(best + 1).min(self.samples.len() - 1)].t);
        let mut peak = (self.samples[best].values[index], self.samples[best].t);
        for _ in 0..60 {
            let (x, y) = (low + 0.382 * (high - low), low + 0.618 * (high - low));
            let (u, v) = (self.value_at(index, x), self.value_at(index, y));
            for (value, t) in [(u, x), (v, y)] {
                if value > peak.0 {
                    peak = (value, t);
                }
            }
            if u > v { high = y } else { low = x }
        }
        match self.limits[index] {
            Some(limit) if limit > peak.0 => (limit, f64::INFINITY),
            _ => peak,
        }
    }

    /// The limit superior of a support function; `None`: it grows, or is not known.
    fn limit(&self, index: usize) -> Option<f64> {
        let support = &self.supports[index];
        let last = self.samples.last()?;
        let central = support.central.lasting(self.marginal)?;
        let starts = support.responses.iter().map(|f| f.lasting(self.marginal)).collect::<Option<Vec<_>>>()?;
        let mut added = support.direct;
        for (k, form) in support.signals.iter().enumerate().filter(|(k, _)| self.sizes[*k] > 0.0) {
            let more = form.integral_from(last.t, self.marginal);
            added += self.sizes[k] * (last.integrals[index][k] + more.min(1e-11 * self.scale / self.sizes[k]));
        }
        let mut omegas: Vec<f64> = Vec::new();
        for (omega, _) in central.iter().chain(starts.iter().flatten()) {
            if *omega != 0.0 && !omegas.iter().any(|o| (o - omega).abs() < self.marginal) {
                omegas.push(*omega);
            }
        }
        let value = |angles: &[f64]| {
            let sum = |waves: &[(f64, (f64, f64))]| -> f64 {
                let one = |(omega, (a, b)): &(f64, (f64, f64))| {
                    let position = omegas.iter().position(|o| (o - omega).abs() < self.marginal);
                    let angle = position.map_or(0.0, |p| angles[p]);
                    a * angle.cos() - b * angle.sin()
                };
                waves.iter().map(one).sum()
            };
            sum(&central) + super::approx::combined(&self.shape, starts.iter().map(|w| sum(w))) + added
        };
        Some(greatest_on_torus(omegas.len(), value))
    }
}

/// The greatest value of a function of angles: on a grid, then by shrinking steps along the axes.
fn greatest_on_torus(dimension: usize, value: impl Fn(&[f64]) -> f64) -> f64 {
    let turn = std::f64::consts::TAU;
    let side: usize = match dimension {
        0 => 1,
        1 => 720,
        2 => 90,
        3 => 24,
        _ => 6,
    };
    let mut best = (f64::NEG_INFINITY, vec![0.0; dimension]);
    for index in 0..side.pow(dimension.min(6) as u32) {
        let mut rest = index;
        let angles: Vec<f64> = (0..dimension)
            .map(|_| {
                let k = rest % side;
                rest /= side;
                turn * k as f64 / side as f64
            })
            .collect();
        let here = value(&angles);
        if here > best.0 {
            best = (here, angles);
        }
    }
    let mut step = turn / side as f64;
    while dimension > 0 && step > 1e-9 {
        let mut moved = false;
        for axis in 0..dimension {
            for sign in [-1.0, 1.0] {
                let mut angles = best.1.clone();
                angles[axis] += sign * step;
                let here = value(&angles);
                if here > best.0 {
                    best = (here, angles);
                    moved = true;
                }
            }
        }
        if !moved {
            step /= 2.0;
        }
    }
    best.0
}

fn gauss(f: &impl Fn(f64) -> f64, a: f64, b: f64) -> f64 {
    let (middle, half) = ((a + b) / 2.0, (b - a) / 2.0);
    half * GAUSS.iter().map(|(x, w)| w * f(middle + half * x)).sum::<f64>()
}

pub(crate) fn bisect(f: &impl Fn(f64) -> f64, mut a: f64, mut b: f64) -> f64 {
    let positive = f(a) > 0.0;
    for _ in 0..80 {
        let middle = (a + b) / 2.0;
        if middle <= a || middle >= b {
            break;
        }
        if (f(middle) > 0.0) == positive { a = middle } else { b = middle }
    }
    (a + b) / 2.0
}

/// A double as a rational number, exactly.
pub(crate) fn rounded_near(x: f64) -> keepout_checker::number::Rational {
    num_traits::FromPrimitive::from_f64(x).unwrap_or_else(num_traits::Zero::zero)
}
