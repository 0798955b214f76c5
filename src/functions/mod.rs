//! Elementary and special functions of balls.

pub mod elementary;
