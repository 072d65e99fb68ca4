//! Enclosures of an exponential polynomial through its closed form.
//!
//! Every exponent is enclosed by a root disc, every coefficient by interval power series at the disc; conjugate terms
//! are joined to twice the real part. At a time the sum is evaluated term by term; over an interval of times it is met
//! with the mean value form. Errors do not accumulate with time: t = 10^6 costs what t = 1 costs.

use super::ExponentialPolynomial;
use crate::error::CoreError;
use crate::integer_polynomial::IntegerPolynomial;
use crate::root::{RootDisc, enclose_roots};
use keepout_checker::number::{Complex, Direction, Dyadic, Interval, Rational};
use keepout_checker::polynomial::Polynomial;
use num_bigint::BigInt;

/// c t^power/power! exp(mu t) for one real exponent, or the sum of it and its conjugate.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Term {
    /// Holds the exponent mu; its imaginary part is not negative.
    pub exponent: RootDisc,
    /// Place of the factor in [`ExponentialPolynomial::factors`].
    pub factor: usize,
    /// The power of t.
    pub power: usize,
    /// Contains the coefficient c.
    pub coefficient: Complex,
}

/// An exponential polynomial as a sum of enclosed terms.
///
/// ```
/// use keepout_core::ToRational;
/// use keepout_core::ExponentialPolynomial;
/// use keepout_checker::number::Interval;
/// use num_rational::BigRational;
/// let g = ExponentialPolynomial::exponential(&BigRational::from_integer((-1).into()));
/// let at_one = g.closed_form(64)?.enclose(&Interval::integer(1)).unwrap();
/// assert!(at_one.hi().to_rational() < Some(BigRational::new(36788.into(), 100000.into())));
/// # Ok::<(), keepout_core::CoreError>(())
/// ```
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ClosedForm {
    terms: Vec<Term>,
    bits: u32,
}

impl ExponentialPolynomial {
    /// The closed form with root discs of `bits` bits.
    ///
    /// # Errors
    /// [`CoreError::LimitExceeded`] if a coefficient cannot be enclosed with eight times as many bits.
    ///
    /// # Guarantee
    /// Every exponent and coefficient lies in its enclosure; all terms with coefficients not known to be 0 are present.
    pub fn closed_form(&self, bits: u32) -> Result<ClosedForm, CoreError> {
        let m = self.annihilator();
        let (numerator, denominator) = self.laplace_numerator(&m);
        let mut terms = Vec::new();
        for (factor, (q, e)) in self.factors.iter().enumerate() {
            let cofactor = m.divide_exact(&q.power(*e)).unwrap_or_else(|| unreachable!("q^e divides m"));
            let data = FactorData { q, e: *e, cofactor: &cofactor, numerator: &numerator, denominator: &denominator };
            terms.extend(data.terms(factor, bits)?);
        }
        Ok(ClosedForm { terms, bits })
    }
}

struct FactorData<'a> {
    q: &'a IntegerPolynomial,
    e: usize,
    cofactor: &'a IntegerPolynomial,
    numerator: &'a IntegerPolynomial,
    denominator: &'a BigInt,
}

impl FactorData<'_> {
    fn terms(&self, factor: usize, bits: u32) -> Result<Vec<Term>, CoreError> {
        for multiple in [1, 2, 4, 8] {
            let work = bits * multiple + 32;
            let discs = enclose_roots(self.q, work)?;
            let upper = discs.into_iter().filter(|d| d.im.sign() != std::cmp::Ordering::Less);
            let terms: Option<Vec<Vec<Term>>> = upper.map(|disc| self.at_root(factor, disc, work + 64)).collect();
            let sharp = |term: &Term| {
                let size = term.coefficient.abs_hi(64).top().max(-i64::from(bits));
                let width = |x: &Interval| x.hi().add(&x.lo().neg(), 64, Direction::Up).top();
                width(&term.coefficient.re).max(width(&term.coefficient.im)) <= size - i64::from(bits) / 2
            };
            match terms.map(|t| t.concat()) {
                Some(terms) if multiple == 8 || terms.iter().all(sharp) => return Ok(terms),
                _ => {}
            }
        }
        Err(CoreError::LimitExceeded { what: "bits of a closed form", limit: u64::from(bits) * 8 })
    }

    /// The e terms at one root; `None` if the unit's enclosure contains 0.
    fn at_root(&self, factor: usize, disc: RootDisc, bits: u32) -> Option<Vec<Term>> {
        let mu = disc.enclose();
        // q(mu + w)/w: the constant term is exactly 0 and dropped.
        let reduced: Vec<Complex> = taylor(self.q, &mu, self.e + 1, bits).into_iter().skip(1).collect();
        let mut unit = taylor(self.cofactor, &mu, self.e, bits);
        for _ in 0..self.e {
            unit = series_product(&unit, &reduced, self.e, bits);
        }
        let inverse = unit.first()?.recip(bits)?;
        let numerator = taylor(self.numerator, &mu, self.e, bits);
        let scale = Interval::rational(&Rational::new(1.into(), self.denominator.clone()), bits);
        let mut h: Vec<Complex> = Vec::with_capacity(self.e);
        for i in 0..self.e {
            let known = (1..=i)
                .fold(numerator[i].mul_real(&scale, bits), |sum, k| sum.sub(&unit[k].mul(&h[i - k], bits), bits));
            h.push(known.mul(&inverse, bits));
        }
        let real = disc.is_real();
        let term = |power: usize| {
            let mut coefficient = h[self.e - 1 - power].clone();
            if real {
                coefficient.im = Interval::integer(0);
            }
            Term { exponent: disc.clone(), factor, power, coefficient }
        };
        Some((0..self.e).map(term).collect())
    }
}

fn taylor(p: &IntegerPolynomial, at: &Complex, count: usize, bits: u32) -> Vec<Complex> {
    let coefficients = p.coefficients().iter().map(|c| Rational::from_integer(c.clone())).collect();
    Polynomial::new(coefficients).taylor(at, count, bits)
}

fn series_product(a: &[Complex], b: &[Complex], count: usize, bits: u32) -> Vec<Complex> {
    let coefficient = |i: usize| (0..=i).fold(Complex::zero(), |sum, k| sum.add(&a[k].mul(&b[i - k], bits), bits));
    (0..count).map(coefficient).collect()
}

impl ClosedForm {
    /// The terms, one for each real exponent or conjugate pair and each power.
    pub fn terms(&self) -> &[Term] {
        &self.terms
    }

    /// Encloses g over an interval of times (or at a point); `None` if an exponent times t may reach 2^40.
    ///
    /// # Guarantee
    /// g(t) lies in the result for each member t.
    pub fn enclose(&self, time: &Interval) -> Option<Interval> {
        let direct = self.sum(time)?;
        if time.lo() == time.hi() {
            return Some(direct);
        }
        let work = self.bits + 32;
        let halfway = time.lo().add(time.hi(), work, Direction::Down).scale(-1);
        let inside = *time.lo() <= halfway && halfway <= *time.hi();
        let middle = Interval::point(if inside { halfway } else { time.lo().clone() });
        let slope = self.derivative().sum(time)?;
        let centred = self.sum(&middle)?.add(&slope.mul(&time.sub(&middle, work), work), work);
        // SOUND: both contain g(t) for each member t (the second by the mean value theorem, because `middle` is a
        // member and
        // `slope` encloses g' on all of `time`), so their intersection does.
        intersection(&direct, &centred).or(Some(direct))
    }

    fn sum(&self, time: &Interval) -> Option<Interval> {
        let work = self.bits + 32;
        self.terms.iter().try_fold(Interval::integer(0), |sum, term| {
            let growth = term.exponent.enclose().mul_real(time, work).exp(work)?;
            let mut value = term.coefficient.mul(&growth, work).re;
            for j in 1..=term.power {
                value = value.mul(time, work).div_integer(j as u32, work);
            }
            let value = if term.exponent.is_real() { value } else { value.scale(1) };
            Some(sum.add(&value, work))
        })
    }

    /// The closed form of g'.
    pub fn derivative(&self) -> Self {
        let work = self.bits + 64;
        let mut terms: Vec<Term> = self.terms.clone();
        for (k, term) in self.terms.iter().enumerate() {
            // (c t^j/j! exp(mu t))' = mu c t^j/j! exp(mu t) + c t^(j-1)/(j-1)! exp(mu t); powers of one exponent are
            // consecutive.
            let mut coefficient = term.coefficient.mul(&term.exponent.enclose(), work);
            let next = self.terms.get(k + 1).filter(|t| t.factor == term.factor && t.exponent == term.exponent);
            if let Some(next) = next {
                coefficient = coefficient.add(&next.coefficient, work);
            }
            terms[k].coefficient = coefficient;
        }
        Self { terms, bits: self.bits }
    }
}

/// The common part, if there is one.
fn intersection(a: &Interval, b: &Interval) -> Option<Interval> {
    let lo: &Dyadic = a.lo().max(b.lo());
    let hi: &Dyadic = a.hi().min(b.hi());
    (lo <= hi).then(|| Interval::hull(lo.clone(), hi.clone()))
}
