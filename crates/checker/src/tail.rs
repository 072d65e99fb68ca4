//! Support functions for all large times.
//!
//! Lemma: let t >= T > 0 and divide S(t) by t^J. A function f splits into waves of constant size times t^J on the imaginary axis, and a rest
//! that is at most its bound at T (see `lead`, with rho = 0). A constant k >= 0 divided by t^J is at most k / T^J. A signal's response with
//! negative real parts only adds at most r (I(T) + R), I(T) the integral of its size up to T, R that of a bound of its size from T on:
//! int_T^inf t^j exp(rho t) dt = exp(rho T) sum_(i <= j) j! / (j - i)! T^(j-i) / |rho|^(i+1) for rho < 0.

use crate::error::{Duty, Obligation, Rejection, Rule};
use crate::lead::{AngleBox, LeadForm, halves, whole_torus};
use crate::limits::{Budget, Limits, within};
use crate::many::{Tail, TailLead};
use crate::number::Direction::Up;
use crate::number::{Complex, Dyadic, Interval, Rational};
use crate::support::{Inputs, Shape, Support};
use crate::trace::ClosedForm;
use num_traits::Zero;
use std::cmp::Ordering;

/// A tail, the leading terms of one functional, and their angles.
pub type Leading<'a> = (&'a Tail, &'a TailLead, &'a [(usize, Vec<i64>)]);

/// The leading parts of one support function and a constant that bounds all else.
pub struct TailForm {
    central: LeadForm,
    starts: Vec<LeadForm>,
    shape: Shape,
    constant: Dyadic,
    bits: u32,
}

impl TailForm {
    /// An upper bound on a box of angles, for all t from the tail's start on. `None`: an angle is out of range.
    pub fn on_leaf(&self, angles: &AngleBox) -> Option<Dyadic> {
        let value = on_leaf(&self.central, &self.starts, &self.shape, angles, self.bits)?;
        // SOUND(hi): a sum of upper bounds, rounded up.
        Some(value.add(&self.constant, self.bits, Up))
    }

    /// About the work of one leaf.
    fn work(&self) -> usize {
        200 * (self.central.count() + self.starts.iter().map(LeadForm::count).sum::<usize>() + 1)
    }
}

impl Support {
    /// Splits S(t) / t^power for all t from the tail's start on.
    ///
    /// # Errors
    /// Inconclusive where a lower term may still increase or a signal's response does not decay.
    pub fn tail_form(
        &self,
        inputs: &Inputs,
        integrals: &[Dyadic],
        (tail, lead, leading): Leading,
        position: usize,
        (bits, budget): (u32, &mut Budget),
    ) -> Result<TailForm, Rejection> {
        let covers = Duty::new(Rule::WorstCase, Obligation::LeavesCoverTorus, position);
        let top = usize::try_from(lead.power).unwrap_or(usize::MAX).saturating_add(1);
        let split =
            |form: &ClosedForm| LeadForm::split(form, (leading, top), &Dyadic::zero(), &tail.from, position, bits);
        let central = split(&self.central)?;
        let starts = self.responses.iter().map(split).collect::<Result<Vec<_>, _>>()?;
        let mut constant = Interval::rational(&self.direct, bits);
        for ((form, (_, size)), before) in self.signals.iter().zip(&inputs.signals).zip(integrals) {
            budget.spend(400 * form.terms.len(), bits)?;
            // A signal of size 0 adds nothing, whatever its response is.
            if size.is_zero() {
                continue;
            }
            let rest = integral_from(form, &tail.from, position, bits)?;
            // SOUND(hi): a sum of upper bounds, rounded up.
            let whole = Interval::point(before.add(&rest, bits, Up));
            constant = constant.add(&whole.mul(&Interval::rational(size, bits), bits), bits);
        }
        let growth = Interval::rational(&tail.from, bits).power(lead.power, bits).recip(bits);
        let constant = constant.mul(&growth.ok_or_else(|| covers.inconclusive())?, bits);
        Ok(TailForm { central, starts, shape: inputs.shape.clone(), constant: constant.hi().clone(), bits })
    }

    /// An upper bound of S(t) / t^power for all t from the tail's start on; of S(t) itself for the power 0.
    ///
    /// # Errors
    /// As [`Support::tail_form`]; and where the boxes are not the whole torus.
    pub fn on_tail(
        &self,
        inputs: &Inputs,
        integrals: &[Dyadic],
        leading: Leading,
        position: usize,
        (limits, bits, budget): (&Limits, u32, &mut Budget),
    ) -> Result<Dyadic, Rejection> {
        let covers = Duty::new(Rule::WorstCase, Obligation::LeavesCoverTorus, position);
        let form = self.tail_form(inputs, integrals, leading, position, (bits, budget))?;
        let mut open: Vec<(AngleBox, u64)> = vec![(whole_torus(leading.0.base.len()), 0)];
        let mut greatest: Option<Dyadic> = None;
        for node in &leading.1.nodes {
            budget.spend(form.work(), bits)?;
            let (angles, depth) = open.pop().ok_or_else(|| covers.refuted())?;
            if let Some(axis) = node {
                within("depth", usize::try_from(depth + 1).unwrap_or(usize::MAX), limits.depth)?;
                let (lower, upper) = halves(&angles, *axis).ok_or_else(|| covers.refuted())?;
                open.push((upper, depth + 1));
                open.push((lower, depth + 1));
                continue;
            }
            let value = form.on_leaf(&angles).ok_or_else(|| covers.inconclusive())?;
            greatest = Some(greatest.map_or(value.clone(), |g| g.max(value)));
        }
        covers.ensure(open.is_empty())?;
        greatest.ok_or_else(|| covers.refuted())
    }
}

/// An upper bound of the leading part with the starts' on a box of angles.
fn on_leaf(central: &LeadForm, starts: &[LeadForm], shape: &Shape, angles: &AngleBox, bits: u32) -> Option<Dyadic> {
    match shape {
        Shape::Sum => {
            let (mut total, mut more) = (central.clone(), Dyadic::zero());
            for form in starts {
                let value = form.enclose(angles)?;
                match value.certain_sign() {
                    Some(sign) => total = total.plus(form, sign == Ordering::Less),
                    // SOUND(hi): a sum of upper bounds, rounded up.
                    None => more = more.add(&value.abs_hi(), bits, Up),
                }
            }
            // SOUND(hi): as above.
            Some(total.enclose(angles)?.hi().add(&more, bits, Up))
        }
        Shape::Hull => {
            let corner = |form: &LeadForm| Some(central.plus(form, false).enclose(angles)?.hi().clone());
            let corners = starts.iter().map(corner).collect::<Option<Vec<_>>>()?;
            Some(corners.into_iter().fold(central.enclose(angles)?.hi().clone(), Dyadic::max))
        }
        Shape::Ellipsoid(weights) => {
            let mut square = Interval::integer(0);
            for (weight, form) in weights.iter().zip(starts) {
                let value = form.enclose(angles)?.square(bits);
                square = square.add(&value.mul(&Interval::rational(weight, bits), bits), bits);
            }
            // SOUND(hi): a sum of upper bounds, rounded up.
            Some(central.enclose(angles)?.hi().add(&square.hi().sqrt_up(bits), bits, Up))
        }
    }
}

/// An upper bound of the integral of |f| from an instant on, all real parts being negative.
fn integral_from(form: &ClosedForm, from: &Rational, position: usize, bits: u32) -> Result<Dyadic, Rejection> {
    let decays = Duty::new(Rule::WorstCase, Obligation::LowerRealPartIsLess, position);
    let start = Interval::rational(from, bits);
    let mut total = Dyadic::zero();
    for term in &form.terms {
        let rho = Interval::point(term.exponent.re.hi().clone());
        decays.decide(rho.hi().sign() == Ordering::Less)?;
        let inverse = rho.neg().recip(bits).ok_or_else(|| decays.inconclusive())?;
        // exp(x) <= exp(-2^39) where x is below: `exp` refuses greater arguments.
        let argument = rho.mul(&start, bits).hi().clone().max(Dyadic::power_of_two(39).neg());
        let decay = Complex::real(Interval::point(argument)).exp(bits).ok_or_else(|| decays.inconclusive())?.re;
        for (j, c) in term.coefficients.iter().enumerate() {
            let (mut sum, mut factor) = (Interval::integer(0), inverse.clone());
            for i in 0..=j {
                let power = start.power(u32::try_from(j - i).unwrap_or(u32::MAX), bits);
                sum = sum.add(&factor.mul(&power, bits), bits);
                let next = Interval::integer(i64::try_from(j - i).unwrap_or(0));
                factor = factor.mul(&next, bits).mul(&inverse, bits);
            }
            let size = Interval::point(c.abs_hi(bits).scale(i64::from(!term.is_real)));
            // SOUND(hi): products and sums of upper bounds of non-negative numbers, rounded up.
            total = total.add(size.mul(&sum, bits).mul(&decay, bits).hi(), bits, Up);
        }
    }
    Ok(total)
}
