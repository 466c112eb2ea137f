//! Symmetric positive definite block-tridiagonal matrices: factor, solve,
//! flexibility of a few freedoms, eigenpairs. Numbers in, numbers out.
//!
//! With `K = K'` cut into blocks of any sizes, `K_ii` on the diagonal and
//! `K_i,i+1` beside it, the block Cholesky factorisation is
//!
//! ```text
//! S_1 = K_11,   S_i = L_i L_i',   W_i = L_i^-1 K_i,i+1,   S_i+1 = K_i+1,i+1 - W_i' W_i
//! ```
//!
//! (Golub and Van Loan, Matrix Computations, 4th ed. 2013, section 4.5), at
//! 7/3 b^3 operations a block of size b.
//!
//! * [`BlockTridiagonal`] holds `K`; fill it with [`BlockTridiagonal::add`] or
//!   through its blocks.
//! * [`Factor`] holds `L` and `W`; it solves for many right-hand sides and gives
//!   the flexibility `F = E' K^-1 E` of selected freedoms.
//! * [`modes_from_flexibility`] finds the eigenpairs of `K phi = lambda M phi`
//!   when `M` acts on the selected freedoms only.
//!
//! Everything runs on the calling thread and gives the same bits from run to
//! run on one kind of processor. The dense kernels stand behind one file,
//! `dense.rs`; no other file knows where they come from.

mod dense;
mod error;
mod factor;
mod leading;
mod matrix;
mod modes;

pub use dense::{Dense, multiply_into};
pub use error::{ModesError, NotPositiveDefinite};
pub use factor::{Factor, FlexibilityWorkspace};
pub use matrix::BlockTridiagonal;
pub use modes::{FloorModes, modes_from_flexibility};
