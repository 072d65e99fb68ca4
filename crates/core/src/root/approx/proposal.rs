//! From complex doubles to dyadic points, and the pairing of proposals as mirror images. Nothing here is proved.

use super::ApproxComplex;
#[cfg(test)]
use super::approx_parts;
use crate::root::evaluation::Point;
use num_bigint::BigInt;
use num_traits::Zero;

/// The dyadic point of a proposal; `None` if it is not finite.
pub(crate) fn approx_point(z: ApproxComplex) -> Option<Point> {
    if !z.is_finite() {
        return None;
    }
    let parts = |x: f64| {
        let bits = x.to_bits();
        let (raw, fraction) = ((bits >> 52 & 0x7ff) as i64, bits & ((1 << 52) - 1));
        let mantissa = if raw == 0 { fraction } else { fraction | 1 << 52 };
        let value = BigInt::from(mantissa);
        (if x < 0.0 { -value } else { value }, raw.max(1) - 1075)
    };
    let ((re, e), (im, g)) = (parts(z.re), parts(z.im));
    // Parts far below the modulus are noise: align to 64 bits below the top.
    let exponent = (e.max(g)) - 64;
    let align = |v: BigInt, from: i64| if from >= exponent { v << (from - exponent) } else { v >> (exponent - from) };
    Some(Point { re: align(re, e), im: align(im, g), exponent })
}

/// The real and upper points, if the proposals pair off as mirror images.
pub(crate) fn approx_mirrored_points(proposals: &[ApproxComplex]) -> Option<Vec<Point>> {
    let partner = |i: usize| {
        let z = proposals[i];
        let distance = |w: &ApproxComplex| (w.re - z.re).hypot(w.im + z.im);
        (0..proposals.len()).min_by(|a, b| distance(&proposals[*a]).total_cmp(&distance(&proposals[*b])))
    };
    let mut points = Vec::new();
    for (i, z) in proposals.iter().enumerate() {
        let j = partner(i)?;
        if partner(j)? != i {
            return None;
        }
        if i == j {
            points.push(approx_point(ApproxComplex { re: z.re, im: 0.0 })?);
        } else if z.im > 0.0 {
            points.push(approx_point(*z)?);
        }
    }
    let count: usize = points.iter().map(|p| if p.im.is_zero() { 1 } else { 2 }).sum();
    (count == proposals.len()).then_some(points)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn doubles_become_points_near_themselves() {
        let p = approx_point(ApproxComplex { re: -1.5, im: 0.25 }).unwrap();
        assert_eq!(approx_parts(&p.re).0 * 2f64.powi((approx_parts(&p.re).1 + p.exponent) as i32), -1.5);
        assert!(approx_point(ApproxComplex { re: f64::NAN, im: 0.0 }).is_none());
    }
}
