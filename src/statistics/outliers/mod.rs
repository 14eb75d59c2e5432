//! Values that do not belong to the rest of their sample.
//!
//! [`generalized_esd`] finds several at once without their hiding one another, [`grubbs`] asks
//! after a single one, and [`modified_z_scores`] stand on median and MAD, which half the sample
//! cannot move, as do [`part_average_limits`] on median and quartiles. [`joint_outliers`] finds a
//! point that is inside every single limit and yet unlike the rest.

mod concentration;
mod esd;
mod grubbs;
mod joint;
mod mcd;
mod modified_z;
mod part_average;
mod scatter;

pub use esd::{ESD_SIZE_MIN, Esd, EsdStep, generalized_esd};
pub use grubbs::{Grubbs, Side, grubbs};
pub use joint::{JOINT_SIZE_PER_CHARACTERISTIC, Joint, joint_outliers};
pub use mcd::{MinimumCovariance, minimum_covariance_determinant};
pub use modified_z::{MODIFIED_Z_LIMIT, modified_z_scores};
pub use part_average::{PartAverage, part_average_limits};
