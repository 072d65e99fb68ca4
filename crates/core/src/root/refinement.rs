//! Refinement of root proposals until their discs are proved.
//!
//! A sweep evaluates q at each point, bounds the disc radii d |W_i|, and stops if every disc is isolated and small.
//! Otherwise each point moves by -W_i. In a *mirrored* set only real points and points of the upper half plane are
//! stored; the conjugates are implied. A *free* set stores all points: it is used when the proposals are not mirror
//! images, until it becomes clear which roots are real.

use super::RootDisc;
use super::approx::{ScaledComplex, approx_mirrored_points, approx_point, approx_roots};
use super::evaluation::{Point, Value, evaluate};
use super::magnitude::Magnitude;
use crate::error::CoreError;
use crate::integer_polynomial::IntegerPolynomial;
use keepout_checker::number::Dyadic;
use num_bigint::BigInt;
use num_traits::{Signed, Zero};
use std::cmp::Ordering;

/// Sweeps allowed for a mirrored set that starts from doubles; each gains up to 50 bits once separated.
const MIRRORED_SWEEPS: usize = 10;
/// Sweeps allowed for a free set.
const FREE_SWEEPS: usize = 400;

#[derive(Clone, Copy, PartialEq, Eq)]
enum Symmetry {
    /// Conjugates of non-real points are implied.
    Mirrored,
    /// Every root has its own point.
    Free,
}

struct PointSet<'a> {
    q: &'a IntegerPolynomial,
    symmetry: Symmetry,
    points: Vec<Point>,
    guards: Vec<u64>,
    bits: u32,
}

/// What a sweep knows about one point.
struct Disc {
    /// Not below d |W|; `None`: two points coincide.
    radius: Option<Magnitude>,
    /// Not above the distance to the nearest other point.
    nearest_lo: Magnitude,
    step: ScaledComplex,
}

/// Disjoint discs for all roots; q is square-free, q(0) != 0, degree >= 2.
pub(super) fn isolate(q: &IntegerPolynomial, bits: u32) -> Result<Vec<RootDisc>, CoreError> {
    let proposals = approx_roots(q.coefficients());
    let extra = bits as usize / 40;
    if let Some(points) = approx_mirrored_points(&proposals) {
        let mut set = PointSet::new(q, Symmetry::Mirrored, points, bits);
        if let Some(discs) = set.run(MIRRORED_SWEEPS + extra) {
            return Ok(discs);
        }
    }
    let limit = CoreError::LimitExceeded { what: "separation of roots", limit: FREE_SWEEPS as u64 };
    let points = proposals.iter().map(|z| approx_point(*z)).collect::<Option<Vec<_>>>().ok_or(limit.clone())?;
    let mut free = PointSet::new(q, Symmetry::Free, points, 8);
    free.perturb_equal();
    free.break_symmetry();
    // More and more accuracy until the mirror images are matched and proved.
    for accuracy in [8, 32, 128, 512, 2048] {
        free.bits = accuracy;
        let Some(discs) = free.run(FREE_SWEEPS) else { break };
        if let Some(points) = free.mirrored(&discs) {
            let mut set = PointSet::new(q, Symmetry::Mirrored, points, bits);
            if let Some(discs) = set.run(MIRRORED_SWEEPS + extra) {
                return Ok(discs);
            }
        }
    }
    Err(limit)
}

impl<'a> PointSet<'a> {
    fn new(q: &'a IntegerPolynomial, symmetry: Symmetry, points: Vec<Point>, bits: u32) -> Self {
        let guards = vec![128; points.len()];
        Self { q, symmetry, points, guards, bits }
    }

    /// Sweeps until every disc is isolated and of radius <= 2^-bits |centre|.
    fn run(&mut self, sweeps: usize) -> Option<Vec<RootDisc>> {
        for _ in 0..sweeps {
            let discs: Vec<Disc> = (0..self.points.len()).map(|i| self.disc(i)).collect::<Option<_>>()?;
            if discs.iter().zip(&self.points).all(|(disc, point)| self.is_final(disc, point)) {
                return Some(self.to_root_discs(&discs));
            }
            for (i, disc) in discs.iter().enumerate() {
                self.advance(i, disc)?;
            }
            self.perturb_equal();
        }
        None
    }

    fn target(&self, point: &Point) -> i64 {
        // SOUND(lo): |centre| >= 2^(top - 1).
        point.top() - 1 - i64::from(self.bits)
    }

    fn is_final(&self, disc: &Disc, point: &Point) -> bool {
        let Some(radius) = disc.radius else { return false };
        self.is_small(radius, disc.nearest_lo, point)
    }

    fn is_small(&self, radius: Magnitude, nearest_lo: Magnitude, point: &Point) -> bool {
        // SOUND: 2 r_i < (distance to the nearest) for all i gives r_i + r_j < |z_i - z_j| for all pairs.
        let isolated = radius.shifted(1).compare(&nearest_lo) == Ordering::Less;
        isolated && radius.top() <= self.target(point)
    }

    /// Evaluates at point i with as many guard bits as needed, and bounds its disc.
    fn disc(&mut self, i: usize) -> Option<Disc> {
        let degree = self.q.degree() as u32;
        let lead = self.q.leading();
        let denominator = Denominator::new(self, i, &lead);
        let lead_lo = Magnitude::integer_lo(&lead, 0);
        loop {
            let value = evaluate(self.q.coefficients(), &self.points[i], self.guards[i]);
            let radius = denominator.radius(&value, degree, lead_lo);
            let sharp = value.top() > value.error.top() + 40;
            let small = radius.is_some_and(|r| self.is_small(r, denominator.nearest_lo, &self.points[i]));
            if sharp || small || radius.is_none() || self.guards[i] > 1 << 22 {
                let step =
                    ScaledComplex::approx_from(&value.re, &value.im, value.exponent).approx_div(denominator.product);
                return Some(Disc { radius, nearest_lo: denominator.nearest_lo, step });
            }
            self.guards[i] *= 2;
        }
    }

    /// z_i <- z_i - W_i, kept to the bits that can matter.
    fn advance(&mut self, i: usize, disc: &Disc) -> Option<()> {
        let point = &self.points[i];
        let (re, mut im, exponent) = disc.step.to_integers()?;
        if self.symmetry == Symmetry::Mirrored && point.im.is_zero() {
            im = BigInt::zero();
        }
        let common = exponent.min(point.exponent);
        let lift = |v: &BigInt, e: i64| v << e.abs_diff(common);
        let next = Point {
            re: lift(&point.re, point.exponent) - lift(&re, exponent),
            im: lift(&point.im, point.exponent) - lift(&im, exponent),
            exponent: common,
        };
        let floor = (next.top() - i64::from(self.bits) - 20).max(common);
        // Keep the distance to near points representable.
        let floor = floor.min(disc.nearest_lo.top() - 60).min(disc_top(disc) - 30);
        let mut next = next.coarsened(floor);
        if self.symmetry == Symmetry::Mirrored && !point.im.is_zero() && !next.im.is_positive() {
            next.im = -next.im + 1;
        }
        self.points[i] = next;
        Some(())
    }

    /// Moves every point by a fraction of the distance to its nearest neighbour, each in another direction: a pair of
    /// mirror images can never reach two real roots, a generic pair does.
    fn break_symmetry(&mut self) {
        let lead = self.q.leading();
        for i in 0..self.points.len() {
            let top = Denominator::new(self, i, &lead).nearest_lo.top();
            let directions = [(5, 3), (-3, 5), (4, -5), (-5, -4), (1, 6), (6, -1), (-2, 5)];
            let (re, im) = directions[i % directions.len()];
            let point = &mut self.points[i];
            let unit = (top - 6).min(point.exponent);
            point.re = (&point.re << point.exponent.abs_diff(unit)) + (BigInt::from(re) << (top - 6).abs_diff(unit));
            point.im = (&point.im << point.exponent.abs_diff(unit)) + (BigInt::from(im) << (top - 6).abs_diff(unit));
            point.exponent = unit;
        }
    }

    /// Moves points that coincide apart.
    fn perturb_equal(&mut self) {
        for i in 0..self.points.len() {
            let equal = (0..i).any(|j| {
                let (re, im, _) = difference(&self.points[i], &self.points[j], Mirror::No);
                re.is_zero() && im.is_zero()
            });
            if equal {
                let p = &mut self.points[i];
                p.re = (&p.re << 8u32) + (i + 1);
                if self.symmetry == Symmetry::Free {
                    p.im = (&p.im << 8u32) + (2 * i + 1);
                } else {
                    p.im <<= 8u32;
                }
                p.exponent -= 8;
            }
        }
    }

    /// The real and upper points of a free set whose discs tell which roots are real.
    fn mirrored(&self, discs: &[RootDisc]) -> Option<Vec<Point>> {
        let mut kept = Vec::new();
        let mut lower = 0;
        for (point, disc) in self.points.iter().zip(discs) {
            if disc.im.abs() <= disc.radius {
                kept.push(Point { re: point.re.clone(), im: BigInt::zero(), exponent: point.exponent });
            } else if point.im.is_positive() {
                kept.push(point.clone());
            } else {
                lower += 1;
            }
        }
        let upper = kept.iter().filter(|p| !p.im.is_zero()).count();
        (upper == lower).then_some(kept)
    }

    fn to_root_discs(&self, discs: &[Disc]) -> Vec<RootDisc> {
        let mut result = Vec::with_capacity(self.q.degree());
        for (point, disc) in self.points.iter().zip(discs) {
            let root = RootDisc {
                re: Dyadic::new(point.re.clone(), point.exponent),
                im: Dyadic::new(point.im.clone(), point.exponent),
                radius: disc.radius.unwrap_or_else(Magnitude::zero).to_dyadic(),
            };
            if self.symmetry == Symmetry::Mirrored && !root.is_real() {
                result.push(root.conjugate());
            }
            result.push(root);
        }
        result
    }
}

fn disc_top(disc: &Disc) -> i64 {
    disc.radius.map_or(i64::MAX / 4, |r| r.top())
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Mirror {
    No,
    Yes,
}

/// (re, im, exponent) of a - b, or of a - conj b; exact.
fn difference(a: &Point, b: &Point, mirror: Mirror) -> (BigInt, BigInt, i64) {
    let exponent = a.exponent.min(b.exponent);
    let lift = |v: &BigInt, e: i64| v << e.abs_diff(exponent);
    let re = lift(&a.re, a.exponent) - lift(&b.re, b.exponent);
    let (x, y) = (lift(&a.im, a.exponent), lift(&b.im, b.exponent));
    (re, if mirror == Mirror::Yes { x + y } else { x - y }, exponent)
}

/// lead * prod_(j != i) (z_i - z_j): a lower bound of the square of the product's modulus, and an approximation.
struct Denominator {
    square_lo: Magnitude,
    nearest_lo: Magnitude,
    product: ScaledComplex,
}

impl Denominator {
    fn new(set: &PointSet<'_>, i: usize, lead: &BigInt) -> Self {
        let zero = BigInt::zero();
        let mut square_lo = Magnitude::one();
        let mut nearest: Option<Magnitude> = None;
        let mut product = ScaledComplex::approx_from(lead, &zero, 0);
        let mut include = |(re, im, exponent): (BigInt, BigInt, i64)| {
            let (a, b) = (Magnitude::integer_lo(&re, exponent), Magnitude::integer_lo(&im, exponent));
            let square = a.mul_lo(a).add_lo(b.mul_lo(b));
            square_lo = square_lo.mul_lo(square);
            if nearest.as_ref().is_none_or(|n| square.compare(n) == Ordering::Less) {
                nearest = Some(square);
            }
            product = product.approx_mul(ScaledComplex::approx_from(&re, &im, exponent));
        };
        for (j, other) in set.points.iter().enumerate() {
            if j != i {
                include(difference(&set.points[i], other, Mirror::No));
            }
            if set.symmetry == Symmetry::Mirrored && !other.im.is_zero() {
                include(difference(&set.points[i], other, Mirror::Yes));
            }
        }
        let nearest_lo = nearest.map_or_else(Magnitude::zero, Magnitude::sqrt_lo);
        Self { square_lo, nearest_lo, product }
    }

    /// Not below d |W|.
    fn radius(&self, value: &Value, degree: u32, lead_lo: Magnitude) -> Option<Magnitude> {
        let numerator = value.modulus_hi().mul_hi(Magnitude::exact(degree, 0));
        // SOUND(hi): numerator rounded up, denominator |lead| sqrt(square_lo) rounded down.
        numerator.div_hi(lead_lo.mul_lo(self.square_lo.sqrt_lo()))
    }
}
