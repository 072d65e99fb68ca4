//! The exact meaning of expressions without comparison: polynomials, and cases where `abs` splits them.
//!
//! abs(e) is e where e >= 0 and -e where -e >= 0. Cases cover everything and agree where they overlap.

use super::polynomial::{Polynomial, bits};
use super::syntax::{Function, Node, NodeKind, Sign, Step};
use crate::diagnostic::{Diagnostic, nearest};
use keepout_checker::statement::Variable;
use num_rational::BigRational;
use num_traits::{One, Signed, ToPrimitive, Zero};

/// The greatest total degree of an expression, outputs expanded.
pub const MAX_DEGREE: u32 = 24;

/// The most terms of an expanded expression.
pub const MAX_TERMS: usize = 10_000;

/// The most cases that the `abs` of one comparison may split it into.
pub const MAX_CASES: usize = 64;

/// The most bits of a numerator or denominator that arithmetic may lead to: about 30,000 digits.
pub const MAX_BITS: u64 = 100_000;

/// The most products of terms in one multiplication.
const MAX_PAIRS: usize = 1_000_000;

/// What a name means where an expression stands.
pub enum Value {
    /// A constant.
    Constant(BigRational),
    /// A variable of the statement.
    Variable(Variable),
    /// A polynomial that the name stands for.
    Polynomial(Polynomial),
    /// A name that is known, but not allowed here: why, and what to do.
    Refused(String, String),
}

/// The names that an expression may use.
pub trait Scope {
    /// The meaning of a name; `None`: not known.
    fn look_up(&self, name: &str) -> Option<Value>;
    /// All names that are allowed, for hints.
    fn names(&self) -> Vec<String>;
    /// What a function other than abs is refused with here, and what to do.
    fn function_hint(&self, function: Function) -> (String, String);
    /// The reciprocal of a divisor that is no constant, or why there is none and what to do; `None`: divisors are constants.
    fn reciprocal(&self, _divisor: &Polynomial) -> Option<Result<Polynomial, (String, String)>> {
        None
    }
    /// Whether abs may split cases here.
    fn splits(&self) -> bool {
        false
    }
    /// The variable that stands for exp of an affine expression, outputs expanded; `None`: exp is not for this place.
    fn exponential(&self, _argument: &Polynomial) -> Option<Variable> {
        None
    }
    /// An expression with the outputs in it replaced by their values.
    fn expanded(&self, value: &Polynomial) -> Polynomial {
        value.clone()
    }
    /// What a variable counts in a degree: the degree of what it stands for.
    fn degree(&self, _variable: Variable) -> u32 {
        1
    }
}

/// A polynomial that holds where all conditions (`polynomial >= 0`) do.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Case {
    /// The conditions.
    pub conditions: Vec<Polynomial>,
    /// The value.
    pub value: Polynomial,
}

type Cases = Result<Vec<Case>, Diagnostic>;

fn plain(value: Polynomial) -> Vec<Case> {
    vec![Case { conditions: Vec::new(), value }]
}

/// Evaluates an expression to cases that cover everything; one case without conditions where there is no `abs`.
///
/// # Errors
/// One diagnostic, with a place in the expression's text.
pub fn evaluate(node: &Node, scope: &dyn Scope) -> Cases {
    match &node.kind {
        NodeKind::Number(value) => Ok(plain(Polynomial::constant(value.clone()))),
        NodeKind::Name(name) => Ok(plain(named(node, name, scope)?)),
        NodeKind::Negative(a) => Ok(scaled(evaluate(a, scope)?, &-BigRational::one())),
        NodeKind::Sum(parts) => sum(node, parts.iter().map(|(sign, part)| (*sign, part)), scope),
        NodeKind::Product(parts) => product(node, parts, scope),
        NodeKind::Power(a, b) => {
            let exponent = exponent(b, scope)?;
            let raise = |case: Case| Ok(Case { value: raised(node, &case.value, exponent, scope)?, ..case });
            evaluate(a, scope)?.into_iter().map(raise).collect()
        }
        NodeKind::Call(Function::Abs, a) => absolute(node, a, scope),
        NodeKind::Call(Function::Exp, a) if scope.splits() => exponential(a, scope),
        NodeKind::Call(function, _) => {
            let (message, help) = scope.function_hint(*function);
            Err(Diagnostic::new(node.span.clone(), message).help(help))
        }
        NodeKind::Comparison(..) | NodeKind::Not(_) | NodeKind::And(..) | NodeKind::Or(..) => {
            Err(Diagnostic::new(node.span.clone(), "expected a number-valued expression, found a condition")
                .help("comparisons, not, and, or stand in a zone's `inside` only, and not within arithmetic"))
        }
    }
}

fn scaled(cases: Vec<Case>, factor: &BigRational) -> Vec<Case> {
    cases.into_iter().map(|c| Case { value: c.value.scaled(factor), ..c }).collect()
}

/// left - right, for a comparison.
///
/// # Errors
/// As [`evaluate`].
pub(super) fn difference(left: &Node, right: &Node, scope: &dyn Scope) -> Cases {
    let whole = Node { span: left.span.start..right.span.end, kind: NodeKind::Number(BigRational::zero()) };
    sum(&whole, [(Sign::Plus, left), (Sign::Minus, right)].into_iter(), scope)
}

fn sum<'n>(node: &Node, parts: impl Iterator<Item = (Sign, &'n Node)>, scope: &dyn Scope) -> Cases {
    let mut total = plain(Polynomial::default());
    for (sign, part) in parts {
        let factor = match sign {
            Sign::Plus => BigRational::one(),
            Sign::Minus => -BigRational::one(),
        };
        total = crossed(node, total, &evaluate(part, scope)?, |mut x, y| {
            if x.add_scaled(y, &factor) > MAX_BITS {
                return Err(too_long(node));
            }
            if x.len() > MAX_TERMS { Err(too_large(node)) } else { Ok(x) }
        })?;
    }
    for case in &total {
        check_size(node, &case.value, scope)?;
    }
    Ok(total)
}

fn product(node: &Node, parts: &[(Step, Node)], scope: &dyn Scope) -> Cases {
    let mut total = plain(Polynomial::constant(BigRational::one()));
    for (step, part) in parts {
        match step {
            Step::Times => {
                total = crossed(node, total, &evaluate(part, scope)?, |x, y| multiplied(node, &x, y, scope))?;
            }
            Step::Over => total = divided(node, total, part, scope)?,
        }
        for case in &total {
            check_size(node, &case.value, scope)?;
        }
    }
    Ok(total)
}

fn divided(node: &Node, cases: Vec<Case>, part: &Node, scope: &dyn Scope) -> Cases {
    let by = evaluate(part, scope)?;
    if let [Case { conditions, value }] = by.as_slice()
        && conditions.is_empty()
        && let Some(reciprocal) = scope.reciprocal(value)
    {
        let refused = |(message, help): (String, String)| Diagnostic::new(part.span.clone(), message).help(help);
        let reciprocal = plain(reciprocal.map_err(refused)?);
        return crossed(node, cases, &reciprocal, |x, y| multiplied(node, &x, y, scope));
    }
    Ok(scaled(cases, &constant_divisor(part, &by)?.recip()))
}

/// Each case of the left with each case of the right.
fn crossed(
    node: &Node,
    left: Vec<Case>,
    right: &[Case],
    combine: impl Fn(Polynomial, &Polynomial) -> Result<Polynomial, Diagnostic>,
) -> Cases {
    if left.len() * right.len() > MAX_CASES {
        return Err(too_many_cases(node));
    }
    let mut cases = Vec::new();
    for x in left {
        if let [y] = right {
            let conditions = x.conditions.into_iter().chain(y.conditions.iter().cloned()).collect();
            cases.push(Case { conditions, value: combine(x.value, &y.value)? });
            continue;
        }
        for y in right {
            let conditions = x.conditions.iter().chain(&y.conditions).cloned().collect();
            cases.push(Case { conditions, value: combine(x.value.clone(), &y.value)? });
        }
    }
    Ok(cases)
}

fn multiplied(node: &Node, x: &Polynomial, y: &Polynomial, scope: &dyn Scope) -> Result<Polynomial, Diagnostic> {
    if x.len() * y.len() > MAX_PAIRS {
        return Err(too_large(node));
    }
    let value = x.mul(y);
    check_size(node, &value, scope)?;
    Ok(value)
}

/// The value of a divisor, not 0.
///
/// # Errors
/// A diagnostic if it is not a constant, or 0.
pub(super) fn divisor(node: &Node, scope: &dyn Scope) -> Result<BigRational, Diagnostic> {
    constant_divisor(node, &evaluate(node, scope)?)
}

fn constant_divisor(node: &Node, cases: &[Case]) -> Result<BigRational, Diagnostic> {
    let value = single_constant(cases).ok_or_else(|| {
        Diagnostic::new(node.span.clone(), "a divisor is a constant")
            .help("multiply through: x/y > 2 with y > 0 is x > 2*y")
    })?;
    if value.is_zero() {
        return Err(Diagnostic::new(node.span.clone(), "division by zero").help("divide by a constant other than 0"));
    }
    Ok(value)
}

fn too_large(node: &Node) -> Diagnostic {
    let message = format!("an expression has at most degree {MAX_DEGREE} and {MAX_TERMS} terms, outputs expanded");
    Diagnostic::new(node.span.clone(), message).help("describe the zone with fewer products, or in several zones")
}

fn too_long(node: &Node) -> Diagnostic {
    Diagnostic::new(node.span.clone(), "this leads to a number of more than about 30000 digits")
        .help("round the constants; a certificate holds every digit")
}

fn too_many_cases(node: &Node) -> Diagnostic {
    let message = format!("the abs in one comparison split it into more than {MAX_CASES} cases");
    Diagnostic::new(node.span.clone(), message).help("split the comparison over several zones")
}

fn check_size(node: &Node, value: &Polynomial, scope: &dyn Scope) -> Result<(), Diagnostic> {
    if value.weighted_degree(&|v| scope.degree(v)) > MAX_DEGREE || value.len() > MAX_TERMS {
        return Err(too_large(node));
    }
    if value.bits() > MAX_BITS { Err(too_long(node)) } else { Ok(()) }
}

/// base^exponent for a constant.
///
/// # Errors
/// A diagnostic if the result is too long.
pub(super) fn raised_constant(node: &Node, base: BigRational, exponent: u32) -> Result<BigRational, Diagnostic> {
    if base.abs().is_one() || base.is_zero() {
        return Ok(num_traits::pow(base, if exponent == 0 { 0 } else { 2 - (exponent % 2) as usize }));
    }
    if (bits(&base) - 1).saturating_mul(u64::from(exponent)) > MAX_BITS {
        return Err(too_long(node));
    }
    let value = num_traits::pow(base, exponent as usize);
    if bits(&value) > MAX_BITS { Err(too_long(node)) } else { Ok(value) }
}

fn raised(node: &Node, base: &Polynomial, exponent: u32, scope: &dyn Scope) -> Result<Polynomial, Diagnostic> {
    if let Some(value) = base.as_constant() {
        return Ok(Polynomial::constant(raised_constant(node, value, exponent)?));
    }
    let mut product = Polynomial::constant(BigRational::one());
    for _ in 0..exponent {
        product = multiplied(node, &product, base, scope)?;
    }
    Ok(product)
}

/// The value of an exponent: a non-negative integer constant.
///
/// # Errors
/// A diagnostic if it is something else.
pub(super) fn exponent(node: &Node, scope: &dyn Scope) -> Result<u32, Diagnostic> {
    let value = single_constant(&evaluate(node, scope)?);
    let small = value.as_ref().filter(|v| v.is_integer()).and_then(|v| v.to_integer().to_u32());
    small.filter(|k| *k <= 10_000).ok_or_else(|| {
        let found = value.filter(|v| bits(v) <= 64).map_or(String::new(), |v| format!(", found {v}"));
        Diagnostic::new(
            node.span.clone(),
            format!("an exponent is a non-negative integer constant, at most 10000{found}"),
        )
        .help("write a reciprocal as a division; roots and variable exponents are not polynomial")
    })
}

/// exp of an affine expression, as a variable of its own.
fn exponential(a: &Node, scope: &dyn Scope) -> Cases {
    let affine = "the argument of exp is affine in states, drives, outputs and t";
    let refused = || {
        Diagnostic::new(a.span.clone(), affine).help("add a state for the argument, or describe the zone without exp")
    };
    let value = polynomial(a, scope).map_err(|_| refused())?;
    let value = scope.expanded(&value);
    if value.is_empty() {
        return Ok(plain(Polynomial::constant(BigRational::one())));
    }
    let has_exponential =
        value.terms().flat_map(|(powers, _)| powers).any(|(v, _)| matches!(v, Variable::Exponential(_)));
    if value.degree() > 1 || has_exponential {
        return Err(refused());
    }
    let variable = scope.exponential(&value).ok_or_else(refused)?;
    Ok(plain(Polynomial::variable(variable)))
}

fn absolute(node: &Node, a: &Node, scope: &dyn Scope) -> Cases {
    let minus = -BigRational::one();
    let mut result = Vec::new();
    for case in evaluate(a, scope)? {
        if let Some(value) = case.value.as_constant() {
            result.push(Case { value: Polynomial::constant(value.abs()), ..case });
            continue;
        }
        if !scope.splits() {
            return Err(Diagnostic::new(node.span.clone(), "abs is for zones").help("use it in a zone's `inside`"));
        }
        if case.value.weighted_degree(&|v| scope.degree(v)) > 1 {
            return Err(Diagnostic::new(a.span.clone(), "the argument of abs is affine, outputs expanded")
                .help("compare squares: abs(p) > b with b >= 0 is p^2 > b^2"));
        }
        let negative = case.value.scaled(&minus);
        for value in [case.value.clone(), negative] {
            let conditions = case.conditions.iter().cloned().chain([value.clone()]).collect();
            result.push(Case { conditions, value });
        }
    }
    if result.len() > MAX_CASES { Err(too_many_cases(node)) } else { Ok(result) }
}

fn named(node: &Node, name: &str, scope: &dyn Scope) -> Result<Polynomial, Diagnostic> {
    match scope.look_up(name) {
        Some(Value::Constant(value)) => Ok(Polynomial::constant(value)),
        Some(Value::Variable(variable)) => Ok(Polynomial::variable(variable)),
        Some(Value::Polynomial(value)) => Ok(value),
        Some(Value::Refused(message, help)) => Err(Diagnostic::new(node.span.clone(), message).help(help)),
        None => {
            let diagnostic = Diagnostic::new(node.span.clone(), format!("`{name}` is not defined"));
            if matches!(name.to_lowercase().as_str(), "inf" | "infinity" | "nan") {
                return Err(diagnostic.help("numbers are finite; for all time, leave `until` out"));
            }
            let names = scope.names();
            let known = names.iter().take(20).cloned().collect::<Vec<_>>().join(", ");
            Err(match nearest(name, names.iter().map(String::as_str)) {
                Some(close) => diagnostic.help(format!("did you mean `{close}`?")),
                None if names.is_empty() => diagnostic.help(format!("declare `{name}` under [constants]")),
                None => diagnostic.help(format!("declare it; names known here: {known}")),
            })
        }
    }
}

fn single_constant(cases: &[Case]) -> Option<BigRational> {
    match cases {
        [Case { conditions, value }] if conditions.is_empty() => value.as_constant(),
        _ => None,
    }
}

/// Evaluates an expression that is a constant.
///
/// # Errors
/// One diagnostic, with a place in the expression's text.
pub fn constant(node: &Node, scope: &dyn Scope) -> Result<BigRational, Diagnostic> {
    let value = single_constant(&evaluate(node, scope)?);
    value
        .ok_or_else(|| Diagnostic::new(node.span.clone(), "expected a constant").help("use numbers and constants only"))
}

/// Evaluates an expression without cases.
///
/// # Errors
/// One diagnostic, with a place in the expression's text.
pub fn polynomial(node: &Node, scope: &dyn Scope) -> Result<Polynomial, Diagnostic> {
    let single = |mut cases: Vec<Case>| cases.pop().filter(|c| cases.is_empty() && c.conditions.is_empty());
    single(evaluate(node, scope)?)
        .map(|c| c.value)
        .ok_or_else(|| Diagnostic::new(node.span.clone(), "abs is for zones").help("use it in a zone's `inside`"))
}
