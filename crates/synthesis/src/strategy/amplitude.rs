//! Sums of waves whose amplitudes add up to the constant: such a function is a sum of squares with weights of one sign.
//!
//! A single wave with a rational amplitude A, A^2 = a^2 + b^2 / w^2: a cos(w t) + (b/w) sin(w t) - A = k (cos(w t/2) + b/(k w)
//! sin(w t/2))^2 for k = a - A; where k = 0, it is -2 A sin(w t/2)^2. With -A in place of A: the same from below.
//!
//! Conjugate waves a_k cos(w_k t), w_k^2 = x_k the roots of an irreducible polynomial P, a_k = a(x_k) of one sign: with |a_k| taken
//! off or added they are v_k h_k^2, v = v(x_k), h_k = cos(w_k t/2) or sin(w_k t/2) / w_k. The functions s_j = sum_k x_k^j h_k have
//! rational derivatives at 0, and sum_k v_k h_k^2 is the quadratic form in them whose matrix is the inverse of the matrix of traces
//! Tr(x^(i+j) / v); a triangular factorisation of it gives the squares.

use crate::enclosure::approx_value;
use crate::strategy::identity::SumOfProducts;
use crate::strategy::linear::{inverse, solve};
use crate::strategy::wave::{projected, square_root_of};
use keepout_checker::number::Rational;
use keepout_checker::polynomial::Polynomial;
use keepout_core::{ExponentialPolynomial, IntegerPolynomial, ToRational, enclose_roots, factorize};
use num_bigint::BigInt;
use num_traits::{One, Signed, Zero};

/// Families of more conjugate waves are not looked at.
const MAX_WAVES: usize = 8;

/// The waves of one family, without the common exponential.
struct Family {
    /// The monic polynomial whose roots are the squares of the frequencies.
    squares: Polynomial,
    /// The sum of the waves.
    function: ExponentialPolynomial,
}

/// A function as a sum of constants of one sign, times an exponential, times squares.
pub(crate) fn squares_of_waves(function: &ExponentialPolynomial) -> Option<SumOfProducts> {
    let rate = common_rate(function)?;
    let plain = function * &ExponentialPolynomial::exponential(&-&rate);
    let (families, constant) = families(&plain)?;
    if families.is_empty() || constant.is_zero() {
        return None;
    }
    let parts: Vec<Squares> = families.iter().map(|f| f.squares_to(constant.is_positive())).collect::<Option<_>>()?;
    if parts.iter().map(|part| &part.amplitude).sum::<Rational>() != constant.abs() {
        return None;
    }
    let growth = ExponentialPolynomial::exponential(&rate);
    let summand = |(weight, root): (Rational, ExponentialPolynomial)| vec![(growth.scaled(&weight), 1), (root, 2)];
    Some(parts.into_iter().flat_map(|part| part.squares).map(summand).collect())
}

/// Weights and roots of squares, the sum of which is the waves with their amplitudes taken off or added.
struct Squares {
    amplitude: Rational,
    squares: Vec<(Rational, ExponentialPolynomial)>,
}

/// The mean of the exponents of the first factor, as a guess at the real part of all.
fn common_rate(function: &ExponentialPolynomial) -> Option<Rational> {
    let first = factorize(&function.annihilator()).factors.first()?.polynomial.to_monic();
    let degree = first.degree();
    Some(-first.coefficients().get(degree.checked_sub(1)?)? / Rational::from_integer(degree.into()))
}

/// The families of a function and its constant, if all exponents but 0 are simple and come in even factors.
fn families(function: &ExponentialPolynomial) -> Option<(Vec<Family>, Rational)> {
    let annihilator = function.annihilator();
    let mut list = Vec::new();
    let mut constant = Rational::zero();
    for factor in factorize(&annihilator).factors {
        let other = annihilator.divide_exact(&factor.polynomial)?;
        let own = projected(function, &factor.polynomial, &other)?;
        let monic = factor.polynomial.to_monic();
        let coefficients = monic.coefficients();
        if factor.multiplicity > 1 {
            return None;
        }
        if monic.degree() == 1 && coefficients[0].is_zero() {
            constant = own.derivatives(1).pop()?;
            continue;
        }
        if monic.degree() > 2 * MAX_WAVES || coefficients.iter().skip(1).step_by(2).any(|c| !c.is_zero()) {
            return None;
        }
        // q(z) = P(-z^2) up to sign.
        let degree = monic.degree() / 2;
        let sign = |i: usize| if (degree + i).is_multiple_of(2) { Rational::one() } else { -Rational::one() };
        let squares = coefficients.iter().step_by(2).enumerate().map(|(i, c)| c * sign(i)).collect();
        list.push(Family { squares: Polynomial::new(squares), function: own });
    }
    Some((list, constant))
}

impl Family {
    /// The squares for the waves plus (`above`) or minus their amplitudes.
    fn squares_to(&self, above: bool) -> Option<Squares> {
        let is_even = self.function.derivatives(2 * self.degree()).iter().skip(1).step_by(2).all(Zero::is_zero);
        if is_even { self.squares_of_cosines(above) } else { self.square_of_one(above) }
    }

    fn degree(&self) -> usize {
        self.squares.degree()
    }

    /// The polynomial of the half frequencies.
    fn halved(&self) -> IntegerPolynomial {
        let four = Rational::from_integer(4.into());
        let mut power = Rational::one();
        let mut coefficients = vec![Rational::zero(); 2 * self.degree() + 1];
        for (i, c) in self.squares.coefficients().iter().enumerate() {
            coefficients[2 * i] = if i % 2 == 0 { c * &power } else { -(c * &power) };
            power *= &four;
        }
        IntegerPolynomial::from_rationals(&coefficients)
    }

    fn square_of_one(&self, above: bool) -> Option<Squares> {
        let [c, _] = self.squares.coefficients() else { return None };
        let square = -c;
        let derivatives = self.function.derivatives(2);
        let (a, b) = (&derivatives[0], &derivatives[1]);
        let amplitude = square_root_of(&(a * a + b * b / &square))?;
        let weight = if above { a + &amplitude } else { a - &amplitude };
        let slope = b / Rational::from_integer(2.into()) / &weight;
        let root = ExponentialPolynomial::new(&self.halved(), &[Rational::one(), slope]).ok()?;
        Some(Squares { amplitude, squares: vec![(weight, root)] })
    }

    fn squares_of_cosines(&self, above: bool) -> Option<Squares> {
        let n = self.degree();
        let sums = self.squares.power_sums(4 * n);
        let values = self.function.derivatives(2 * n);
        // Tr(a x^i) = (-1)^i y_2i.
        let moments: Vec<Rational> =
            values.iter().step_by(2).enumerate().map(|(i, y)| if i % 2 == 0 { y.clone() } else { -y }).collect();
        let rows: Vec<Vec<Rational>> = (0..n).map(|i| (0..n).map(|j| sums[i + j].clone()).collect()).collect();
        let a = solve(&rows, &moments)?;
        let is_positive = self.common_sign(&a)?;
        let is_sine = is_positive != above;
        let two = Rational::from_integer(if above { 2.into() } else { (-2).into() });
        let magnitude: Vec<Rational> =
            a.iter().map(|c| c * &two * if is_positive { Rational::one() } else { -Rational::one() }).collect();
        let weight = if is_sine { self.times_x(&magnitude) } else { magnitude };
        let recip = self.inverse_of(&weight)?;
        let trace = |k: usize| recip.iter().enumerate().map(|(l, c)| c * &sums[k + l]).sum::<Rational>();
        let traces: Vec<Vec<Rational>> = (0..n).map(|i| (0..n).map(|j| trace(i + j)).collect()).collect();
        let roots: Vec<ExponentialPolynomial> =
            (0..n).map(|j| self.half_wave(j, is_sine, &sums)).collect::<Option<_>>()?;
        let mut squares = Vec::new();
        for (weight, row) in triangular(inverse(&traces)?)? {
            let terms = row.iter().zip(&roots).map(|(c, s)| s.scaled(c));
            squares.push((weight, terms.fold(ExponentialPolynomial::zero(), |sum, term| &sum + &term)));
        }
        let amplitude = values.first()?.abs();
        Some(Squares { amplitude, squares })
    }

    /// Whether the numbers a(x_k) are all positive, or all negative.
    fn common_sign(&self, a: &[Rational]) -> Option<bool> {
        let discs = enclose_roots(&IntegerPolynomial::from_rationals(self.squares.coefficients()), 64).ok()?;
        let value = |x: f64| a.iter().rev().fold(0.0, |sum, c| sum * x + approx_value(c));
        let values: Vec<f64> =
            discs.iter().map(|d| Some(value(approx_value(&d.re.to_rational()?)))).collect::<Option<_>>()?;
        let first = *values.first()? > 0.0;
        values.iter().all(|v| (*v > 0.0) == first).then_some(first)
    }

    /// x times an element of Q[x] / P.
    fn times_x(&self, element: &[Rational]) -> Vec<Rational> {
        let top = element.last().cloned().unwrap_or_else(Rational::zero);
        let shifted = std::iter::once(Rational::zero()).chain(element.iter().cloned());
        shifted.zip(self.squares.coefficients()).take(element.len()).map(|(x, c)| x - c * &top).collect()
    }

    /// The inverse of an element of Q[x] / P.
    fn inverse_of(&self, element: &[Rational]) -> Option<Vec<Rational>> {
        let n = self.degree();
        let columns: Vec<Vec<Rational>> =
            std::iter::successors(Some(element.to_vec()), |column| Some(self.times_x(column))).take(n).collect();
        let rows: Vec<Vec<Rational>> = (0..n).map(|i| columns.iter().map(|c| c[i].clone()).collect()).collect();
        let one: Vec<Rational> = (0..n).map(|i| Rational::from_integer(BigInt::from(i == 0))).collect();
        solve(&rows, &one)
    }

    /// sum_k x_k^j h_k.
    fn half_wave(&self, j: usize, is_sine: bool, sums: &[Rational]) -> Option<ExponentialPolynomial> {
        let quarter = Rational::new((-1).into(), 4.into());
        let mut power = if is_sine { Rational::new(1.into(), 2.into()) } else { Rational::one() };
        let mut derivatives = vec![Rational::zero(); 2 * self.degree()];
        for i in 0..self.degree() {
            derivatives[2 * i + usize::from(is_sine)] = &sums[i + j] * &power;
            power *= &quarter;
        }
        ExponentialPolynomial::new(&self.halved(), &derivatives).ok()
    }
}

/// A quadratic form as a sum of weights times squares of linear forms, by elimination. `None`: a pivot is 0.
fn triangular(mut matrix: Vec<Vec<Rational>>) -> Option<Vec<(Rational, Vec<Rational>)>> {
    let n = matrix.len();
    let mut list = Vec::new();
    for i in 0..n {
        let weight = matrix[i][i].clone();
        if weight.is_zero() {
            return None;
        }
        let row: Vec<Rational> = matrix[i].iter().map(|x| x / &weight).collect();
        for j in 0..n {
            for k in 0..n {
                let taken = &weight * &row[j] * &row[k];
                matrix[j][k] -= taken;
            }
        }
        list.push((weight, row));
    }
    Some(list)
}
