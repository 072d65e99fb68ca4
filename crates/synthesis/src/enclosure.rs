//! A problem at one precision: certified roots, closed forms, signs on stretches of time.

use crate::problem::Problem;
use keepout_checker::Limits;
use keepout_checker::certificate::{Factor, RootFamily, Sign};
use keepout_checker::error::Rejection;
use keepout_checker::exponential;
use keepout_checker::limits::Budget;
use keepout_checker::number::{Interval, Rational};
use keepout_checker::root::RootTable;
use keepout_checker::trace::{ClosedForm, Stretch};
use std::cmp::Ordering;

/// Enclosures of everything in a problem, with mantissas of `bits` bits.
pub(crate) struct Enclosure {
    pub(crate) bits: u32,
    pub(crate) families: Vec<RootFamily>,
    pub(crate) table: RootTable,
    pub(crate) forms: Vec<ClosedForm>,
    budget: Budget,
    limits: Limits,
}

/// Signs on a stretch, and whether the zone follows to be true or false there.
pub(crate) struct Judgement {
    pub(crate) signs: Vec<Option<Sign>>,
    pub(crate) truth: Option<bool>,
    pub(crate) order: u32,
}

impl Enclosure {
    /// Encloses a problem at a precision. An error says that the precision does not separate the roots.
    pub(crate) fn new(problem: &Problem, bits: u32, limits: &Limits) -> Result<Self, Rejection> {
        let families: Vec<RootFamily> = problem.families.iter().map(|f| family(f, bits)).collect();
        let unlimited = Limits { work: u64::MAX, ..limits.clone() };
        let mut budget = Budget::new(&unlimited);
        let table = RootTable::new(&families, bits, &mut budget)?;
        let mut enclosure = Self { bits, families, table, forms: Vec::new(), budget, limits: unlimited };
        enclosure.add_forms(problem)?;
        Ok(enclosure)
    }

    fn add_forms(&mut self, problem: &Problem) -> Result<(), Rejection> {
        for function in self.forms.len()..problem.factors.len() {
            let (factors, derivatives) = (&problem.factors[function], problem.own_derivatives(function));
            self.forms.push(ClosedForm::new(factors, &derivatives, &self.table, self.bits, 0, &mut self.budget)?);
        }
        Ok(())
    }

    /// Takes in what was added to the problem since. Known roots keep their places, so the closed forms stay.
    pub(crate) fn renew(&mut self, problem: &Problem) -> Option<()> {
        let added = problem.families.iter().skip(self.families.len()).map(|f| family(f, self.bits));
        let known = self.families.len();
        self.families.extend(added);
        if self.families.len() > known {
            self.table = RootTable::new(&self.families, self.bits, &mut self.budget).ok()?;
        }
        self.add_forms(problem).ok()
    }

    /// Whether the closed forms lose no more than half of their digits to cancellation: at t = 0, where the values are known.
    ///
    /// A guess for choosing the precision. The scale of a trace is the largest of |y_k| / r^k for its first derivatives, r a
    /// bound of its exponents.
    pub(crate) fn is_precise(&mut self, problem: &Problem) -> bool {
        let zero = Rational::from_integer(0.into());
        (0..problem.traces()).all(|i| {
            if self.forms[i].terms.is_empty() {
                return true;
            }
            let rates = self.forms[i].terms.iter().map(|t| t.exponent.abs_hi(self.bits).top());
            let rate = 2.0_f64.powi(rates.max().unwrap_or(0).clamp(-500, 500) as i32);
            let derivatives = problem.sequences[i].derivatives(6);
            let sizes = derivatives.iter().enumerate().map(|(k, y)| approx_value(y).abs() / rate.powi(k as i32));
            let scale = sizes.fold(0.0, f64::max);
            let order = self.order(&zero, &zero);
            let Some(value) = self.on_stretch(problem, i, &zero, &zero, order) else { return false };
            let width = value.hi().add(&value.lo().neg(), 64, keepout_checker::number::Direction::Up);
            width.top() as f64 <= scale.log2() - 0.5 * f64::from(self.bits)
        })
    }

    /// Encloses a function on [from, to], with a number of Taylor terms that suits the stretch.
    pub(crate) fn on_stretch(
        &mut self,
        problem: &Problem,
        function: usize,
        from: &Rational,
        to: &Rational,
        order: u32,
    ) -> Option<Interval> {
        if problem.products_of(function).is_empty() {
            return on_stretch(&self.forms[function], from, to, order, self.bits, &mut self.budget);
        }
        let half = Rational::new(1.into(), 2.into());
        let (centre, half_width) = ((from + to) * &half, (to - from) * &half);
        let stretch = Stretch { centre: &centre, half_width: &half_width, order, bits: self.bits };
        let pairs: Vec<_> =
            problem.products_of(function).iter().map(|(c, a)| (&self.forms[*c], &self.forms[*a])).collect();
        exponential::enclose(&pairs, stretch, &mut self.budget).ok().flatten()
    }

    /// Encloses g / t^power on [0, to] for a trace that vanishes at 0 to that order.
    pub(crate) fn quotient_at_start(
        &mut self,
        index: usize,
        power: usize,
        to: &Rational,
        order: u32,
    ) -> Option<Interval> {
        let zero = Rational::from_integer(0.into());
        let stretch = Stretch { centre: &zero, half_width: to, order, bits: self.bits };
        self.forms.get(index)?.quotient(power, stretch, &mut self.budget).ok().flatten()
    }

    /// The signs of the traces on [from, to], only as many as the zone's truth needs, `first` before the others.
    pub(crate) fn judge(&mut self, problem: &Problem, from: &Rational, to: &Rational, first: &[usize]) -> Judgement {
        let order = self.order(from, to);
        let mut judgement = Judgement { signs: vec![None; self.forms.len()], truth: None, order };
        let rest = (0..problem.atoms()).filter(|i| !first.contains(i));
        // Signs of auxiliary functions last: they are needed only where traces touch zero.
        let auxiliary = (problem.traces()..self.forms.len()).filter(|i| !first.contains(i));
        let sequence: Vec<usize> = first.iter().copied().chain(rest).chain(auxiliary).collect();
        judgement.truth = problem.truth(&judgement.signs);
        for index in sequence {
            if judgement.truth.is_some() {
                break;
            }
            judgement.signs[index] = self.sign(problem, index, from, to, order);
            judgement.truth = problem.truth(&judgement.signs);
        }
        judgement
    }

    /// The sign of one function on [from, to]; exact at t = 0.
    pub(crate) fn sign(
        &mut self,
        problem: &Problem,
        index: usize,
        from: &Rational,
        to: &Rational,
        order: u32,
    ) -> Option<Sign> {
        let zero = Rational::from_integer(0.into());
        if *to == zero && problem.products_of(index).is_empty() {
            return Some(problem.sequences[index].sign_at_zero());
        }
        if problem.is_zero(index) {
            return Some(Ordering::Equal);
        }
        self.on_stretch(problem, index, from, to, order)?.certain_sign()
    }

    /// A number of Taylor terms: the remainder is then small against the terms kept, for exponents up to the largest.
    pub(crate) fn order(&self, from: &Rational, to: &Rational) -> u32 {
        let h = approx_value(&((to - from) / Rational::from_integer(2.into())));
        let largest = |x: &Interval| x.abs_hi().top().min(1000) as f64;
        let rates = self.forms.iter().flat_map(|f| &f.terms);
        let top = rates.map(|t| largest(&t.exponent.re).max(largest(&t.exponent.im))).fold(-1000.0_f64, f64::max);
        let x = h * top.exp2();
        let longest =
            self.forms.iter().flat_map(|f| f.terms.iter().map(|t| t.coefficients.len())).max().unwrap_or(1) as u32;
        let mut term = 1.0_f64;
        let mut order = 1;
        while order < 22 && term > 2.0_f64.powi(-40) {
            term *= x / f64::from(order);
            order += 1;
        }
        order.max(2) + longest
    }

    /// What a cell costs, in units of effort: more for long sums of terms.
    pub(crate) fn cost(&self) -> u64 {
        let terms = self.forms.iter().map(|f| f.terms.len() as u64).sum::<u64>();
        1 + terms / 32
    }

    /// The limits of the checker, without the bound on work.
    pub(crate) fn limits(&self) -> &Limits {
        &self.limits
    }
}

fn on_stretch(
    form: &ClosedForm,
    from: &Rational,
    to: &Rational,
    order: u32,
    bits: u32,
    budget: &mut Budget,
) -> Option<Interval> {
    let half = Rational::new(1.into(), 2.into());
    let (centre, half_width) = ((from + to) * &half, (to - from) * &half);
    form.enclose(Stretch { centre: &centre, half_width: &half_width, order, bits }, budget).ok().flatten()
}

impl Problem {
    /// The degree of a product of families.
    pub(crate) fn degree(&self, factors: &[Factor]) -> usize {
        factors.iter().map(|f| self.families[f.family].degree() * f.multiplicity as usize).sum()
    }
}

/// A rational as a double, for choices that need no trust.
pub(crate) fn approx_value(x: &Rational) -> f64 {
    num_traits::ToPrimitive::to_f64(x).unwrap_or(f64::MAX)
}

/// The family of a polynomial, with approximations of its roots to a few bits more than asked for.
pub(crate) fn family(polynomial: &keepout_core::IntegerPolynomial, bits: u32) -> RootFamily {
    RootFamily { polynomial: polynomial.to_monic(), centres: crate::strategy::root::centres(polynomial, bits) }
}
