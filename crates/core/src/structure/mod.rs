//! The exact structure of the spectrum of a rational matrix.
//!
//! Blocks, irreducible factors with algebraic multiplicity and Jordan index, root discs, the order of the real parts
//! *including their exact equalities*, proposed and proved relations among the frequencies, and the growth of exp(At).
//! What is not proved is said to be so: each fact carries its [`Evidence`]. The Jordan index of an eigenvalue is the
//! size of its largest Jordan block, the multiplicity of its factor in the minimal polynomial.

mod equality;
mod growth;
mod pair_sum;
mod rate;
mod relation;

pub(crate) use equality::vanishes_at;
pub use growth::{Boundedness, Growth};
pub use pair_sum::{pair_difference_polynomial, pair_sum_polynomial};
pub use rate::RateClass;
pub(crate) use rate::{PairSums, classes as rate_classes};
pub use relation::FrequencyRelation;

use crate::blocks::{Block, SparseMatrix, characteristic_by_blocks};
use crate::error::CoreError;
use crate::factor::{Irreducibility, factorize};
use crate::integer_polynomial::IntegerPolynomial;
use crate::matrix::RationalMatrix;
use crate::minimal_polynomial::minimal_polynomial;
use crate::root::{RootDisc, enclose_roots};

/// How much is known about a stated fact.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Evidence {
    /// Proved.
    Proved,
    /// Neither proved nor refuted within the limits.
    Open,
}

/// Precision and limits of the analysis.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct StructureOptions {
    /// Bits of the root discs at first, and at least in the result.
    pub bits: u32,
    /// Bits up to which undecided comparisons are repeated.
    pub bits_limit: u32,
    /// Orders up to which the minimal polynomial is computed when eigenvalues repeat.
    pub minimal_polynomial_order: usize,
    /// Largest coefficient of a frequency relation that is looked for.
    pub relation_size: u32,
}

impl Default for StructureOptions {
    fn default() -> Self {
        Self { bits: 64, bits_limit: 1024, minimal_polynomial_order: 200, relation_size: 64 }
    }
}

/// A factor of the characteristic polynomial.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SpectralFactor {
    /// Primitive and square-free.
    pub polynomial: IntegerPolynomial,
    /// Whether it is proved irreducible.
    pub irreducibility: Irreducibility,
    /// Its multiplicity in the characteristic polynomial.
    pub algebraic_multiplicity: usize,
    /// Its multiplicity in the minimal polynomial; `None` if the order is above the limit and eigenvalues repeat.
    pub index: Option<usize>,
}

/// A real eigenvalue, or the one with positive imaginary part of a conjugate pair.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Eigenvalue {
    /// Holds this root of the factor and no other root of it.
    pub disc: RootDisc,
    /// Place of the factor in [`SpectralStructure::factors`].
    pub factor: usize,
}

/// The result of [`spectral_structure`].
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SpectralStructure {
    /// The order n of the matrix.
    pub order: usize,
    /// The diagonal blocks, in block lower triangular order.
    pub blocks: Vec<Block>,
    /// Pairwise coprime factors of the characteristic polynomial.
    pub factors: Vec<SpectralFactor>,
    /// Distinct eigenvalues, one for each conjugate pair, factor by factor.
    pub eigenvalues: Vec<Eigenvalue>,
    /// The eigenvalues grouped by equal real part, largest real part first.
    pub rates: Vec<RateClass>,
    /// Integer relations among the imaginary parts of the non-real eigenvalues.
    pub relations: Vec<FrequencyRelation>,
    /// The growth of exp(At).
    pub growth: Growth,
    /// Bits of the discs.
    pub bits: u32,
}

impl SpectralStructure {
    /// The multiplicity of an eigenvalue in the characteristic polynomial.
    pub fn algebraic_multiplicity(&self, eigenvalue: usize) -> usize {
        self.factors[self.eigenvalues[eigenvalue].factor].algebraic_multiplicity
    }

    /// The size of the largest Jordan block of an eigenvalue, if it is known.
    pub fn index(&self, eigenvalue: usize) -> Option<usize> {
        self.factors[self.eigenvalues[eigenvalue].factor].index
    }
}

/// The structure of a dense matrix, with default options.
///
/// # Errors
/// [`CoreError::NotSquare`]; [`CoreError::LimitExceeded`] if roots cannot be separated.
///
/// ```
/// use keepout_core::{RationalMatrix, spectral_structure};
/// // x'' = -x: bounded, frequency 1
/// let structure = spectral_structure(&RationalMatrix::from_integers(&[vec![0, 1], vec![-1, 0]])?)?;
/// assert_eq!(structure.rates.len(), 1);
/// assert_eq!(structure.rates[0].rational, Some(num_rational::BigRational::from_integer(0.into())));
/// # Ok::<(), keepout_core::CoreError>(())
/// ```
pub fn spectral_structure(a: &RationalMatrix) -> Result<SpectralStructure, CoreError> {
    spectral_structure_with(&SparseMatrix::try_from(a)?, &StructureOptions::default())
}

/// The structure of a sparse matrix.
///
/// # Errors
/// As [`spectral_structure`].
pub fn spectral_structure_with(a: &SparseMatrix, options: &StructureOptions) -> Result<SpectralStructure, CoreError> {
    let blocks = characteristic_by_blocks(a)?;
    let mut factors = collect_factors(&blocks);
    set_indices(a, &mut factors, options)?;
    let mut bits = options.bits.max(8);
    let mut sums = PairSums::default();
    loop {
        let eigenvalues = collect_eigenvalues(&factors, bits)?;
        let rates = rate_classes(&factors, &eigenvalues, &mut sums, bits);
        let open = rates.iter().any(|class| class.equality == Evidence::Open || class.sign().is_none());
        if open && bits < options.bits_limit {
            bits = (2 * bits).min(options.bits_limit);
            continue;
        }
        let relations = relation::relations(&factors, &eigenvalues, &rates, options.relation_size)?;
        let growth = growth::growth(&factors, &eigenvalues, &rates);
        return Ok(SpectralStructure {
            order: a.order(),
            blocks,
            factors,
            eigenvalues,
            rates,
            relations,
            growth,
            bits,
        });
    }
}

/// The factors of all blocks, equal ones joined and partial ones made coprime.
fn collect_factors(blocks: &[Block]) -> Vec<SpectralFactor> {
    let mut pieces: Vec<(IntegerPolynomial, usize, Irreducibility)> = Vec::new();
    for block in blocks {
        for factor in factorize(&block.characteristic_polynomial).factors {
            pieces.push((factor.polynomial, factor.multiplicity, factor.irreducibility));
        }
    }
    pieces.sort_by(|a, b| (a.0.degree(), a.0.coefficients()).cmp(&(b.0.degree(), b.0.coefficients())));
    // Proved irreducible factors are equal or coprime; the others may share a part with any factor.
    let complete = pieces.iter().all(|(_, _, irreducibility)| *irreducibility == Irreducibility::Proved);
    if !complete {
        let polynomials: Vec<IntegerPolynomial> = pieces.iter().map(|(p, _, _)| p.clone()).collect();
        return IntegerPolynomial::coprime_base(&polynomials)
            .into_iter()
            .map(|member| joined(member, &pieces))
            .collect();
    }
    let mut factors: Vec<SpectralFactor> = Vec::new();
    for (polynomial, multiplicity, irreducibility) in pieces {
        match factors.last_mut() {
            Some(last) if last.polynomial == polynomial => last.algebraic_multiplicity += multiplicity,
            _ => factors.push(SpectralFactor {
                polynomial,
                irreducibility,
                algebraic_multiplicity: multiplicity,
                index: None,
            }),
        }
    }
    factors
}

/// A member of the coprime base with its total multiplicity (pieces are square-free).
fn joined(member: IntegerPolynomial, pieces: &[(IntegerPolynomial, usize, Irreducibility)]) -> SpectralFactor {
    let mut algebraic_multiplicity = 0;
    let mut irreducibility = Irreducibility::NotFactoredFurther;
    for (piece, multiplicity, piece_irreducibility) in pieces {
        if piece.divide_exact(&member).is_some() {
            algebraic_multiplicity += multiplicity;
        }
        if *piece == member && *piece_irreducibility == Irreducibility::Proved {
            irreducibility = Irreducibility::Proved;
        }
    }
    SpectralFactor { polynomial: member, irreducibility, algebraic_multiplicity, index: None }
}

fn set_indices(a: &SparseMatrix, factors: &mut [SpectralFactor], options: &StructureOptions) -> Result<(), CoreError> {
    for factor in factors.iter_mut().filter(|f| f.algebraic_multiplicity == 1) {
        factor.index = Some(1);
    }
    if factors.iter().all(|f| f.index.is_some()) || a.order() > options.minimal_polynomial_order {
        return Ok(());
    }
    let all: Vec<usize> = (0..a.order()).collect();
    let minimal = minimal_polynomial(&a.principal(&all))?;
    for factor in factors {
        let mut rest = minimal.clone();
        let mut index = 0;
        while let Some(quotient) = rest.divide_exact(&factor.polynomial) {
            rest = quotient;
            index += 1;
        }
        // An unsplit factor could divide the minimal polynomial unevenly: then its power does not leave a coprime rest.
        let even = rest.gcd(&factor.polynomial).is_constant();
        factor.index = even.then_some(index);
    }
    Ok(())
}

fn collect_eigenvalues(factors: &[SpectralFactor], bits: u32) -> Result<Vec<Eigenvalue>, CoreError> {
    let mut eigenvalues = Vec::new();
    for (factor, f) in factors.iter().enumerate() {
        let discs = enclose_roots(&f.polynomial, bits)?;
        let upper = discs.into_iter().filter(|d| d.im.sign() != std::cmp::Ordering::Less);
        eigenvalues.extend(upper.map(|disc| Eigenvalue { disc, factor }));
    }
    Ok(eigenvalues)
}
