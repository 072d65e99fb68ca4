//! A proved set of starts as polynomial equations and inequalities over the states and some auxiliary variables.
//!
//! Nothing is rounded: an algebraic number is an auxiliary variable with its polynomial and a rectangle that holds no other root.
//! exp(i phi) becomes a point (c, s) of the unit circle; y, u, T stay what they are, up to roots (so that all powers are whole)
//! and inverses (so that no power is negative).

use crate::outcome::Proof;
use crate::problem::Problem;
use keepout_checker::Limits;
use keepout_checker::certificate::Evidence;
use keepout_checker::number::Rational;
use keepout_checker::region::{Exponent, Reason, Region};
use keepout_checker::statement::{Claim, Expression, Formula, Relation, Statement, Variable};
use keepout_core::IntegerPolynomial;
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Signed, ToPrimitive, Zero};
use std::collections::BTreeMap;

/// Variables, by position, and their powers >= 1.
type Powers = BTreeMap<usize, u32>;

/// A polynomial in the variables of an [`ExplicitSet`]: coefficients by powers.
#[derive(Clone, Debug, PartialEq, Eq, Default)]
pub struct SetPolynomial(pub BTreeMap<BTreeMap<usize, u32>, Rational>);

/// A variable of an explicit set.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SetVariable {
    /// Its name; states have their own.
    pub name: String,
    /// What it stands for.
    pub meaning: String,
}

/// A formula in polynomials of an explicit set.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum SetFormula {
    /// A comparison with 0.
    Atom(SetPolynomial, Relation),
    /// All of them hold.
    And(Vec<SetFormula>),
    /// One of them holds.
    Or(Vec<SetFormula>),
}

/// The set of all states for which there are values of the auxiliary variables such that all conditions hold; and the zone.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ExplicitSet {
    /// The states, then the auxiliary variables.
    pub variables: Vec<SetVariable>,
    /// The number of states.
    pub states: usize,
    /// The conditions.
    pub conditions: Vec<(SetPolynomial, Relation)>,
    /// The zone, which no point of the set is in.
    pub zone: SetFormula,
}

/// The explicit form of a proved set of starts. `None`: the proof is not of a set, or has powers that are too great to write.
pub fn explicit(proof: &Proof) -> Option<ExplicitSet> {
    let statement = proof.statement();
    let Claim::Region(region) = &statement.claim else { return None };
    let Evidence::Region(evidence) = &proof.certificate().evidence else { return None };
    let problem = Problem::new(statement, statement.claim.clone(), &Limits::default()).ok()?;
    let mut writer = Writer::new(statement);
    let lines: Vec<Option<Rational>> = evidence
        .roots
        .iter()
        .map(|index| {
            evidence.growths.iter().find(|step| step.root == *index).and_then(|step| match &step.reason {
                Reason::Line(line) => Some(line.clone()),
                Reason::Base | Reason::Sum(_) => None,
            })
        })
        .collect();
    let used: Vec<usize> = region.exponents.iter().map(|e| e.root).collect();
    let mut roots = BTreeMap::new();
    for position in used {
        roots.insert(position, writer.root(region, position, lines.get(position)?.as_ref()));
    }
    let growths = writer.growths(region)?;
    let angles = writer.angles(region);
    let time = writer.time(region, &growths, &problem)?;
    writer.coordinates(region, &problem, &roots, &growths, &angles, time)?;
    let zone = writer.formula(&statement.zone.inside)?;
    Some(ExplicitSet {
        variables: writer.variables,
        states: statement.states.len(),
        conditions: writer.conditions,
        zone,
    })
}

impl SetPolynomial {
    fn constant(value: Rational) -> Self {
        let mut sum = Self::default();
        sum.push(Powers::new(), value);
        sum
    }

    fn variable(position: usize) -> Self {
        Self::monomial(position, 1)
    }

    fn monomial(position: usize, power: u32) -> Self {
        let powers = if power == 0 { Powers::new() } else { Powers::from([(position, power)]) };
        Self(BTreeMap::from([(powers, Rational::one())]))
    }

    fn push(&mut self, powers: Powers, c: Rational) {
        let slot = self.0.entry(powers).or_insert_with(Rational::zero);
        *slot += c;
        self.0.retain(|_, c| !c.is_zero());
    }

    fn add(mut self, other: &Self) -> Self {
        for (powers, c) in &other.0 {
            self.push(powers.clone(), c.clone());
        }
        self
    }

    fn sub(self, other: &Self) -> Self {
        self.add(&other.scaled(&-Rational::one()))
    }

    fn scaled(&self, factor: &Rational) -> Self {
        if factor.is_zero() {
            return Self::default();
        }
        Self(self.0.iter().map(|(powers, c)| (powers.clone(), c * factor)).collect())
    }

    fn mul(&self, other: &Self) -> Self {
        let mut product = Self::default();
        for (p, a) in &self.0 {
            for (q, b) in &other.0 {
                let mut powers = p.clone();
                for (variable, power) in q {
                    *powers.entry(*variable).or_insert(0) += power;
                }
                product.push(powers, a * b);
            }
        }
        product
    }
}

/// Real and imaginary part.
#[derive(Clone, Debug)]
struct Pair(SetPolynomial, SetPolynomial);

impl Pair {
    fn one() -> Self {
        Self(SetPolynomial::constant(Rational::one()), SetPolynomial::default())
    }

    fn mul(&self, other: &Self) -> Self {
        let re = self.0.mul(&other.0).sub(&self.1.mul(&other.1));
        Self(re, self.0.mul(&other.1).add(&self.1.mul(&other.0)))
    }

    /// The value of a polynomial with rational coefficients, constant term first.
    fn evaluate(&self, coefficients: &[Rational]) -> Self {
        coefficients.iter().rev().fold(Self(SetPolynomial::default(), SetPolynomial::default()), |sum, c| {
            let product = sum.mul(self);
            Self(product.0.add(&SetPolynomial::constant(c.clone())), product.1)
        })
    }
}

/// A positive quantity as a power of a variable, or of the inverse of one: quantity = up^root, = down^(-root).
#[derive(Clone, Debug)]
struct Positive {
    up: Option<usize>,
    down: Option<usize>,
    root: BigInt,
}

impl Positive {
    /// quantity^g as a power of a variable; or 1 / quantity^g, where the flag is false. `None`: too great a power.
    fn power(&self, g: &Rational) -> Option<(bool, SetPolynomial)> {
        let power = (g.abs() * Rational::from_integer(self.root.clone())).to_integer().to_u32()?;
        let (own, other) = if g.is_negative() { (self.down, self.up) } else { (self.up, self.down) };
        let monomial = SetPolynomial::monomial(own.or(other)?, power);
        Some((own.is_some(), monomial))
    }
}

/// The powers of y, u_1, u_2, ... are written so.
type Growths = Vec<Positive>;

struct Writer<'a> {
    statement: &'a Statement,
    variables: Vec<SetVariable>,
    conditions: Vec<(SetPolynomial, Relation)>,
}

impl<'a> Writer<'a> {
    fn new(statement: &'a Statement) -> Self {
        let state =
            |s: &keepout_checker::statement::State| SetVariable { name: s.name.clone(), meaning: "a state".into() };
        Self { statement, variables: statement.states.iter().map(state).collect(), conditions: Vec::new() }
    }

    /// A new variable; its name gets underscores until it is new.
    fn variable(&mut self, name: &str, meaning: String) -> usize {
        let mut name = name.to_string();
        while self.variables.iter().any(|v| v.name == name) {
            name.push('_');
        }
        self.variables.push(SetVariable { name, meaning });
        self.variables.len() - 1
    }

    fn require(&mut self, polynomial: SetPolynomial, relation: Relation) {
        if !polynomial.0.is_empty() {
            self.conditions.push((polynomial, relation));
        }
    }

    fn between(&mut self, variable: usize, (lo, hi): &(Rational, Rational)) {
        let x = SetPolynomial::variable(variable);
        self.require(x.clone().sub(&SetPolynomial::constant(lo.clone())), Relation::NonNegative);
        self.require(x.sub(&SetPolynomial::constant(hi.clone())), Relation::NonPositive);
    }

    /// A root as a constant or as auxiliary variables.
    fn root(&mut self, region: &Region, position: usize, line: Option<&Rational>) -> Pair {
        let named = &region.roots[position];
        let k = position + 1;
        let is_real = named.im.0.is_zero() && named.im.1.is_zero();
        let re = match line {
            Some(line) => SetPolynomial::constant(line.clone()),
            None => {
                let variable = self.variable(&format!("root_{k}_re"), format!("the real part of root {k}"));
                self.between(variable, &named.re);
                SetPolynomial::variable(variable)
            }
        };
        let im = if is_real {
            SetPolynomial::default()
        } else {
            let variable = self.variable(&format!("root_{k}_im"), format!("the imaginary part of root {k}"));
            self.between(variable, &named.im);
            SetPolynomial::variable(variable)
        };
        let root = Pair(re, im);
        let Pair(zero_re, zero_im) = root.evaluate(&named.polynomial);
        self.require(zero_re, Relation::Zero);
        self.require(zero_im, Relation::Zero);
        root
    }

    /// Variables for y and u_1, u_2, ..., and their bounds.
    fn growths(&mut self, region: &Region) -> Option<Growths> {
        let zero = Rational::zero();
        let powers_of = |j: usize| region.exponents.iter().filter_map(move |e| e.growth.get(j));
        let mut growths = Growths::new();
        for j in 0..=region.rates.len() {
            let mut root = powers_of(j).fold(BigInt::one(), |l, g| l.lcm(g.denom()));
            if j == 0 {
                let bands = region.rates.iter().flat_map(|r| [&r.lo, &r.hi]);
                root = bands.chain(&region.power).fold(root, |l, g| l.lcm(g.denom()));
            }
            let down = powers_of(j).any(|g| *g < zero);
            let is_bound = j > 0 || !region.rates.is_empty() || region.power.is_some();
            let up = powers_of(j).any(|g| *g > zero) || (!down && is_bound);
            let what = if j == 0 { "y".to_string() } else { format!("u_{j}") };
            let named = |sign: &str| {
                if root.is_one() { format!("{what}^({sign}1)") } else { format!("{what}^({sign}1/{root})") }
            };
            let up = up.then(|| self.variable(&what, format!("{}, positive", named(""))));
            let down = down.then(|| self.variable(&format!("{what}_inverse"), format!("{}, positive", named("-"))));
            for variable in up.iter().chain(&down) {
                self.require(SetPolynomial::variable(*variable), Relation::Positive);
            }
            if let (Some(up), Some(down)) = (up, down) {
                let product = SetPolynomial::variable(up).mul(&SetPolynomial::variable(down));
                self.require(product.sub(&SetPolynomial::constant(Rational::one())), Relation::Zero);
            }
            growths.push(Positive { up, down, root });
        }
        let start = SetPolynomial::constant(region.start.clone());
        if growths[0].up.is_some() || growths[0].down.is_some() {
            self.at_most(&start, &[(0, Rational::one())], &growths)?;
        }
        for (j, rate) in region.rates.iter().enumerate() {
            let one = SetPolynomial::constant(Rational::one());
            // y^lo <= u, u <= y^hi
            self.at_most(&one, &[(0, -&rate.lo), (j + 1, Rational::one())], &growths)?;
            self.at_most(&one, &[(0, rate.hi.clone()), (j + 1, -Rational::one())], &growths)?;
        }
        Some(growths)
    }

    /// Requires left <= product of powers of y, u_1, ..., each put on the side on which its power can be written.
    fn at_most(&mut self, left: &SetPolynomial, right: &[(usize, Rational)], growths: &Growths) -> Option<()> {
        let mut sides = (left.clone(), SetPolynomial::constant(Rational::one()));
        for (j, g) in right {
            let (is_right, monomial) = growths[*j].power(g)?;
            let side = if is_right { &mut sides.1 } else { &mut sides.0 };
            *side = side.mul(&monomial);
        }
        self.require(sides.0.sub(&sides.1), Relation::NonPositive);
        Some(())
    }

    /// A point of the unit circle for each base angle.
    fn angles(&mut self, region: &Region) -> Vec<(usize, usize)> {
        let mut angles = Vec::new();
        for k in 1..=region.base.len() {
            let c = self.variable(&format!("c_{k}"), format!("the cosine of base angle {k}"));
            let s = self.variable(&format!("s_{k}"), format!("the sine of base angle {k}"));
            let squares = SetPolynomial::monomial(c, 2).add(&SetPolynomial::monomial(s, 2));
            self.require(squares.sub(&SetPolynomial::constant(Rational::one())), Relation::Zero);
            angles.push((c, s));
        }
        angles
    }

    /// The variable T, if some state has a power of t. Outer `None`: it cannot be told.
    #[expect(clippy::option_option, reason = "failure and absence are different")]
    fn time(&mut self, region: &Region, growths: &Growths, problem: &Problem) -> Option<Option<usize>> {
        let first = problem.traces() - self.statement.states.len();
        if problem.factors.get(first..problem.traces())?.iter().flatten().all(|f| f.multiplicity == 1) {
            return Some(None);
        }
        let time = self.variable("T", "stands for the time".into());
        let variable = SetPolynomial::variable(time);
        self.require(variable.clone().sub(&SetPolynomial::constant(region.from.clone())), Relation::NonNegative);
        if let Some(power) = &region.power {
            self.at_most(&variable, &[(0, power.clone())], growths)?;
        }
        Some(Some(time))
    }

    /// e of an exponent: its growth and its turns.
    fn factor(exponent: &Exponent, growths: &Growths, angles: &[(usize, usize)]) -> Option<Pair> {
        let mut product = Pair::one();
        for (g, positive) in exponent.growth.iter().zip(growths) {
            if !g.is_zero() {
                let (_, monomial) = positive.power(g).filter(|(is_own, _)| *is_own)?;
                product = product.mul(&Pair(monomial, SetPolynomial::default()));
            }
        }
        for (n, (c, s)) in exponent.turns.iter().zip(angles) {
            let sign = Rational::from_integer(n.signum().into());
            let wave = Pair(SetPolynomial::variable(*c), SetPolynomial::variable(*s).scaled(&sign));
            for _ in 0..n.unsigned_abs() {
                product = product.mul(&wave);
            }
        }
        Some(product)
    }

    /// x_i = the sum over the exponents.
    fn coordinates(
        &mut self,
        region: &Region,
        problem: &Problem,
        roots: &BTreeMap<usize, Pair>,
        growths: &Growths,
        angles: &[(usize, usize)],
        time: Option<usize>,
    ) -> Option<()> {
        let states = self.statement.states.len();
        let first = problem.traces() - states;
        for state in 0..states {
            let coefficients = problem.function(first + state)?.coefficients();
            let mut sum = SetPolynomial::default();
            for exponent in &region.exponents {
                let named = &region.roots[exponent.root];
                let own = IntegerPolynomial::from_rationals(&named.polynomial).primitive_part();
                let is_real = named.im.0.is_zero() && named.im.1.is_zero();
                let factor = Self::factor(exponent, growths, angles)?;
                for c in coefficients.iter().filter(|c| c.factor.divide_exact(&own).is_some()) {
                    let value = roots[&exponent.root].evaluate(&remainder(c.element(), &named.polynomial));
                    let mut term = value.mul(&factor).0;
                    let mut weight = Rational::from_integer(if is_real { 1 } else { 2 }.into());
                    for j in 1..=c.power {
                        weight /= Rational::from_integer(j.into());
                        term = term.mul(&SetPolynomial::variable(time?));
                    }
                    sum = sum.add(&term.scaled(&weight));
                }
            }
            self.require(sum.sub(&SetPolynomial::variable(state)), Relation::Zero);
        }
        Some(())
    }

    fn formula(&self, formula: &Formula) -> Option<SetFormula> {
        let all = |parts: &[Formula]| parts.iter().map(|p| self.formula(p)).collect::<Option<Vec<_>>>();
        Some(match formula {
            Formula::Atom(atom) => SetFormula::Atom(self.expression(&atom.polynomial)?, atom.relation),
            Formula::And(parts) => SetFormula::And(all(parts)?),
            Formula::Or(parts) => SetFormula::Or(all(parts)?),
        })
    }

    /// A polynomial of the zone in the states alone.
    fn expression(&self, expression: &Expression) -> Option<SetPolynomial> {
        let mut sum = SetPolynomial::default();
        for term in &expression.terms {
            let mut product = SetPolynomial::constant(term.coefficient.clone());
            for (variable, power) in &term.powers {
                let factor = match variable {
                    Variable::State(i) => SetPolynomial::variable(*i),
                    Variable::Output(i) => self.expression(&self.statement.outputs.get(*i)?.value)?,
                    Variable::Drive(_) | Variable::Time | Variable::Exponential(_) | Variable::Disturbance(_) => {
                        return None;
                    }
                };
                for _ in 0..*power {
                    product = product.mul(&factor);
                }
            }
            sum = sum.add(&product);
        }
        Some(sum)
    }
}

/// The remainder of a polynomial by a monic one.
fn remainder(mut p: Vec<Rational>, monic: &[Rational]) -> Vec<Rational> {
    while p.len() >= monic.len() {
        let Some(lead) = p.pop() else { break };
        let shift = p.len() + 1 - monic.len();
        for (slot, c) in p.iter_mut().skip(shift).zip(monic) {
            *slot -= &lead * c;
        }
    }
    p
}
