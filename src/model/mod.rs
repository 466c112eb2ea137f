//! What the engineer states: a tower, validated, in SI units.
//!
//! This room reads tower files and says everything that is wrong with them. It
//! must never know about matrices, verdicts or searching.
//!
//! On the way in: text, `table` (walking TOML), `file` (what is written),
//! `short` (the short form spelt out), `resolve` (names become indices,
//! units become SI), `validate` (rules of the whole), a [`tower::Tower`].

pub mod error;
mod file;
pub mod read;
mod resolve;
mod short;
pub mod sizes;
mod table;
pub mod tower;
mod validate;
pub mod write;
