//! Taylor coefficients at 0 and derivatives at 0, from each other.

use keepout_checker::number::Rational;
use num_bigint::BigInt;
use num_traits::One;

/// The coefficients y_k / k!.
pub(crate) fn taylor(derivatives: &[Rational]) -> Vec<Rational> {
    with_factorials(derivatives, |y, factorial| y / factorial)
}

/// The derivatives c_k k!.
pub(crate) fn derivatives(taylor: &[Rational]) -> Vec<Rational> {
    with_factorials(taylor, |c, factorial| c * factorial)
}

fn with_factorials(list: &[Rational], combine: impl Fn(&Rational, &Rational) -> Rational) -> Vec<Rational> {
    let mut factorial = Rational::one();
    let mut result = Vec::new();
    for (k, x) in list.iter().enumerate() {
        factorial *= Rational::from_integer(BigInt::from(k.max(1)));
        result.push(combine(x, &factorial));
    }
    result
}
