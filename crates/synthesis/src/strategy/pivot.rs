//! Pivots: functions whose sign decides the signs of traces where these vanish.

use crate::enclosure::Enclosure;
use crate::problem::Problem;
use crate::strategy::square::square_root;
use crate::strategy::taylor::{derivatives, taylor};
use keepout_checker::certificate::{Auxiliary, Cell, Factor, Pivot, Product, Sign};
use keepout_checker::number::Rational;
use keepout_core::{IntegerPolynomial, factorize};
use num_traits::{One, Zero};
use std::cmp::Ordering;

/// Auxiliary functions and products of a certificate.
#[derive(Clone, Debug, Default)]
pub(crate) struct Pivots {
    pub(crate) auxiliaries: Vec<Auxiliary>,
    pub(crate) products: Vec<Product>,
}

/// What happens right after t = 0.
pub(crate) enum AtStart {
    /// No trace vanishes there, or no help comes from it.
    Ordinary,
    /// The zone is false on the cell [0, cell.to].
    Clear(Cell),
    /// The zone is true at each instant after 0 of the cell.
    Entered(Cell),
}

/// What a pivot shows on a cell.
pub(crate) enum Touch {
    /// Nothing.
    None,
    /// The zone is false on the cell.
    Clear(Cell),
    /// The zone is true where the pivot vanishes, which it does.
    Entered(Cell),
}

/// A trace, the power of the pivot in it, and the cofactor.
type Split = (usize, u32, Auxiliary);

/// A cell after t = 0 in which the zone is entered is made this short: 2^-34, times the first length tried.
const START_HALVINGS: u32 = 80;

/// Looks at the stretch right after t = 0, where traces may vanish. The zone is false at t = 0.
pub(crate) fn at_start(to: &Rational, problem: &Problem, enclosure: &mut Enclosure) -> AtStart {
    let vanishing: Vec<(usize, usize)> = (0..problem.sequences.len())
        .filter(|i| !enclosure.forms[*i].terms.is_empty())
        .filter_map(|i| problem.sequences[i].values().iter().position(|y| !y.is_zero()).map(|k| (i, k)))
        .filter(|(_, k)| *k > 0)
        .collect();
    if vanishing.is_empty() {
        return AtStart::Ordinary;
    }
    let mut to = to.clone();
    let mut shortened = 0;
    for _ in 0..START_HALVINGS {
        let zero = Rational::zero();
        let order = enclosure.order(&zero, &to) + vanishing.iter().map(|(_, k)| *k as u32).max().unwrap_or(0) + 2;
        let mut signs: Vec<Option<Sign>> =
            (0..problem.sequences.len()).map(|i| enclosure.sign(problem, i, &zero, &to, order)).collect();
        let mut listed = Vec::new();
        for (i, k) in &vanishing {
            let sign = enclosure.quotient_at_start(*i, *k, &to, order).and_then(|v| v.certain_sign());
            signs[*i] = sign;
            listed.extend(sign.map(|s| (*i, *k as u32, s)));
        }
        let truth = problem.formula.truth(&signs);
        let plain = signs.iter().enumerate().filter(|(i, _)| vanishing.iter().all(|(v, _)| v != i));
        let plain = plain.filter_map(|(i, s)| s.map(|s| (i, s))).collect();
        let cell = Cell { to: to.clone(), order, signs: plain, pivot: Pivot::Start(listed) };
        match truth {
            Some(false) => return AtStart::Clear(cell),
            Some(true) if shortened >= 34 => return AtStart::Entered(cell),
            Some(true) => shortened += 1,
            None => {}
        }
        to /= Rational::from_integer(2.into());
    }
    AtStart::Ordinary
}

impl Pivots {
    /// A cell [a, b] with a trace that changes its sign there, and with the zone true where that trace is zero.
    pub(crate) fn crossing(
        &mut self,
        a: &Rational,
        b: &Rational,
        problem: &mut Problem,
        enclosure: &mut Enclosure,
    ) -> Option<Cell> {
        let order = enclosure.order(a, b);
        let signs: Vec<Option<Sign>> =
            (0..problem.sequences.len()).map(|i| enclosure.sign(problem, i, a, b, order)).collect();
        for i in 0..signs.len() {
            let mut with_zero = signs.clone();
            with_zero[i] = Some(Ordering::Equal);
            if signs[i].is_some() || problem.formula.truth(&with_zero) != Some(true) {
                continue;
            }
            let ends = [a, b].map(|t| enclosure.sign(problem, i, t, t, order));
            let opposite = [Some(Ordering::Less), Some(Ordering::Greater)];
            if ends != opposite && ends != [opposite[1], opposite[0]] {
                continue;
            }
            let degree = problem.degree(&problem.factors[i]);
            let pivot = self.auxiliary(Auxiliary {
                factors: problem.factors[i].clone(),
                derivatives: problem.sequences[i].derivatives(degree),
            });
            let one = self.polynomial(&[Rational::one()], problem)?;
            let product = self.product(Product { trace: i, pivot, power: 1, cofactor: one });
            enclosure.renew(problem)?;
            let plain = signs.iter().enumerate().filter_map(|(j, s)| s.map(|s| (j, s))).collect();
            return Some(Cell {
                to: b.clone(),
                order,
                signs: plain,
                pivot: Pivot::Auxiliary(pivot, vec![(product, Ordering::Greater)]),
            });
        }
        None
    }

    /// A cell that refutes the zone for all time: a trace is a constant times a square, and the zone is false whether the root
    /// is zero or not.
    pub(crate) fn timeless(&mut self, to: &Rational, problem: &mut Problem, enclosure: &mut Enclosure) -> Option<Cell> {
        for i in 0..problem.sequences.len() {
            let Some((kappa, root)) = square_root(i, problem) else { continue };
            let sign = kappa.cmp(&Rational::zero());
            let with = |sign: Sign| -> Vec<Option<Sign>> {
                (0..problem.sequences.len()).map(|j| (i == j).then_some(sign)).collect()
            };
            if [sign, Ordering::Equal].iter().any(|s| problem.formula.truth(&with(*s)) != Some(false)) {
                continue;
            }
            let cofactor = constant(&kappa, problem)?;
            let (pivot, cofactor) = (self.auxiliary(root), self.auxiliary(cofactor));
            let product = self.product(Product { trace: i, pivot, power: 2, cofactor });
            enclosure.renew(problem)?;
            let pivot = Pivot::Auxiliary(pivot, vec![(product, sign)]);
            return Some(Cell { to: to.clone(), order: 2, signs: Vec::new(), pivot });
        }
        None
    }

    /// Decides a cell [a, b] in which traces vanish at a time that is a root of a polynomial with rational coefficients.
    pub(crate) fn touch(
        &mut self,
        a: &Rational,
        b: &Rational,
        problem: &mut Problem,
        enclosure: &mut Enclosure,
    ) -> Touch {
        let mut pivots: Vec<(usize, Vec<Split>)> = Vec::new();
        for w in candidates(a, b, problem).into_iter().filter(|w| !w[0].is_zero()) {
            let splits: Vec<Split> = (0..problem.sequences.len())
                .filter_map(|i| divided(i, &w, problem).map(|(power, cofactor)| (i, power, cofactor)))
                .collect();
            if !splits.is_empty() {
                pivots.extend(self.polynomial(&w, problem).map(|pivot| (pivot, splits)));
            }
        }
        for i in 0..problem.sequences.len() {
            if let Some((kappa, root)) = square_root(i, problem) {
                let constant = constant(&kappa, problem);
                let pivot = self.auxiliary(root);
                pivots.extend(constant.map(|cofactor| (pivot, vec![(i, 2, cofactor)])));
            }
        }
        if pivots.is_empty() || enclosure.renew(problem).is_none() {
            return Touch::None;
        }
        for (pivot, splits) in pivots {
            match self.touch_with(pivot, splits, a, b, problem, enclosure) {
                Some(Touch::None) | None => {}
                Some(found) => return found,
            }
        }
        Touch::None
    }

    fn touch_with(
        &mut self,
        pivot: usize,
        splits: Vec<Split>,
        a: &Rational,
        b: &Rational,
        problem: &Problem,
        enclosure: &mut Enclosure,
    ) -> Option<Touch> {
        let order = enclosure.order(a, b);
        let mut plain: Vec<Option<Sign>> =
            (0..problem.sequences.len()).map(|i| enclosure.sign(problem, i, a, b, order)).collect();
        let mut cases = [plain.clone(), plain.clone(), plain.clone()];
        let mut listed = Vec::new();
        for (i, power, cofactor) in splits {
            let form = enclosure.closed_form(&cofactor.factors, &cofactor.derivatives).ok()?;
            let Some(sign) = enclosure.on_stretch(&form, a, b, order).and_then(|v| v.certain_sign()) else { continue };
            let cofactor = self.auxiliary(cofactor);
            let product = self.product(Product { trace: i, pivot, power, cofactor });
            listed.push((product, sign));
            plain[i] = None;
            let negative = if power % 2 == 1 { sign.reverse() } else { sign };
            for (case, s) in cases.iter_mut().zip([negative, Ordering::Equal, sign]) {
                case[i] = Some(s);
            }
        }
        let truths = cases.each_ref().map(|signs| problem.formula.truth(signs));
        let plain = plain.iter().enumerate().filter_map(|(i, s)| s.map(|s| (i, s))).collect();
        let cell = Cell { to: b.clone(), order, signs: plain, pivot: Pivot::Auxiliary(pivot, listed) };
        if truths == [Some(false); 3] {
            return Some(Touch::Clear(cell));
        }
        let root = self.auxiliaries[pivot].clone();
        let form = enclosure.closed_form(&root.factors, &root.derivatives).ok()?;
        let mut at = |t: &Rational| enclosure.on_stretch(&form, t, t, order).and_then(|v| v.certain_sign());
        let ends = (at(a)?, at(b)?);
        let changes = ends.0 == ends.1.reverse() && ends.0 != Ordering::Equal;
        (changes && truths[1] == Some(true)).then_some(Touch::Entered(cell))
    }

    fn auxiliary(&mut self, auxiliary: Auxiliary) -> usize {
        position_or_push(&mut self.auxiliaries, auxiliary)
    }

    fn product(&mut self, product: Product) -> usize {
        position_or_push(&mut self.products, product)
    }

    /// The position of the auxiliary function that is a polynomial in t.
    fn polynomial(&mut self, coefficients: &[Rational], problem: &mut Problem) -> Option<usize> {
        polynomial(coefficients, problem).map(|auxiliary| self.auxiliary(auxiliary))
    }
}

/// The function that is a polynomial in t.
fn polynomial(coefficients: &[Rational], problem: &mut Problem) -> Option<Auxiliary> {
    let family = problem.family(&IntegerPolynomial::variable())?;
    let factors = vec![Factor { family, multiplicity: u32::try_from(coefficients.len()).ok()? }];
    Some(Auxiliary { factors, derivatives: derivatives(coefficients) })
}

/// The function that is a constant.
fn constant(value: &Rational, problem: &mut Problem) -> Option<Auxiliary> {
    polynomial(std::slice::from_ref(value), problem)
}

fn position_or_push<T: PartialEq>(list: &mut Vec<T>, item: T) -> usize {
    list.iter().position(|known| *known == item).unwrap_or_else(|| {
        list.push(item);
        list.len() - 1
    })
}

/// Polynomials in t that may vanish in [a, b] together with traces: t - q for the simplest rational q, and the factors of P for
/// each trace P(t) exp(r t).
fn candidates(a: &Rational, b: &Rational, problem: &Problem) -> Vec<Vec<Rational>> {
    let simplest = simplest_between(a, b);
    let mut list = vec![vec![-simplest, Rational::one()]];
    for (sequence, factors) in problem.sequences.iter().zip(&problem.factors) {
        let [factor] = factors.as_slice() else { continue };
        let family = problem.families[factor.family].to_monic();
        if family.degree() != 1 || factor.multiplicity < 2 {
            continue;
        }
        let rate = -family.coefficients()[0].clone();
        let p = without_exponential(&sequence.derivatives(factor.multiplicity as usize), &rate);
        for part in factorize(&IntegerPolynomial::from_rationals(&p)).factors {
            let w = part.polynomial.to_monic().coefficients().to_vec();
            let ends = [a, b].map(|t| part.polynomial.value_rational(t));
            if &ends[0] * &ends[1] <= Rational::zero() && !list.contains(&w) {
                list.push(w);
            }
        }
    }
    list
}

/// The coefficients of P from the list of derivatives at 0 of P(t) exp(rate t).
fn without_exponential(list: &[Rational], rate: &Rational) -> Vec<Rational> {
    let p = taylor(list);
    let powers = std::iter::successors(Some(Rational::one()), |power| Some(-(power * rate)));
    let inverse = taylor(&powers.take(p.len()).collect::<Vec<_>>());
    (0..p.len()).map(|k| (0..=k).map(|j| &p[j] * &inverse[k - j]).sum()).collect()
}

/// The trace as w^power times a cofactor, power >= 1 as great as possible, if w divides it.
///
/// g = w h iff h has the annihilator with each multiplicity lowered by deg w, and the derivatives that the Leibniz rule gives.
fn divided(index: usize, w: &[Rational], problem: &Problem) -> Option<(u32, Auxiliary)> {
    let degree = u32::try_from(w.len() - 1).ok()?;
    let mut factors = problem.factors[index].clone();
    let mut power = 0;
    let mut derivatives = problem.sequences[index].derivatives(problem.degree(&factors));
    while !factors.is_empty() && factors.iter().all(|f| f.multiplicity > degree) {
        let lower: Vec<Factor> =
            factors.iter().map(|f| Factor { multiplicity: f.multiplicity - degree, ..*f }).collect();
        let quotient = series_quotient(&derivatives, w);
        let size = problem.degree(&lower);
        let m = lower.iter().fold(keepout_checker::polynomial::Polynomial::one(), |m, f| {
            m.mul(&problem.families[f.family].to_monic().power(f.multiplicity))
        });
        let sequence = keepout_checker::sequence::Sequence::from_rationals(&quotient);
        if !sequence.is_annihilated(&m, quotient.len() - size) {
            break;
        }
        (factors, derivatives, power) = (lower, quotient[..size].to_vec(), power + 1);
    }
    (power > 0).then_some((power, Auxiliary { factors, derivatives }))
}

/// The derivatives at 0 of g / w from the list of those of g; w(0) is not 0.
fn series_quotient(list: &[Rational], w: &[Rational]) -> Vec<Rational> {
    let mut quotient: Vec<Rational> = Vec::new();
    for (k, c) in taylor(list).iter().enumerate() {
        let known: Rational = (1..w.len().min(k + 1)).map(|j| &w[j] * &quotient[k - j]).sum();
        quotient.push((c - known) / &w[0]);
    }
    derivatives(&quotient)
}

/// The rational with the least denominator in [a, b], 0 < a < b. Source: Stern-Brocot tree.
pub(crate) fn simplest_between(a: &Rational, b: &Rational) -> Rational {
    let whole = a.ceil();
    if whole <= *b {
        return whole;
    }
    let floor = a.floor();
    let rest = simplest_between(&(b - &floor).recip(), &(a - &floor).recip());
    floor + rest.recip()
}
