//! The exact structure behind the relative ellipse: eigenvalues, growth, and the distance as an exponential polynomial.

use keepout_core::structure::Boundedness;
use keepout_core::{CoreError, ExponentialPolynomial, RationalMatrix, spectral_structure};
use num_rational::BigRational;

fn number(numerator: i64, denominator: i64) -> BigRational {
    BigRational::new(numerator.into(), denominator.into())
}

fn main() -> Result<(), CoreError> {
    // Radial and along-track motion: radial, along, radial rate, along rate; mean motion n = 113/100000 rad/s.
    let (n, zero, one) = (number(113, 100_000), number(0, 1), number(1, 1));
    let rows = [
        vec![zero.clone(), zero.clone(), one.clone(), zero.clone()],
        vec![zero.clone(), zero.clone(), zero.clone(), one.clone()],
        vec![number(3, 1) * &n * &n, zero.clone(), zero.clone(), number(2, 1) * &n],
        vec![zero.clone(), zero.clone(), number(-2, 1) * &n, zero.clone()],
    ];
    let a = RationalMatrix::new(&rows)?;
    let structure = spectral_structure(&a)?;
    println!("the free motion is bounded: {}", structure.growth.boundedness == Boundedness::Bounded);

    // From this start the drift is exactly zero: the along-track motion has no term in t.
    let start = [number(210, 1), number(35, 1), number(1, 50), number(-2, 1) * &n * number(210, 1)];
    let position = |k: usize| {
        let functional: Vec<BigRational> = (0..4).map(|i| if i == k { one.clone() } else { zero.clone() }).collect();
        ExponentialPolynomial::trace(&a, &functional, &start)
    };
    let (radial, along) = (position(0)?, position(1)?);
    println!("along-track motion: annihilator {}, order {}", along.annihilator(), along.order());
    let square = &(&radial * &radial) + &(&along * &along);
    println!("squared distance in the plane: annihilator {}", square.annihilator());
    Ok(())
}
