//! Matrix games in floating point: the best mixtures of both sides.

/// Pivots of the simplex method at most.
const MAX_PIVOTS: usize = 1_000;

/// What both sides can hold.
pub(crate) struct Solution {
    /// The columns' mixture: no row is above the value against it.
    pub(crate) columns: Vec<f64>,
    /// The rows' mixture: no column is below the value against it.
    pub(crate) rows: Vec<f64>,
}

/// The game in which rows want a large entry and columns a small one; `None`: the numbers do not allow it.
///
/// All entries shifted above 0, with B y <= 1, y >= 0 and sum y greatest, y is the columns' mixture but for a factor, and the
/// prices of the constraints are the rows' (simplex method).
pub(crate) fn solve(entries: &[Vec<f64>]) -> Option<Solution> {
    let (rows, columns) = (entries.len(), entries.first()?.len());
    let size = entries.iter().flatten().fold(0.0_f64, |s, x| s.max(x.abs()));
    let scaled = |x: &f64| if size > 0.0 { x / size + 2.0 } else { 2.0 };
    // Each line: the entries, the slacks, the right side. The last line: what an increase of each variable gains.
    let width = columns + rows + 1;
    let mut table: Vec<Vec<f64>> = Vec::new();
    for (k, row) in entries.iter().enumerate() {
        let mut line: Vec<f64> = row.iter().map(scaled).collect();
        line.extend((0..rows).map(|i| if i == k { 1.0 } else { 0.0 }));
        line.push(1.0);
        table.push(line);
    }
    let mut gains = vec![0.0_f64; width];
    gains[..columns].fill(1.0);
    let mut basis: Vec<usize> = (columns..columns + rows).collect();
    for _ in 0..MAX_PIVOTS {
        let entering = (0..width - 1).max_by(|a, b| gains[*a].total_cmp(&gains[*b])).filter(|j| gains[*j] > 1e-13);
        let Some(entering) = entering else { break };
        let ratio = |k: &usize| table[*k][width - 1] / table[*k][entering];
        let candidates = (0..rows).filter(|k| table[*k][entering] > 1e-12);
        let leaving = candidates.min_by(|a, b| ratio(a).total_cmp(&ratio(b)))?;
        let pivot = table[leaving][entering];
        table[leaving].iter_mut().for_each(|x| *x /= pivot);
        let line = table[leaving].clone();
        let others = table.iter_mut().enumerate().filter(|(k, _)| *k != leaving).map(|(_, row)| row);
        for row in others.chain(std::iter::once(&mut gains)) {
            let factor = row[entering];
            row.iter_mut().zip(&line).for_each(|(x, l)| *x -= factor * l);
        }
        basis[leaving] = entering;
    }
    let mut mixture = vec![0.0; columns];
    for (variable, line) in basis.iter().zip(&table).filter(|(v, _)| **v < columns) {
        mixture[*variable] = line[width - 1];
    }
    let prices = gains[columns..columns + rows].iter().map(|g| -g).collect();
    Some(Solution { columns: normalised(mixture)?, rows: normalised(prices)? })
}

/// The same proportions with sum 1, without what is only rounding.
fn normalised(mut weights: Vec<f64>) -> Option<Vec<f64>> {
    let largest = weights.iter().fold(0.0_f64, |s, x| s.max(*x));
    weights.iter_mut().for_each(|x| *x = if *x < 1e-12 * largest { 0.0 } else { *x });
    let total: f64 = weights.iter().sum();
    if !(total > 0.0 && total.is_finite()) {
        return None;
    }
    Some(weights.into_iter().map(|x| x / total).collect())
}

#[cfg(test)]
mod tests {
    use super::solve;

    #[test]
    fn games_have_their_known_mixtures() {
        // Matching with stakes: value 1/5 by columns (2/5, 3/5) and rows (2/5, 3/5).
        let entries = vec![vec![2.0, -1.0], vec![-1.0, 1.0]];
        let solution = solve(&entries).unwrap();
        for (found, expected) in solution.columns.iter().chain(&solution.rows).zip([0.4, 0.6, 0.4, 0.6]) {
            assert!((found - expected).abs() < 1e-12);
        }
        // A saddle: row 1, column 0.
        let solution = solve(&[vec![1.0, 5.0], vec![2.0, 3.0]]).unwrap();
        assert!(solution.columns[0] > 1.0 - 1e-12 && solution.rows[1] > 1.0 - 1e-12);
    }
}
