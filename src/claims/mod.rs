//! Claims: what a printed sentence allows, and whether the certified number agrees.

pub mod statement;
