//! Equivalent circuit of a part: a complex nonlinear least-squares fit to the whole sweep.
//!
//! Minimises `Σ |Z_i − Z(f_i)|² / |Z_i|²`, real and imaginary part as separate residuals
//! (proportional weighting, as in B. A. Boukamp, Solid State Ionics 20 (1986) 31), by variable
//! projection or by the method of Levenberg and Marquardt with analytic derivatives. The simplest
//! circuit comes first; a larger one is tried only where the first leaves more than the sweep's own
//! noise, and kept only where it brings information. A fit that does not describe the part says so.

mod data;
mod exponential;
mod fit;
mod marquardt;
mod model;
mod projected;
mod reading;
mod start;

pub use fit::{CircuitFit, Covariance, Parameter, Residual, fit};
pub use model::Circuit;

pub(super) use reading::read;
