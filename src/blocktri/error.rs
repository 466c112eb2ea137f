//! What can go wrong, and where to look.

/// A matrix given to the factorisation is not positive definite, or holds a
/// value that is not finite.
///
/// The leading part of the matrix up to, but without, `index` is positive
/// definite. A pivot counts as failed when it is not above
/// `64 * f64::EPSILON * diagonal`: by then elimination has cancelled every digit
/// of it, and whatever is left is rounding.
#[derive(Debug, Clone, Copy, PartialEq, thiserror::Error)]
#[error(
    "not positive definite at index {index}: pivot {pivot:e} left of diagonal entry {diagonal:e}; \
     raise that diagonal entry above what its couplings take from it, \
     or look for a value that is not finite"
)]
pub struct NotPositiveDefinite {
    /// Global index of the failing pivot.
    pub index: usize,
    /// What elimination left of the diagonal entry; may be NaN or infinite.
    pub pivot: f64,
    /// The diagonal entry before elimination.
    pub diagonal: f64,
}

/// The eigenpairs could not be found.
#[derive(Debug, Clone, Copy, PartialEq, thiserror::Error)]
pub enum ModesError {
    #[error(
        "the flexibility is {rows} x {columns} but {groups} mass blocks of 3 need a square matrix of {}; \
         give one 3 x 3 mass block for every three freedoms",
        3 * groups
    )]
    SizesDiffer {
        rows: usize,
        columns: usize,
        groups: usize,
    },
    #[error("{requested} modes requested but there are only {available}; ask for fewer")]
    TooManyRequested { requested: usize, available: usize },
    #[error(
        "mass block {group} is not symmetric, finite and positive definite; \
         give it a diagonal that outweighs its off-diagonal entries"
    )]
    MassNotPositiveDefinite { group: usize },
    #[error(
        "the flexibility holds a value that is not finite at ({row}, {column}); \
         check the matrix it was made from"
    )]
    NotFinite { row: usize, column: usize },
    #[error(
        "the flexibility is not symmetric at ({row}, {column}); \
         form it as E' K^-1 E with one selection of freedoms"
    )]
    NotSymmetric { row: usize, column: usize },
    #[error(
        "the flexibility is not positive definite: eigenvalue {index} from the top is {value:e} \
         beside the largest {largest:e}; check that no freedom is selected twice or held rigid"
    )]
    FlexibilityNotPositiveDefinite {
        index: usize,
        value: f64,
        largest: f64,
    },
    #[error("the dense eigensolver did not converge; look for extreme ratios in the flexibility")]
    NoConvergence,
}
