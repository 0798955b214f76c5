//! Claims: what a printed sentence allows, and whether the certified number agrees.
//!
//! [`mod@file`] reads claims files, [`statement`] says what a printed text allows, [`question`] turns a claim into a request,
//! [`judge`] gives the verdict, [`slips`] looks for the mistake behind a refuted one.

pub mod file;
pub mod judge;
pub mod question;
pub mod slips;
pub mod statement;
