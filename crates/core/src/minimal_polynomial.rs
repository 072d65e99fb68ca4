//! Minimal polynomials of rational matrices, at a vector and as a whole.
//!
//! The minimal polynomial of A at v generates the m with m(A) v = 0. It is found modulo word-size primes by
//! elimination among v, Av, A^2 v, ..., lifted, and verified in integers. If the Krylov spaces of v_1..v_k together
//! span Q^n, the least common multiple of the minimal polynomials at v_1..v_k is the one of A. Full rank modulo a
//! prime proves full rank over the rationals. All results are exact. The multiplicity of a factor in the minimal
//! polynomial is the size of the largest Jordan block of its roots.

use crate::error::CoreError;
use crate::integer_polynomial::IntegerPolynomial;
use crate::matrix::RationalMatrix;
use crate::modular::{Field, Reconstruction, large_field};
use keepout_checker::number::Rational;
use num_bigint::BigInt;

/// The primitive integer multiple of the minimal polynomial of A: the m of least degree with m(A) = 0.
///
/// # Errors
/// [`CoreError::NotSquare`].
///
/// # Cost
/// One Krylov sequence for each unit of the largest geometric multiplicity.
///
/// ```
/// use keepout_core::{IntegerPolynomial, RationalMatrix, minimal_polynomial};
/// assert_eq!(minimal_polynomial(&RationalMatrix::identity(5))?, IntegerPolynomial::from_small(&[-1, 1]));
/// # Ok::<(), keepout_core::CoreError>(())
/// ```
pub fn minimal_polynomial(a: &RationalMatrix) -> Result<IntegerPolynomial, CoreError> {
    let n = a.order()?;
    let (_, b) = a.common_scaled();
    let field = large_field(0);
    let matrix: Vec<u64> = b.entries().iter().map(|e| field.residue_of(e)).collect();
    let mut span = Span { field, rows: Vec::new() };
    let mut minimal = IntegerPolynomial::one();
    let mut attempt = 0;
    while span.rows.len() < n {
        let v = varied_vector(n, attempt);
        attempt += 1;
        let mut vector: Vec<u64> = v.iter().map(|e| field.residue_of(e)).collect();
        let before = span.rows.len();
        while span.insert(&vector) {
            vector = matrix.chunks_exact(n).map(|row| field.dot(row, &vector)).collect();
        }
        if span.rows.len() > before {
            let v: Vec<Rational> = v.into_iter().map(Rational::from_integer).collect();
            minimal = minimal.lcm(&minimal_polynomial_at(a, &v)?);
        }
    }
    Ok(minimal)
}

/// Small integers without pattern for the first attempts; unit vectors later, so that the span is full in the end.
fn varied_vector(n: usize, attempt: usize) -> Vec<BigInt> {
    if attempt >= 2 * n {
        return (0..n).map(|i| BigInt::from(u8::from(i == attempt % n))).collect();
    }
    let mut state = 0x2545_f491_4f6c_dd1d_u64.wrapping_add(attempt as u64);
    let mut next = || {
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        BigInt::from((state >> 33) % 201) - 100
    };
    (0..n).map(|_| next()).collect()
}

/// A space of vectors modulo p, by reduced rows: (pivot column, row with 1 there).
struct Span {
    field: Field,
    rows: Vec<(usize, Vec<u64>)>,
}

impl Span {
    /// Adds a vector; whether the space has grown.
    fn insert(&mut self, vector: &[u64]) -> bool {
        let mut reduced = vector.to_vec();
        for (pivot, row) in &self.rows {
            let minus = self.field.neg(reduced[*pivot]);
            if minus != 0 {
                for (slot, r) in reduced.iter_mut().zip(row) {
                    *slot = self.field.add(*slot, self.field.mul(minus, *r));
                }
            }
        }
        let Some(pivot) = reduced.iter().position(|e| *e != 0) else { return false };
        let inverse = self.field.inverse(reduced[pivot]);
        self.rows.push((pivot, reduced.into_iter().map(|e| self.field.mul(e, inverse)).collect()));
        true
    }
}

/// The primitive integer multiple of the minimal polynomial of A at v: the m of least degree with m(A) v = 0.
///
/// # Errors
/// [`CoreError::NotSquare`]; [`CoreError::Shape`] if v has not n entries.
///
/// # Guarantee
/// m(A) v = 0 is verified in integers; the degree is minimal because the rank of v, Av, A^2 v, ... modulo a prime is
/// never above the rank over the rationals.
pub fn minimal_polynomial_at(a: &RationalMatrix, v: &[Rational]) -> Result<IntegerPolynomial, CoreError> {
    let n = a.order()?;
    if v.len() != n {
        return Err(CoreError::Shape { what: "vector", expected: n, found: v.len() });
    }
    let (d, b) = a.common_scaled();
    let start = IntegerPolynomial::from_rationals(v);
    let start: Vec<BigInt> = (0..n).map(|i| start.coefficient(i)).collect();
    // The minimal polynomial of the integer matrix B = d A at v is monic over the integers; m(z) = m_B(d z).
    let mut krylov = vec![start];
    let mut best = 0;
    let mut lifted = Reconstruction::default();
    for index in 0.. {
        let field = large_field(index);
        let matrix: Vec<u64> = b.entries().iter().map(|e| field.residue_of(e)).collect();
        let vector: Vec<u64> = krylov[0].iter().map(|e| field.residue_of(e)).collect();
        let m = modular_minimal_polynomial(&field, &matrix, vector);
        let degree = m.len() - 1;
        if degree < best {
            continue;
        }
        if degree > best {
            best = degree;
            lifted = Reconstruction::default();
        }
        if lifted.push(field, &m) {
            let candidate = IntegerPolynomial::new(lifted.values());
            while krylov.len() <= degree {
                krylov.push(b.apply(&krylov[krylov.len() - 1]));
            }
            let vanishes = (0..n).all(|i| {
                let sum: BigInt = candidate.coefficients().iter().zip(&krylov).map(|(c, x)| c * &x[i]).sum();
                sum == BigInt::ZERO
            });
            if vanishes {
                return Ok(candidate.dilate_up(&d).primitive_part());
            }
        }
    }
    unreachable!("finitely many primes are unlucky, and the polynomial has finitely many bits")
}

/// The monic dependency of least degree among v, Bv, B^2 v, ... modulo p.
fn modular_minimal_polynomial(field: &Field, matrix: &[u64], start: Vec<u64>) -> Vec<u64> {
    let n = start.len();
    // Each reduced row: (pivot column, vector with pivot 1, its combination of Krylov vectors).
    let mut rows: Vec<(usize, Vec<u64>, Vec<u64>)> = Vec::new();
    let mut vector = start;
    for step in 0..=n {
        let mut reduced = vector.clone();
        let mut combination = vec![0; step + 1];
        combination[step] = field.one();
        for (pivot, row, weights) in &rows {
            let minus = field.neg(reduced[*pivot]);
            if minus != 0 {
                for (slot, r) in reduced.iter_mut().zip(row) {
                    *slot = field.add(*slot, field.mul(minus, *r));
                }
                for (slot, w) in combination.iter_mut().zip(weights) {
                    *slot = field.add(*slot, field.mul(minus, *w));
                }
            }
        }
        let Some(pivot) = reduced.iter().position(|e| *e != 0) else { return combination };
        let inverse = field.inverse(reduced[pivot]);
        let scale = |v: Vec<u64>| v.into_iter().map(|e| field.mul(e, inverse)).collect::<Vec<_>>();
        rows.push((pivot, scale(reduced), scale(combination)));
        vector = matrix.chunks_exact(n).map(|row| field.dot(row, &vector)).collect();
    }
    unreachable!("n + 1 vectors of length n are dependent")
}
