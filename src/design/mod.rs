//! What may vary in one layout of a tower, and the road from variables to
//! objective, conditions and derivatives.
//!
//! The only room that knows both sizes and variables. It must never choose: it
//! answers a search, and knows no layout but its own.

pub mod cuts;
pub mod evaluate;
pub mod variables;
