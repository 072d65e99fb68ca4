//! Polynomials of a zone on a set of starts (see [`crate::region`]), expanded in the coordinates of the set.
//!
//! A polynomial p in the states becomes on the set a finite sum of C y^g_0 u_1^g_1 ... T^j exp(i n . phi), one summand for each key
//! (g, j, n): states have such sums by definition, and sums and products of such sums are such sums.
//!
//! Lemma (exact zeros): put y = exp(scale t), u_j = exp(rho_j t), T = t, phi = omega t. Then p becomes its trace along the trajectory, and the
//! key (g, j, n) becomes t^j exp(lambda t) with lambda = scale g_0 + rho . (g_1, ...) + i n . omega. If the lambda of this key is
//! different from that of all keys with other (g, n), then the trace has C as its coefficient of t^j exp(lambda t), because functions t^j exp(lambda t)
//! with different (j, lambda) are linearly independent. If moreover lambda is no root, of multiplicity above j, of an annihilator of
//! the trace, then that coefficient is 0, so C = 0. Both are told from disjoint enclosures.
//!
//! Lemma (dominance): for y >= y_0 >= exp(l), y^lo_j <= u_j <= y^hi_j, 0 < from <= T <= y^power the quotient of two keys'
//! y^d_0 u^d T^k is at most y^e T^min(k, 0), e = d_0 + sum of d_j hi_j (d_j > 0) or d_j lo_j (d_j < 0) + max(k, 0) power; for e <= 0
//! this is at most exp(e l) from^min(k, 0).

use crate::error::Rejection;
use crate::lead::LeadForm;
use crate::limits::{Budget, Limits, within};
use crate::number::Direction::Up;
use crate::number::{Complex, Dyadic, Interval, Rational};
use crate::region::Region;
use crate::root::RootTable;
use crate::statement::{Expression, Statement, Variable};
use crate::trace::ClosedForm;
use num_bigint::BigInt;
use num_traits::{Signed, Zero};
use std::collections::{BTreeMap, BTreeSet};

/// y^growth_0 u_1^growth_1 ... T^power exp(i turns . phi).
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Key {
    /// The powers of y, u_1, u_2, ...
    pub growth: Vec<Rational>,
    /// The power of T.
    pub power: usize,
    /// The multiples of the base angles.
    pub turns: Vec<i64>,
}

impl Key {
    fn times(&self, other: &Self) -> Option<Self> {
        let growth = self.growth.iter().zip(&other.growth).map(|(a, b)| a + b).collect();
        let turns = self.turns.iter().zip(&other.turns).map(|(a, b)| a.checked_add(*b)).collect::<Option<_>>()?;
        Some(Self { growth, power: self.power.checked_add(other.power)?, turns })
    }

    fn conj(&self) -> Option<Self> {
        let turns = self.turns.iter().map(|n| n.checked_neg()).collect::<Option<_>>()?;
        Some(Self { turns, ..self.clone() })
    }
}

/// Coefficients, each enclosed; keys that are absent have the coefficient 0.
pub type Expansion = BTreeMap<Key, Complex>;

/// The coordinates of a set of starts, with what they stand for enclosed.
#[derive(Debug)]
pub struct Frame<'a> {
    region: &'a Region,
    /// The scale and the base rates.
    rates: Vec<Interval>,
    frequencies: Vec<Interval>,
    /// The key of each exponent, by the position of its root in the table.
    keys: BTreeMap<usize, Key>,
    bits: u32,
}

impl<'a> Frame<'a> {
    /// Prepares a set; `roots`: the position in the table of each of its roots. `None`: a position or a length does not fit.
    pub fn new(region: &'a Region, roots: &[usize], table: &RootTable, bits: u32) -> Option<Self> {
        let value = |position: &usize| Some(&table.roots().get(*roots.get(*position)?)?.value);
        let mut rates = vec![Interval::rational(&region.scale, bits)];
        for rate in &region.rates {
            rates.push(value(&rate.root)?.re.clone());
        }
        let frequencies: Vec<Interval> =
            region.base.iter().map(|b| value(b).map(|v| v.im.clone())).collect::<Option<_>>()?;
        let mut keys = BTreeMap::new();
        for exponent in &region.exponents {
            let fits = exponent.growth.len() == rates.len() && exponent.turns.len() == frequencies.len();
            let key = Key { growth: exponent.growth.clone(), power: 0, turns: exponent.turns.clone() };
            // An exponent that is listed twice would count twice.
            if !fits || keys.insert(*roots.get(exponent.root)?, key).is_some() {
                return None;
            }
        }
        Some(Self { region, rates, frequencies, keys, bits })
    }

    /// The expansion of a state from its closed form along the trajectory. `None`: one of its exponents is not listed.
    pub fn coordinate(&self, form: &ClosedForm) -> Option<Expansion> {
        let mut sum = Expansion::new();
        for term in &form.terms {
            let key = self.keys.get(&term.root)?;
            for (power, c) in term.coefficients.iter().enumerate() {
                let key = Key { power, ..key.clone() };
                if term.is_real {
                    self.add(&mut sum, key, c);
                } else {
                    self.add(&mut sum, key.conj()?, &c.conj());
                    self.add(&mut sum, key, c);
                }
            }
        }
        Some(sum)
    }

    fn add(&self, sum: &mut Expansion, key: Key, c: &Complex) {
        let slot = sum.entry(key).or_insert_with(Complex::zero);
        *slot = slot.add(c, self.bits);
    }

    fn product(&self, a: &Expansion, b: &Expansion, limits: &Limits, budget: &mut Budget) -> Expanded {
        budget.spend(a.len().saturating_mul(b.len()).saturating_mul(4), self.bits)?;
        let mut product = Expansion::new();
        for (k, c) in a {
            for (l, d) in b {
                let Some(key) = k.times(l) else { return Ok(None) };
                self.add(&mut product, key, &c.mul(d, self.bits));
            }
            within("statement_entries", product.len(), limits.statement_entries)?;
        }
        Ok(Some(product))
    }

    /// The expansion of a polynomial; `None`: it names something else than states and outputs.
    pub fn expand(
        &self,
        polynomial: &Expression,
        statement: &Statement,
        coordinates: &[Expansion],
        limits: &Limits,
        budget: &mut Budget,
    ) -> Expanded {
        let constant =
            Key { growth: vec![Rational::zero(); self.rates.len()], power: 0, turns: vec![0; self.frequencies.len()] };
        let mut sum = Expansion::new();
        for term in &polynomial.terms {
            let factor = Complex::real(Interval::rational(&term.coefficient, self.bits));
            let mut product = Expansion::from([(constant.clone(), factor)]);
            for (variable, exponent) in &term.powers {
                let factor = match variable {
                    Variable::State(i) => coordinates.get(*i).cloned(),
                    // An output names no output, so this goes no deeper.
                    Variable::Output(i) => match statement.outputs.get(*i) {
                        Some(output) => self.expand(&output.value, statement, coordinates, limits, budget)?,
                        None => None,
                    },
                    Variable::Drive(_) | Variable::Time | Variable::Exponential(_) | Variable::Disturbance(_) => None,
                };
                let Some(factor) = factor else { return Ok(None) };
                within("degree", usize::try_from(*exponent).unwrap_or(usize::MAX), limits.degree)?;
                for _ in 0..*exponent {
                    let Some(next) = self.product(&product, &factor, limits, budget)? else { return Ok(None) };
                    product = next;
                }
            }
            for (key, c) in product {
                self.add(&mut sum, key, &c);
            }
        }
        Ok(Some(sum))
    }

    /// Encloses lambda of a key.
    fn exponent(&self, growth: &[Rational], turns: &[i64]) -> Complex {
        let bits = self.bits;
        let mut lambda = Complex::zero();
        for (g, rate) in growth.iter().zip(&self.rates) {
            lambda.re = lambda.re.add(&rate.mul(&Interval::rational(g, bits), bits), bits);
        }
        for (n, frequency) in turns.iter().zip(&self.frequencies) {
            lambda.im = lambda.im.add(&frequency.mul(&Interval::integer(*n), bits), bits);
        }
        lambda
    }

    /// The expansion without the keys whose coefficients are exactly 0 by the first lemma; `trace`: the closed form of the
    /// polynomial along the trajectory.
    pub fn without_zeros(
        &self,
        expansion: &Expansion,
        trace: &ClosedForm,
        budget: &mut Budget,
    ) -> Result<Expansion, Rejection> {
        let apart = |a: &Complex, b: &Complex| a.re.is_disjoint(&b.re) || a.im.is_disjoint(&b.im);
        let names: BTreeSet<(&Vec<Rational>, &Vec<i64>)> = expansion.keys().map(|k| (&k.growth, &k.turns)).collect();
        budget.spend(names.len().saturating_mul(names.len() + 4 * trace.terms.len()), 64)?;
        let lambdas: BTreeMap<_, Complex> =
            names.into_iter().map(|name| (name, self.exponent(name.0, name.1))).collect();
        let mut kept = Expansion::new();
        for (key, c) in expansion {
            let name = (&key.growth, &key.turns);
            let Some(lambda) = lambdas.get(&name) else { continue };
            let is_alone = || lambdas.iter().all(|(other, value)| *other == name || apart(lambda, value));
            let may_be_root = trace
                .terms
                .iter()
                .filter(|term| term.coefficients.len() > key.power)
                .any(|term| !apart(lambda, &term.exponent) || !apart(lambda, &term.exponent.conj()));
            if may_be_root || !is_alone() {
                kept.insert(key.clone(), c.clone());
            }
        }
        Ok(kept)
    }

    /// The expansion divided by the leading y^g T^j, as its waves on the base angles and a bound of the rest, for all points of
    /// the set (second lemma); `log_start`: a number whose exponential is at most the set's `start`.
    ///
    /// `None`: some other key is not shown to stay bounded beside the leading one.
    pub fn lead_form(
        &self,
        expansion: &Expansion,
        lead: (&[Rational], usize),
        log_start: &Rational,
    ) -> Option<LeadForm> {
        let bits = self.bits;
        let mut waves = Vec::new();
        let mut rest = Dyadic::zero();
        for (key, c) in expansion {
            if (key.growth.as_slice(), key.power) == lead {
                waves.push((c.clone(), key.turns.clone()));
                continue;
            }
            let ratio = self.greatest_ratio(key, lead, log_start)?;
            // SOUND(hi): |C exp(i n . phi)| = |C| times a quotient >= 0, both from above, rounded up.
            rest = rest.add(&c.abs_hi(bits).mul(&ratio, bits, Up), bits, Up);
        }
        Some(LeadForm::of_waves(waves, rest, bits))
    }

    /// Not below the quotient of a key and the lead, without their waves, at any point of the set.
    fn greatest_ratio(&self, key: &Key, (growth, power): (&[Rational], usize), log_start: &Rational) -> Option<Dyadic> {
        let bits = self.bits;
        let mut differences = key.growth.iter().zip(growth).map(|(a, b)| a - b);
        let mut e = differences.next()?;
        for (d, rate) in differences.zip(&self.region.rates) {
            e += if d.is_positive() { &d * &rate.hi } else { &d * &rate.lo };
        }
        let excess = key.power.saturating_sub(power);
        if excess > 0 {
            e += self.region.power.as_ref()? * Rational::from_integer(BigInt::from(excess));
        }
        if e.is_positive() {
            return None;
        }
        // exp refuses arguments of 2^40; any greater exponent gives a greater bound.
        let floor = Rational::from_integer(BigInt::from(-(1_i64 << 39_u32)));
        let exponent = Interval::rational(&(e * log_start).max(floor), bits);
        // SOUND(hi): e <= 0 and y >= y_0 >= exp(l), so y^e <= exp(e l); upper end of its enclosure.
        let growth = Complex::real(exponent).exp(bits)?.re.hi().clone();
        let Some(missing) = power.checked_sub(key.power).filter(|m| *m > 0) else { return Some(growth) };
        let late = Interval::rational(&self.region.from, bits).power(u32::try_from(missing).ok()?, bits).recip(bits)?;
        // SOUND(hi): T >= from > 0 (ensured by the rule), so T^-m <= from^-m; product of upper ends of positive numbers, rounded up.
        Some(growth.mul(late.hi(), bits, Up))
    }
}

/// An expansion; `None`: there is none.
type Expanded = Result<Option<Expansion>, Rejection>;
