//! Exact coefficients of the closed form, as elements of Q[z]/(q).
//!
//! With the Laplace transform N(z)/m(z), m = q^e c, and a root mu of q, the coefficient of t^j/j! exp(mu t) is
//! h_(e-1-j), where h is the power series of N(mu+w) / u(mu+w), u = c (q/w)^e. Since h_i = (N_i - sum_(k>=1) u_k
//! h_(i-k))/u_0, the element H_i = u_0^(i+1) h_i is obtained without division: H_i = u_0^i N_i - sum_(k=1..i) u_k
//! u_0^(k-1) H_(i-k). As u_0(mu) != 0, the coefficient vanishes at mu if and only if mu is a root of gcd(H_i, q): one
//! gcd decides it exactly.

use super::ExponentialPolynomial;
use super::residue_ring::Residue;
use crate::integer_polynomial::IntegerPolynomial;
use crate::root::RootDisc;
use crate::structure::vanishes_at;
use keepout_checker::number::Rational;
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Zero};

/// The coefficients of t^power/power! exp(mu t) for all roots mu of one factor of the annihilator.
#[derive(Clone, Debug)]
pub struct Coefficient {
    /// The factor q whose roots are the exponents.
    pub factor: IntegerPolynomial,
    /// The power j of t.
    pub power: usize,
    /// The coefficient vanishes at a root of q if and only if it is a root of this divisor of q (1: at none).
    pub vanishing: IntegerPolynomial,
    /// H = u_0^(i+1) h, and u_0^(i+1).
    scaled: Residue,
    scale: Residue,
}

impl Coefficient {
    /// Whether the coefficient is zero at the root in the disc, exactly; `None` if the disc is too coarse to tell.
    ///
    /// The disc is one of [`crate::enclose_roots`] of the factor, with that many bits.
    pub fn vanishes_at(&self, disc: &RootDisc, bits: u32) -> Option<bool> {
        vanishes_at(&self.factor, &self.vanishing, disc, bits)
    }

    /// The coefficient as r(mu): rational coefficients of r, ascending, deg r < deg q.
    ///
    /// # Cost
    /// One extended gcd over the rationals: costly for factors of degree above 20.
    pub fn element(&self) -> Vec<Rational> {
        let inverse =
            self.scale.inverse(&self.factor).unwrap_or_else(|| unreachable!("u_0 has no root in common with q"));
        let value = self.scaled.mul(&inverse, &self.factor);
        let ratio = |c: &BigInt| Rational::new(c.clone(), value.denominator.clone());
        value.numerator.coefficients().iter().map(ratio).collect()
    }
}

impl ExponentialPolynomial {
    /// The exact coefficients, factor by factor, each with powers 0 .. multiplicity - 1.
    ///
    /// # Guarantee
    /// g(t) is the sum over all roots mu of all factors, and all powers j, of (coefficient at mu) t^j/j! exp(mu t).
    /// Coefficients of the highest power of each factor vanish nowhere, because the annihilator is minimal.
    pub fn coefficients(&self) -> Vec<Coefficient> {
        let m = self.annihilator();
        let (numerator, denominator) = self.laplace_numerator(&m);
        let mut result = Vec::new();
        for (q, e) in &self.factors {
            let cofactor = m.divide_exact(&q.power(*e)).unwrap_or_else(|| unreachable!("q^e divides m"));
            let n = taylor(&numerator, &denominator, q, *e);
            let u = unit_series(q, &cofactor, *e);
            let mut scaled: Vec<Residue> = Vec::with_capacity(*e);
            let mut scales = vec![Residue::one()];
            for i in 0..*e {
                let mut value = scales[i].mul(&n[i], q);
                for k in 1..=i {
                    value = value.sub(&u[k].mul(&scales[k - 1], q).mul(&scaled[i - k], q), q);
                }
                scales.push(scales[i].mul(&u[0], q));
                scaled.push(value);
            }
            for power in 0..*e {
                let i = e - 1 - power;
                result.push(Coefficient {
                    factor: q.clone(),
                    power,
                    vanishing: q.gcd(&scaled[i].numerator),
                    scaled: scaled[i].clone(),
                    scale: scales[i + 1].clone(),
                });
            }
        }
        result
    }

    /// (n, d) with Laplace transform (n/d) / m: N = sum_k y_k sum_(i>k) m_i z^(i-k-1).
    pub(super) fn laplace_numerator(&self, m: &IntegerPolynomial) -> (IntegerPolynomial, BigInt) {
        let common = self.derivatives.iter().fold(BigInt::one(), |l, y| l.lcm(y.denom()));
        let mut coefficients = vec![BigInt::zero(); m.degree()];
        for (k, y) in self.derivatives.iter().enumerate() {
            let y = y.numer() * (&common / y.denom());
            for (slot, c) in coefficients.iter_mut().zip(&m.coefficients()[k + 1..]) {
                *slot += c * &y;
            }
        }
        (IntegerPolynomial::new(coefficients), common)
    }
}

/// The Taylor coefficients p^(k)/k! modulo q, k < count, of p = numerator / denominator.
fn taylor(numerator: &IntegerPolynomial, denominator: &BigInt, q: &IntegerPolynomial, count: usize) -> Vec<Residue> {
    let mut derivative = numerator.clone();
    let mut factorial = denominator.clone();
    (0..count)
        .map(|k| {
            if k > 0 {
                derivative = derivative.derivative();
                factorial *= BigInt::from(k);
            }
            Residue::new(&derivative, &factorial, q)
        })
        .collect()
}

/// The first e coefficients of c(mu+w) (q(mu+w)/w)^e.
fn unit_series(q: &IntegerPolynomial, cofactor: &IntegerPolynomial, e: usize) -> Vec<Residue> {
    let one = BigInt::one();
    // q(mu) = 0: drop the constant term.
    let reduced: Vec<Residue> = taylor(q, &one, q, e + 1).into_iter().skip(1).collect();
    (0..e).fold(taylor(cofactor, &one, q, e), |product, _| {
        (0..e)
            .map(|i| {
                (0..=i).fold(Residue::zero(), |sum, k| {
                    let term = product[k].mul(&reduced[i - k], q);
                    // sum + term
                    sum.sub(&Residue::zero().sub(&term, q), q)
                })
            })
            .collect()
    })
}
