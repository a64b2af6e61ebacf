//! Sentences of a verdict.
//! Must not decide.
