//! Factors of polynomials in several variables.
//!
//! Kronecker's substitution x_i = z^(s_i) with s_i the product of the (degree + 1) of the variables before turns a polynomial into
//! one of a single variable, from which it can be read back. Products of factors of that are tried as factors.
//! Source: von zur Gathen and Gerhard, Modern Computer Algebra, sec. 8.4 (from memory).

use keepout_checker::number::Rational;
use keepout_checker::statement::{Expression, Term, Variable};
use keepout_core::{IntegerPolynomial, factorize};
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Zero};
use std::collections::BTreeMap;

/// The greatest degree after the substitution.
const MAX_DEGREE: usize = 400;

/// At most so many factors of one variable are combined.
const MAX_FACTORS: usize = 12;

/// Exponents and their coefficient.
type Dense = BTreeMap<Vec<usize>, BigInt>;

/// The factors of a polynomial with their powers, a constant one (not 1) included; their product is the polynomial.
pub(crate) fn factors_of(polynomial: &Expression) -> Vec<(Expression, u32)> {
    factors(polynomial).unwrap_or_else(|| vec![(polynomial.clone(), 1)])
}

fn factors(polynomial: &Expression) -> Option<Vec<(Expression, u32)>> {
    let substitution = Substitution::new(polynomial)?;
    let denominator = polynomial.terms.iter().fold(BigInt::one(), |l, t| l.lcm(t.coefficient.denom()));
    let mut rest = substitution.dense(polynomial, &denominator);
    let mut found: Vec<(Dense, u32)> = Vec::new();
    for variable in 0..substitution.variables.len() {
        let power = rest.keys().map(|e| e[variable]).min().unwrap_or(0);
        if power > 0 {
            rest = rest
                .into_iter()
                .map(|(mut e, c)| {
                    e[variable] -= power;
                    (e, c)
                })
                .collect();
            let mut exponents = vec![0; substitution.variables.len()];
            exponents[variable] = 1;
            found.push((Dense::from([(exponents, BigInt::one())]), u32::try_from(power).ok()?));
        }
    }
    let mut pool: Vec<IntegerPolynomial> = Vec::new();
    for factor in factorize(&substitution.single(&rest)).factors {
        pool.extend(std::iter::repeat_n(factor.polynomial, factor.multiplicity));
    }
    if pool.len() > MAX_FACTORS {
        return None;
    }
    let mut size = 1;
    while 2 * size <= pool.len() {
        match substitution.first_factor(&rest, &pool, size) {
            None => size += 1,
            Some((chosen, factor, cofactor)) => {
                let mut position = 0;
                pool.retain(|_| {
                    position += 1;
                    chosen >> (position - 1) & 1 == 0
                });
                rest = cofactor;
                match found.iter_mut().find(|(f, _)| *f == factor) {
                    Some((_, power)) => *power += 1,
                    None => found.push((factor, 1)),
                }
            }
        }
    }
    if !pool.is_empty() {
        let (primitive, content) = primitive(&rest);
        rest = Dense::from([(vec![0; substitution.variables.len()], content)]);
        match found.iter_mut().find(|(f, _)| *f == primitive) {
            Some((_, power)) => *power += 1,
            None => found.push((primitive, 1)),
        }
    }
    let unit = Rational::new(rest.values().next()?.clone(), denominator);
    let mut list: Vec<(Expression, u32)> = found.iter().map(|(f, k)| (substitution.expression(f), *k)).collect();
    if !unit.is_one() {
        list.push((Expression { terms: vec![Term { coefficient: unit, powers: Vec::new() }] }, 1));
    }
    Some(list)
}

/// Coefficients without their common divisor, that of the greatest exponents positive; and the divisor with sign.
fn primitive(p: &Dense) -> (Dense, BigInt) {
    let mut content = p.values().fold(BigInt::zero(), |g, c| g.gcd(c));
    if p.values().next_back().is_some_and(|c| c.sign() == num_bigint::Sign::Minus) {
        content = -content;
    }
    (p.iter().map(|(e, c)| (e.clone(), c / &content)).collect(), content)
}

struct Substitution {
    variables: Vec<Variable>,
    sizes: Vec<usize>,
}

impl Substitution {
    fn new(polynomial: &Expression) -> Option<Self> {
        let mut degrees: BTreeMap<Variable, usize> = BTreeMap::new();
        for (variable, power) in polynomial.terms.iter().flat_map(|t| &t.powers) {
            let degree = degrees.entry(*variable).or_default();
            *degree = (*degree).max(*power as usize);
        }
        let (variables, sizes): (Vec<Variable>, Vec<usize>) = degrees.into_iter().map(|(v, d)| (v, d + 1)).unzip();
        let all = sizes.iter().try_fold(1_usize, |n, s| n.checked_mul(*s))?;
        (!variables.is_empty() && all <= MAX_DEGREE).then_some(Self { variables, sizes })
    }

    fn dense(&self, polynomial: &Expression, denominator: &BigInt) -> Dense {
        let mut dense = Dense::new();
        for term in &polynomial.terms {
            let power = |v: &Variable| term.powers.iter().find(|(w, _)| w == v).map_or(0, |(_, k)| *k as usize);
            let coefficient = &term.coefficient * Rational::from_integer(denominator.clone());
            *dense.entry(self.variables.iter().map(power).collect()).or_default() += coefficient.to_integer();
        }
        dense
    }

    fn single(&self, p: &Dense) -> IntegerPolynomial {
        let place = |e: &Vec<usize>| e.iter().zip(&self.sizes).rev().fold(0, |n, (k, size)| n * size + k);
        let mut coefficients = vec![BigInt::zero(); 1 + p.keys().map(place).max().unwrap_or(0)];
        p.iter().for_each(|(e, c)| coefficients[place(e)] = c.clone());
        IntegerPolynomial::new(coefficients)
    }

    fn several(&self, p: &IntegerPolynomial) -> Dense {
        let exponents = |mut n: usize| {
            let digit = |size: &usize| {
                let k = n % size;
                n /= size;
                k
            };
            self.sizes.iter().map(digit).collect::<Vec<_>>()
        };
        let terms = p.coefficients().iter().enumerate().filter(|(_, c)| !c.is_zero());
        terms.map(|(n, c)| (exponents(n), c.clone())).collect()
    }

    /// A factor that is the product of `size` polynomials of the pool: which ones (bits), the factor, the cofactor.
    fn first_factor(&self, p: &Dense, pool: &[IntegerPolynomial], size: usize) -> Option<(u32, Dense, Dense)> {
        let whole = self.single(p);
        (1_u32..1 << pool.len()).filter(|chosen| chosen.count_ones() as usize == size).find_map(|chosen| {
            let members = pool.iter().enumerate().filter(|(i, _)| chosen >> i & 1 == 1);
            let product = members.fold(IntegerPolynomial::one(), |q, (_, f)| &q * f);
            let (factor, cofactor) = (self.several(&product), self.several(&whole.divide_exact(&product)?));
            let (factor, content) = primitive(&factor);
            let cofactor: Dense = cofactor.into_iter().map(|(e, c)| (e, c * &content)).collect();
            (multiplied(&factor, &cofactor) == *p).then_some((chosen, factor, cofactor))
        })
    }

    fn expression(&self, p: &Dense) -> Expression {
        let term = |(exponents, c): (&Vec<usize>, &BigInt)| {
            let powers = self.variables.iter().zip(exponents).filter(|(_, k)| **k > 0);
            let powers = powers.map(|(v, k)| (*v, u32::try_from(*k).unwrap_or(u32::MAX))).collect();
            Term { coefficient: Rational::from_integer(c.clone()), powers }
        };
        Expression { terms: p.iter().map(term).collect() }
    }
}

fn multiplied(p: &Dense, q: &Dense) -> Dense {
    let mut product = Dense::new();
    for (e, a) in p {
        for (f, b) in q {
            let exponents: Vec<usize> = e.iter().zip(f).map(|(x, y)| x + y).collect();
            *product.entry(exponents).or_default() += a * b;
        }
    }
    product.retain(|_, c| !c.is_zero());
    product
}

#[cfg(test)]
mod tests {
    use super::*;

    fn polynomial(terms: &[(i64, &[u32])]) -> Expression {
        let term = |(c, powers): &(i64, &[u32])| Term {
            coefficient: Rational::from_integer((*c).into()),
            powers: powers.iter().enumerate().filter(|(_, k)| **k > 0).map(|(i, k)| (Variable::State(i), *k)).collect(),
        };
        Expression { terms: terms.iter().map(term).collect() }
    }

    #[test]
    fn products_of_two_variables_come_apart() {
        let powers = |terms: &[(i64, &[u32])]| {
            let mut powers: Vec<u32> = factors_of(&polynomial(terms)).iter().map(|(_, k)| *k).collect();
            powers.sort_unstable();
            powers
        };
        // (x - 1)^2 (y + 2) and -2 x y^2 (x + y)
        let first: &[(i64, &[u32])] =
            &[(1, &[2, 1]), (2, &[2, 0]), (-2, &[1, 1]), (-4, &[1, 0]), (1, &[0, 1]), (2, &[0, 0])];
        assert_eq!(powers(first), [1, 2]);
        assert_eq!(powers(&[(-2, &[2, 2]), (-2, &[1, 3])]), [1, 1, 1, 2]);
    }

    #[test]
    fn an_irreducible_polynomial_stays() {
        let p = polynomial(&[(1, &[2, 0]), (1, &[0, 2]), (-1, &[0, 0])]);
        assert_eq!(factors_of(&p).len(), 1);
    }
}
