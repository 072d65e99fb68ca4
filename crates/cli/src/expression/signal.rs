//! Known inputs: sums of products of t^k, exp(r*t), sin(w*t), cos(w*t), as exact sums of single terms.

use super::parser::{Function, Node, NodeKind};
use super::polynomial::{Scope, Value, constant, evaluate};
use crate::diagnostic::Diagnostic;
use keepout_checker::statement::{SignalTerm, Variable, Wave};
use num_rational::BigRational;
use num_traits::{One, Signed, ToPrimitive, Zero};
use std::collections::BTreeMap;

/// The greatest power of t.
const MAX_POWER: u32 = 24;

/// The most terms.
const MAX_TERMS: usize = 2_000;

/// The shape of a term: power of t, rate, frequency and whether it is a sine (frequency 0: neither).
type Shape = (u32, BigRational, BigRational, bool);

#[derive(Clone, Default)]
struct Signal(BTreeMap<Shape, BigRational>);

impl Signal {
    fn single(power: u32, rate: BigRational, frequency: BigRational, is_sine: bool, coefficient: BigRational) -> Self {
        let mut signal = Self::default();
        signal.accumulate(power, rate, frequency, is_sine, coefficient);
        signal
    }

    fn constant(value: BigRational) -> Self {
        Self::single(0, BigRational::zero(), BigRational::zero(), false, value)
    }

    /// sin(-w t) = -sin(w t), cos(-w t) = cos(w t), sin(0) = 0, cos(0) = 1.
    fn accumulate(
        &mut self,
        power: u32,
        rate: BigRational,
        frequency: BigRational,
        is_sine: bool,
        mut coefficient: BigRational,
    ) {
        if is_sine && frequency.is_negative() {
            coefficient = -coefficient;
        }
        if (is_sine && frequency.is_zero()) || coefficient.is_zero() {
            return;
        }
        let shape = (power, rate, frequency.abs(), is_sine);
        let slot = self.0.entry(shape.clone()).or_insert_with(BigRational::zero);
        *slot += coefficient;
        if slot.is_zero() {
            self.0.remove(&shape);
        }
    }

    fn add(&self, other: &Self, factor: &BigRational) -> Self {
        let mut sum = self.clone();
        for ((power, rate, frequency, is_sine), c) in &other.0 {
            sum.accumulate(*power, rate.clone(), frequency.clone(), *is_sine, c * factor);
        }
        sum
    }

    /// 2 cos a cos b = cos(a-b) + cos(a+b), 2 sin a sin b = cos(a-b) - cos(a+b), 2 sin a cos b = sin(a+b) + sin(a-b).
    fn mul(&self, other: &Self) -> Self {
        let half = BigRational::new(1.into(), 2.into());
        let mut product = Self::default();
        for ((p, r, a, sine_a), c) in &self.0 {
            for ((q, s, b, sine_b), d) in &other.0 {
                let (power, rate, value) = (p + q, r + s, c * d * &half);
                let is_sine = sine_a != sine_b;
                let (sum, difference) = (a + b, if *sine_a || !*sine_b { a - b } else { b - a });
                let sign = if *sine_a && *sine_b { -BigRational::one() } else { BigRational::one() };
                product.accumulate(power, rate.clone(), sum, is_sine, &value * sign);
                product.accumulate(power, rate, difference, is_sine, value);
            }
        }
        product
    }
}

/// The terms of a known input.
///
/// # Errors
/// One diagnostic, with a place in the expression's text.
pub fn signal(node: &Node, scope: &dyn Scope) -> Result<Vec<SignalTerm>, Diagnostic> {
    let signal = expand(node, scope)?;
    let term = |((power, rate, frequency, is_sine), coefficient): (Shape, BigRational)| SignalTerm {
        coefficient,
        power,
        rate,
        wave: match (frequency.is_zero(), is_sine) {
            (true, _) => Wave::One,
            (false, true) => Wave::Sine(frequency),
            (false, false) => Wave::Cosine(frequency),
        },
    };
    Ok(signal.0.into_iter().map(term).collect())
}

fn expand(node: &Node, scope: &dyn Scope) -> Result<Signal, Diagnostic> {
    let zero = BigRational::zero;
    let result = match &node.kind {
        NodeKind::Number(value) => Signal::constant(value.clone()),
        NodeKind::Name(name) => match scope.look_up(name) {
            Some(Value::Variable(Variable::Time)) => Signal::single(1, zero(), zero(), false, BigRational::one()),
            _ => Signal::constant(constant(node, scope)?),
        },
        NodeKind::Negative(a) => Signal::default().add(&expand(a, scope)?, &-BigRational::one()),
        NodeKind::Sum(a, b) => expand(a, scope)?.add(&expand(b, scope)?, &BigRational::one()),
        NodeKind::Difference(a, b) => expand(a, scope)?.add(&expand(b, scope)?, &-BigRational::one()),
        NodeKind::Product(a, b) => product(node, &expand(a, scope)?, &expand(b, scope)?)?,
        NodeKind::Quotient(a, b) => {
            let divisor = constant(b, scope)?;
            if divisor.is_zero() {
                return Err(Diagnostic::new(b.span.clone(), "division by zero"));
            }
            Signal::default().add(&expand(a, scope)?, &divisor.recip())
        }
        NodeKind::Power(a, b) => {
            let base = expand(a, scope)?;
            let exponent = constant(b, scope)?;
            let small = exponent.is_integer().then(|| exponent.to_integer().to_u32()).flatten();
            let Some(exponent) = small.filter(|k| *k <= MAX_POWER || base.0.len() <= 1) else {
                return Err(Diagnostic::new(
                    b.span.clone(),
                    format!("an exponent is a non-negative integer constant, at most {MAX_POWER}"),
                ));
            };
            if exponent > 1_000 {
                return Err(Diagnostic::new(b.span.clone(), "an exponent is at most 1000"));
            }
            let mut power = Signal::constant(BigRational::one());
            for _ in 0..exponent {
                power = product(node, &power, &base)?;
            }
            power
        }
        NodeKind::Call(Function::Abs, _) => {
            return Err(Diagnostic::new(node.span.clone(), "abs is not allowed in a signal")
                .help("a signal is a sum of products of t^k, exp(r*t), sin(w*t), cos(w*t)"));
        }
        NodeKind::Call(function, a) => {
            let rate = linear(*function, a, scope)?;
            match function {
                Function::Exp => Signal::single(0, rate, zero(), false, BigRational::one()),
                Function::Sin => Signal::single(0, zero(), rate, true, BigRational::one()),
                Function::Cos | Function::Abs => Signal::single(0, zero(), rate, false, BigRational::one()),
            }
        }
        NodeKind::Comparison(..) | NodeKind::Not(_) | NodeKind::And(..) | NodeKind::Or(..) => {
            return Err(Diagnostic::new(node.span.clone(), "expected a signal, found a condition"));
        }
    };
    Ok(result)
}

fn product(node: &Node, a: &Signal, b: &Signal) -> Result<Signal, Diagnostic> {
    let product = a.mul(b);
    let power = product.0.keys().map(|(power, ..)| *power).max().unwrap_or(0);
    if power > MAX_POWER || product.0.len() > MAX_TERMS {
        return Err(Diagnostic::new(
            node.span.clone(),
            format!("a signal has at most {MAX_TERMS} terms and the power t^{MAX_POWER}"),
        ));
    }
    Ok(product)
}

/// The rational factor of t in the argument of exp, sin or cos.
fn linear(function: Function, node: &Node, scope: &dyn Scope) -> Result<BigRational, Diagnostic> {
    let (name, letter) = match function {
        Function::Exp => ("exp", "r"),
        Function::Sin => ("sin", "w"),
        Function::Cos | Function::Abs => ("cos", "w"),
    };
    let cases = evaluate(node, scope)?;
    let mut rate = BigRational::zero();
    for (powers, coefficient) in cases.iter().flat_map(|c| c.value.terms()) {
        match powers {
            [(Variable::Time, 1)] => rate = coefficient.clone(),
            [] => {
                let help = match function {
                    Function::Exp => "exp(a + r*t) is exp(a)*exp(r*t): give the factor exp(a) as an exact number",
                    Function::Sin | Function::Cos | Function::Abs => {
                        "expand the phase: sin(w*t + a) is sin(w*t)*cos(a) + cos(w*t)*sin(a); give cos(a) and sin(a) as exact numbers"
                    }
                };
                return Err(Diagnostic::new(
                    node.span.clone(),
                    format!("the argument of {name} is {letter}*t without a constant part"),
                )
                .help(help));
            }
            _ => {
                return Err(Diagnostic::new(
                    node.span.clone(),
                    format!("the argument of {name} is {letter}*t with a rational constant {letter}"),
                ));
            }
        }
    }
    Ok(rate)
}
