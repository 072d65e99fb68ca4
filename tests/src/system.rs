//! Statements from matrices and polynomials, for tests.

use keepout_checker::number::Rational;
use keepout_checker::statement::{
    Affine, Atom, Claim, Expression, Formula, Phase, Relation, Starts, State, Statement, Term, Variable, Zone,
};

/// A rational from `p` or `p/q`.
///
/// # Panics
/// If the text is not a rational.
pub fn rational(text: &str) -> Rational {
    text.parse().expect("a rational")
}

/// A linear system x' = A x + c from x(0), states named x0, x1, ...
#[derive(Clone, Debug)]
pub struct System {
    /// The rows of A.
    pub a: Vec<Vec<Rational>>,
    /// The offset.
    pub c: Vec<Rational>,
    /// The start.
    pub start: Vec<Rational>,
}

impl System {
    /// Reads the rows of A, the offset and the start from texts: entries separated by blanks, rows by semicolons.
    ///
    /// # Panics
    /// If an entry is not a rational.
    pub fn new(a: &str, c: &str, start: &str) -> Self {
        let row = |text: &str| text.split_whitespace().map(rational).collect::<Vec<_>>();
        Self { a: a.split(';').map(row).collect(), c: row(c), start: row(start) }
    }

    /// The unit step response of 1 / (s^n + d_(n-1) s^(n-1) + ... + d_0) scaled to d_0 / (...): companion form, x0 is the output.
    pub fn step_response(denominator: &[Rational]) -> Self {
        let n = denominator.len();
        let zero = rational("0");
        let mut a = vec![vec![zero.clone(); n]; n];
        for i in 0..n - 1 {
            a[i][i + 1] = rational("1");
        }
        a[n - 1] = denominator.iter().map(|d| -d).collect();
        let mut c = vec![zero.clone(); n];
        c[n - 1] = denominator[0].clone();
        Self { a, c, start: vec![zero; n] }
    }

    /// The statement with this zone, for all time.
    pub fn statement(&self, inside: Formula) -> Statement {
        let states = self.start.iter().enumerate();
        let rates = self.a.iter().zip(&self.c).map(|(row, offset)| {
            let terms = row.iter().enumerate().filter(|(_, v)| **v != rational("0"));
            Affine { terms: terms.map(|(j, v)| (v.clone(), Variable::State(j))).collect(), offset: offset.clone() }
        });
        Statement {
            title: "test".into(),
            states: states.map(|(i, s)| State { name: format!("x{i}"), unit: None, start: s.clone() }).collect(),
            starts: Starts::One,
            disturbances: Vec::new(),
            uncertain: Vec::new(),
            drives: vec![],
            outputs: vec![],
            exponentials: Vec::new(),
            phases: vec![Phase { rates: rates.collect(), uncertain: Vec::new() }],
            zone: Zone { name: "zone".into(), reference: None, inside, from: rational("0"), until: None },
            claim: Claim::Never { margin: rational("0") },
        }
    }
}

/// The polynomial with these terms: a coefficient, and the exponents of x0, x1, ...
pub fn polynomial(terms: &[(&str, &[u32])]) -> Expression {
    let term = |(c, powers): &(&str, &[u32])| Term {
        coefficient: rational(c),
        powers: powers.iter().enumerate().filter(|(_, k)| **k > 0).map(|(i, k)| (Variable::State(i), *k)).collect(),
    };
    Expression { terms: terms.iter().map(term).collect() }
}

/// The comparison of a polynomial with zero.
pub fn atom(terms: &[(&str, &[u32])], relation: Relation) -> Formula {
    Formula::Atom(Atom { polynomial: polynomial(terms), relation })
}
