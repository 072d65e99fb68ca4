//! Lattice reduction, and proposals for integer relations among real numbers.
//!
//! LLL in the all-integer form: d_i are the Gram determinants, lambda_ij = d_j mu_ij, all integers; a basis is reduced
//! with delta = 3/4. The output is exact and deterministic; that it is a basis of the same lattice holds by
//! construction (only integer row operations). Relations proposed here are *not* proved: they are candidates for an
//! exact test elsewhere. Source: Lenstra, Lenstra, Lovasz, Math. Ann. 261 (1982) 515-534; de Weger's integral variant,
//! as in Cohen, A Course in Computational Algebraic Number Theory, Algorithm 2.6.7 (from memory).

use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Signed, Zero};

/// Working state: b_i the rows, `gram[i]` = d_i (d_0 = 1), `lambda[i][j]` = d_(j+1) mu_ij for j < i.
struct Reduction {
    rows: Vec<Vec<BigInt>>,
    gram: Vec<BigInt>,
    lambda: Vec<Vec<BigInt>>,
}

fn dot(a: &[BigInt], b: &[BigInt]) -> BigInt {
    a.iter().zip(b).map(|(x, y)| x * y).sum()
}

impl Reduction {
    /// Gram-Schmidt in integers; `None` if the rows are dependent.
    fn new(rows: Vec<Vec<BigInt>>) -> Option<Self> {
        let n = rows.len();
        let mut gram = vec![BigInt::one()];
        let mut lambda = vec![vec![BigInt::zero(); n]; n];
        for i in 0..n {
            for j in 0..=i {
                let mut u = dot(&rows[i], &rows[j]);
                for k in 0..j {
                    u = (&gram[k + 1] * u - &lambda[i][k] * &lambda[j][k]) / &gram[k];
                }
                if j < i {
                    lambda[i][j] = u;
                } else if u.is_zero() {
                    return None;
                } else {
                    gram.push(u);
                }
            }
        }
        Some(Self { rows, gram, lambda })
    }

    /// Makes |mu_kl| <= 1/2.
    fn size_reduce(&mut self, k: usize, l: usize) {
        let d = &self.gram[l + 1];
        let twice: BigInt = &self.lambda[k][l] * 2;
        if twice.abs() <= *d {
            return;
        }
        let q = (twice + d).div_floor(&(d * 2));
        let (head, tail) = self.rows.split_at_mut(k);
        for (x, y) in tail[0].iter_mut().zip(&head[l]) {
            *x -= &q * y;
        }
        let (head, tail) = self.lambda.split_at_mut(k);
        for i in 0..l {
            tail[0][i] -= &q * &head[l][i];
        }
        tail[0][l] -= &q * d;
    }

    /// Exchanges rows k-1 and k.
    fn swap(&mut self, k: usize) {
        self.rows.swap(k - 1, k);
        let (head, tail) = self.lambda.split_at_mut(k);
        for j in 0..k - 1 {
            std::mem::swap(&mut head[k - 1][j], &mut tail[0][j]);
        }
        let l = self.lambda[k][k - 1].clone();
        let b = (&self.gram[k - 1] * &self.gram[k + 1] + &l * &l) / &self.gram[k];
        for i in k + 1..self.rows.len() {
            let t = self.lambda[i][k].clone();
            self.lambda[i][k] = (&self.gram[k + 1] * &self.lambda[i][k - 1] - &l * &t) / &self.gram[k];
            self.lambda[i][k - 1] = (&b * &t + &l * &self.lambda[i][k]) / &self.gram[k + 1];
        }
        self.gram[k] = b;
    }

    /// Lovasz's condition at k, with delta = 3/4.
    fn is_ordered(&self, k: usize) -> bool {
        let l = &self.lambda[k][k - 1];
        let left: BigInt = (&self.gram[k + 1] * &self.gram[k - 1] + l * l) * 4;
        left >= &self.gram[k] * &self.gram[k] * 3
    }
}

/// An LLL-reduced basis (delta = 3/4) of the lattice spanned by the rows; `None` if the rows are linearly dependent.
///
/// # Cost
/// Polynomial; for n rows of b bits about n^4 b integer operations. Meant for n <= 40.
///
/// ```
/// use keepout_core::lattice::reduce_basis;
/// let rows = [[1, 1, 1], [-1, 0, 2], [3, 5, 6]].map(|r: [i32; 3]| r.map(Into::into).to_vec());
/// let reduced = reduce_basis(rows.to_vec()).unwrap();
/// assert_eq!(reduced[0], [0, 1, 0].map(Into::into));
/// ```
pub fn reduce_basis(rows: Vec<Vec<BigInt>>) -> Option<Vec<Vec<BigInt>>> {
    let n = rows.len();
    let mut state = Reduction::new(rows)?;
    let mut k = 1;
    while k < n {
        state.size_reduce(k, k - 1);
        if state.is_ordered(k) {
            for l in (0..k - 1).rev() {
                state.size_reduce(k, l);
            }
            k += 1;
        } else {
            state.swap(k);
            k = (k - 1).max(1);
        }
    }
    Some(state.rows)
}

/// Proposes independent integer relations sum_j n_j x_j = 0 among real numbers given as integers X_j ~ x_j 2^bits.
///
/// Returned are the vectors of a reduced basis of the lattice {(n, 2^-bits-scaled residual)} whose coefficients are at
/// most `size` and whose residual |sum n_j X_j| is at most `size` times the number of terms: what rounding explains.
/// **Not proved**; a relation with coefficients up to `size` that is exact is found if `bits` is well above (number of
/// terms) * log2(size). Shortest first.
pub fn approx_integer_relations(scaled: &[BigInt], size: u32) -> Vec<Vec<BigInt>> {
    let n = scaled.len();
    let rows = scaled.iter().enumerate().map(|(i, x)| {
        let mut row = vec![BigInt::zero(); n + 1];
        row[i] = BigInt::one();
        row[n] = x.clone();
        row
    });
    let Some(reduced) = reduce_basis(rows.collect()) else { return Vec::new() };
    let size = BigInt::from(size);
    let slack = &size * BigInt::from(n);
    let mut relations: Vec<Vec<BigInt>> = reduced
        .into_iter()
        .filter(|row| row[n].abs() <= slack && row[..n].iter().all(|c| c.abs() <= size))
        .map(|mut row| {
            row.truncate(n);
            if row.iter().find(|c| !c.is_zero()).is_some_and(Signed::is_negative) {
                row.iter_mut().for_each(|c| *c = -&*c);
            }
            row
        })
        .collect();
    relations.sort_by_key(|row| row.iter().map(|c| c * c).sum::<BigInt>());
    relations
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn relation_among_roots_of_two_is_proposed() {
        // 1, sqrt 2, sqrt 8, sqrt 3 at 200 bits: 2 sqrt 2 - sqrt 8 = 0 is the only small relation.
        let root = |v: u32| (BigInt::from(v) << 400u32).sqrt();
        let relations = approx_integer_relations(&[root(1), root(2), root(8), root(3)], 100);
        assert_eq!(relations, vec![[0, 2, -1, 0].map(BigInt::from).to_vec()]);
    }

    #[test]
    fn dependent_rows_are_refused() {
        let row = |a: i32, b: i32| vec![BigInt::from(a), BigInt::from(b)];
        assert_eq!(reduce_basis(vec![row(1, 2), row(2, 4)]), None);
    }
}
