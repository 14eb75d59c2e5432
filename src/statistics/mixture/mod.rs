//! Two populations in one sample.
//!
//! [`dip_test`] asks whether the sample can come from any population with a single peak;
//! [`two_normals`] fits a mixture of two normal populations and says by an information criterion
//! whether it describes the sample better than one.

mod dip;
mod em;

pub use dip::{Dip, dip_statistic, dip_test};
pub use em::{Component, MIXTURE_SIZE_MIN, Mixture, Spread, one_normal_bic, two_normals};
