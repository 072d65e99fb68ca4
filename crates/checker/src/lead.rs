//! The leading part of a trace on the torus of its frequencies.
//!
//! Lemma: order the terms t^j exp(mu t) by (Re mu, j). Let (rho, J) be the greatest and write g = t^J exp(rho t) (f + r), f the
//! sum of the leading terms c exp(i theta), r the rest. For t >= t0 > 0 a term of r is at most |c| t0^(j-J) exp((rho' - rho) t0)
//! if t^(j-J) exp((rho' - rho) t) decreases from t0 on: for rho' = rho because then j < J; for rho' < rho if (rho - rho') t0 >= j - J.
//! The sign of g at t is that of f + r.

use crate::error::{Duty, Obligation, Rejection, Rule};
use crate::number::Direction::{Down, Up};
use crate::number::{Complex, Dyadic, Interval, Rational};
use crate::trace::ClosedForm;
use num_bigint::BigInt;
use num_traits::One;

/// One leading term: `weight * Re(coefficient exp(i turns . phi))`, weight 1 for a real root, 2 for a conjugate pair.
#[derive(Clone, Debug)]
struct Wave {
    coefficient: Complex,
    turns: Vec<i64>,
}

/// f and a bound of |r| for all times from t0 on.
#[derive(Clone, Debug)]
pub struct LeadForm {
    waves: Vec<Wave>,
    rest: Dyadic,
    bits: u32,
}

/// A box of angles: on each axis a centre and half the width.
pub type AngleBox = Vec<(Rational, Rational)>;

impl LeadForm {
    /// Splits a closed form at its leading terms: the given roots with the given turns (none for a real root), all of
    /// real part exactly rho; `rho_lo` <= rho.
    ///
    /// # Errors
    /// Inconclusive where another root's real part is not certainly smaller, or a lower term may still increase at t0.
    pub fn new(
        form: &ClosedForm,
        leading: &[(usize, Vec<i64>)],
        rho_lo: &Dyadic,
        t0: &Rational,
        position: usize,
        bits: u32,
    ) -> Result<Self, Rejection> {
        let leads = form.terms.iter().filter(|t| leading.iter().any(|(r, _)| *r == t.root));
        let top = leads.map(|t| t.coefficients.len()).max().unwrap_or(0);
        Self::split(form, (leading, top), rho_lo, t0, position, bits)
    }

    /// The same with t^(top - 1) for t^J, whatever the coefficients of the leading roots are; but they have no higher powers.
    pub fn split(
        form: &ClosedForm,
        (leading, top): (&[(usize, Vec<i64>)], usize),
        rho_lo: &Dyadic,
        t0: &Rational,
        position: usize,
        bits: u32,
    ) -> Result<Self, Rejection> {
        let lower = Duty::new(Rule::Cone, Obligation::LowerRealPartIsLess, position);
        let decreases = Duty::new(Rule::Cone, Obligation::LowerTermDecreases, position);
        let turns_of = |root: usize| leading.iter().find(|(r, _)| *r == root).map(|(_, turns)| turns);
        let start = Interval::rational(t0, bits);
        let mut lead = Self { waves: Vec::new(), rest: Dyadic::zero(), bits };
        for term in &form.terms {
            let turns = turns_of(term.root);
            // SOUND(lo): rho - rho' >= rho_lo - (upper end of rho'), rounded down; 0 for a leading root, exactly.
            let below = || rho_lo.add(&term.exponent.re.hi().neg(), bits, Down);
            let gap = turns.map_or_else(below, |_| Dyadic::zero());
            lower.decide(turns.is_some() || gap.sign() == std::cmp::Ordering::Greater)?;
            lower.decide(turns.is_none() || term.coefficients.len() <= top)?;
            let decay = Interval::point(gap.clone()).mul(&start, bits);
            for (j, c) in term.coefficients.iter().enumerate() {
                let weighted = if term.is_real { c.clone() } else { c.add(c, bits) };
                if let (Some(turns), true) = (turns, j + 1 == top) {
                    lead.waves.push(Wave { coefficient: weighted, turns: turns.clone() });
                    continue;
                }
                let excess = (j + 1).saturating_sub(top);
                decreases.decide(*decay.lo() >= Dyadic::new(BigInt::from(excess), 0))?;
                let power = power_of_start(&start, j + 1, top, bits).ok_or_else(|| decreases.inconclusive())?;
                // SOUND(hi): exp(-x) is decreasing, so the least x = gap t0 gives the greatest value; any smaller x, here
                // 2^39 where it is above, gives a greater one (`exp` refuses arguments of 2^40).
                let factor = Complex::real(Interval::point(decay.lo().clone().min(Dyadic::power_of_two(39)).neg()))
                    .exp(bits)
                    .ok_or_else(|| decreases.inconclusive())?;
                let bound = weighted.abs_hi(bits).mul(power.hi(), bits, Up).mul(factor.re.hi(), bits, Up);
                lead.rest = lead.rest.add(&bound, bits, Up);
            }
        }
        Ok(lead)
    }

    /// The sum of these waves, each with coefficient and turns and weight 1, and of a rest with this bound.
    pub fn of_waves(waves: Vec<(Complex, Vec<i64>)>, rest: Dyadic, bits: u32) -> Self {
        let waves = waves.into_iter().map(|(coefficient, turns)| Wave { coefficient, turns }).collect();
        Self { waves, rest, bits }
    }

    /// The sum, or the difference, of two forms with the same t^J exp(rho t) and angles.
    pub fn plus(&self, other: &Self, negated: bool) -> Self {
        let turned = |wave: &Wave| {
            let coefficient =
                if negated { Complex::zero().sub(&wave.coefficient, self.bits) } else { wave.coefficient.clone() };
            Wave { coefficient, turns: wave.turns.clone() }
        };
        let waves = self.waves.iter().cloned().chain(other.waves.iter().map(turned)).collect();
        // SOUND(hi): |r_1 +- r_2| <= |r_1| + |r_2|, rounded up.
        Self { waves, rest: self.rest.add(&other.rest, self.bits, Up), bits: self.bits }
    }

    /// Encloses f + r on a box of angles, for all times from t0 on.
    ///
    /// f(phi) = f(c) + grad f(c) . d + R, |R| <= 1/2 sum |coefficient| (sum_j |n_j| r_j)^2 for |d_j| <= r_j (Taylor, Lagrange).
    /// `None`: an angle is out of range.
    pub fn enclose(&self, angles: &AngleBox) -> Option<Interval> {
        let bits = self.bits;
        let radii: Vec<Dyadic> = angles.iter().map(|(_, r)| Interval::rational(r, bits).abs_hi()).collect();
        let mut value = Interval::symmetric(&self.rest);
        let mut gradient = vec![Interval::integer(0); angles.len()];
        let mut curvature = Dyadic::zero();
        for wave in &self.waves {
            let angle: Rational =
                wave.turns.iter().zip(angles).map(|(n, (c, _))| c * Rational::from_integer((*n).into())).sum();
            let theta = Complex { re: Interval::integer(0), im: Interval::rational(&angle, bits) };
            let turned = wave.coefficient.mul(&theta.exp(bits)?, bits);
            value = value.add(&turned.re, bits);
            let mut reach = Dyadic::zero();
            for ((n, r), slope) in wave.turns.iter().zip(&radii).zip(&mut gradient) {
                // d/dphi_j Re(z exp(i n phi)) = -n_j Im(z exp(i n phi))
                *slope = slope.sub(&turned.im.mul(&Interval::integer(*n), bits), bits);
                let step = Dyadic::new(BigInt::from(n.abs()), 0).mul(r, bits, Up);
                reach = reach.add(&step, bits, Up);
            }
            // SOUND(hi): products and sums of upper bounds of non-negative numbers, rounded up.
            let bend = wave.coefficient.abs_hi(bits).mul(&reach, bits, Up).mul(&reach, bits, Up).scale(-1);
            curvature = curvature.add(&bend, bits, Up);
        }
        let mut spread = curvature;
        for (slope, r) in gradient.iter().zip(&radii) {
            spread = spread.add(&slope.abs_hi().mul(r, bits, Up), bits, Up);
        }
        Some(value.add(&Interval::symmetric(&spread), bits))
    }

    /// The number of leading terms.
    pub fn count(&self) -> usize {
        self.waves.len()
    }

    /// A bound of |r| for all times from t0 on.
    pub fn rest(&self) -> &Dyadic {
        &self.rest
    }
}

/// Encloses t0^(numerator - denominator).
fn power_of_start(start: &Interval, numerator: usize, denominator: usize, bits: u32) -> Option<Interval> {
    let exponent = u32::try_from(numerator.abs_diff(denominator)).ok()?;
    let power = start.power(exponent, bits);
    if numerator >= denominator { Some(power) } else { power.recip(bits) }
}

/// The box that covers the torus of this dimension: its side 44/7 is more than 2 pi.
///
/// Source: pi < 22/7 (Archimedes, Measurement of a Circle, prop. 3; 22/7 - pi is the integral of x^4 (1-x)^4 / (1+x^2) over [0, 1]).
pub fn whole_torus(dimension: usize) -> AngleBox {
    let half = Rational::new(22_i32.into(), 7_i32.into());
    vec![(half.clone(), half); dimension]
}

/// The lower and the upper half of a box along an axis.
pub fn halves(angles: &AngleBox, axis: usize) -> Option<(AngleBox, AngleBox)> {
    let quarter = angles.get(axis)?.1.clone() / Rational::from_integer(2_i32.into());
    let moved = |sign: Rational| {
        let mut half = angles.clone();
        if let Some((centre, radius)) = half.get_mut(axis) {
            *centre += &quarter * sign;
            *radius = quarter.clone();
        }
        half
    };
    Some((moved(-Rational::one()), moved(Rational::one())))
}
