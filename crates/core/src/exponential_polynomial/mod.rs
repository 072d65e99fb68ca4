//! Real exponential polynomials with exact data: the ring of scalar traces.
//!
//! An exponential polynomial g(t) = sum c t^j exp(mu t) is held by an annihilator m = prod q_e^e over Q (m(d/dt) g =
//! 0, the q_e square-free and coprime) and its derivatives g(0), g'(0), ..., g^(N-1)(0), N = deg m, all rational.
//! Sums, products and derivatives stay in this form; no eigenvalue is ever approximated. The annihilator is the
//! minimal one: it is found from the derivatives themselves, so that cancelled exponents disappear exactly. The zero
//! function has m = 1 and no derivatives. Coefficients, dominance and enclosures are in the files beside this one.

mod closed_form;
mod coefficient;
mod dominance;
mod residue_ring;

pub use closed_form::{ClosedForm, Term};
pub use coefficient::Coefficient;
pub use dominance::DominanceClass;

use crate::error::CoreError;
use crate::integer_polynomial::IntegerPolynomial;
use crate::linear_recurrence::minimal_annihilator;
use crate::matrix::RationalMatrix;
use crate::minimal_polynomial::minimal_polynomial_at;
use keepout_checker::number::Rational;
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Zero};
use std::ops::{Add, Mul, Neg, Sub};

/// A real function sum c t^j exp(mu t) with rational derivatives at 0 and a rational annihilator.
///
/// ```
/// use keepout_core::ExponentialPolynomial;
/// use num_rational::BigRational;
/// let three = BigRational::from_integer(3.into());
/// let (cosine, sine) = (ExponentialPolynomial::cosine(&three), ExponentialPolynomial::sine(&three));
/// let one = &(&cosine * &cosine) + &(&sine * &sine);
/// assert_eq!(one, ExponentialPolynomial::constant(BigRational::from_integer(1.into())));
/// ```
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ExponentialPolynomial {
    /// Square-free, coprime, primitive, by increasing multiplicity.
    factors: Vec<(IntegerPolynomial, usize)>,
    /// g(0), g'(0), ..., as many as the degree of the annihilator.
    derivatives: Vec<Rational>,
}

impl ExponentialPolynomial {
    /// The function that `annihilator` annihilates, with these derivatives at 0.
    ///
    /// # Errors
    /// [`CoreError::Shape`] if there are not as many derivatives as the degree of the annihilator.
    pub fn new(annihilator: &IntegerPolynomial, derivatives: &[Rational]) -> Result<Self, CoreError> {
        let order = annihilator.degree();
        if annihilator.is_zero() || derivatives.len() != order {
            return Err(CoreError::Shape { what: "derivatives at 0", expected: order, found: derivatives.len() });
        }
        let scaled = ScaledSequence::new(annihilator, derivatives);
        Ok(Self::from_scaled(&scaled.extended(2 * order), order))
    }

    /// h exp(At) s, the trace of a linear functional along a trajectory.
    ///
    /// # Errors
    /// [`CoreError::NotSquare`], [`CoreError::Shape`].
    pub fn trace(a: &RationalMatrix, functional: &[Rational], start: &[Rational]) -> Result<Self, CoreError> {
        let n = a.order()?;
        if functional.len() != n {
            return Err(CoreError::Shape { what: "functional", expected: n, found: functional.len() });
        }
        let annihilator = minimal_polynomial_at(a, start)?;
        let mut derivatives = Vec::with_capacity(annihilator.degree());
        let mut state = start.to_vec();
        for _ in 0..annihilator.degree() {
            derivatives.push(functional.iter().zip(&state).map(|(h, x)| h * x).sum());
            state = a.apply(&state)?;
        }
        Self::new(&annihilator, &derivatives)
    }

    /// The zero function.
    pub fn zero() -> Self {
        Self { factors: Vec::new(), derivatives: Vec::new() }
    }

    /// A constant function.
    pub fn constant(value: Rational) -> Self {
        Self::simple(IntegerPolynomial::variable(), vec![value])
    }

    /// The function t.
    pub fn time() -> Self {
        Self { factors: vec![(IntegerPolynomial::variable(), 2)], derivatives: vec![Rational::zero(), Rational::one()] }
    }

    /// exp(rate t).
    pub fn exponential(rate: &Rational) -> Self {
        let factor = IntegerPolynomial::new(vec![-rate.numer(), rate.denom().clone()]);
        Self::simple(factor, vec![Rational::one()])
    }

    /// cos(frequency t).
    pub fn cosine(frequency: &Rational) -> Self {
        if frequency.is_zero() {
            return Self::constant(Rational::one());
        }
        Self::simple(harmonic(frequency), vec![Rational::one(), Rational::zero()])
    }

    /// sin(frequency t).
    pub fn sine(frequency: &Rational) -> Self {
        Self::simple(harmonic(frequency), vec![Rational::zero(), frequency.clone()])
    }

    fn simple(factor: IntegerPolynomial, derivatives: Vec<Rational>) -> Self {
        if derivatives.iter().all(Zero::is_zero) {
            return Self::zero();
        }
        Self { factors: vec![(factor, 1)], derivatives }
    }

    /// The pairs (q_e, e) of the minimal annihilator prod q_e^e.
    pub fn factors(&self) -> &[(IntegerPolynomial, usize)] {
        &self.factors
    }

    /// The primitive minimal annihilator; 1 for the zero function.
    pub fn annihilator(&self) -> IntegerPolynomial {
        self.factors.iter().fold(IntegerPolynomial::one(), |m, (q, e)| &m * &q.power(*e))
    }

    /// The order N: the degree of the minimal annihilator.
    pub fn order(&self) -> usize {
        self.derivatives.len()
    }

    /// Whether this is the zero function; exact.
    pub fn is_zero(&self) -> bool {
        self.derivatives.is_empty()
    }

    /// The first `count` derivatives at 0, from g(0) on; exact.
    pub fn derivatives(&self, count: usize) -> Vec<Rational> {
        if count <= self.order() || self.is_zero() {
            let known = self.derivatives.iter().take(count).cloned();
            return known.chain(std::iter::repeat_n(Rational::zero(), count.saturating_sub(self.order()))).collect();
        }
        let scaled = ScaledSequence::new(&self.annihilator(), &self.derivatives);
        scaled.extended(count).to_rationals()
    }

    /// The derivative g'.
    pub fn derivative(&self) -> Self {
        let order = self.order();
        let scaled = ScaledSequence::new(&self.annihilator(), &self.derivatives);
        let mut terms = scaled.extended(2 * order + 1);
        if !terms.terms.is_empty() {
            // Y_(k+1) = c l^(k+1) y_(k+1): the factor l stays in the common denominator.
            terms.terms.remove(0);
            terms.common *= &terms.lead;
        }
        Self::from_scaled(&terms, order)
    }

    /// factor * g.
    pub fn scaled(&self, factor: &Rational) -> Self {
        if factor.is_zero() {
            return Self::zero();
        }
        let derivatives = self.derivatives.iter().map(|y| y * factor).collect();
        Self { factors: self.factors.clone(), derivatives }
    }

    /// g^exponent.
    pub fn power(&self, exponent: u32) -> Self {
        (0..exponent).fold(Self::constant(Rational::one()), |product, _| &product * self)
    }

    /// The function with these scaled derivatives, known to have order <= `order`; at least 2 `order` terms are given.
    fn from_scaled(scaled: &ScaledSequence, order: usize) -> Self {
        let terms = &scaled.terms[..scaled.terms.len().min(2 * order)];
        let minimal = minimal_annihilator(terms)
            .unwrap_or_else(|| unreachable!("the scaled derivatives obey a monic integer recurrence of this order"));
        let annihilator = minimal.dilate_up(&scaled.lead).primitive_part();
        let mut derivatives = scaled.to_rationals();
        derivatives.truncate(annihilator.degree());
        Self { factors: annihilator.square_free_decomposition(), derivatives }
    }
}

fn harmonic(frequency: &Rational) -> IntegerPolynomial {
    let (p, q) = (frequency.numer(), frequency.denom());
    IntegerPolynomial::new(vec![p * p, BigInt::zero(), q * q])
}

/// Integers Y_k = common lead^k y_k that obey a monic integer recurrence.
struct ScaledSequence {
    lead: BigInt,
    common: BigInt,
    terms: Vec<BigInt>,
    /// M_0 .. M_(N-1) with Y_(k+N) = -sum M_i Y_(k+i).
    recurrence: Vec<BigInt>,
}

impl ScaledSequence {
    fn new(annihilator: &IntegerPolynomial, derivatives: &[Rational]) -> Self {
        Self::with_lead(annihilator, derivatives, annihilator.leading())
    }

    /// `lead` is a multiple of the annihilator's leading coefficient.
    fn with_lead(annihilator: &IntegerPolynomial, derivatives: &[Rational], lead: BigInt) -> Self {
        let common = derivatives.iter().fold(BigInt::one(), |l, y| l.lcm(y.denom()));
        let mut power = common.clone();
        let mut terms = Vec::with_capacity(derivatives.len());
        for y in derivatives {
            terms.push(y.numer() * (&power / y.denom()));
            power *= &lead;
        }
        let n = annihilator.degree();
        let quotient = |i: usize| annihilator.coefficient(i) * lead.pow((n - i) as u32) / annihilator.leading();
        Self { recurrence: (0..n).map(quotient).collect(), lead, common, terms }
    }

    fn extended(mut self, count: usize) -> Self {
        let n = self.recurrence.len();
        while self.terms.len() < count {
            let k = self.terms.len() - n;
            let next: BigInt = self.recurrence.iter().zip(&self.terms[k..]).map(|(m, y)| m * y).sum();
            self.terms.push(-next);
        }
        self
    }

    fn to_rationals(&self) -> Vec<Rational> {
        let mut power = self.common.clone();
        let mut values = Vec::with_capacity(self.terms.len());
        for term in &self.terms {
            values.push(Rational::new(term.clone(), power.clone()));
            power *= &self.lead;
        }
        values
    }
}

/// Both sequences with the same leading factor, to `count` terms each.
fn aligned(g: &ExponentialPolynomial, h: &ExponentialPolynomial, count: usize) -> (ScaledSequence, ScaledSequence) {
    let (a, b) = (g.annihilator(), h.annihilator());
    let lead = a.leading().lcm(&b.leading());
    let first = ScaledSequence::with_lead(&a, &g.derivatives, lead.clone()).extended(count);
    (first, ScaledSequence::with_lead(&b, &h.derivatives, lead).extended(count))
}

impl Add for &ExponentialPolynomial {
    type Output = ExponentialPolynomial;

    fn add(self, other: Self) -> ExponentialPolynomial {
        if self.is_zero() || other.is_zero() {
            return if self.is_zero() { other.clone() } else { self.clone() };
        }
        let order = self.order() + other.order();
        let (first, second) = aligned(self, other, 2 * order);
        let terms = first.terms.iter().zip(&second.terms).map(|(x, y)| x * &second.common + y * &first.common);
        let scaled = ScaledSequence {
            terms: terms.collect(),
            common: &first.common * &second.common,
            lead: first.lead,
            recurrence: Vec::new(),
        };
        ExponentialPolynomial::from_scaled(&scaled, order)
    }
}

impl Neg for &ExponentialPolynomial {
    type Output = ExponentialPolynomial;

    fn neg(self) -> ExponentialPolynomial {
        self.scaled(&-Rational::one())
    }
}

impl Sub for &ExponentialPolynomial {
    type Output = ExponentialPolynomial;

    fn sub(self, other: Self) -> ExponentialPolynomial {
        self + &-other
    }
}

impl Mul for &ExponentialPolynomial {
    type Output = ExponentialPolynomial;

    /// The product, by Leibniz's rule; its order is at most the product of the orders.
    fn mul(self, other: Self) -> ExponentialPolynomial {
        if self.is_zero() || other.is_zero() {
            return ExponentialPolynomial::zero();
        }
        let order = self.order() * other.order();
        let (first, second) = aligned(self, other, 2 * order);
        let mut row = vec![BigInt::one()];
        let mut terms = Vec::with_capacity(2 * order);
        for k in 0..2 * order {
            terms.push((0..=k).map(|i| &row[i] * &first.terms[i] * &second.terms[k - i]).sum());
            let inner = row.windows(2).map(|w| &w[0] + &w[1]);
            row = std::iter::once(BigInt::one()).chain(inner).chain(std::iter::once(BigInt::one())).collect();
        }
        let scaled =
            ScaledSequence { terms, common: &first.common * &second.common, lead: first.lead, recurrence: Vec::new() };
        ExponentialPolynomial::from_scaled(&scaled, order)
    }
}
