//! Deliberate faults, for showing that the tests can fail.
//!
//! Without the cargo feature `spoil` every question is answered `false` at compile time and no
//! trace of a fault is left in the program. With the feature, one fault at a time can be switched
//! on by a test; `tests/spoil.rs` shows for each one that the containment checks notice it.

/// A bound, a sign or a rounding that can be broken on purpose.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[repr(u8)]
pub enum Fault {
    /// Radii are rounded down instead of up.
    RadiusRoundedDown = 1,
    /// The rounding error of a product of balls is forgotten.
    ProductRoundingForgotten = 2,
    /// The discretisation error of the trapezoid rule is left out.
    TrapezoidErrorForgotten = 3,
    /// The far field of the spectral route is added with the wrong sign.
    FarFieldSign = 4,
    /// The cut-off tail of the kernel route is left out.
    KernelTailForgotten = 5,
    /// A printed lower bound is rounded up.
    LowerBoundRoundedUp = 6,
    /// The power series of the K functions are cut too early, without their tail bound.
    BesselSeriesCut = 7,
    /// The power series of the dilogarithm is cut too early, without its tail bound.
    DilogarithmSeriesCut = 8,
    /// What lies beyond the last panel of a piecewise packet is left out.
    PiecewiseTailForgotten = 10,
    /// The spectral sum of a general packet is cut too early, without the bound of what lies beyond the last node.
    CutOffForgotten = 9,
    /// The distance of the lattice sum from the integral is left out.
    LatticeErrorForgotten = 40,
    /// The discretisation error of the contour route is left out.
    ContourStripForgotten = 41,
    /// The sum of the contour route ends too early, without its cut-off error.
    ContourCutForgotten = 42,
    /// The discretisation error on the contour of steepest descent is left out.
    DescentErrorForgotten = 31,
    /// The pole near the contour of steepest descent is forgotten.
    DescentPoleForgotten = 32,
    /// The series of the amplitude in powers of the interval is cut without a bound of the rest.
    IntervalSeriesCut = 33,
    /// Hankel functions of the wrong kind inside the cone of the propagator.
    PropagatorBranch = 34,
}

#[cfg(feature = "spoil")]
static ACTIVE: std::sync::atomic::AtomicU8 = std::sync::atomic::AtomicU8::new(0);

/// Switches one fault on, or all off.
#[cfg(feature = "spoil")]
pub fn activate(fault: Option<Fault>) {
    ACTIVE.store(fault.map_or(0, |f| f as u8), std::sync::atomic::Ordering::SeqCst);
}

/// Whether the fault is switched on.
#[cfg(feature = "spoil")]
pub(crate) fn is_active(fault: Fault) -> bool {
    ACTIVE.load(std::sync::atomic::Ordering::Relaxed) == fault as u8
}

/// Whether the fault is switched on: never, without the feature.
#[cfg(not(feature = "spoil"))]
#[inline(always)]
pub(crate) const fn is_active(_fault: Fault) -> bool {
    false
}
