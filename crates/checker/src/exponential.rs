//! Polynomials with exponentials of affine expressions, as sums of products of a polynomial and one exponential.

use crate::error::Rejection;
use crate::limits::Budget;
use crate::number::Direction::Up;
use crate::number::{Complex, Dyadic, Interval, Rational};
use crate::statement::{Affine, Exponential, Expression, Term, Variable};
use crate::trace::{ClosedForm, Stretch};
use num_traits::Zero;
use std::collections::BTreeMap;

/// Splits p(x, e), e_i = exp(a_i), into pairs (c, a) with p = sum of c exp(a); c has no exponential, a is affine. Empty if no
/// exponential occurs in p.
///
/// Why: e_1^j_1 e_2^j_2 ... = exp(j_1 a_1 + j_2 a_2 + ...).
pub fn products(polynomial: &Expression, exponentials: &[Exponential]) -> Vec<(Expression, Expression)> {
    let is_exponential = |variable: &Variable| matches!(variable, Variable::Exponential(_));
    if !polynomial.terms.iter().flat_map(|t| &t.powers).any(|(variable, _)| is_exponential(variable)) {
        return Vec::new();
    }
    let mut groups: BTreeMap<Vec<(Variable, u32)>, Vec<Term>> = BTreeMap::new();
    for term in &polynomial.terms {
        let (own, powers) = term.powers.iter().partition(|(variable, _)| is_exponential(variable));
        let term = Term { coefficient: term.coefficient.clone(), powers };
        groups.entry(own).or_default().push(term);
    }
    let argument = |own: Vec<(Variable, u32)>| {
        let mut sum: BTreeMap<Vec<(Variable, u32)>, Rational> = BTreeMap::new();
        for (variable, power) in own {
            let Variable::Exponential(position) = variable else { continue };
            let Some(Affine { terms, offset }) = exponentials.get(position).map(|e| &e.argument) else { continue };
            let power = Rational::from_integer(power.into());
            for (factor, of) in terms {
                *sum.entry(vec![(*of, 1)]).or_insert_with(Zero::zero) += factor * &power;
            }
            *sum.entry(Vec::new()).or_insert_with(Zero::zero) += offset * &power;
        }
        let terms = sum.into_iter().filter(|(_, c)| !c.is_zero());
        Expression { terms: terms.map(|(powers, coefficient)| Term { coefficient, powers }).collect() }
    };
    groups.into_iter().map(|(own, terms)| (Expression { terms }, argument(own))).collect()
}

/// Encloses the sum of c exp(a) over pairs (c, a) on a stretch; `None`: an argument is out of range.
///
/// Mean value form: each function is f(centre) + s q(s), q enclosed on the stretch, |s| <= h. For exp(a): with |s q| <= u <= 1 it is
/// exp(a(centre)) (1 + s q p), p = (exp(x) - 1) / x at x = s q, and 1 - u/2 <= p <= 1 + u (its series is 1 + x/2 + x^2/6 + ...).
/// Where u > 1: interval by interval.
pub fn enclose(
    pairs: &[(&ClosedForm, &ClosedForm)],
    stretch: Stretch,
    budget: &mut Budget,
) -> Result<Option<Interval>, Rejection> {
    let bits = stretch.bits;
    let mut sum = Interval::integer(0);
    let mut slope = Interval::integer(0);
    let h = Interval::rational(stretch.half_width, bits).abs_hi();
    let around = Interval::symmetric(&h);
    for (coefficient, argument) in pairs {
        budget.spend(usize::try_from(bits / 4).unwrap_or(0) + 64, bits)?;
        let (Some(c), Some(a)) = (Line::new(coefficient, stretch, budget)?, Line::new(argument, stretch, budget)?)
        else {
            return Ok(None);
        };
        // SOUND(hi): |q| h from above.
        let reach = a.slope.as_ref().map(|q| q.abs_hi().mul(&h, bits, Up)).filter(|u| *u <= Dyadic::power_of_two(0));
        let (Some(q), Some(p), Some(u)) = (&a.slope, &c.slope, reach) else {
            let (Some(c), Some(a)) = (coefficient.enclose(stretch, budget)?, argument.enclose(stretch, budget)?) else {
                return Ok(None);
            };
            let Some(e) = Complex::real(a).exp(bits) else { return Ok(None) };
            sum = sum.add(&c.mul(&e.re, bits), bits);
            continue;
        };
        let Some(e) = Complex::real(a.value.clone()).exp(bits) else { return Ok(None) };
        let one = Interval::integer(1);
        let stretched = Interval::hull(u.scale(-1).neg(), u);
        let turn = e.re.mul(&q.mul(&one.add(&stretched, bits), bits), bits);
        // (v + s p)(e + s turn) = v e + s (v turn + p e + s p turn)
        let tilt = c.value.mul(&turn, bits).add(&p.mul(&e.re, bits), bits);
        slope = slope.add(&tilt.add(&around.mul(&p.mul(&turn, bits), bits), bits), bits);
        sum = sum.add(&c.value.mul(&e.re, bits), bits);
    }
    Ok(Some(sum.add(&around.mul(&slope, bits), bits)))
}

/// A function as value + s slope for |s| <= h.
struct Line {
    value: Interval,
    /// `None`: too few terms.
    slope: Option<Interval>,
}

impl Line {
    fn new(form: &ClosedForm, stretch: Stretch, budget: &mut Budget) -> Result<Option<Self>, Rejection> {
        let zero = Rational::zero();
        let Some(value) = form.enclose(Stretch { half_width: &zero, ..stretch }, budget)? else { return Ok(None) };
        // The quotient drops the first Taylor coefficient, whether it is zero or not: it encloses (f - f(centre)) / s. On an instant
        // there is no s.
        let slope =
            if stretch.half_width.is_zero() { Some(Interval::integer(0)) } else { form.quotient(1, stretch, budget)? };
        Ok(Some(Self { value, slope }))
    }
}
