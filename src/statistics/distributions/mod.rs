//! Distribution functions, tails and quantiles.
//!
//! Both tails are computed as such, never as one minus the other where that would cancel, so that
//! small tail probabilities keep their relative accuracy. An argument outside the domain gives NaN.
//!
//! Measured against references of 50 digits, relative errors here are below 1e-12 (Student's t
//! 1e-11 at a million degrees of freedom). From the `libm` crate comes the complementary error function,
//! from `statrs` the inverse error function alone, as a start for one Newton step: the complementary
//! one there was measured at 1e-10 (at z = 0.8), and its incomplete beta and gamma functions are not used: their prefactor is the
//! exponential of a difference of large log gammas (an error that grows with the arguments), the
//! continued fraction stops after 140 terms, and the far tail is one minus the near one.

mod binomial;
mod chi_squared;
mod fisher;
mod hypergeometric;
mod incomplete;
mod noncentral_t;
mod normal;
mod quantile;
mod student_t;

pub use binomial::{
    beta_cdf, beta_quantile, beta_sf, beta_upper_quantile, binomial_cdf, binomial_sf,
};
pub use chi_squared::{
    chi_mean_ratio, chi_squared_cdf, chi_squared_quantile, chi_squared_sf,
    chi_squared_upper_quantile, gamma_quantile, poisson_cdf,
};
pub use fisher::{f_sf, f_upper_quantile};
pub use hypergeometric::{hypergeometric_cdf, hypergeometric_sf};
pub use noncentral_t::{
    noncentral_t_cdf, noncentral_t_quantile, noncentral_t_sf, noncentrality_at,
};
pub use normal::{normal_cdf, normal_ln_cdf, normal_quantile, normal_sf, normal_upper_quantile};
pub use student_t::{student_t_cdf, student_t_sf, student_t_upper_quantile};
