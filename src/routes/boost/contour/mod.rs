//! stub
use super::BoostProblem;
/// stub
pub struct Contour;
/// stub
pub struct Complement;
