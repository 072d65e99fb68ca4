//! Bounds of functions for all large times, unbounded ends included: what exponentials of states need of the far field.
//!
//! Lemma: let g = t^J exp(rho t) v with lo <= v <= hi for all t >= t0 > 0, and G = t0^J exp(rho t0). If rho = 0 and J = 0, then
//! lo <= g <= hi. If rho < 0 and J <= -rho t0, then t^J exp(rho t) decreases from t0 on: min(lo, 0) G <= g <= max(hi, 0) G.
//! Otherwise (rho > 0, or rho = 0 < J) it increases: g >= lo G if lo > 0, g <= hi G if hi < 0.

use crate::certificate::{Lead, RealPart, Sign};
use crate::lead::{AngleBox, LeadForm};
use crate::number::Direction::{Down, Up};
use crate::number::{Complex, Dyadic, Interval, Rational};
use crate::root::RootTable;
use crate::trace::ClosedForm;
use num_traits::Zero;
use std::cmp::Ordering;

/// All values from `lo` to `hi`; `None`: no bound on that side.
#[derive(Clone, Debug)]
pub struct Range {
    lo: Option<Dyadic>,
    hi: Option<Dyadic>,
}

/// A leading part with the growth of its factor t^J exp(rho t).
#[derive(Clone, Debug)]
pub struct Growth {
    /// The leading part.
    pub form: LeadForm,
    /// J > 0, or rho != 0.
    grows: Option<Ordering>,
    /// Encloses t0^J exp(rho t0).
    factor: Interval,
    bits: u32,
}

impl Growth {
    /// The growth of a function with these leading terms. `None`: the sign of rho, or whether the factor decreases from t0 on, is not
    /// decided. The certificate's reasons for equal real parts have been checked.
    pub fn new(
        form: LeadForm,
        lead: &Lead,
        closed: &ClosedForm,
        table: &RootTable,
        t0: &Rational,
        bits: u32,
    ) -> Option<Self> {
        let root = table.roots().get(*lead.roots.first()?)?;
        let terms = closed.terms.iter().filter(|t| lead.roots.contains(&t.root));
        let power = terms.map(|t| t.coefficients.len()).max()?.checked_sub(1)?;
        let is_zero = match &lead.real_part {
            RealPart::Line(line) => line.is_zero(),
            // The root of z is 0 exactly.
            RealPart::Single | RealPart::Doubled(_) => {
                let polynomial = table.polynomial(root.family)?;
                polynomial.degree() == 1 && polynomial.coefficients().first().is_some_and(Zero::is_zero)
            }
        };
        let sign = if is_zero { Ordering::Equal } else { root.value.re.certain_sign()? };
        let start = Interval::rational(t0, bits);
        let exponent = if is_zero { Interval::integer(0) } else { root.value.re.mul(&start, bits) };
        let grows = match (sign, power) {
            (Ordering::Equal, 0) => None,
            (Ordering::Less, _) => {
                // SOUND(hi): -rho t0 >= J holds if it does for the upper end of rho t0.
                let slowest = exponent.hi().neg();
                (slowest >= Dyadic::new(power.into(), 0)).then_some(Some(Ordering::Less))?
            }
            _ => Some(Ordering::Greater),
        };
        let factor = Complex::real(exponent).exp(bits)?.re.mul(&start.power(u32::try_from(power).ok()?, bits), bits);
        Some(Self { form, grows, factor, bits })
    }

    /// Bounds the function on a box of angles, for all times from t0 on.
    pub fn range(&self, angles: &AngleBox) -> Option<Range> {
        let value = self.form.enclose(angles)?;
        let (lo, hi) = (value.lo().clone(), value.hi().clone());
        let zero = Dyadic::zero();
        let (least, greatest) = (self.factor.lo(), self.factor.hi());
        Some(match self.grows {
            None => Range { lo: Some(lo), hi: Some(hi) },
            // SOUND(lo, hi): a negative lower end times the greatest factor, rounded down; a positive upper end likewise, up.
            Some(Ordering::Less) => Range {
                lo: Some(lo.min(zero.clone()).mul(greatest, self.bits, Down)),
                hi: Some(hi.max(zero).mul(greatest, self.bits, Up)),
            },
            // SOUND(lo, hi): a positive lower end times the least factor, rounded down; a negative upper end likewise, up.
            Some(_) => Range {
                lo: (lo > zero).then(|| lo.mul(least, self.bits, Down)),
                hi: (hi < zero).then(|| hi.mul(least, self.bits, Up)),
            },
        })
    }
}

impl Range {
    /// The number 0.
    pub fn zero() -> Self {
        Self { lo: Some(Dyadic::zero()), hi: Some(Dyadic::zero()) }
    }

    /// exp of all values.
    fn exp(&self, bits: u32) -> Option<Self> {
        // SOUND(lo): exp(x) > 0; for a very small x, where `exp` refuses, 0 is a lower bound and exp(-2^39) an upper one.
        let floor = Dyadic::power_of_two(39).neg();
        let of = |x: &Dyadic| Complex::real(Interval::point(x.clone().max(floor.clone()))).exp(bits);
        let lo = match self.lo.as_ref().filter(|x| **x > floor) {
            Some(x) => of(x)?.re.lo().clone(),
            None => Dyadic::zero(),
        };
        let hi = match &self.hi {
            Some(x) => Some(of(x)?.re.hi().clone()),
            None => None,
        };
        Some(Self { lo: Some(lo), hi })
    }

    /// The products with values of a range of positive numbers.
    fn times_positive(&self, factor: &Self, bits: u32) -> Self {
        let zero = Dyadic::zero();
        let least = factor.lo.clone().unwrap_or_else(Dyadic::zero).max(zero.clone());
        // SOUND(lo, hi): a bound on the side of zero is multiplied by the least factor, one beyond zero by the greatest; rounded outward.
        let end = |x: &Dyadic, is_inner: bool, direction| {
            if is_inner {
                Some(x.mul(&least, bits, direction))
            } else {
                Some(x.mul(factor.hi.as_ref()?, bits, direction))
            }
        };
        Self {
            lo: self.lo.as_ref().and_then(|x| end(x, *x >= zero, Down)),
            hi: self.hi.as_ref().and_then(|x| end(x, *x <= zero, Up)),
        }
    }

    /// The sums.
    fn plus(&self, other: &Self, bits: u32) -> Self {
        let sum =
            |a: &Option<Dyadic>, b: &Option<Dyadic>, direction| Some(a.as_ref()?.add(b.as_ref()?, bits, direction));
        // SOUND(lo, hi): sums of bounds on one side, rounded outward.
        Self { lo: sum(&self.lo, &other.lo, Down), hi: sum(&self.hi, &other.hi, Up) }
    }

    /// The sign of all values.
    fn certain_sign(&self) -> Option<Sign> {
        let zero = Dyadic::zero();
        match (&self.lo, &self.hi) {
            (Some(lo), _) if *lo > zero => Some(Ordering::Greater),
            (_, Some(hi)) if *hi < zero => Some(Ordering::Less),
            _ => None,
        }
    }
}

/// The sign of sum of c exp(a) for ranges of (c, a); `None`: not decided, or a range is missing.
pub fn sign_of_products(products: impl Iterator<Item = Option<(Range, Range)>>, bits: u32) -> Option<Sign> {
    let mut sum = Range::zero();
    for pair in products {
        let (coefficient, argument) = pair?;
        sum = sum.plus(&coefficient.times_positive(&argument.exp(bits)?, bits), bits);
    }
    sum.certain_sign()
}
