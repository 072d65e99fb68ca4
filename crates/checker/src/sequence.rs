//! Derivatives at t = 0 of everything that a statement speaks of, exactly.
//!
//! y_k = g^(k)(0) for states, drives, t and polynomials in them: states by x^(k+1) = A x^(k) + B u^(k) (+ c for k = 0),
//! products by the Leibniz rule (f g)_k = sum_j binom(k, j) f_j g_(k-j). For many trajectories: of the one from the centre of the
//! starts, each disturbance constant in the middle of its range, without the uncertain terms.
//!
//! Representation: y_k = value_k / (denominator rate^k) with integers, so that no common divisor is ever taken.
//! `rate` is one positive integer for all sequences of a statement: it clears the denominators of the dynamics.

use crate::error::Rejection;
use crate::limits::{Budget, Limits, within};
use crate::number::Rational;
use crate::polynomial::Polynomial;
use crate::statement::{Affine, Disturbance, Drive, Expression, SignalTerm, Statement, Variable, Wave};
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Zero};
use std::cmp::Ordering;
use std::collections::{BTreeMap, BTreeSet};

/// The derivatives at 0 of one function.
#[derive(Clone, Debug)]
pub struct Sequence {
    rate: BigInt,
    pub(crate) denominator: BigInt,
    pub(crate) values: Vec<BigInt>,
}

impl Sequence {
    /// A sequence of rational derivatives.
    pub fn from_rationals(derivatives: &[Rational]) -> Self {
        let denominator = common_denominator(derivatives.iter());
        let values = derivatives.iter().map(|y| y.numer() * (&denominator / y.denom())).collect();
        Self { rate: BigInt::one(), denominator, values }
    }

    /// How many derivatives are known.
    pub fn count(&self) -> usize {
        self.values.len()
    }

    /// The integers y_k denominator rate^k.
    pub fn values(&self) -> &[BigInt] {
        &self.values
    }

    /// The common positive integer factor of time.
    pub fn rate(&self) -> &BigInt {
        &self.rate
    }

    /// The sign of the function's value at 0, exactly.
    pub fn sign_at_zero(&self) -> Ordering {
        self.values.first().map_or(Ordering::Equal, |value| value.cmp(&BigInt::zero()))
    }

    /// The first `count` derivatives as rationals.
    pub fn derivatives(&self, count: usize) -> Vec<Rational> {
        let mut denominator = self.denominator.clone();
        let mut derivatives = Vec::new();
        for value in self.values.iter().take(count) {
            derivatives.push(Rational::new(value.clone(), denominator.clone()));
            denominator *= &self.rate;
        }
        derivatives
    }

    /// Whether sum_j m_j y_(k+j) = 0 for k = 0 .. count - 1. `false` if too few derivatives are known.
    pub fn is_annihilated(&self, m: &Polynomial, count: usize) -> bool {
        if self.values.len() < count + m.degree() {
            return false;
        }
        // sum_j m_j y_(k+j) = 0 iff sum_j (m_j rate^(d-j) L) value_(k+j) = 0, L a common denominator of m.
        let scale = common_denominator(m.coefficients().iter());
        let mut power = BigInt::one();
        let mut weights: Vec<BigInt> = Vec::new();
        for c in m.coefficients().iter().rev() {
            weights.push(c.numer() * (&scale / c.denom()) * &power);
            power *= &self.rate;
        }
        weights.reverse();
        (0..count).all(|k| {
            let terms = self.values.iter().skip(k).zip(&weights);
            terms.map(|(value, weight)| value * weight).sum::<BigInt>().is_zero()
        })
    }

    pub(crate) fn constant(value: &Rational, rate: &BigInt, length: usize) -> Self {
        let mut values = vec![BigInt::zero(); length];
        if let Some(first) = values.first_mut() {
            *first = value.numer().clone();
        }
        Self { rate: rate.clone(), denominator: value.denom().clone(), values }
    }

    fn time(rate: &BigInt, length: usize) -> Self {
        let mut sequence = Self::constant(&Rational::zero(), rate, length);
        if let Some(slope) = sequence.values.get_mut(1) {
            *slope = rate.clone();
        }
        sequence
    }

    fn scaled(mut self, factor: &Rational) -> Self {
        self.denominator *= factor.denom();
        self.values.iter_mut().for_each(|v| *v *= factor.numer());
        self
    }

    /// self + other; both have the same rate and length.
    pub(crate) fn add(mut self, other: &Self) -> Self {
        let common = self.denominator.lcm(&other.denominator);
        let (ours, theirs) = (&common / &self.denominator, &common / &other.denominator);
        for (v, w) in self.values.iter_mut().zip(&other.values) {
            *v = &*v * &ours + w * &theirs;
        }
        self.denominator = common;
        self
    }

    /// self * other, by the Leibniz rule; both have the same rate.
    pub fn mul(&self, other: &Self) -> Self {
        let length = self.values.len().min(other.values.len());
        let mut binomials: Vec<BigInt> = vec![BigInt::one()];
        let mut values = Vec::with_capacity(length);
        for k in 0..length {
            let pairs = self.values.iter().zip(other.values.iter().take(k + 1).rev());
            values.push(pairs.zip(&binomials).map(|((f, g), b)| f * g * b).sum());
            let shifted =
                binomials.iter().skip(1).chain(std::iter::once(&BigInt::zero())).map(BigInt::clone).collect::<Vec<_>>();
            binomials =
                std::iter::once(BigInt::one()).chain(binomials.iter().zip(&shifted).map(|(a, b)| a + b)).collect();
        }
        Self { rate: self.rate.clone(), denominator: &self.denominator * &other.denominator, values }
    }

    fn power(&self, exponent: u32) -> Self {
        let one = Self::constant(&Rational::one(), &self.rate, self.values.len());
        (0..exponent).fold(one, |product, _| product.mul(self))
    }
}

fn common_denominator<'a>(numbers: impl Iterator<Item = &'a Rational>) -> BigInt {
    numbers.fold(BigInt::one(), |common, x| common.lcm(x.denom()))
}

/// Derivatives at 0 of polynomials along the trajectory of a statement, to the order that proves an annihilator.
pub struct Flow<'a> {
    statement: &'a Statement,
    limits: &'a Limits,
    rate: BigInt,
}

impl<'a> Flow<'a> {
    /// Prepares the first phase of a statement.
    pub fn new(statement: &'a Statement, limits: &'a Limits) -> Self {
        let rates = statement.phases.iter().flat_map(|p| &p.rates);
        let factors = rates.flat_map(|r| r.terms.iter().map(|(factor, _)| factor));
        let signals = statement.drives.iter().flat_map(|d| &d.signal);
        let speeds = signals.flat_map(|s| match &s.wave {
            Wave::One => vec![&s.rate],
            Wave::Cosine(w) | Wave::Sine(w) => vec![&s.rate, w],
        });
        Self { statement, limits, rate: common_denominator(factors.chain(speeds)) }
    }

    fn rates(&self) -> &'a [Affine] {
        self.statement.phases.first().map_or(&[], |p| &p.rates)
    }

    /// The variables that an expression depends on: outputs replaced, states closed under their rates.
    fn support(&self, expression: &Expression) -> BTreeSet<Variable> {
        let mut support = BTreeSet::new();
        let mut open: Vec<Variable> = variables(expression).collect();
        while let Some(variable) = open.pop() {
            if !support.insert(variable) {
                continue;
            }
            match variable {
                Variable::State(i) => {
                    open.extend(self.rates().get(i).into_iter().flat_map(|r| r.terms.iter().map(|(_, v)| *v)));
                }
                Variable::Output(i) => {
                    open.extend(self.statement.outputs.get(i).into_iter().flat_map(|o| variables(&o.value)));
                }
                // An exponential is split off before; one that is left is not known to `evaluate`.
                Variable::Drive(_) | Variable::Time | Variable::Exponential(_) | Variable::Disturbance(_) => {}
            }
        }
        support
    }

    fn degree(&self, expression: &Expression) -> usize {
        let weight = |variable: &Variable| match variable {
            Variable::Output(i) => self.statement.outputs.get(*i).map_or(0, |o| self.degree(&o.value)),
            Variable::State(_)
            | Variable::Drive(_)
            | Variable::Time
            | Variable::Exponential(_)
            | Variable::Disturbance(_) => 1,
        };
        let factor = |(v, k): &(Variable, u32)| weight(v).saturating_mul(usize::try_from(*k).unwrap_or(usize::MAX));
        let degree = |powers: &[(Variable, u32)]| powers.iter().map(factor).fold(0, usize::saturating_add);
        expression.terms.iter().map(|t| degree(&t.powers)).max().unwrap_or(0)
    }

    /// An order bound N: the trace of the expression obeys a linear differential equation of order <= N with
    /// constant coefficients, and so does the trace of m(d/dt) applied to it, for any polynomial m.
    ///
    /// Why: let V be the span of 1, the states in the support, and t^i exp(r t) cos(w t), t^i exp(r t) sin(w t) for
    /// the exponents of the drives in the support (and t). V contains every variable of the expression and its derivatives
    /// stay in V: a state's rate is affine in states and drives of the support. The products of exactly D elements of V
    /// span a space of dimension <= binom(dim V - 1 + D, D); it is closed under differentiation (Leibniz) and, 1 being
    /// in V, contains the trace of each polynomial of degree <= D. A function in a space of dimension N closed under
    /// d/dt that has N vanishing derivatives at 0 is zero (Cayley-Hamilton, uniqueness of solutions).
    fn order_bound(&self, expression: &Expression) -> Result<usize, Rejection> {
        let degree = self.degree(expression);
        within("degree", degree, self.limits.degree)?;
        let zero = Rational::zero();
        let mut exponents: BTreeMap<(&Rational, Option<&Rational>), u32> = BTreeMap::from([((&zero, None), 0)]);
        let mut raise = |key, power: u32| {
            let top = exponents.entry(key).or_insert(0);
            *top = power.max(*top);
        };
        let mut dimension: usize = 0;
        for variable in self.support(expression) {
            match variable {
                Variable::State(_) => dimension += 1,
                Variable::Time => raise((&zero, None), 1),
                // A disturbance stands for a constant; 1 is counted already.
                Variable::Output(_) | Variable::Exponential(_) | Variable::Disturbance(_) => {}
                Variable::Drive(i) => {
                    for term in self.statement.drives.get(i).into_iter().flat_map(|d| &d.signal) {
                        let frequency = match &term.wave {
                            Wave::One => None,
                            Wave::Cosine(w) | Wave::Sine(w) => Some(w),
                        };
                        raise((&term.rate, frequency), term.power);
                    }
                }
            }
        }
        for ((_, frequency), power) in exponents {
            dimension += usize::try_from(power + 1).unwrap_or(usize::MAX) * if frequency.is_some() { 2 } else { 1 };
        }
        // binom(dimension - 1 + degree, degree), cut off above the limit.
        let mut bound = 1;
        for i in 1..=degree {
            bound = bound * (dimension - 1 + i) / i;
            within("derivatives", bound.saturating_mul(degree), self.limits.derivatives)?;
        }
        Ok(bound)
    }

    /// The trace of an expression: its order bound N, and 2 N derivatives at 0 (an annihilator of degree <= N is proved
    /// by N + N of them).
    ///
    /// # Errors
    /// [`Rejection::LimitExceeded`] where the order bound or the degree is beyond the limits; [`Rejection::Malformed`] where
    /// the expression names a quantity that the statement does not declare.
    pub fn trace(&self, expression: &Expression, budget: &mut Budget) -> Result<(usize, Sequence), Rejection> {
        let order = self.order_bound(expression)?;
        let length = 2 * order.max(1);
        let support = self.support(expression);
        // The k-th values are about as long as rate^k: so long sums for each state, and products for each factor of a term.
        let words = usize::try_from(self.rate.bits()).unwrap_or(usize::MAX).saturating_mul(length) / 64 + 1;
        budget.spend(words.saturating_mul(length).saturating_mul(100 * support.len()), 1)?;
        let factors = expression.terms.len() * self.degree(expression).saturating_sub(1).min(length);
        budget.spend(factors.saturating_mul(length * length).saturating_mul(words), 1)?;
        let mut known = self.variables(&support, length);
        for (i, output) in self.statement.outputs.iter().enumerate() {
            let value = self.evaluate(&output.value, &known, length);
            known.extend(value.map(|sequence| (Variable::Output(i), sequence)));
        }
        let trace = self.evaluate(expression, &known, length).ok_or_else(|| Rejection::Malformed {
            place: "an expression".into(),
            expected: "declared quantities only",
            found: "another one".into(),
        })?;
        Ok((order, trace))
    }

    /// The sequence of an expression; `None` if it uses a variable that is not known.
    fn evaluate(
        &self,
        expression: &Expression,
        known: &BTreeMap<Variable, Sequence>,
        length: usize,
    ) -> Option<Sequence> {
        let mut sum = Sequence::constant(&Rational::zero(), &self.rate, length);
        for term in &expression.terms {
            let mut product: Option<Sequence> = None;
            for (variable, exponent) in &term.powers {
                let factor = known.get(variable)?.power(*exponent);
                product = Some(product.map_or(factor.clone(), |p| p.mul(&factor)));
            }
            let one = || Sequence::constant(&Rational::one(), &self.rate, length);
            sum = sum.add(&product.unwrap_or_else(one).scaled(&term.coefficient));
        }
        Some(sum)
    }

    /// The sequences of states, drives and time in a support that is closed under rates.
    fn variables(&self, support: &BTreeSet<Variable>, length: usize) -> BTreeMap<Variable, Sequence> {
        let mut known = BTreeMap::new();
        for variable in support {
            match variable {
                Variable::Time => drop(known.insert(*variable, Sequence::time(&self.rate, length))),
                Variable::Drive(i) => {
                    let drive = self.statement.drives.get(*i);
                    known.extend(drive.map(|d| (*variable, self.drive(d, length))));
                }
                Variable::Disturbance(i) => {
                    let disturbance = self.statement.disturbances.get(*i);
                    let constant = |d: &Disturbance| Sequence::constant(&d.range.centre(), &self.rate, length);
                    known.extend(disturbance.map(|d| (*variable, constant(d))));
                }
                Variable::State(_) | Variable::Output(_) | Variable::Exponential(_) => {}
            }
        }
        self.states(support, &mut known, length);
        known
    }

    /// Adds the sequences of the states: with X_k = x^(k) S q^k, U_k likewise, X_(k+1) = (q A) X_k + (q B) U_k + [k = 0] q c S.
    fn states(&self, support: &BTreeSet<Variable>, known: &mut BTreeMap<Variable, Sequence>, length: usize) {
        let state = |v: &Variable| if let Variable::State(i) = v { Some(*i) } else { None };
        let known_states = self.rates().len().min(self.statement.states.len());
        let states: Vec<usize> = support.iter().filter_map(state).filter(|i| *i < known_states).collect();
        let starts = states.iter().filter_map(|i| self.statement.states.get(*i)).map(|s| &s.start);
        let offsets = states.iter().filter_map(|i| self.rates().get(*i)).map(|r| &r.offset);
        let common = common_denominator(starts.chain(offsets));
        let common = known.values().fold(common, |c, sequence| c.lcm(&sequence.denominator));
        let integer = |x: &Rational| x.numer() * (&common / x.denom());
        let mut current: BTreeMap<Variable, BigInt> = BTreeMap::new();
        let mut values: BTreeMap<Variable, Vec<BigInt>> = BTreeMap::new();
        for i in &states {
            current.extend(self.statement.states.get(*i).map(|s| (Variable::State(*i), integer(&s.start))));
        }
        for k in 0..length {
            for (variable, sequence) in &*known {
                let value = sequence.values.get(k).map(|v| v * (&common / &sequence.denominator));
                current.extend(value.map(|v| (*variable, v)));
            }
            let mut next = BTreeMap::new();
            for i in &states {
                let variable = Variable::State(*i);
                values.entry(variable).or_default().extend(current.get(&variable).cloned());
                let Some(rate) = self.rates().get(*i) else { continue };
                let mut sum = if k == 0 { integer(&rate.offset) * &self.rate } else { BigInt::zero() };
                for (factor, of) in &rate.terms {
                    let weight = factor.numer() * (&self.rate / factor.denom());
                    sum += current.get(of).map_or_else(BigInt::zero, |x| x * weight);
                }
                next.insert(variable, sum);
            }
            current = next;
        }
        for (variable, values) in values {
            known.insert(variable, Sequence { rate: self.rate.clone(), denominator: common.clone(), values });
        }
    }

    fn drive(&self, drive: &Drive, length: usize) -> Sequence {
        let zero = Sequence::constant(&Rational::zero(), &self.rate, length);
        drive.signal.iter().fold(zero, |sum, term| sum.add(&self.signal(term, length)))
    }

    fn signal(&self, term: &SignalTerm, length: usize) -> Sequence {
        let integer = |x: &Rational| x.numer() * (&self.rate / x.denom());
        // exp(r t): derivatives r^k; as integers (r q)^k.
        let powers = |base: BigInt| -> Vec<BigInt> {
            std::iter::successors(Some(BigInt::one()), |p| Some(p * &base)).take(length).collect()
        };
        let sequence = |values| Sequence { rate: self.rate.clone(), denominator: BigInt::one(), values };
        let exponential = sequence(powers(integer(&term.rate)));
        // cos(w t): w^k (1, 0, -1, 0, ...); sin(w t): w^k (0, 1, 0, -1, ...).
        let wave = |w: &Rational, signs: [i32; 4]| {
            sequence(
                powers(integer(w)).into_iter().zip(signs.iter().cycle()).map(|(p, s)| p * BigInt::from(*s)).collect(),
            )
        };
        let modulated = match &term.wave {
            Wave::One => exponential,
            Wave::Cosine(w) => exponential.mul(&wave(w, [1_i32, 0_i32, -1_i32, 0_i32])),
            Wave::Sine(w) => exponential.mul(&wave(w, [0_i32, 1_i32, 0_i32, -1_i32])),
        };
        Sequence::time(&self.rate, length).power(term.power).mul(&modulated).scaled(&term.coefficient)
    }
}

fn variables(expression: &Expression) -> impl Iterator<Item = Variable> + '_ {
    expression.terms.iter().flat_map(|t| t.powers.iter().map(|(v, _)| *v))
}
