//! Rule `inseparable`: from some instant on, a point of the trajectory cone is in the zone at each time.
//!
//! Needs: base frequencies that are independent over the rationals; leading terms of functions (see `far_field`); a box of angles,
//! functions with an axis each whose signs on the two faces across that axis are opposite, and signs on the whole box, such
//! that the zone is true where the former vanish.
//! Not needed: that the trajectory ever enters the zone. It need not.
//! Why: the orbit of independent frequencies is dense, so the box is part of the cone's torus. At each t the functions vanish
//! together at a point of the box (Poincare-Miranda theorem; Kulpa, Amer. Math. Monthly 104:545-550, 1997). So each cone meets
//! the zone, and each o-minimal invariant that contains the trajectory contains a cone (doi:10.4230/LIPIcs.ICALP.2020.107).
//! Source: docs/theorems/inseparable.md.

use super::cell::set;
use crate::certificate::Meeting;
use crate::error::{Checked, Duty, Obligation, Rule};
use crate::far_field::Leads;
use crate::limits::Budget;
use crate::model::Setting;
use crate::number::{Dyadic, Interval, Rational};
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{Signed, Zero};
use std::cmp::Ordering;

/// Checks that the zone meets the trajectory cone at each time from meeting.far.from on.
pub(crate) fn check(meeting: &Meeting, on: Setting, budget: &mut Budget) -> Checked {
    let rule = Rule::Inseparable;
    let leads = Leads::new(&meeting.far, rule, on, budget)?;
    let independent = Duty::new(rule, Obligation::FrequenciesAreIndependent, 0);
    for root in &meeting.far.base {
        on.model.table.spend_reflection(*root, budget)?;
    }
    let decided = are_independent(&meeting.far.base, on).ok_or_else(|| independent.inconclusive())?;
    independent.ensure(decided && meeting.angles.len() == meeting.far.base.len())?;
    let mut signs = on.no_signs();
    for (position, (function, axis)) in meeting.zeros.iter().enumerate() {
        let opposite = Duty::new(rule, Obligation::FacesHaveOppositeSigns, position);
        opposite.ensure(meeting.zeros.iter().take(position).all(|(_, other)| other != axis))?;
        let (centre, radius) = meeting.angles.get(*axis).ok_or_else(|| opposite.refuted())?;
        let mut found = Vec::new();
        for end in [centre - radius, centre + radius] {
            let mut face = meeting.angles.clone();
            if let Some(slot) = face.get_mut(*axis) {
                *slot = (end, Rational::zero());
            }
            found.push(leads.sign(*function, &face, opposite, on, budget)?);
        }
        opposite
            .ensure(found == [Ordering::Less, Ordering::Greater] || found == [Ordering::Greater, Ordering::Less])?;
        set(&mut signs, *function, Ordering::Equal);
    }
    for (function, sign) in &meeting.signs {
        let on_box = Duty::new(rule, Obligation::SignOnLeaf, 0);
        leads.prove_sign(*function, *sign, &meeting.angles, on_box, on, budget)?;
        set(&mut signs, *function, *sign);
    }
    Duty::new(rule, Obligation::ZoneIsProvedOnTorus, 0).ensure(on.truth(signs) == Some(true))
}

/// Whether the imaginary parts of the base roots are linearly independent over the rationals; `None`: not decided.
///
/// One frequency is: it is not 0. Lemma (squares): square roots of positive rationals are independent if no product of two of
/// these rationals is a square of a rational (Besicovitch, J. London Math. Soc. 15:3-6, 1940).
fn are_independent(base: &[usize], on: Setting) -> Option<bool> {
    let squares: Vec<Option<Rational>> = base.iter().map(|root| square_of_frequency(*root, on)).collect();
    match (squares.into_iter().collect::<Option<Vec<_>>>(), base) {
        (Some(squares), _) => {
            Some(squares.iter().enumerate().all(|(i, a)| squares.iter().skip(i + 1).all(|b| !is_square(&(a * b)))))
        }
        (None, [_]) => Some(true),
        (None, [first, second]) => is_irrational_ratio(*first, *second, on).then_some(true),
        (None, _) => None,
    }
}

/// omega^2 for a root of z^2 + b z + c: c - b^2 / 4.
fn square_of_frequency(root: usize, on: Setting) -> Option<Rational> {
    let family = on.model.table.roots().get(root)?.family;
    let [c, b, _] = on.model.table.polynomial(family)?.coefficients() else { return None };
    Some(c - b * b / Rational::from_integer(4_i32.into())).filter(Signed::is_positive)
}

fn is_square(x: &Rational) -> bool {
    [x.numer(), x.denom()].into_iter().all(|n| !n.is_negative() && &n.sqrt().pow(2) == n)
}

/// Whether the ratio of the frequencies is certainly irrational.
///
/// Lemma: let a_1, a_2 be roots of monic polynomials with integer coefficients, N the constant term of the second, N != 0. Then
/// N / a_2 is an algebraic integer (divide the equation by a_2). So N a_1 / a_2 is one, and an integer if it is rational.
fn is_irrational_ratio(first: usize, second: usize, on: Setting) -> bool {
    let (Some((l, _)), Some((m, n))) = (integral(first, on), integral(second, on)) else { return false };
    let (roots, bits) = (on.model.table.roots(), on.certificate.bits);
    let frequency = |root: usize| roots.get(root).map(|r| r.value.im.clone());
    let (Some(a), Some(b)) = (frequency(first), frequency(second)) else { return false };
    let factor = Interval::rational(&Rational::new(n.abs() * l, m), bits);
    b.recip(bits).is_some_and(|b| has_no_integer(&a.mul(&b, bits).mul(&factor, bits)))
}

/// For a root sigma + i omega, sigma rational: an integer l > 0 such that l i omega is a root of a monic polynomial with integer
/// coefficients, and the constant term of that. `None`: that the real part is sigma is not shown, or the constant term is 0.
fn integral(root: usize, on: Setting) -> Option<(BigInt, BigInt)> {
    let table = &on.model.table;
    let polynomial = table.polynomial(table.roots().get(root)?.family)?;
    let degree = polynomial.degree();
    // The only rational that can be the real part by symmetry.
    let line = polynomial.mean()?;
    if table.is_on_line(root, &line, on.certificate.bits) != Some(true) {
        return None;
    }
    // q(line - z) has the roots line - mu, i omega or its conjugate among them; its leading coefficient is 1 or -1.
    let shifted = polynomial.reflected(&line);
    let l = shifted.coefficients().iter().fold(BigInt::from(1_i32), |l, c| l.lcm(c.denom()));
    let constant = shifted.coefficients().first()? * Rational::from_integer(l.pow(u32::try_from(degree).ok()?));
    (!constant.is_zero()).then(|| (l, constant.to_integer()))
}

/// Whether no integer lies in an interval of positive numbers.
fn has_no_integer(x: &Interval) -> bool {
    // A lower end with a positive exponent is an integer itself.
    let Ok(shift) = u64::try_from(-x.lo().exponent()) else { return false };
    // SOUND(lo): the greatest integer that is at most the lower end; the next one is to be above the upper end.
    let floor = x.lo().mantissa() >> shift;
    let (below, above) = (Dyadic::new(floor.clone(), 0), Dyadic::new(floor + BigInt::from(1_i32), 0));
    below < *x.lo() && *x.hi() < above
}
