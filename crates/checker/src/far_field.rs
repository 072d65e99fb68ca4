//! Leading terms of functions for all large times, on the torus of the angles of their roots: what the rules `cone` and
//! `inseparable` share.
//!
//! Needs: for each function used, leading roots with exactly equal real parts, the others with smaller ones; for each leading
//! root that is not real, its angle as an integer combination of base angles. Not needed: that a leading coefficient is not
//! zero (then no sign can be proved).

use crate::certificate::{Angle, FarField, Lead, RealPart, RootRef, Sign};
use crate::error::{Checked, Duty, Obligation, Rejection, Rule};
use crate::lead::{AngleBox, LeadForm};
use crate::limits::Budget;
use crate::model::Setting;
use crate::number::Dyadic;
use crate::range::{Growth, Range, sign_of_products};
use num_traits::Signed;
use std::cmp::Ordering;
use std::collections::BTreeMap;

/// The turns of each root whose angle is known.
pub(crate) type Turns = BTreeMap<usize, Vec<i64>>;

/// The leading part of each function that has one in the certificate.
pub(crate) struct Leads {
    forms: BTreeMap<usize, LeadForm>,
    growths: BTreeMap<usize, Growth>,
}

impl Leads {
    /// Proves a far field. The certificate's sums have been checked.
    pub(crate) fn new(far: &FarField, rule: Rule, on: Setting, budget: &mut Budget) -> Result<Self, Rejection> {
        let Setting { certificate, model, .. } = on;
        Duty::new(rule, Obligation::FarFieldStartsLate, 0).ensure(far.from.is_positive())?;
        let turns = check_angles((&far.base, &far.angles), on)?;
        let mut leads = Self { forms: BTreeMap::new(), growths: BTreeMap::new() };
        for lead in &far.leads {
            let known = Duty::new(Rule::Cone, Obligation::AngleIsCombination, lead.function);
            let function = model.functions.get(lead.function).ok_or_else(|| known.refuted())?;
            // A line of symmetry is shown by a product of polynomials for each root.
            let size = model.table.roots().len();
            budget.spend((size * size).saturating_mul(64 * lead.roots.len()) + 100 * size, certificate.bits)?;
            let rho_lo = check_real_parts(lead, on, budget)?;
            let mut leading = Vec::new();
            for root in &lead.roots {
                let known = Duty::new(Rule::Cone, Obligation::AngleIsCombination, *root);
                let is_real = model.table.roots().get(*root).is_some_and(|r| r.is_real);
                let angle = if is_real { Some(vec![0; far.base.len()]) } else { turns.get(root).cloned() };
                leading.push((*root, angle.ok_or_else(|| known.refuted())?));
            }
            let form = LeadForm::new(&function.form, &leading, &rho_lo, &far.from, lead.function, certificate.bits)?;
            let (t0, bits) = (&far.from, certificate.bits);
            let growth = Growth::new(form.clone(), lead, &function.form, &model.table, t0, bits);
            leads.growths.extend(growth.map(|growth| (lead.function, growth)));
            leads.forms.insert(lead.function, form);
        }
        Ok(leads)
    }

    /// Proves that a function has this sign on a box of angles; `Equal` only for the zero function.
    pub(crate) fn prove_sign(
        &self,
        function: usize,
        sign: Sign,
        angles: &AngleBox,
        duty: Duty,
        on: Setting,
        budget: &mut Budget,
    ) -> Checked {
        duty.ensure(self.sign(function, angles, duty, on, budget)? == sign)
    }

    /// The sign of a function on a box of angles.
    pub(crate) fn sign(
        &self,
        function: usize,
        angles: &AngleBox,
        duty: Duty,
        on: Setting,
        budget: &mut Budget,
    ) -> Result<Sign, Rejection> {
        let known = on.model.functions.get(function).ok_or_else(|| duty.refuted())?;
        if known.is_zero() {
            return Ok(Ordering::Equal);
        }
        if !known.products.is_empty() {
            let bits = on.certificate.bits;
            budget.spend(known.products.len().saturating_mul(2_000), bits)?;
            let range = |position: &usize| {
                let zero = on.model.functions.get(*position).filter(|f| f.is_zero()).map(|_| Range::zero());
                zero.or_else(|| self.growths.get(position)?.range(angles))
            };
            let pairs = known.products.iter().map(|(c, a)| Some((range(c)?, range(a)?)));
            return sign_of_products(pairs, bits).ok_or_else(|| duty.inconclusive());
        }
        let form = self.forms.get(&function).ok_or_else(|| duty.refuted())?;
        budget.spend(200 * form.count(), on.certificate.bits)?;
        form.enclose(angles).and_then(|value| value.certain_sign()).ok_or_else(|| duty.inconclusive())
    }
}

/// Checks that the leading roots have equal real parts; returns a lower bound of it.
fn check_real_parts(lead: &Lead, on: Setting, budget: &mut Budget) -> Result<Dyadic, Rejection> {
    let Setting { certificate, model, .. } = on;
    let equal = Duty::new(Rule::Cone, Obligation::RealPartsAreEqual, lead.function);
    match &lead.real_part {
        RealPart::Single => equal.ensure(lead.roots.len() == 1)?,
        RealPart::Line(line) => {
            for root in &lead.roots {
                let on_line = Duty::new(Rule::Equality, Obligation::RootIsOnLine, *root);
                model.table.spend_reflection(*root, budget)?;
                let decided =
                    model.table.is_on_line(*root, line, certificate.bits).ok_or_else(|| on_line.inconclusive())?;
                on_line.ensure(decided)?;
            }
        }
        RealPart::Doubled(sums) => {
            equal.ensure(sums.len() == lead.roots.len())?;
            let mut doubles = Vec::new();
            for (index, root) in sums.iter().zip(&lead.roots) {
                let sum = certificate.sums.get(*index).ok_or_else(|| equal.refuted())?;
                let pair = [false, true].map(|conjugate| (1, RootRef { index: *root, conjugate }));
                equal.ensure(sum.parts == pair)?;
                doubles.push(sum.root.index);
            }
            // root + conj root is real, so the root that it is is real: the position alone names it.
            equal.ensure(doubles.windows(2).all(|pair| pair.first() == pair.last()))?;
        }
    }
    // SOUND(lo): rho is in the real enclosure of each leading root, so each lower end is a lower bound.
    let ends = lead.roots.iter().filter_map(|r| model.table.roots().get(*r)).map(|r| r.value.re.lo().clone());
    ends.max().ok_or_else(|| equal.refuted())
}

/// Checks the angles in order; returns the turns of each root that is not real.
///
/// Lemma: a sum n_1 a + n_2 b = r of roots holds for imaginary parts too; the imaginary part of conj a is minus that of a, and
/// that of a real root is 0.
pub(crate) fn check_angles((base, angles): (&[usize], &[Angle]), on: Setting) -> Result<Turns, Rejection> {
    let Setting { certificate, model, .. } = on;
    let mut turns = Turns::new();
    let is_real = |index: usize| model.table.roots().get(index).is_some_and(|r| r.is_real);
    for angle in angles {
        let duty = Duty::new(Rule::Cone, Obligation::AngleIsCombination, angle.root);
        let Some(position) = angle.sum else {
            let unit: Vec<i64> = base.iter().map(|b| i64::from(*b == angle.root)).collect();
            duty.ensure(!is_real(angle.root) && unit.iter().sum::<i64>() == 1 && unit == angle.turns)?;
            turns.insert(angle.root, unit);
            continue;
        };
        let sum = certificate.sums.get(position).ok_or_else(|| duty.refuted())?;
        let mut total = vec![0_i64; base.len()];
        for (times, part) in &sum.parts {
            if is_real(part.index) {
                continue;
            }
            let known = turns.get(&part.index).ok_or_else(|| duty.refuted())?;
            let sign = if part.conjugate { -1 } else { 1 };
            for (slot, n) in total.iter_mut().zip(known) {
                *slot = times
                    .checked_mul(*n)
                    .and_then(|x| x.checked_mul(sign))
                    .and_then(|x| slot.checked_add(x))
                    .ok_or_else(|| duty.refuted())?;
            }
        }
        let expected: Vec<i64> = if sum.root.conjugate { total.iter().map(|n| -n).collect() } else { total };
        duty.ensure(sum.root.index == angle.root && expected == angle.turns)?;
        turns.insert(angle.root, expected);
    }
    Ok(turns)
}
