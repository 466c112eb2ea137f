//! What every report must say beside its numbers. The one place of this text.

/// What the results are for, what they leave out, and what is still to verify.
pub const CAUTIONS: [&str; 4] = [
    "This is an aid for concept design. Local codes and a licensed engineer decide.",
    "Left out: out-of-plane bending of walls, frame action between slabs and walls, the \
     restraint that floors put on the Poisson effect in walls, construction sequence, creep and \
     shrinkage, soil beyond the stated springs, P-delta and wind and earthquake actions beyond \
     those given, and the design of members (reinforcement, connections, foundations).",
    "Limits, factors and clauses marked \"from memory\" are to be verified against the standard \
     before anyone relies on them.",
    "A search looks at many designs, not at every one: a cheaper scheme may exist down to the lower \
     bound, where one is stated, and \"nothing found\" alone does not mean \"impossible\".",
];

pub fn cautions() -> Vec<std::borrow::Cow<'static, str>> {
    CAUTIONS.iter().map(|&text| text.into()).collect()
}
