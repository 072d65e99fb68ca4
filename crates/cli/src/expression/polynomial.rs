//! The exact meaning of expressions without comparison: polynomials, and cases where `abs` splits them.

use super::parser::{Function, Node, NodeKind};
use crate::diagnostic::{Diagnostic, nearest};
use keepout_checker::statement::{Expression, Term, Variable};
use num_rational::BigRational;
use num_traits::{One, Signed, ToPrimitive, Zero};
use std::collections::BTreeMap;

/// The greatest total degree of an expression.
pub const MAX_DEGREE: u32 = 24;

/// The most terms of an expanded expression.
const MAX_TERMS: usize = 20_000;

/// The most cases that the `abs` of one comparison may split it into.
const MAX_CASES: usize = 64;

/// A polynomial: products of powers of variables, and their coefficients (none 0).
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Polynomial(BTreeMap<Vec<(Variable, u32)>, BigRational>);

impl Polynomial {
    /// A constant.
    pub fn constant(value: BigRational) -> Self {
        let mut map = BTreeMap::new();
        if !value.is_zero() {
            map.insert(Vec::new(), value);
        }
        Self(map)
    }

    /// A variable.
    pub fn variable(variable: Variable) -> Self {
        Self(BTreeMap::from([(vec![(variable, 1)], BigRational::one())]))
    }

    /// The value, if it is a constant.
    pub fn as_constant(&self) -> Option<BigRational> {
        match self.0.len() {
            0 => Some(BigRational::zero()),
            1 => self.0.get(&Vec::new()).cloned(),
            _ => None,
        }
    }

    /// The total degree.
    pub fn degree(&self) -> u32 {
        self.0.keys().map(|p| p.iter().map(|(_, k)| k).sum()).max().unwrap_or(0)
    }

    /// The products with their coefficients.
    pub fn terms(&self) -> impl Iterator<Item = (&[(Variable, u32)], &BigRational)> {
        self.0.iter().map(|(p, c)| (p.as_slice(), c))
    }

    /// The same polynomial in the vocabulary of statements.
    pub fn expression(&self) -> Expression {
        let term = |(p, c): (&Vec<_>, &BigRational)| Term { coefficient: c.clone(), powers: p.clone() };
        Expression { terms: self.0.iter().map(term).collect() }
    }

    fn accumulate(&mut self, powers: Vec<(Variable, u32)>, coefficient: BigRational) {
        let slot = self.0.entry(powers.clone()).or_insert_with(BigRational::zero);
        *slot += coefficient;
        if slot.is_zero() {
            self.0.remove(&powers);
        }
    }

    /// self + factor * other
    pub fn add(&self, other: &Self, factor: &BigRational) -> Self {
        let mut sum = self.clone();
        for (powers, c) in &other.0 {
            sum.accumulate(powers.clone(), c * factor);
        }
        sum
    }

    /// self * other
    pub fn mul(&self, other: &Self) -> Self {
        let mut product = Self::default();
        for (p, c) in &self.0 {
            for (q, d) in &other.0 {
                let mut powers: BTreeMap<Variable, u32> = p.iter().copied().collect();
                for (v, k) in q {
                    *powers.entry(*v).or_insert(0) += k;
                }
                product.accumulate(powers.into_iter().collect(), c * d);
            }
        }
        product
    }

    /// self with variables replaced by polynomials.
    pub fn substitute(&self, replace: &dyn Fn(Variable) -> Option<Polynomial>) -> Self {
        let mut sum = Self::default();
        for (powers, c) in &self.0 {
            let mut product = Self::constant(c.clone());
            for (v, k) in powers {
                let factor = replace(*v).unwrap_or_else(|| Self::variable(*v));
                for _ in 0..*k {
                    product = product.mul(&factor);
                }
            }
            sum = sum.add(&product, &BigRational::one());
        }
        sum
    }
}

/// What a name means where an expression stands.
pub enum Value {
    /// A constant.
    Constant(BigRational),
    /// A variable of the statement.
    Variable(Variable),
    /// A name that is known, but not allowed here: why, and what to do.
    Refused(String, Option<String>),
}

/// The names that an expression may use.
pub trait Scope {
    /// The meaning of a name; `None`: not known.
    fn look_up(&self, name: &str) -> Option<Value>;
    /// All names, for hints.
    fn names(&self) -> Vec<String>;
    /// What functions other than abs are refused with here.
    fn function_hint(&self) -> (&'static str, &'static str);
    /// Whether abs may split cases here.
    fn splits(&self) -> bool {
        false
    }
}

/// A polynomial that holds where all conditions (`polynomial >= 0`) do.
#[derive(Clone, Debug)]
pub struct Case {
    /// The conditions.
    pub conditions: Vec<Polynomial>,
    /// The value.
    pub value: Polynomial,
}

/// Evaluates an expression to cases that cover everything; one case without conditions where there is no `abs`.
///
/// # Errors
/// One diagnostic, with a place in the expression's text.
pub fn evaluate(node: &Node, scope: &dyn Scope) -> Result<Vec<Case>, Diagnostic> {
    let minus = -BigRational::one();
    let plain = |value| Ok(vec![Case { conditions: Vec::new(), value }]);
    match &node.kind {
        NodeKind::Number(value) => plain(Polynomial::constant(value.clone())),
        NodeKind::Name(name) => plain(named(node, name, scope)?),
        NodeKind::Negative(a) => {
            let cases = evaluate(a, scope)?;
            let negated = |c: Case| Case { value: Polynomial::default().add(&c.value, &minus), ..c };
            Ok(cases.into_iter().map(negated).collect())
        }
        NodeKind::Sum(a, b) => both(node, a, b, scope, |x, y| x.add(y, &BigRational::one())),
        NodeKind::Difference(a, b) => both(node, a, b, scope, |x, y| x.add(y, &minus)),
        NodeKind::Product(a, b) => both(node, a, b, scope, Polynomial::mul),
        NodeKind::Quotient(a, b) => {
            let divisor = constant(b, scope).map_err(|d| Diagnostic {
                help: d.help.or_else(|| Some("multiply through: x/y > 2 with y > 0 is x > 2*y".into())),
                message: if d.message.starts_with("expected a constant") {
                    "a divisor is a constant".into()
                } else {
                    d.message
                },
                ..d
            })?;
            if divisor.is_zero() {
                return Err(Diagnostic::new(b.span.clone(), "division by zero"));
            }
            let inverse = Polynomial::constant(divisor.recip());
            Ok(evaluate(a, scope)?.into_iter().map(|c| Case { value: c.value.mul(&inverse), ..c }).collect())
        }
        NodeKind::Power(a, b) => {
            let exponent = exponent(b, scope)?;
            let cases = evaluate(a, scope)?;
            let mut result = Vec::new();
            for case in cases {
                result.push(Case { value: raised(node, &case.value, exponent)?, ..case });
            }
            Ok(result)
        }
        NodeKind::Call(Function::Abs, a) => absolute(node, a, scope),
        NodeKind::Call(Function::Exp | Function::Sin | Function::Cos, _) => {
            let (message, help) = scope.function_hint();
            Err(Diagnostic::new(node.span.clone(), message).help(help))
        }
        NodeKind::Comparison(..) | NodeKind::Not(_) | NodeKind::And(..) | NodeKind::Or(..) => {
            Err(Diagnostic::new(node.span.clone(), "expected a number-valued expression, found a condition"))
        }
    }
}

fn both(
    node: &Node,
    a: &Node,
    b: &Node,
    scope: &dyn Scope,
    combine: impl Fn(&Polynomial, &Polynomial) -> Polynomial,
) -> Result<Vec<Case>, Diagnostic> {
    let (left, right) = (evaluate(a, scope)?, evaluate(b, scope)?);
    if left.len() * right.len() > MAX_CASES {
        return Err(Diagnostic::new(
            node.span.clone(),
            format!("the abs in one comparison split it into more than {MAX_CASES} cases"),
        ));
    }
    let mut cases = Vec::new();
    for x in &left {
        for y in &right {
            if x.value.0.len() * y.value.0.len() > MAX_TERMS * 50
                || x.value.degree() + y.value.degree() > 2 * MAX_DEGREE
            {
                return Err(too_large(node));
            }
            let value = combine(&x.value, &y.value);
            check_size(node, &value)?;
            let conditions = x.conditions.iter().chain(&y.conditions).cloned().collect();
            cases.push(Case { conditions, value });
        }
    }
    Ok(cases)
}

fn too_large(node: &Node) -> Diagnostic {
    Diagnostic::new(
        node.span.clone(),
        format!("an expression has at most degree {MAX_DEGREE} and {MAX_TERMS} terms when expanded"),
    )
}

fn check_size(node: &Node, value: &Polynomial) -> Result<(), Diagnostic> {
    if value.degree() > MAX_DEGREE || value.0.len() > MAX_TERMS { Err(too_large(node)) } else { Ok(()) }
}

fn raised(node: &Node, base: &Polynomial, exponent: u32) -> Result<Polynomial, Diagnostic> {
    if let Some(value) = base.as_constant() {
        let bits = value.numer().bits().max(value.denom().bits()).saturating_mul(u64::from(exponent));
        if bits > 100_000 {
            return Err(Diagnostic::new(node.span.clone(), "this power has more than 30,000 digits"));
        }
        return Ok(Polynomial::constant(num_traits::pow(value, exponent as usize)));
    }
    let mut product = Polynomial::constant(BigRational::one());
    for _ in 0..exponent {
        product = product.mul(base);
        check_size(node, &product)?;
    }
    Ok(product)
}

fn exponent(node: &Node, scope: &dyn Scope) -> Result<u32, Diagnostic> {
    let refused =
        || Diagnostic::new(node.span.clone(), "an exponent is a non-negative integer constant, at most 10000");
    let value = constant(node, scope).map_err(|_| refused())?;
    let small = value.is_integer().then(|| value.to_integer().to_u32()).flatten();
    small.filter(|k| *k <= 10_000).ok_or_else(refused)
}

fn absolute(node: &Node, a: &Node, scope: &dyn Scope) -> Result<Vec<Case>, Diagnostic> {
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
        if case.value.degree() > 1 {
            return Err(Diagnostic::new(a.span.clone(), "the argument of abs is affine")
                .help("compare squares: abs(p) > b with b >= 0 is p^2 > b^2"));
        }
        let negative = Polynomial::default().add(&case.value, &minus);
        for value in [case.value.clone(), negative] {
            let conditions = case.conditions.iter().cloned().chain([value.clone()]).collect();
            result.push(Case { conditions, value });
        }
    }
    if result.len() > MAX_CASES {
        return Err(Diagnostic::new(
            node.span.clone(),
            format!("the abs in one comparison split it into more than {MAX_CASES} cases"),
        ));
    }
    Ok(result)
}

fn named(node: &Node, name: &str, scope: &dyn Scope) -> Result<Polynomial, Diagnostic> {
    match scope.look_up(name) {
        Some(Value::Constant(value)) => Ok(Polynomial::constant(value)),
        Some(Value::Variable(variable)) => Ok(Polynomial::variable(variable)),
        Some(Value::Refused(message, help)) => {
            let diagnostic = Diagnostic::new(node.span.clone(), message);
            Err(match help {
                Some(help) => diagnostic.help(help),
                None => diagnostic,
            })
        }
        None => {
            let names = scope.names();
            let diagnostic = Diagnostic::new(node.span.clone(), format!("`{name}` is not defined"));
            Err(match nearest(name, names.iter().map(String::as_str)) {
                Some(close) => diagnostic.help(format!("did you mean `{close}`?")),
                None if names.is_empty() => diagnostic,
                None => diagnostic.help(format!("names known here: {}", names.join(", "))),
            })
        }
    }
}

/// Evaluates an expression that is a constant.
///
/// # Errors
/// One diagnostic, with a place in the expression's text.
pub fn constant(node: &Node, scope: &dyn Scope) -> Result<BigRational, Diagnostic> {
    let cases = evaluate(node, scope)?;
    let value = match cases.as_slice() {
        [Case { conditions, value }] if conditions.is_empty() => value.as_constant(),
        _ => None,
    };
    value.ok_or_else(|| Diagnostic::new(node.span.clone(), "expected a constant"))
}
