//! Certified enclosures of the roots of polynomials.
//!
//! Lemma (Boersch-Supan, Numer. Math. 5:380-398, 1963; Smith, J. ACM 17:661-674, 1970): let q be monic of degree d and
//! z_1..z_d distinct, W_i = q(z_i) / prod_(j != i) (z_i - z_j). All roots of q lie in the union of the discs
//! |z - z_i| <= d |W_i|, and a disc disjoint from the others holds exactly one root (Gerschgorin, for the matrix
//! diag(z) - W 1^T whose characteristic polynomial is q). Here all discs of all families are pairwise disjoint: so every
//! polynomial is square-free, no two families share a root, and a disc names one root. For real q, a disc with a real centre
//! that is disjoint from the others holds a real root (its conjugate is a root in the same disc), one that is disjoint
//! from its mirror image holds a root that is not real.

use crate::certificate::{Factor, RootFamily, RootRef};
use crate::error::{Duty, Obligation, Rejection, Rule};
use crate::limits::Budget;
use crate::number::Direction::Up;
use crate::number::{Complex, Dyadic, Interval, Rational};
use crate::polynomial::{Polynomial, length};
use num_traits::Zero;
use std::cmp::Ordering;

/// One root: a disc that holds it and no other root of any family.
#[derive(Clone, Debug)]
pub struct Root {
    /// The family that it belongs to.
    pub family: usize,
    /// Whether it is real.
    pub is_real: bool,
    /// A rectangle that contains it.
    pub value: Complex,
    centre: Complex,
    radius: Dyadic,
}

impl Root {
    fn conj(&self) -> Self {
        Self { value: self.value.conj(), centre: self.centre.conj(), ..self.clone() }
    }

    fn is_disjoint(&self, other: &Self, bits: u32) -> bool {
        let distance = self.centre.sub(&other.centre, bits).abs_squared(bits);
        let reach = self.radius.add(&other.radius, bits, Up);
        // SOUND: distance^2 from below (lower end of an enclosure) against (r_1 + r_2)^2 from above.
        *distance.lo() > reach.mul(&reach, bits, Up)
    }
}

/// All families with their certified roots.
#[derive(Clone, Debug)]
pub struct RootTable {
    families: Vec<Polynomial>,
    /// Bits of each coefficient over the family's common denominator, at most.
    sizes: Vec<usize>,
    roots: Vec<Root>,
}

impl RootTable {
    /// Certifies the roots of all families.
    ///
    /// # Errors
    /// [`Rejection::Inconclusive`] where discs meet at this precision.
    pub fn new(families: &[RootFamily], bits: u32, budget: &mut Budget) -> Result<Self, Rejection> {
        let mut roots = Vec::new();
        for (position, family) in families.iter().enumerate() {
            let degree = family.polynomial.degree();
            budget.spend(2 * degree * degree, bits)?;
            budget.spend(degree, u32::try_from(family.polynomial.length()).unwrap_or(u32::MAX))?;
            let separated = Duty::new(Rule::Trace, Obligation::RootsAreSeparated, position);
            roots.extend(discs(position, family, bits).ok_or_else(|| separated.inconclusive())?);
        }
        budget.spend(2 * roots.len() * roots.len(), bits)?;
        let sizes = families.iter().map(|f| f.polynomial.common_length()).collect();
        let table = Self { families: families.iter().map(|f| f.polynomial.clone()).collect(), sizes, roots };
        match table.colliding_family(bits) {
            None => Ok(table),
            Some(family) => Err(Duty::new(Rule::Trace, Obligation::RootsAreSeparated, family).inconclusive()),
        }
    }

    /// A family with a disc that meets another disc of any family, or its own mirror image.
    fn colliding_family(&self, bits: u32) -> Option<usize> {
        // Two discs on opposite sides of the real axis meet only if the mirror image of one meets the other, and
        // mirrored pairs are as far apart as the originals.
        for (i, root) in self.roots.iter().enumerate() {
            let mirrored = !root.is_real && !root.is_disjoint(&root.conj(), bits);
            let meets = |other: &Root| !root.is_disjoint(other, bits) || !root.is_disjoint(&other.conj(), bits);
            if mirrored || self.roots.iter().skip(i + 1).any(meets) {
                return Some(root.family);
            }
        }
        None
    }

    /// The listed roots, in order.
    pub fn roots(&self) -> &[Root] {
        &self.roots
    }

    /// The polynomial of a family.
    pub fn polynomial(&self, family: usize) -> Option<&Polynomial> {
        self.families.get(family)
    }

    /// The family of the polynomial z, whose root is 0.
    pub fn zero_family(&self) -> Option<usize> {
        self.families.iter().position(|f| f.degree() == 1 && f.coefficients().first().is_some_and(Zero::is_zero))
    }

    /// The root, or its conjugate.
    pub fn get(&self, root: RootRef) -> Option<Root> {
        let found = self.roots.get(root.index)?;
        Some(if root.conjugate { found.conj() } else { found.clone() })
    }

    /// The product of families with multiplicity.
    pub fn product(&self, factors: &[Factor]) -> Option<Polynomial> {
        factors.iter().try_fold(Polynomial::one(), |product, factor| {
            Some(product.mul(&self.families.get(factor.family)?.power(factor.multiplicity)))
        })
    }

    /// Accounts for the product of families with multiplicity: over the product of their common denominators, coefficients are as long as
    /// those of all factors together.
    pub fn spend_product(&self, factors: &[Factor], budget: &mut Budget) -> Result<(), Rejection> {
        let (mut degree, mut length) = (0_usize, 0_usize);
        for factor in factors {
            let Some(polynomial) = self.families.get(factor.family) else { continue };
            let times = usize::try_from(factor.multiplicity).unwrap_or(usize::MAX);
            let size = self.sizes.get(factor.family).copied().unwrap_or(usize::MAX);
            degree = degree.saturating_add(polynomial.degree().saturating_mul(times));
            length = length.saturating_add(size.saturating_mul(times));
        }
        budget.spend(degree.saturating_mul(degree), u32::try_from(length).unwrap_or(u32::MAX))
    }

    /// Accounts for the reflection of a root's polynomial about the mean of its roots, and for clearing denominators after that:
    /// numbers as long as all coefficients and the mean's power of the degree.
    pub fn spend_reflection(&self, index: usize, budget: &mut Budget) -> Result<(), Rejection> {
        let Some(polynomial) = self.roots.get(index).and_then(|r| self.families.get(r.family)) else { return Ok(()) };
        let degree = polynomial.degree();
        let mean = polynomial.mean().map_or(0, |a| length(&a));
        let bits = polynomial.length().saturating_add(degree.saturating_mul(mean));
        budget.spend(degree.saturating_mul(degree), u32::try_from(bits).unwrap_or(u32::MAX))
    }

    /// The roots that the members of `value` can be, among all roots of the families; conjugates stand for themselves.
    pub fn candidates(&self, value: &Complex, families: &[Factor]) -> Vec<RootRef> {
        let mut found = Vec::new();
        for (index, root) in self.roots.iter().enumerate() {
            if !families.iter().any(|f| f.family == root.family) {
                continue;
            }
            let apart = |a: &Complex, b: &Complex| a.re.is_disjoint(&b.re) || a.im.is_disjoint(&b.im);
            if !apart(value, &root.value) {
                found.push(RootRef { index, conjugate: false });
            }
            if !root.is_real && !apart(value, &root.value.conj()) {
                found.push(RootRef { index, conjugate: true });
            }
        }
        found
    }

    /// Whether the root's real part is exactly `line`.
    ///
    /// Lemma: let q be real with q(2 a - z) = +-q(z). Then z -> 2 a - conj z maps roots of q to roots of q. If the
    /// image of a root's disc meets no other disc of the family, the root is its own image: its real part is a.
    /// `Some(false)`: the polynomial is not symmetric; `None`: not decided.
    pub fn is_on_line(&self, index: usize, line: &Rational, bits: u32) -> Option<bool> {
        let root = self.roots.get(index)?;
        let polynomial = self.families.get(root.family)?;
        // Symmetry about a line maps the roots to themselves, so their mean is on it.
        if polynomial.mean().as_ref() != Some(line) {
            return Some(false);
        }
        let reflected = polynomial.reflected(&(line + line));
        let sign = Rational::from_integer(if polynomial.degree() % 2 == 0 { 1_i32 } else { -1_i32 }.into());
        let symmetric =
            reflected.coefficients().iter().map(|c| c * &sign).eq(polynomial.coefficients().iter().cloned());
        if !symmetric {
            return Some(false);
        }
        let double = Interval::rational(&(line + line), bits);
        let image = Complex { re: double.sub(&root.value.re, bits), im: root.value.im.clone() };
        let family = [Factor { family: root.family, multiplicity: 1 }];
        let only = self.candidates(&image, &family) == vec![RootRef { index, conjugate: false }];
        only.then_some(true)
    }
}

/// The discs of one family, not yet known to be disjoint. `None` where approximations coincide.
fn discs(position: usize, family: &RootFamily, bits: u32) -> Option<Vec<Root>> {
    let point = |re: &Dyadic, im: &Dyadic| Complex { re: Interval::point(re.clone()), im: Interval::point(im.clone()) };
    let mut all: Vec<Complex> = family.centres.iter().map(|(re, im)| point(re, im)).collect();
    let lower: Vec<Complex> = family
        .centres
        .iter()
        .filter(|(_, im)| im.sign() != Ordering::Equal)
        .map(|(re, im)| point(re, &im.neg()))
        .collect();
    all.extend(lower);
    let degree = Dyadic::new(family.polynomial.degree().into(), 0);
    let mut roots = Vec::new();
    for (i, (re, im)) in family.centres.iter().enumerate() {
        let centre = point(re, im);
        let value = family.polynomial.taylor(&centre, 1, bits).into_iter().next()?;
        let others = all.iter().enumerate().filter(|(j, _)| *j != i);
        let product = others.fold(Complex::one(), |product, (_, z)| product.mul(&centre.sub(z, bits), bits));
        let weight = value.mul(&product.recip(bits)?, bits);
        // SOUND(hi): d |W_i|, both factors from above, rounded up.
        let radius = weight.abs_hi(bits).mul(&degree, bits, Up);
        let is_real = im.sign() == Ordering::Equal;
        let spread = Interval::symmetric(&radius);
        let value = Complex {
            re: centre.re.add(&spread, bits),
            im: if is_real { Interval::integer(0) } else { centre.im.add(&spread, bits) },
        };
        roots.push(Root { family: position, is_real, value, centre, radius });
    }
    Some(roots)
}
