//! Closed forms of traces, and their enclosures over stretches of time.
//!
//! Lemma: let g have the monic annihilator m of degree d and the derivatives y_k at 0. Its Laplace transform is N / m with
//! N_i = sum_(j > i) m_j y_(j-1-i). At a root mu of multiplicity e write N(mu + w) / [m(mu + w) / w^e] = h_0 + h_1 w + ...;
//! then the coefficient of t^j exp(mu t) in g is h_(e-1-j) / j!. (Partial fractions.)
//! The factors w of m(mu + w) are taken out exactly: q(mu) = 0 is known, its enclosure is dropped.

use crate::certificate::Factor;
use crate::error::{Duty, Obligation, Rejection, Rule};
use crate::limits::Budget;
use crate::number::Direction::Up;
use crate::number::{Complex, Dyadic, Interval, Rational};
use crate::polynomial::Polynomial;
use crate::root::RootTable;
use crate::sequence::Sequence;
use crate::taylor::Taylor;
use num_bigint::BigInt;

/// The terms of one exponent, its conjugate understood: `sum_j coefficients[j] t^j exp(mu t)`.
#[derive(Clone, Debug)]
pub struct Term {
    /// The position of the root in the table.
    pub root: usize,
    /// Encloses mu.
    pub exponent: Complex,
    /// Whether mu is real: then the term counts once, else twice its real part.
    pub is_real: bool,
    /// Enclose the coefficients.
    pub coefficients: Vec<Complex>,
}

/// A real exponential polynomial, each coefficient and exponent enclosed. No term: the zero function, exactly.
#[derive(Clone, Debug)]
pub struct ClosedForm {
    /// The terms.
    pub terms: Vec<Term>,
}

/// A stretch of time [centre - half_width, centre + half_width], and how to enclose on it.
#[derive(Clone, Copy, Debug)]
pub struct Stretch<'a> {
    /// The centre of the Taylor polynomial.
    pub centre: &'a Rational,
    /// Half the length, >= 0.
    pub half_width: &'a Rational,
    /// The number of Taylor terms.
    pub order: u32,
    /// Mantissa bits.
    pub bits: u32,
}

impl ClosedForm {
    /// The closed form of the function with this annihilator and these derivatives at 0 (at least as many as its degree).
    ///
    /// # Errors
    /// [`Rejection::Inconclusive`] where a root is not separated well enough at this precision.
    pub fn new(
        factors: &[Factor],
        derivatives: &[Rational],
        table: &RootTable,
        bits: u32,
        position: usize,
        budget: &mut Budget,
    ) -> Result<Self, Rejection> {
        let duty = Duty::new(Rule::Trace, Obligation::ClosedFormIsEnclosed, position);
        let m = table.product(factors).ok_or_else(|| duty.refuted())?;
        let numerator = laplace_numerator(&m, derivatives);
        let mut terms = Vec::new();
        for factor in factors {
            for (index, root) in table.roots().iter().enumerate().filter(|(_, r)| r.family == factor.family) {
                let multiplicity = usize::try_from(factor.multiplicity).unwrap_or(usize::MAX);
                budget.spend((m.degree() * multiplicity).saturating_mul(multiplicity + 2), bits)?;
                let series = coefficients(factors, *factor, &numerator, &root.value, table, bits);
                let coefficients = series.ok_or_else(|| duty.inconclusive())?;
                terms.push(Term { root: index, exponent: root.value.clone(), is_real: root.is_real, coefficients });
            }
        }
        Ok(Self { terms })
    }

    /// Encloses g / s^drop for the offsets s = t - centre of a stretch, where the first `drop` Taylor coefficients of g
    /// at the centre are known to be 0 exactly; where they are not, this is so for g without these terms. `drop` = 0: encloses g itself. `None`: an argument is out of range.
    ///
    /// Each term is sum_k c_k s^k with c_k = sum_i p_i b_(k-i), P(centre + s) = sum p_i s^i, b_k = mu^k / k!, all times
    /// exp(mu centre). Lemma: for x = |mu| h and 2 x <= m + 1, sum_(l >= m) x^l / l! <= 2 x^m / m! (ratio <= 1/2). So the terms
    /// from k = K on are at most |exp(mu centre)| sum_i |p_i| h^i 2 x^(K-i) / (K-i)!, and being a series with terms of that
    /// size at s = h, divided by s^drop they are at most the same divided by h^drop for |s| <= h (drop <= K).
    pub fn quotient(&self, drop: usize, stretch: Stretch, budget: &mut Budget) -> Result<Option<Interval>, Rejection> {
        let order = usize::try_from(stretch.order).unwrap_or(usize::MAX);
        if drop >= order {
            return Ok(None);
        }
        let Some(Taylor { coefficients: sums, slack, half_width: h, .. }) = self.expand(drop, stretch, budget)? else {
            return Ok(None);
        };
        let mut result = Interval::symmetric(&slack);
        if drop > 0 {
            let Some(inverse) = Interval::point(h.clone())
                .power(u32::try_from(drop).unwrap_or(u32::MAX), stretch.bits)
                .recip(stretch.bits)
            else {
                return Ok(None);
            };
            result = result.mul(&inverse, stretch.bits);
        }
        let mut power = Dyadic::power_of_two(0);
        for (k, sum) in sums.iter().skip(drop).enumerate() {
            // SOUND(hi): |sum_k s^k| <= |sum_k| h^k, both factors from above, rounded up; the constant term enters as it is.
            let part =
                if k == 0 { sum.clone() } else { Interval::symmetric(&sum.abs_hi().mul(&power, stretch.bits, Up)) };
            result = result.add(&part, stretch.bits);
            power = power.mul(&h, stretch.bits, Up);
        }
        Ok(Some(result))
    }

    /// The Taylor model of g about a stretch's centre; `drop` as in [`ClosedForm::quotient`].
    fn expand(&self, drop: usize, stretch: Stretch, budget: &mut Budget) -> Result<Option<Taylor>, Rejection> {
        let order = usize::try_from(stretch.order).unwrap_or(usize::MAX);
        let h = Interval::rational(stretch.half_width, stretch.bits).abs_hi();
        let mut model = Taylor::zero(order, &h, stretch.bits);
        for term in &self.terms {
            let size = (order + term.coefficients.len()).saturating_mul(term.coefficients.len());
            budget.spend(size + usize::try_from(stretch.bits / 4).unwrap_or(0) + 64, stretch.bits)?;
            let Some(tail) = term.expand(stretch, &h, drop, &mut model.coefficients) else { return Ok(None) };
            // SOUND(hi): a sum of upper bounds, rounded up.
            model.slack = model.slack.add(&tail, stretch.bits, Up);
        }
        Ok(Some(model))
    }

    /// The Taylor model of g on a stretch. `drop` = 1 makes sure that the rest is a power series without constant term
    /// (see [`Taylor::slope`]).
    pub fn taylor(&self, drop: usize, stretch: Stretch, budget: &mut Budget) -> Result<Option<Taylor>, Rejection> {
        if usize::try_from(stretch.order).unwrap_or(usize::MAX) <= drop {
            return Ok(None);
        }
        self.expand(drop, stretch, budget)
    }

    /// Encloses g on a stretch.
    pub fn enclose(&self, stretch: Stretch, budget: &mut Budget) -> Result<Option<Interval>, Rejection> {
        self.quotient(0, stretch, budget)
    }
}

impl Term {
    /// Adds the term's Taylor coefficients to the sums; returns a bound of the rest on the stretch.
    fn expand(&self, stretch: Stretch, h: &Dyadic, drop: usize, sums: &mut [Interval]) -> Option<Dyadic> {
        let bits = stretch.bits;
        let order = sums.len();
        let x = self.exponent.abs_hi(bits).mul(h, bits, Up);
        let degree = self.coefficients.len().saturating_sub(1);
        let doubled = i64::from(!self.is_real);
        // The tail lemma needs 2 x <= m + 1 for the least m = order - degree >= 1.
        let fits = order > degree && x.scale(1) <= Dyadic::new(BigInt::from(order - degree + 1), 0);
        let centre = Interval::rational(stretch.centre, bits);
        let flow = if fits { self.exponent.mul_real(&centre, bits).exp(bits) } else { None };
        let Some(flow) = flow else {
            return if drop == 0 { Some(self.bound(stretch)?.scale(doubled)) } else { None };
        };
        let shifted: Vec<Complex> =
            taylor_shift(&self.coefficients, &centre, bits).iter().map(|p| p.mul(&flow, bits)).collect();
        let mut tail = Dyadic::zero();
        for (i, p) in shifted.iter().enumerate() {
            let mut b = p.clone();
            for (k, sum) in sums.iter_mut().enumerate().skip(i) {
                *sum = sum.add(&b.re.scale(doubled), bits);
                b = b.mul(&self.exponent, bits).div_integer(u32::try_from(k - i + 1).ok()?, bits);
            }
            // SOUND(hi): |p_i| h^i 2 x^m / m!, m = order - i: products of upper bounds of non-negative numbers, rounded up.
            let rest = exp_term(&x, order - i, bits).scale(1);
            let mut bound = p.abs_hi(bits).mul(&rest, bits, Up);
            for _ in 0..i {
                bound = bound.mul(h, bits, Up);
            }
            tail = tail.add(&bound, bits, Up);
        }
        Some(tail.scale(doubled))
    }

    /// A bound of |sum_j c_j t^j exp(mu t)| on the stretch: sum_j |c_j| T^j exp(max Re mu t), T not below any |t|.
    fn bound(&self, stretch: Stretch) -> Option<Dyadic> {
        let bits = stretch.bits;
        let ends = [stretch.centre - stretch.half_width, stretch.centre + stretch.half_width];
        let [low, high] = ends.each_ref().map(|t| Interval::rational(t, bits));
        let times = Interval::hull(low.lo().clone(), high.hi().clone());
        // SOUND(hi): exp is increasing, so the greatest Re mu t gives the greatest growth.
        // It may be replaced by any greater one, here by -2^39 where it is below: `exp` refuses arguments of 2^40.
        let greatest = self.exponent.re.mul(&times, bits).hi().clone().max(Dyadic::power_of_two(39).neg());
        let mut power = Complex::real(Interval::point(greatest)).exp(bits)?.re.hi().clone();
        let mut sum = Dyadic::zero();
        for c in &self.coefficients {
            sum = sum.add(&c.abs_hi(bits).mul(&power, bits, Up), bits, Up);
            power = power.mul(&times.abs_hi(), bits, Up);
        }
        Some(sum)
    }
}

/// x^m / m!, from above.
fn exp_term(x: &Dyadic, m: usize, bits: u32) -> Dyadic {
    (1..=m).fold(Dyadic::power_of_two(0), |term, k| {
        // SOUND(hi): each factor x / k >= 0 rounded up.
        term.mul(&x.div(&Dyadic::new(k.into(), 0), bits, Up), bits, Up)
    })
}

/// The coefficients of p(centre + s) in s.
fn taylor_shift(p: &[Complex], centre: &Interval, bits: u32) -> Vec<Complex> {
    let mut row = p.to_vec();
    for done in 0..row.len() {
        let mut carry = Complex::zero();
        for slot in row.iter_mut().skip(done).rev() {
            carry = slot.add(&carry.mul_real(centre, bits), bits);
            *slot = carry.clone();
        }
    }
    row
}

/// N_i = sum_(j > i) m_j y_(j-1-i).
fn laplace_numerator(m: &Polynomial, derivatives: &[Rational]) -> Polynomial {
    // Over common denominators, so that no common divisor is taken before the end.
    let [m, y] = [m.coefficients(), derivatives].map(Sequence::from_rationals);
    let coefficient = |i: usize| {
        let sum = m.values.iter().skip(i + 1).zip(&y.values).map(|(m, y)| m * y).sum();
        Rational::new(sum, &m.denominator * &y.denominator)
    };
    Polynomial::new((0..m.count().saturating_sub(1)).map(coefficient).collect())
}

/// The coefficients of t^j exp(mu t), j = 0 .. e - 1. `None`: a division by an interval that may contain 0.
fn coefficients(
    factors: &[Factor],
    own: Factor,
    numerator: &Polynomial,
    mu: &Complex,
    table: &RootTable,
    bits: u32,
) -> Option<Vec<Complex>> {
    let length = usize::try_from(own.multiplicity).ok()?;
    let mut denominator = vec![Complex::one()];
    denominator.resize(length, Complex::zero());
    for factor in factors {
        let polynomial = table.polynomial(factor.family)?;
        let series = if factor.family == own.family {
            // q(mu + w) / w: q(mu) = 0 exactly, so the enclosure of the constant coefficient is dropped.
            polynomial.taylor(mu, length + 1, bits).into_iter().skip(1).collect()
        } else {
            polynomial.taylor(mu, length, bits)
        };
        for _ in 0..factor.multiplicity {
            denominator = series_product(&denominator, &series, bits);
        }
    }
    let inverse = denominator.first()?.recip(bits)?;
    let mut quotient: Vec<Complex> = Vec::new();
    for (k, n) in numerator.taylor(mu, length, bits).iter().enumerate() {
        let known = quotient.iter().zip(denominator.iter().skip(1).take(k).rev());
        let rest = known.fold(n.clone(), |rest, (h, d)| rest.sub(&h.mul(d, bits), bits));
        quotient.push(rest.mul(&inverse, bits));
    }
    quotient.reverse();
    for (j, c) in quotient.iter_mut().enumerate() {
        for k in 2..=u32::try_from(j).ok()? {
            *c = c.div_integer(k, bits);
        }
    }
    Some(quotient)
}

/// The product of two power series of the same length, cut off there.
fn series_product(a: &[Complex], b: &[Complex], bits: u32) -> Vec<Complex> {
    (1..=a.len())
        .map(|n| {
            let pairs = a.iter().take(n).zip(b.iter().take(n).rev());
            pairs.fold(Complex::zero(), |sum, (x, y)| sum.add(&x.mul(y, bits), bits))
        })
        .collect()
}
