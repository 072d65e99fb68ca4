//! Closed forms and support functions in floating point: guesses, on which nothing rests.

use crate::strategy::cone::approx_dyadic;
use keepout_checker::number::Complex;
use keepout_checker::support::{Shape, Support};
use keepout_checker::trace::ClosedForm;

/// sum of Re(c t^j exp((rho + i omega) t)).
#[derive(Clone, Debug, Default)]
pub(crate) struct ApproxForm {
    terms: Vec<ApproxTerm>,
}

#[derive(Clone, Debug)]
struct ApproxTerm {
    rho: f64,
    omega: f64,
    /// Real and imaginary parts, doubled for conjugate pairs.
    coefficients: Vec<(f64, f64)>,
}

fn approx_complex(z: &Complex) -> (f64, f64) {
    let middle = |x: &keepout_checker::number::Interval| (approx_dyadic(x.lo()) + approx_dyadic(x.hi())) / 2.0;
    (middle(&z.re), middle(&z.im))
}

impl ApproxForm {
    pub(crate) fn new(form: &ClosedForm) -> Self {
        let term = |t: &keepout_checker::trace::Term| {
            let (rho, omega) = approx_complex(&t.exponent);
            let weight = if t.is_real { 1.0 } else { 2.0 };
            let coefficients = t.coefficients.iter().map(approx_complex).map(|(a, b)| (weight * a, weight * b));
            ApproxTerm { rho, omega, coefficients: coefficients.collect() }
        };
        Self { terms: form.terms.iter().map(term).collect() }
    }

    /// A sum of multiples of forms.
    fn mixed(weighted: &[(f64, &Self)]) -> Self {
        let mut terms: Vec<ApproxTerm> = Vec::new();
        for (weight, term) in weighted.iter().flat_map(|(w, form)| form.terms.iter().map(move |t| (w, t))) {
            let scaled = term.coefficients.iter().map(|(a, b)| (weight * a, weight * b));
            // Forms over the same certified roots have the same numbers.
            match terms.iter_mut().find(|t| t.rho == term.rho && t.omega == term.omega) {
                Some(known) => {
                    let length = known.coefficients.len().max(term.coefficients.len());
                    known.coefficients.resize(length, (0.0, 0.0));
                    known.coefficients.iter_mut().zip(scaled).for_each(|(c, (a, b))| *c = (c.0 + a, c.1 + b));
                }
                None => {
                    terms.push(ApproxTerm { rho: term.rho, omega: term.omega, coefficients: scaled.collect() });
                }
            }
        }
        Self { terms }
    }

    pub(crate) fn value(&self, t: f64) -> f64 {
        self.terms.iter().map(|term| term.value(t)).sum()
    }

    /// The greatest |mu| of the terms that are not yet below a size, and the greatest rho of terms that last.
    pub(crate) fn speed(&self, t: f64, least: f64) -> f64 {
        let active = self.terms.iter().filter(|term| term.size(t) > least);
        active.map(|term| term.rho.hypot(term.omega)).fold(0.0, f64::max)
    }

    /// A bound of the terms that decay, at t and later (where they decrease).
    pub(crate) fn rest(&self, t: f64, marginal: f64) -> f64 {
        self.terms.iter().filter(|term| term.rho < -marginal).map(|term| term.size(t)).sum()
    }

    /// A bound of the integral of the size from t on; infinite where a term does not decay.
    pub(crate) fn integral_from(&self, t: f64, marginal: f64) -> f64 {
        let one = |term: &ApproxTerm| {
            if term.rho >= -marginal { f64::INFINITY } else { term.size(t) * 2.0 / term.rho.abs() }
        };
        self.terms.iter().map(one).sum()
    }

    /// The part that neither grows nor decays, as constant and waves (omega, size): only powers 0 of t; else `None`.
    pub(crate) fn lasting(&self, marginal: f64) -> Option<Vec<(f64, (f64, f64))>> {
        let mut waves = Vec::new();
        for term in self.terms.iter().filter(|term| term.rho >= -marginal) {
            if term.rho > marginal || term.coefficients.len() > 1 {
                return None;
            }
            waves.push((term.omega, term.coefficients[0]));
        }
        Some(waves)
    }
}

impl ApproxTerm {
    fn value(&self, t: f64) -> f64 {
        let growth = (self.rho * t).exp();
        if growth == 0.0 {
            return 0.0;
        }
        let (sine, cosine) = (self.omega * t).sin_cos();
        let mut power = growth;
        let mut sum = 0.0;
        for (a, b) in &self.coefficients {
            sum += power * (a * cosine - b * sine);
            power *= t;
        }
        sum
    }

    fn size(&self, t: f64) -> f64 {
        let mut power = (self.rho * t).exp();
        let mut sum = 0.0;
        for (a, b) in &self.coefficients {
            sum += a.hypot(*b) * power;
            power *= t.max(1e-300);
        }
        sum
    }
}

/// A support function.
#[derive(Clone, Debug)]
pub(crate) struct ApproxSupport {
    pub(crate) central: ApproxForm,
    pub(crate) responses: Vec<ApproxForm>,
    pub(crate) signals: Vec<ApproxForm>,
    pub(crate) direct: f64,
}

impl ApproxSupport {
    pub(crate) fn new(support: &Support) -> Self {
        Self {
            central: ApproxForm::new(&support.central),
            responses: support.responses.iter().map(ApproxForm::new).collect(),
            signals: support.signals.iter().map(ApproxForm::new).collect(),
            direct: crate::enclosure::approx_value(&support.direct),
        }
    }

    /// The support function of a sum of multiples, with factors that are not negative, of functions with these.
    pub(crate) fn mixed(weighted: &[(f64, &Self)]) -> Self {
        let of = |pick: &dyn Fn(&'_ Self) -> &'_ ApproxForm| {
            let forms: Vec<(f64, &ApproxForm)> = weighted.iter().map(|(w, s)| (*w, pick(s))).collect();
            ApproxForm::mixed(&forms)
        };
        let (starts, signals) = weighted.first().map_or((0, 0), |(_, s)| (s.responses.len(), s.signals.len()));
        Self {
            central: of(&|s| &s.central),
            responses: (0..starts).map(|j| of(&|s| &s.responses[j])).collect(),
            signals: (0..signals).map(|k| of(&|s| &s.signals[k])).collect(),
            direct: weighted.iter().map(|(w, s)| w * s.direct).sum(),
        }
    }

    pub(crate) fn all(&self) -> impl Iterator<Item = &ApproxForm> {
        std::iter::once(&self.central).chain(&self.responses).chain(&self.signals)
    }

    /// What the starts add at t.
    pub(crate) fn starts(&self, shape: &Shape, t: f64) -> f64 {
        let values = self.responses.iter().map(|f| f.value(t));
        combined(shape, values)
    }
}

/// What the starts add, from the values of the responses to their vectors.
pub(crate) fn combined(shape: &Shape, values: impl Iterator<Item = f64>) -> f64 {
    match shape {
        Shape::Sum => values.map(f64::abs).sum(),
        Shape::Hull => values.fold(0.0, f64::max),
        Shape::Ellipsoid(weights) => {
            let weighted = values.zip(weights).map(|(f, d)| crate::enclosure::approx_value(d) * f * f);
            weighted.sum::<f64>().sqrt()
        }
    }
}

/// The factors of the starts' vectors in the start that makes the sum of the responses with these values greatest.
pub(crate) fn worst_factors(shape: &Shape, values: &[f64]) -> Vec<f64> {
    match shape {
        Shape::Sum => values.iter().map(|x| if *x >= 0.0 { 1.0 } else { -1.0 }).collect(),
        Shape::Hull => {
            let best = (0..values.len()).max_by(|a, b| values[*a].total_cmp(&values[*b])).filter(|i| values[*i] > 0.0);
            (0..values.len()).map(|i| if best == Some(i) { 1.0 } else { 0.0 }).collect()
        }
        Shape::Ellipsoid(weights) => {
            let norm = combined(shape, values.iter().copied()).max(1e-300);
            values.iter().zip(weights).map(|(f, d)| crate::enclosure::approx_value(d) * f / norm).collect()
        }
    }
}
