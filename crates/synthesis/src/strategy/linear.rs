//! Small systems of linear equations over the rationals.

use keepout_checker::number::Rational;
use num_traits::{One, Zero};

/// The solution x of rows x = right, by elimination. `None`: the rows are not independent.
pub(crate) fn solve(rows: &[Vec<Rational>], right: &[Rational]) -> Option<Vec<Rational>> {
    let mut table: Vec<Vec<Rational>> =
        rows.iter().zip(right).map(|(row, r)| row.iter().chain([r]).cloned().collect()).collect();
    let size = table.len();
    for column in 0..size {
        let pivot = (column..size).find(|i| !table[*i][column].is_zero())?;
        table.swap(column, pivot);
        let inverse = table[column][column].recip();
        table[column].iter_mut().for_each(|x| *x *= &inverse);
        let row = table[column].clone();
        for (_, other) in table.iter_mut().enumerate().filter(|(i, _)| *i != column) {
            let factor = other[column].clone();
            other.iter_mut().zip(&row).for_each(|(x, y)| *x -= y * &factor);
        }
    }
    table.into_iter().map(|mut row| row.pop()).collect()
}

/// The weights x_k of sum_k x_k node_k^m = moment_m, m = 0, 1, ..., for distinct nodes.
pub(crate) fn weights(nodes: &[Rational], moments: &[Rational]) -> Option<Vec<Rational>> {
    let mut rows = Vec::new();
    let mut powers = vec![Rational::one(); nodes.len()];
    for _ in nodes {
        rows.push(powers.clone());
        powers.iter_mut().zip(nodes).for_each(|(power, node)| *power *= node);
    }
    solve(&rows, moments.get(..nodes.len())?)
}

/// The inverse of a matrix. `None`: it is singular.
pub(crate) fn inverse(rows: &[Vec<Rational>]) -> Option<Vec<Vec<Rational>>> {
    let n = rows.len();
    let unit = |k: usize| (0..n).map(|i| if i == k { Rational::one() } else { Rational::zero() }).collect::<Vec<_>>();
    let columns: Vec<Vec<Rational>> = (0..n).map(|k| solve(rows, &unit(k))).collect::<Option<_>>()?;
    Some((0..n).map(|i| columns.iter().map(|c| c[i].clone()).collect()).collect())
}
