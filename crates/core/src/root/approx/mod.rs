//! Floating-point proposals for roots. Nothing here is proved.
//!
//! Start points on the circles of the Newton polygon, then the Ehrlich-Aberth iteration. Each evaluation rescales the
//! coefficients to the modulus of the point, so that coefficients of any size work as long as the roots themselves are
//! ordinary doubles. Source: Bini, Numer. Algorithms 13 (1996) 179-200.

mod proposal;
mod scaled;

pub(crate) use proposal::{approx_mirrored_points, approx_point};
pub(crate) use scaled::ScaledComplex;

use num_bigint::{BigInt, Sign};
use num_traits::{ToPrimitive, Zero};
use std::collections::HashMap;

const SWEEPS: usize = 100;

/// A complex double.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct ApproxComplex {
    pub(crate) re: f64,
    pub(crate) im: f64,
}

impl ApproxComplex {
    fn add(self, o: Self) -> Self {
        Self { re: self.re + o.re, im: self.im + o.im }
    }
    fn sub(self, o: Self) -> Self {
        Self { re: self.re - o.re, im: self.im - o.im }
    }
    fn mul(self, o: Self) -> Self {
        Self { re: self.re * o.re - self.im * o.im, im: self.re * o.im + self.im * o.re }
    }
    fn norm(self) -> f64 {
        self.re * self.re + self.im * self.im
    }
    fn abs(self) -> f64 {
        self.re.hypot(self.im)
    }
    fn recip(self) -> Self {
        let n = self.norm();
        if n > 1e-290 && n < 1e290 {
            return Self { re: self.re / n, im: -self.im / n };
        }
        let a = self.abs();
        Self { re: self.re / a / a, im: -self.im / a / a }
    }
    fn scale(self, f: f64) -> Self {
        Self { re: self.re * f, im: self.im * f }
    }
    pub(crate) fn is_finite(self) -> bool {
        self.re.is_finite() && self.im.is_finite()
    }
}

/// 2^e, 0 or infinity beyond the range of doubles.
pub(crate) fn approx_power_of_two(e: i64) -> f64 {
    match e {
        -1022..=1023 => f64::from_bits(((e + 1023) as u64) << 52),
        i64::MIN..=-1075 => 0.0,
        -1074..=-1023 => f64::from_bits(1 << (e + 1074)),
        _ => f64::INFINITY,
    }
}

/// (m, e) with a = m 2^e nearly, |m| < 1 and e the bit length.
pub(crate) fn approx_parts(a: &BigInt) -> (f64, i64) {
    let bits = a.bits();
    let magnitude = if bits <= 64 {
        a.magnitude().to_u64().unwrap_or(0) as f64 * approx_power_of_two(-(bits as i64))
    } else {
        (a.magnitude() >> (bits - 64)).to_u64().unwrap_or(0) as f64 * approx_power_of_two(-64)
    };
    (if a.sign() == Sign::Minus { -magnitude } else { magnitude }, bits as i64)
}

/// Proposals for all roots of a polynomial with non-zero constant term; some may be far off or not finite.
pub(crate) fn approx_roots(coefficients: &[BigInt]) -> Vec<ApproxComplex> {
    let parts: Vec<(f64, i64)> = coefficients.iter().map(approx_parts).collect();
    let mut roots = approx_start_points(&parts);
    let mut done = vec![false; roots.len()];
    let mut tables: HashMap<i64, Vec<f64>> = HashMap::new();
    for _ in 0..SWEEPS {
        if done.iter().all(|d| *d) {
            break;
        }
        for i in 0..roots.len() {
            if done[i] {
                continue;
            }
            let z = roots[i];
            let s = z.abs().log2().ceil();
            if !s.is_finite() {
                done[i] = true;
                continue;
            }
            let table = tables.entry(s as i64).or_insert_with(|| approx_table(&parts, s as i64));
            let Some((newton, small)) = approx_newton(table, z, s as i64) else {
                done[i] = true;
                continue;
            };
            let mut pull = ApproxComplex { re: 0.0, im: 0.0 };
            for (j, other) in roots.iter().enumerate() {
                if j != i {
                    pull = pull.add(z.sub(*other).recip());
                }
            }
            let one = ApproxComplex { re: 1.0, im: 0.0 };
            let step = newton.mul(one.sub(newton.mul(pull)).recip());
            if step.is_finite() {
                roots[i] = z.sub(step);
            }
            done[i] = small || step.abs() <= 4e-16 * z.abs() || !step.is_finite();
        }
    }
    roots
}

/// The coefficients of p(2^s w), scaled to a largest modulus below 1.
fn approx_table(parts: &[(f64, i64)], s: i64) -> Vec<f64> {
    let tops = parts.iter().enumerate().filter(|(_, (m, _))| *m != 0.0).map(|(k, (_, e))| e + s * k as i64);
    let largest = tops.max().unwrap_or(0);
    parts.iter().enumerate().map(|(k, (m, e))| m * approx_power_of_two(e + s * k as i64 - largest)).collect()
}

/// (p/p' at z, whether |p(z)| is down to rounding noise).
fn approx_newton(table: &[f64], z: ApproxComplex, s: i64) -> Option<(ApproxComplex, bool)> {
    let (down, up) = (approx_power_of_two(-s), approx_power_of_two(s));
    let w = z.scale(down);
    let radius = w.abs();
    let mut value = ApproxComplex { re: 0.0, im: 0.0 };
    let mut slope = value;
    let mut noise = 0.0;
    for c in table.iter().rev() {
        slope = slope.mul(w).add(value);
        value = value.mul(w);
        value.re += c;
        noise = noise * radius + value.abs_sum();
    }
    let newton = value.mul(slope.recip()).scale(up);
    let small = value.abs_sum() <= 4e-16 * noise;
    newton.is_finite().then_some((newton, small))
}

impl ApproxComplex {
    fn abs_sum(self) -> f64 {
        self.re.abs() + self.im.abs()
    }
}

/// Points on the circles given by the upper convex hull of (k, log2 |a_k|).
fn approx_start_points(parts: &[(f64, i64)]) -> Vec<ApproxComplex> {
    let heights: Vec<(f64, f64)> = parts
        .iter()
        .enumerate()
        .filter(|(_, (m, _))| !m.is_zero())
        .map(|(k, (m, e))| (k as f64, m.abs().log2() + *e as f64))
        .collect();
    let mut hull: Vec<(f64, f64)> = Vec::new();
    for p in heights {
        while hull.len() >= 2 {
            let (a, b) = (hull[hull.len() - 2], hull[hull.len() - 1]);
            if (b.1 - a.1) * (p.0 - a.0) > (p.1 - a.1) * (b.0 - a.0) {
                break;
            }
            hull.pop();
        }
        hull.push(p);
    }
    let mut points = Vec::new();
    for pair in hull.windows(2) {
        let count = pair[1].0 - pair[0].0;
        let radius = ((pair[0].1 - pair[1].1) / count).exp2();
        for k in 0..count as usize {
            let angle = std::f64::consts::TAU * (k as f64 / count + pair[0].0 / parts.len() as f64) + 0.7;
            points.push(ApproxComplex { re: radius * angle.cos(), im: radius * angle.sin() });
        }
    }
    points
}
