//! Dense matrices over the rationals and the integers.
//!
//! Entries are stored row by row; rows * columns = number of entries always holds. A rational matrix becomes an
//! integer one by clearing denominators row by row ([`RationalMatrix::row_scaled`]) or at once
//! ([`RationalMatrix::common_scaled`]): all hot algorithms of the crate work on the integer forms.

use crate::error::CoreError;
use keepout_checker::number::Rational;
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Zero};
use std::ops::Index;

/// A matrix of rational numbers.
///
/// ```
/// use keepout_core::RationalMatrix;
/// let a = RationalMatrix::from_integers(&[vec![0, 1], vec![-39, -40]])?;
/// assert_eq!(a.trace(), (-40).into_rational());
/// # use num_rational::BigRational;
/// # trait IntoRational { fn into_rational(self) -> BigRational; }
/// # impl IntoRational for i64 { fn into_rational(self) -> BigRational { BigRational::from_integer(self.into()) } }
/// # Ok::<(), keepout_core::CoreError>(())
/// ```
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RationalMatrix {
    rows: usize,
    columns: usize,
    entries: Vec<Rational>,
}

/// A matrix of integers.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct IntegerMatrix {
    rows: usize,
    columns: usize,
    entries: Vec<BigInt>,
}

fn flatten<T: Clone>(rows: &[Vec<T>]) -> Result<(usize, Vec<T>), CoreError> {
    let columns = rows.first().map_or(0, Vec::len);
    match rows.iter().find(|row| row.len() != columns) {
        Some(row) => Err(CoreError::Shape { what: "row of a matrix", expected: columns, found: row.len() }),
        None => Ok((columns, rows.concat())),
    }
}

impl RationalMatrix {
    /// The matrix with these rows.
    ///
    /// # Errors
    /// [`CoreError::Shape`] if the rows differ in length.
    pub fn new(rows: &[Vec<Rational>]) -> Result<Self, CoreError> {
        let (columns, entries) = flatten(rows)?;
        Ok(Self { rows: rows.len(), columns, entries })
    }

    /// The matrix with these small integer entries.
    ///
    /// # Errors
    /// [`CoreError::Shape`] if the rows differ in length.
    pub fn from_integers(rows: &[Vec<i64>]) -> Result<Self, CoreError> {
        let (columns, entries) = flatten(rows)?;
        let entries = entries.into_iter().map(|e| Rational::from_integer(e.into())).collect();
        Ok(Self { rows: rows.len(), columns, entries })
    }

    /// The matrix with entry `entry(i, j)` in row i, column j.
    pub fn from_function(rows: usize, columns: usize, entry: impl Fn(usize, usize) -> Rational) -> Self {
        let entries = (0..rows).flat_map(|i| (0..columns).map(move |j| (i, j))).map(|(i, j)| entry(i, j)).collect();
        Self { rows, columns, entries }
    }

    /// The n x n identity.
    pub fn identity(n: usize) -> Self {
        Self::from_function(n, n, |i, j| if i == j { Rational::one() } else { Rational::zero() })
    }

    /// Number of rows.
    pub fn rows(&self) -> usize {
        self.rows
    }

    /// Number of columns.
    pub fn columns(&self) -> usize {
        self.columns
    }

    /// The order n of a square matrix.
    ///
    /// # Errors
    /// [`CoreError::NotSquare`].
    pub fn order(&self) -> Result<usize, CoreError> {
        if self.rows == self.columns {
            Ok(self.rows)
        } else {
            Err(CoreError::NotSquare { rows: self.rows, columns: self.columns })
        }
    }

    /// One row.
    pub fn row(&self, i: usize) -> &[Rational] {
        &self.entries[i * self.columns..(i + 1) * self.columns]
    }

    /// The sum of the diagonal entries.
    pub fn trace(&self) -> Rational {
        (0..self.rows.min(self.columns)).map(|i| self[(i, i)].clone()).sum()
    }

    /// The transposed matrix.
    pub fn transposed(&self) -> Self {
        Self::from_function(self.columns, self.rows, |i, j| self[(j, i)].clone())
    }

    /// Every entry times a rational number.
    pub fn scaled(&self, factor: &Rational) -> Self {
        let entries = self.entries.iter().map(|e| e * factor).collect();
        Self { rows: self.rows, columns: self.columns, entries }
    }

    /// A x.
    ///
    /// # Errors
    /// [`CoreError::Shape`] if x has not one entry for each column.
    pub fn apply(&self, x: &[Rational]) -> Result<Vec<Rational>, CoreError> {
        if x.len() != self.columns {
            return Err(CoreError::Shape { what: "vector", expected: self.columns, found: x.len() });
        }
        Ok((0..self.rows)
            .map(|i| self.row(i).iter().zip(x).filter(|(a, _)| !a.is_zero()).map(|(a, b)| a * b).sum())
            .collect())
    }

    /// self * other.
    ///
    /// # Errors
    /// [`CoreError::Shape`] if the inner dimensions differ.
    pub fn product(&self, other: &Self) -> Result<Self, CoreError> {
        if self.columns != other.rows {
            return Err(CoreError::Shape { what: "rows of a factor", expected: self.columns, found: other.rows });
        }
        Ok(Self::from_function(self.rows, other.columns, |i, j| {
            (0..self.columns).map(|k| &self[(i, k)] * &other[(k, j)]).sum()
        }))
    }

    /// The square matrix of the rows and columns named.
    pub fn principal(&self, indices: &[usize]) -> Self {
        Self::from_function(indices.len(), indices.len(), |i, j| self[(indices[i], indices[j])].clone())
    }

    /// (d, R) with d_i > 0 the least common denominator of row i, and R = diag(d) A an integer matrix.
    pub fn row_scaled(&self) -> (Vec<BigInt>, IntegerMatrix) {
        let mut scales = Vec::with_capacity(self.rows);
        let mut entries = Vec::with_capacity(self.entries.len());
        for i in 0..self.rows {
            let scale = self.row(i).iter().fold(BigInt::one(), |l, e| l.lcm(e.denom()));
            entries.extend(self.row(i).iter().map(|e| e.numer() * (&scale / e.denom())));
            scales.push(scale);
        }
        (scales, IntegerMatrix { rows: self.rows, columns: self.columns, entries })
    }

    /// (d, B) with d > 0 the least common denominator of all entries, and B = d A an integer matrix.
    pub fn common_scaled(&self) -> (BigInt, IntegerMatrix) {
        let scale = self.entries.iter().fold(BigInt::one(), |l, e| l.lcm(e.denom()));
        let entries = self.entries.iter().map(|e| e.numer() * (&scale / e.denom())).collect();
        (scale, IntegerMatrix { rows: self.rows, columns: self.columns, entries })
    }
}

impl Index<(usize, usize)> for RationalMatrix {
    type Output = Rational;
    fn index(&self, (i, j): (usize, usize)) -> &Rational {
        &self.entries[i * self.columns + j]
    }
}

impl IntegerMatrix {
    /// The matrix with these rows.
    ///
    /// # Errors
    /// [`CoreError::Shape`] if the rows differ in length.
    pub fn new(rows: &[Vec<BigInt>]) -> Result<Self, CoreError> {
        let (columns, entries) = flatten(rows)?;
        Ok(Self { rows: rows.len(), columns, entries })
    }

    /// Number of rows.
    pub fn rows(&self) -> usize {
        self.rows
    }

    /// Number of columns.
    pub fn columns(&self) -> usize {
        self.columns
    }

    /// One row.
    pub fn row(&self, i: usize) -> &[BigInt] {
        &self.entries[i * self.columns..(i + 1) * self.columns]
    }

    /// All entries, row by row.
    pub fn entries(&self) -> &[BigInt] {
        &self.entries
    }

    /// A x; x has one entry for each column, further entries are ignored.
    pub fn apply(&self, x: &[BigInt]) -> Vec<BigInt> {
        (0..self.rows)
            .map(|i| self.row(i).iter().zip(x).filter(|(a, _)| !a.is_zero()).map(|(a, b)| a * b).sum())
            .collect()
    }

    /// The largest sum of absolute values of a row.
    pub fn row_sum_norm(&self) -> BigInt {
        let sums =
            (0..self.rows).map(|i| self.row(i).iter().map(|e| BigInt::from(e.magnitude().clone())).sum::<BigInt>());
        sums.max().unwrap_or_default()
    }
}

impl From<&IntegerMatrix> for RationalMatrix {
    fn from(matrix: &IntegerMatrix) -> Self {
        let entries = matrix.entries.iter().map(|e| Rational::from_integer(e.clone())).collect();
        Self { rows: matrix.rows, columns: matrix.columns, entries }
    }
}
