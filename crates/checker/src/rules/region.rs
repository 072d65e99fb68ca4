//! Rule `region`: a set of starts contains the trajectory from some instant on, is invariant, and avoids the zone.
//!
//! Needs: the roots that the set names; real and imaginary parts of the trajectory's exponents as the said combinations of base
//! rates and base frequencies; bands that hold the rates; the zone's polynomials expanded on the set (see `expansion`), with a
//! leading growth each; a bisection of the base angles, complete, with signs on each leaf from which the zone is false.
//! Not needed: independent base frequencies or rates (with a missed relation the set is larger, and so is what is proved). The
//! certificate's identities, which hold along the trajectory, are not used: they need not hold on the set.
//! Why: the flow moves a point of the set by phi + omega tau, y exp(scale tau), u_j exp(rho_j tau), T + tau, which the bands allow.
//! Source: docs/theorems/region.md.

use super::cell::set;
use crate::bisection::{Leaf, check_leaves};
use crate::certificate::Factor;
use crate::combination::{Part, rows};
use crate::error::{Checked, Duty, Obligation, Rejection, Rule};
use crate::expansion::Frame;
use crate::lead::{AngleBox, LeadForm};
use crate::limits::Budget;
use crate::model::Setting;
use crate::number::{Complex, Dyadic, Interval, Rational};
use crate::region::{Region, RegionProof};
use num_traits::{Signed, Zero};
use std::cmp::Ordering;
use std::collections::BTreeMap;

/// The leading part of each polynomial that has one; `None`: the polynomial is 0 on the set.
type Leads = BTreeMap<usize, Option<LeadForm>>;

/// Checks a set of starts. The certificate's sums have been checked.
pub(crate) fn check(region: &Region, proof: &RegionProof, on: Setting, budget: &mut Budget) -> Checked {
    let table = &on.model.table;
    let size = table.roots().len();
    budget.spend((proof.growths.len() + region.roots.len()).saturating_mul(64 * size * size), on.certificate.bits)?;
    check_roots(region, proof, on)?;
    check_exponents(region, proof, on, budget)?;
    check_bounds(region, proof, on)?;
    let unlisted = Duty::new(Rule::Region, Obligation::ExponentsAreListed, 0);
    let frame = Frame::new(region, &proof.roots, table, on.certificate.bits).ok_or_else(|| unlisted.refuted())?;
    let leads = leads(&frame, proof, on, budget)?;
    check_leaves((region.base.len(), &proof.nodes), Rule::Region, on.limits, |position, angles, leaf| {
        check_leaf(position, angles, leaf, &leads, on, budget)
    })
}

/// Each root of the set is the only one of its polynomial in its rectangle, and real if that is a segment of the real axis.
fn check_roots(region: &Region, proof: &RegionProof, on: Setting) -> Checked {
    let (table, bits) = (&on.model.table, on.certificate.bits);
    Duty::new(Rule::Region, Obligation::RootIsNamed, 0).ensure(proof.roots.len() == region.roots.len())?;
    for (position, (named, index)) in region.roots.iter().zip(&proof.roots).enumerate() {
        let duty = Duty::new(Rule::Region, Obligation::RootIsNamed, position);
        let root = table.roots().get(*index).ok_or_else(|| duty.refuted())?;
        let polynomial = table.polynomial(root.family).ok_or_else(|| duty.refuted())?;
        duty.ensure(polynomial.coefficients() == named.polynomial)?;
        duty.ensure(root.is_real == (named.im.0.is_zero() && named.im.1.is_zero()))?;
        duty.decide(is_within(&root.value.re, &named.re, bits) && is_within(&root.value.im, &named.im, bits))?;
        let side = |(lo, hi): &(Rational, Rational)| {
            Interval::hull(Interval::rational(lo, bits).lo().clone(), Interval::rational(hi, bits).hi().clone())
        };
        let rectangle = Complex { re: side(&named.re), im: side(&named.im) };
        let inside = table.candidates(&rectangle, &[Factor { family: root.family, multiplicity: 1 }]);
        duty.decide(inside.len() == 1)?;
    }
    Ok(())
}

/// Whether all members lie between two rationals.
fn is_within(x: &Interval, (lo, hi): &(Rational, Rational), bits: u32) -> bool {
    Interval::rational(lo, bits).hi() <= x.lo() && x.hi() <= Interval::rational(hi, bits).lo()
}

/// The real and imaginary parts of all exponents of the set are as listed, and an exponent that may be 0 has no growth and no turns.
///
/// The latter: a constant offset of the equations is matched by the term with exponent 0 alone, which must not be moved.
fn check_exponents(region: &Region, proof: &RegionProof, on: Setting, budget: &mut Budget) -> Checked {
    let listed = Duty::new(Rule::Region, Obligation::ExponentsAreListed, 0);
    let root = |position: &usize| proof.roots.get(*position).copied().ok_or_else(|| listed.refuted());
    let rates = region.rates.iter().map(|rate| root(&rate.root)).collect::<Result<Vec<_>, _>>()?;
    let base = region.base.iter().map(root).collect::<Result<Vec<_>, _>>()?;
    listed.ensure(region.scale.is_positive())?;
    let growths = rows(&proof.growths, Part::Real, &rates, &region.scale, on, budget)?;
    let angles = rows(&proof.angles, Part::Imaginary, &base, &region.scale, on, budget)?;
    for exponent in &region.exponents {
        let index = root(&exponent.root)?;
        let found = on.model.table.roots().get(index).ok_or_else(|| listed.refuted())?;
        let turns: Vec<Rational> = exponent.turns.iter().map(|n| Rational::from_integer((*n).into())).collect();
        let still = exponent.growth.iter().chain(&turns).all(Zero::is_zero);
        let rate = Duty::new(Rule::Region, Obligation::RateIsCombination, index);
        rate.ensure(growths.get(&index) == Some(&exponent.growth))?;
        let angle = Duty::new(Rule::Region, Obligation::AngleIsCombination, index);
        let none = vec![Rational::zero(); base.len()];
        angle.ensure(if found.is_real { turns == none } else { angles.get(&index) == Some(&turns) })?;
        let may_be_zero = found.value.re.certain_sign().is_none_or(|s| s == Ordering::Equal)
            && found.value.im.certain_sign().is_none_or(|s| s == Ordering::Equal);
        listed.ensure(still || !may_be_zero)?;
    }
    Ok(())
}

/// The bands hold the base rates; y and T begin where the trajectory is at `from`; the power bounds T for ever.
///
/// Lemma: let power scale exp(power l) >= 1 and exp(l) <= start. For y >= start, T <= y^power, tau >= 0: (y exp(scale tau))^power >=
/// y^power (1 + power scale tau) >= T + tau. So if also from <= exp(power l), then t <= exp(power scale t) for all t >= from.
fn check_bounds(region: &Region, proof: &RegionProof, on: Setting) -> Checked {
    let bits = on.certificate.bits;
    for (position, rate) in region.rates.iter().enumerate() {
        let duty = Duty::new(Rule::Region, Obligation::RateIsInBand, position);
        let index = proof.roots.get(rate.root).ok_or_else(|| duty.refuted())?;
        let root = on.model.table.roots().get(*index).ok_or_else(|| duty.refuted())?;
        duty.decide(is_within(&root.value.re, &(&region.scale * &rate.lo, &region.scale * &rate.hi), bits))?;
    }
    let contains = Duty::new(Rule::Region, Obligation::SetContainsTrajectory, 0);
    contains.ensure(region.from.is_positive() && region.start.is_positive())?;
    let exp = |x: &Rational| Complex::real(Interval::rational(x, bits)).exp(bits).map(|e| e.re);
    let start = Interval::rational(&region.start, bits);
    let first = exp(&(&region.scale * &region.from)).ok_or_else(|| contains.inconclusive())?;
    let below = exp(&proof.log_start).ok_or_else(|| contains.inconclusive())?;
    contains.decide(start.hi() <= first.lo() && below.hi() <= start.lo())?;
    if let Some(power) = &region.power {
        let bounds = Duty::new(Rule::Region, Obligation::PowerBoundsTime, 0);
        bounds.ensure(power.is_positive())?;
        let reach = exp(&(power * &proof.log_start)).ok_or_else(|| bounds.inconclusive())?;
        let slope = reach.mul(&Interval::rational(&(power * &region.scale), bits), bits);
        bounds.decide(*slope.lo() >= Dyadic::power_of_two(0))?;
        bounds.decide(*reach.lo() >= *Interval::rational(&region.from, bits).hi())?;
    }
    Ok(())
}

/// The zone's polynomials on the set: those that are 0 on it, and those with a lead.
fn leads(frame: &Frame, proof: &RegionProof, on: Setting, budget: &mut Budget) -> Result<Leads, Rejection> {
    let statement = &on.certificate.statement;
    // The states are the last traces.
    let zone = on.model.formula.polynomials.len().saturating_sub(statement.states.len());
    let mut coordinates = Vec::new();
    for (position, function) in on.model.functions.iter().skip(zone).take(statement.states.len()).enumerate() {
        let listed = Duty::new(Rule::Region, Obligation::ExponentsAreListed, position);
        coordinates.push(frame.coordinate(&function.form).ok_or_else(|| listed.refuted())?);
    }
    let mut leads = Leads::new();
    for (position, polynomial) in on.model.formula.polynomials.iter().take(zone).enumerate() {
        let of_states = Duty::new(Rule::Region, Obligation::ZoneIsOfStates, position);
        let expansion = frame.expand(polynomial, statement, &coordinates, on.limits, budget)?;
        let expansion = expansion.ok_or_else(|| of_states.refuted())?;
        let function = on.model.functions.get(position).ok_or_else(|| of_states.refuted())?;
        let expansion = frame.without_zeros(&expansion, &function.form, budget)?;
        if expansion.is_empty() {
            leads.insert(position, None);
        }
        for lead in proof.leads.iter().filter(|lead| lead.function == position) {
            let dominates = Duty::new(Rule::Region, Obligation::LeadDominates, position);
            let key = (lead.growth.as_slice(), usize::try_from(lead.power).unwrap_or(usize::MAX));
            let form = frame.lead_form(&expansion, key, &proof.log_start).ok_or_else(|| dominates.inconclusive())?;
            leads.insert(position, Some(form));
        }
    }
    Ok(leads)
}

/// On a leaf of the bisection the signs hold and refute the zone.
fn check_leaf(
    position: usize,
    angles: &AngleBox,
    (listed, pivot): Leaf,
    leads: &Leads,
    on: Setting,
    budget: &mut Budget,
) -> Checked {
    let on_leaf = Duty::new(Rule::Region, Obligation::SignOnLeaf, position);
    let mut signs = on.no_signs();
    for (index, sign) in listed {
        match leads.get(index).ok_or_else(|| on_leaf.refuted())? {
            None => on_leaf.ensure(*sign == Ordering::Equal)?,
            Some(form) => {
                budget.spend(200 * form.count(), on.certificate.bits)?;
                on_leaf.sign(&form.enclose(angles).ok_or_else(|| on_leaf.inconclusive())?, *sign)?;
            }
        }
        set(&mut signs, *index, *sign);
    }
    // The formula alone, without the certificate's identities.
    let refuted = pivot.is_none() && on.model.formula.truth(&signs) == Some(false);
    Duty::new(Rule::Region, Obligation::ZoneIsRefutedOnLeaf, position).ensure(refuted)
}
