//! Results told to people and to files.
//!
//! Numbers arrive ready: this room names, rounds for the eye, lays out and
//! writes; it does no engineering arithmetic. It must never print: text is
//! returned, files are written where the caller says.
//!
//! [`summary`] mirrors results as they appear in JSON; [`check_text`] and
//! [`proposal_text`] lay the same mirrors out for reading; [`folder`] writes
//! schemes, after reading each file back and examining it afresh.

pub mod cautions;
pub mod check_text;
pub mod compare;
pub mod detail;
pub mod folder;
pub mod numbers;
pub mod page;
pub mod placement_summary;
pub mod placement_text;
pub mod proposal_text;
pub mod summary;
mod tables;
pub mod words;
