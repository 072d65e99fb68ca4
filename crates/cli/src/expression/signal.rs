//! Known inputs: sums of products of t^k, exp(r*t), sin(w*t), cos(w*t), as exact sums of single terms.

use super::evaluate::{MAX_BITS, Scope, Value, constant, divisor, evaluate, exponent, raised_constant};
use super::polynomial::bits;
use super::syntax::{Function, Node, NodeKind, Sign, Step};
use crate::diagnostic::Diagnostic;
use keepout_checker::statement::{SignalTerm, Variable, Wave};
use num_rational::BigRational;
use num_traits::{One, Signed, Zero};
use std::collections::BTreeMap;

/// The greatest power of t in a signal.
pub const MAX_SIGNAL_POWER: u32 = 24;

/// The most terms of an expanded signal.
pub const MAX_SIGNAL_TERMS: usize = 2_000;

/// The most products of terms in one multiplication.
const MAX_PAIRS: usize = 200_000;

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

    fn add_scaled(&mut self, other: &Self, factor: &BigRational) {
        for ((power, rate, frequency, is_sine), c) in &other.0 {
            self.accumulate(*power, rate.clone(), frequency.clone(), *is_sine, c * factor);
        }
    }

    fn scaled(&self, factor: &BigRational) -> Self {
        let mut product = Self::default();
        product.add_scaled(self, factor);
        product
    }

    /// The value, if it is a constant.
    fn as_constant(&self) -> Option<BigRational> {
        let shape: Shape = (0, BigRational::zero(), BigRational::zero(), false);
        match self.0.len() {
            0 => Some(BigRational::zero()),
            1 => self.0.get(&shape).cloned(),
            _ => None,
        }
    }

    fn bits(&self) -> u64 {
        let of = |((_, rate, frequency, _), c): (&Shape, &BigRational)| bits(rate).max(bits(frequency)).max(bits(c));
        self.0.iter().map(of).max().unwrap_or(0)
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
    let minus = || -BigRational::one();
    let result = match &node.kind {
        NodeKind::Number(value) => Signal::constant(value.clone()),
        NodeKind::Name(name) => match scope.look_up(name) {
            Some(Value::Variable(Variable::Time)) => Signal::single(1, zero(), zero(), false, BigRational::one()),
            _ => Signal::constant(constant(node, scope)?),
        },
        NodeKind::Negative(a) => expand(a, scope)?.scaled(&minus()),
        NodeKind::Sum(parts) => {
            let mut total = Signal::default();
            for (sign, part) in parts {
                let factor = if *sign == Sign::Plus { BigRational::one() } else { minus() };
                total.add_scaled(&within(part, expand(part, scope)?)?, &factor);
                if total.0.len() > MAX_SIGNAL_TERMS {
                    return Err(too_large(node));
                }
            }
            total
        }
        NodeKind::Product(parts) => {
            let mut total = Signal::constant(BigRational::one());
            for (step, part) in parts {
                total = match step {
                    Step::Times => product(node, &total, &expand(part, scope)?)?,
                    Step::Over => within(node, total.scaled(&signal_divisor(part, scope)?.recip()))?,
                };
            }
            total
        }
        NodeKind::Power(a, b) => raised(node, &expand(a, scope)?, exponent(b, scope)?)?,
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
            return Err(Diagnostic::new(node.span.clone(), "expected a signal, found a condition")
                .help("a signal is a sum of products of t^k, exp(r*t), sin(w*t), cos(w*t)"));
        }
    };
    within(node, result)
}

fn signal_divisor(node: &Node, scope: &dyn Scope) -> Result<BigRational, Diagnostic> {
    if let Some(value) = expand(node, scope)?.as_constant().filter(|v| !v.is_zero()) {
        return Ok(value);
    }
    let varies = |n: &&Node| matches!(n.kind, NodeKind::Call(..));
    let help = match Some(node).filter(varies) {
        Some(_) => "write exp(-r*t) in place of 1/exp(r*t); other quotients of waves are not sums of waves",
        None => "a signal is divided by a constant other than 0",
    };
    Err(divisor(node, scope)
        .err()
        .filter(|d| d.message == "division by zero")
        .unwrap_or_else(|| Diagnostic::new(node.span.clone(), "a divisor is a constant").help(help)))
}

fn raised(node: &Node, base: &Signal, exponent: u32) -> Result<Signal, Diagnostic> {
    if let Some(value) = base.as_constant() {
        return Ok(Signal::constant(raised_constant(node, value, exponent)?));
    }
    if exponent > 100 {
        return Err(Diagnostic::new(node.span.clone(), "the power of a signal is at most 100")
            .help("write the power of an exponential as exp(n*r*t)"));
    }
    let mut power = Signal::constant(BigRational::one());
    for _ in 0..exponent {
        power = product(node, &power, base)?;
    }
    Ok(power)
}

fn product(node: &Node, a: &Signal, b: &Signal) -> Result<Signal, Diagnostic> {
    if a.0.len() * b.0.len() > MAX_PAIRS { Err(too_large(node)) } else { within(node, a.mul(b)) }
}

fn too_large(node: &Node) -> Diagnostic {
    let message = format!("a signal has at most {MAX_SIGNAL_TERMS} terms and the power t^{MAX_SIGNAL_POWER}, expanded");
    Diagnostic::new(node.span.clone(), message).help("declare several drives and add them up in the rate")
}

fn within(node: &Node, signal: Signal) -> Result<Signal, Diagnostic> {
    let power = signal.0.keys().map(|(power, ..)| *power).max().unwrap_or(0);
    if power > MAX_SIGNAL_POWER || signal.0.len() > MAX_SIGNAL_TERMS {
        return Err(too_large(node));
    }
    if signal.bits() > MAX_BITS {
        return Err(Diagnostic::new(node.span.clone(), "this leads to a number of more than about 30000 digits")
            .help("round the constants; a certificate holds every digit"));
    }
    Ok(signal)
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
                    Function::Exp => {
                        "exp(a + r*t) is exp(a)*exp(r*t): give the factor exp(a) as an exact number, or as a range under [uncertain]"
                    }
                    Function::Sin | Function::Cos | Function::Abs => {
                        "expand the phase: sin(w*t + a) is sin(w*t)*cos(a) + cos(w*t)*sin(a); give cos(a) and sin(a) as exact numbers, or as ranges under [uncertain]"
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
                )
                .help(format!("write {name}({letter}*t); other functions of time are not covered")));
            }
        }
    }
    Ok(rate)
}
