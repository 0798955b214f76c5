//! The box: constant amplitude on an interval, zero outside.

use crate::arithmetic::ExactInput;
use crate::error::Error;

/// `psi0(x) = (2a)^(-1/2)` for `|x| <= a`, zero elsewhere: norm one, jumps at both edges.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct BoxPacket {
    half_width: ExactInput,
}

impl BoxPacket {
    /// The packet's name on the command line and in certificates.
    pub const NAME: &'static str = "box";

    /// A box of half-width `a > 0`.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the half-width is not certainly positive.
    pub fn new(half_width: ExactInput) -> Result<BoxPacket, Error> {
        if *half_width.lower() <= 0 {
            let wanted = "give a half-width greater than 0, such as 1, 0.5 or 1/3";
            return Err(Error::bad_input("half-width", half_width.text(), wanted));
        }
        Ok(BoxPacket { half_width })
    }

    /// Half of the interval's length.
    pub fn half_width(&self) -> &ExactInput {
        &self.half_width
    }
}
