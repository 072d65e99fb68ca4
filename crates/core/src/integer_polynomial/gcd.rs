//! Greatest common divisors and square-free parts of integer polynomials.
//!
//! The gcd is found modulo word-size primes, lifted, and *verified by division*: a common divisor whose degree is not
//! below the degree of the gcd modulo some prime that divides no leading coefficient is the gcd.
//! Source: Brown, J. ACM 18 (1971) 478-504; Yun, SYMSAC 1976, doi:10.1145/800205.806320 (from memory).

use super::IntegerPolynomial;
use crate::modular::{Field, Reconstruction, large_field};
use crate::modular_polynomial as mp;
use num_integer::Integer;

impl IntegerPolynomial {
    /// The residues of the coefficients, trimmed.
    pub(crate) fn residues(&self, field: &Field) -> mp::Residues {
        mp::trim(self.coefficients.iter().map(|c| field.residue_of(c)).collect())
    }

    /// The primitive greatest common divisor over the rationals, leading coefficient positive; gcd(0, 0) = 0.
    ///
    /// # Cost
    /// One Euclidean scheme modulo a 62-bit prime if the operands are coprime; else one for each 62 bits of the result.
    pub fn gcd(&self, other: &Self) -> Self {
        let (a, b) = (self.primitive_part(), other.primitive_part());
        if a.is_zero() || b.is_zero() {
            return if a.is_zero() { b } else { a };
        }
        if a.is_constant() || b.is_constant() {
            return Self::one();
        }
        let lead = a.leading().gcd(&b.leading());
        let mut best = usize::MAX;
        let mut lifted = Reconstruction::default();
        for index in 0.. {
            let field = large_field(index);
            let (fa, fb) = (a.residues(&field), b.residues(&field));
            if fa.len() != a.coefficients.len() || fb.len() != b.coefficients.len() {
                continue;
            }
            let g = mp::gcd(&field, &fa, &fb);
            let degree = g.len() - 1;
            // The gcd modulo p is a multiple of the true one, because p divides no leading coefficient.
            if degree == 0 {
                return Self::one();
            }
            if degree > best {
                continue;
            }
            if degree < best {
                best = degree;
                lifted = Reconstruction::default();
            }
            let stable = lifted.push(field, &mp::scale(&field, &g, field.residue_of(&lead)));
            if stable || index == 0 {
                let candidate = Self::new(lifted.values()).primitive_part();
                if a.divide_exact(&candidate).is_some() && b.divide_exact(&candidate).is_some() {
                    return candidate;
                }
            }
        }
        unreachable!("the primes below 2^62 are more than any operand has bits")
    }

    /// The primitive least common multiple; 0 if an operand is 0.
    pub fn lcm(&self, other: &Self) -> Self {
        if self.is_zero() || other.is_zero() {
            return Self::zero();
        }
        let reduced = self.divide_exact(&self.gcd(other)).unwrap_or_else(|| unreachable!("a gcd divides"));
        (&reduced * other).primitive_part()
    }

    /// Whether no square of a non-constant polynomial divides this one.
    pub fn is_square_free(&self) -> bool {
        !self.is_zero() && self.gcd(&self.derivative()).is_constant()
    }

    /// The primitive product of the distinct irreducible factors.
    pub fn square_free_part(&self) -> Self {
        if self.is_constant() {
            return if self.is_zero() { Self::zero() } else { Self::one() };
        }
        let primitive = self.primitive_part();
        let gcd = primitive.gcd(&primitive.derivative());
        primitive.divide_exact(&gcd).unwrap_or(primitive)
    }

    /// Pairs (q_e, e): square-free, pairwise coprime, primitive, not constant, with self = content * prod q_e^e, by
    /// increasing e. Empty for constants.
    pub fn square_free_decomposition(&self) -> Vec<(Self, usize)> {
        let mut parts = Vec::new();
        if self.is_constant() {
            return parts;
        }
        let f = self.primitive_part();
        let derivative = f.derivative();
        let common = f.gcd(&derivative);
        let exact = |a: &Self, b: &Self| a.divide_exact(b).unwrap_or_else(|| unreachable!("a gcd divides"));
        let mut c = exact(&f, &common);
        let mut d = &exact(&derivative, &common) - &c.derivative();
        for e in 1.. {
            if c.is_constant() {
                break;
            }
            let q = if d.is_zero() { c.clone() } else { c.gcd(&d) };
            c = exact(&c, &q);
            d = &exact(&d, &q) - &c.derivative();
            if !q.is_constant() {
                parts.push((q, e));
            }
        }
        parts
    }

    /// Pairwise coprime primitive polynomials such that every input is a constant times a product of powers of them.
    ///
    /// Constants and zeros are skipped. Cost: quadratic in the number of parts, one gcd each.
    pub fn coprime_base(polynomials: &[Self]) -> Vec<Self> {
        let mut base: Vec<Self> = Vec::new();
        let mut pending: Vec<Self> = polynomials.iter().rev().map(Self::primitive_part).collect();
        while let Some(next) = pending.pop() {
            if next.is_constant() {
                continue;
            }
            let meeting = base.iter().enumerate().find_map(|(i, b)| {
                let g = b.gcd(&next);
                (!g.is_constant()).then_some((i, g))
            });
            match meeting {
                None => base.push(next),
                Some((i, g)) if g == base[i] => {
                    // Remove every power of the known member.
                    let mut rest = next;
                    while let Some(q) = rest.divide_exact(&g) {
                        rest = q;
                    }
                    pending.push(rest);
                }
                Some((i, g)) => {
                    let old = base.swap_remove(i);
                    let quotient = old.divide_exact(&g).unwrap_or_default();
                    pending.push(next);
                    pending.push(quotient);
                    pending.push(g);
                }
            }
        }
        base.retain(|b| !b.is_zero());
        base.sort_by(|a, b| (a.degree(), a.coefficients()).cmp(&(b.degree(), b.coefficients())));
        base
    }
}
