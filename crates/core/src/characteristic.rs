//! Characteristic polynomials of rational matrices.
//!
//! With d_i the common denominator of row i and R = diag(d) A, the polynomial det(diag(d) z - R) = d_1...d_n chi(z)
//! has integer coefficients. Its coefficient of z^(n-k) is a sum of binom(n,k) products of a k x k minor of R and n-k
//! scales, so Hadamard's inequality bounds it; it is computed modulo enough 62-bit primes to exceed twice the bound.
//! Modulo p the matrix is brought to Hessenberg form by similarity. Results are exact.
//! Source: Cohen, A Course in Computational Algebraic Number Theory, Algorithm 2.2.9 (from memory).

use crate::error::CoreError;
use crate::integer_polynomial::IntegerPolynomial;
use crate::matrix::{IntegerMatrix, RationalMatrix};
use crate::modular::{Field, Reconstruction, large_field};
use num_bigint::BigInt;
use num_traits::One;

/// The primitive integer multiple of det(z - A), leading coefficient positive.
///
/// For an integer matrix this is the monic characteristic polynomial itself.
///
/// # Errors
/// [`CoreError::NotSquare`].
///
/// # Cost
/// O(n^3) word operations for each 62 bits of the largest coefficient.
///
/// ```
/// use keepout_core::{IntegerPolynomial, RationalMatrix, characteristic_polynomial};
/// let a = RationalMatrix::from_integers(&[vec![-131, 19, 18], vec![-390, 56, 54], vec![-387, 57, 52]])?;
/// // (z + 1)(z + 2)(z + 20), Ward's third example
/// assert_eq!(characteristic_polynomial(&a)?, IntegerPolynomial::from_small(&[40, 62, 23, 1]));
/// # Ok::<(), keepout_core::CoreError>(())
/// ```
pub fn characteristic_polynomial(a: &RationalMatrix) -> Result<IntegerPolynomial, CoreError> {
    let n = a.order()?;
    let (scales, scaled) = a.row_scaled();
    let bound = coefficient_bits(&scales, &scaled);
    let product: BigInt = scales.iter().product();
    let mut lifted = Reconstruction::default();
    let mut known = 0;
    for index in 0.. {
        if known > bound + 1 {
            break;
        }
        let field = large_field(index);
        let Some(matrix) = modular_matrix(&field, &scales, &scaled) else { continue };
        let mut chi = hessenberg_characteristic(&field, matrix, n);
        let factor = field.residue_of(&product);
        if !product.is_one() {
            for c in &mut chi {
                *c = field.mul(*c, factor);
            }
        }
        lifted.push(field, &chi);
        // SOUND(lo): each prime is above 2^61, so the product exceeds 2^(61 k).
        known += 61;
    }
    Ok(IntegerPolynomial::new(lifted.values()).primitive_part())
}

/// A number k with |coefficient| < 2^k for each coefficient of det(diag(d) z - R).
fn coefficient_bits(scales: &[BigInt], scaled: &IntegerMatrix) -> u64 {
    let n = scales.len();
    // norm_i^2 < 2^s, so norm_i < 2^(s/2). In halves of a bit: max(s, 2 bits(d_i)) bounds both factors a row can give.
    let mut halves = 0;
    for (i, scale) in scales.iter().enumerate() {
        let square: BigInt = scaled.row(i).iter().map(|e| e * e).sum();
        // SOUND(hi): a scale of 1 contributes the factor 1, that is 0 bits.
        let scale_halves = if scale.is_one() { 0 } else { 2 * scale.bits() };
        halves += square.bits().max(scale_halves);
    }
    // SOUND(hi): binom(n, k) <= 2^n.
    n as u64 + halves / 2 + 1
}

/// A modulo p, row by row; `None` if p divides a denominator.
fn modular_matrix(field: &Field, scales: &[BigInt], scaled: &IntegerMatrix) -> Option<Vec<u64>> {
    let mut matrix = Vec::with_capacity(scaled.entries().len());
    for (i, scale) in scales.iter().enumerate() {
        let row = scaled.row(i).iter().map(|e| field.residue_of(e));
        if scale.is_one() {
            matrix.extend(row);
            continue;
        }
        let residue = field.residue_of(scale);
        if residue == 0 {
            return None;
        }
        let inverse = field.inverse(residue);
        matrix.extend(row.map(|e| field.mul(e, inverse)));
    }
    Some(matrix)
}

/// The characteristic polynomial modulo p, ascending.
fn hessenberg_characteristic(field: &Field, mut h: Vec<u64>, n: usize) -> Vec<u64> {
    reduce_to_hessenberg(field, &mut h, n);
    // chi_k = (z - h_kk) chi_(k-1) - sum_(i<k) h_ik (h_(i+1,i) ... h_(k,k-1)) chi_(i-1)
    let mut chis: Vec<Vec<u64>> = vec![vec![field.one()]];
    for k in 0..n {
        let mut next = vec![0; k + 2];
        let diagonal = field.neg(h[k * n + k]);
        for (j, c) in chis[k].iter().enumerate() {
            next[j + 1] = field.add(next[j + 1], *c);
            next[j] = field.add(next[j], field.mul(diagonal, *c));
        }
        let mut chain = field.one();
        for i in (0..k).rev() {
            chain = field.mul(chain, h[(i + 1) * n + i]);
            if chain == 0 {
                break;
            }
            let factor = field.neg(field.mul(chain, h[i * n + k]));
            if factor != 0 {
                for (slot, c) in next.iter_mut().zip(&chis[i]) {
                    *slot = field.add(*slot, field.mul(factor, *c));
                }
            }
        }
        chis.push(next);
    }
    chis.pop().unwrap_or_default()
}

/// A similar matrix with zeros below the first subdiagonal, in place.
fn reduce_to_hessenberg(field: &Field, h: &mut [u64], n: usize) {
    let mut factors = vec![0u64; n];
    for k in 0..n.saturating_sub(2) {
        let Some(pivot) = (k + 1..n).find(|i| h[i * n + k] != 0) else { continue };
        if pivot != k + 1 {
            for j in 0..n {
                h.swap(pivot * n + j, (k + 1) * n + j);
            }
            for i in 0..n {
                h.swap(i * n + pivot, i * n + k + 1);
            }
        }
        let inverse = field.inverse(h[(k + 1) * n + k]);
        let (top, bottom) = h.split_at_mut((k + 2) * n);
        let source = &top[(k + 1) * n + k..(k + 2) * n];
        for (i, row) in bottom.chunks_exact_mut(n).enumerate() {
            let u = field.mul(row[k], inverse);
            factors[k + 2 + i] = u;
            if u != 0 {
                let minus = field.neg(u);
                for (slot, s) in row[k..].iter_mut().zip(source) {
                    *slot = field.add(*slot, field.mul(minus, *s));
                }
            }
        }
        // The inverse transformation on the right: column k+1 += sum of u_i column i.
        for row in h.chunks_exact_mut(n) {
            let sum = field.dot(&row[k + 2..], &factors[k + 2..]);
            row[k + 1] = field.add(row[k + 1], sum);
        }
    }
}
