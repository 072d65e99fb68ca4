//! The block structure of a matrix: strongly connected components of its dependency graph.
//!
//! State i depends on state j if A_ij is not 0. Listed so that each component comes after the ones that it depends on,
//! the components bring A to block lower triangular form by a permutation; the characteristic polynomial is the
//! product over the blocks. Exact, and linear in the number of non-zero entries: this is what makes large sparse
//! models tractable. Source: Tarjan, SIAM J. Comput. 1 (1972) 146-160 (here without recursion).

use crate::characteristic::characteristic_polynomial;
use crate::error::CoreError;
use crate::integer_polynomial::IntegerPolynomial;
use crate::matrix::RationalMatrix;
use keepout_checker::number::Rational;
use num_traits::Zero;
use std::collections::HashMap;

/// A square matrix given by its non-zero entries.
///
/// Invariant: in each row the columns increase and no value is 0.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SparseMatrix {
    rows: Vec<Vec<(usize, Rational)>>,
}

impl SparseMatrix {
    /// The n x n matrix with these entries (row, column, value); entries at the same place are added.
    ///
    /// # Errors
    /// [`CoreError::Shape`] for an index that is not below n.
    pub fn new(n: usize, entries: impl IntoIterator<Item = (usize, usize, Rational)>) -> Result<Self, CoreError> {
        let mut rows = vec![HashMap::new(); n];
        for (i, j, value) in entries {
            if i >= n || j >= n {
                return Err(CoreError::Shape { what: "index of a matrix entry", expected: n, found: i.max(j) });
            }
            *rows[i].entry(j).or_insert_with(Rational::zero) += value;
        }
        let sorted = rows.into_iter().map(|row| {
            let mut row: Vec<_> = row.into_iter().filter(|(_, v): &(usize, Rational)| !v.is_zero()).collect();
            row.sort_by_key(|(j, _)| *j);
            row
        });
        Ok(Self { rows: sorted.collect() })
    }

    /// The order n.
    pub fn order(&self) -> usize {
        self.rows.len()
    }

    /// The non-zero entries (column, value) of a row, by column.
    pub fn row(&self, i: usize) -> &[(usize, Rational)] {
        &self.rows[i]
    }

    /// The dense square matrix of the rows and columns named.
    pub fn principal(&self, indices: &[usize]) -> RationalMatrix {
        let place: HashMap<usize, usize> = indices.iter().enumerate().map(|(k, i)| (*i, k)).collect();
        let mut rows = vec![vec![Rational::zero(); indices.len()]; indices.len()];
        for (row, i) in rows.iter_mut().zip(indices) {
            for (j, value) in &self.rows[*i] {
                if let Some(k) = place.get(j) {
                    row[*k] = value.clone();
                }
            }
        }
        let n = indices.len();
        RationalMatrix::from_function(n, n, |i, j| rows[i][j].clone())
    }

    /// The strongly connected components, each after the ones it depends on; indices in a component increase.
    pub fn blocks(&self) -> Vec<Vec<usize>> {
        let graph: Vec<Vec<usize>> = self.rows.iter().map(|row| row.iter().map(|(j, _)| *j).collect()).collect();
        strong_components(&graph)
    }
}

impl TryFrom<&RationalMatrix> for SparseMatrix {
    type Error = CoreError;

    fn try_from(matrix: &RationalMatrix) -> Result<Self, CoreError> {
        let n = matrix.order()?;
        let row = |i: usize| {
            let entries = matrix.row(i).iter().enumerate().filter(|(_, v)| !v.is_zero());
            entries.map(|(j, v)| (j, v.clone())).collect()
        };
        Ok(Self { rows: (0..n).map(row).collect() })
    }
}

/// The strongly connected components of a graph given by successor lists; a component comes after all components that
/// it can reach.
///
/// # Cost
/// Linear in vertices and edges; no recursion.
///
/// ```
/// use keepout_core::blocks::strong_components;
/// // 0 <-> 1, 0 -> 2
/// assert_eq!(strong_components(&[vec![1, 2], vec![0], vec![]]), [vec![2], vec![0, 1]]);
/// ```
pub fn strong_components(successors: &[Vec<usize>]) -> Vec<Vec<usize>> {
    const UNSEEN: usize = usize::MAX;
    let n = successors.len();
    let mut number = vec![UNSEEN; n];
    let mut low = vec![0; n];
    let mut on_stack = vec![false; n];
    let (mut stack, mut components, mut count) = (Vec::new(), Vec::new(), 0);
    for root in 0..n {
        if number[root] != UNSEEN {
            continue;
        }
        // Frames (vertex, next successor to look at).
        let mut frames = vec![(root, 0)];
        while let Some((v, next)) = frames.pop() {
            if next == 0 {
                number[v] = count;
                low[v] = count;
                count += 1;
                stack.push(v);
                on_stack[v] = true;
            }
            if let Some(&w) = successors[v].get(next) {
                frames.push((v, next + 1));
                if number[w] == UNSEEN {
                    frames.push((w, 0));
                } else if on_stack[w] {
                    low[v] = low[v].min(number[w]);
                }
                continue;
            }
            if let Some((parent, _)) = frames.last() {
                low[*parent] = low[*parent].min(low[v]);
            }
            if low[v] == number[v] {
                let start = stack.iter().rposition(|w| *w == v).unwrap_or(0);
                let mut component = stack.split_off(start);
                component.iter().for_each(|w| on_stack[*w] = false);
                component.sort_unstable();
                components.push(component);
            }
        }
    }
    components
}

/// One diagonal block of a matrix.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Block {
    /// The states of the block.
    pub indices: Vec<usize>,
    /// The primitive integer multiple of its characteristic polynomial.
    pub characteristic_polynomial: IntegerPolynomial,
}

/// The diagonal blocks with their characteristic polynomials, in block lower triangular order.
///
/// # Guarantee
/// The product of the polynomials is the characteristic polynomial of the matrix, up to a rational factor.
///
/// # Errors
/// None for square matrices; the signature follows [`characteristic_polynomial`].
pub fn characteristic_by_blocks(a: &SparseMatrix) -> Result<Vec<Block>, CoreError> {
    let blocks = a.blocks().into_iter();
    blocks
        .map(|indices| {
            let characteristic_polynomial = characteristic_polynomial(&a.principal(&indices))?;
            Ok(Block { indices, characteristic_polynomial })
        })
        .collect()
}
