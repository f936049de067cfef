//! Numerical tools that know nothing of records: polynomials, sums, quantiles, autoregression.

pub mod autoregressive_gap;
pub mod noise;
pub mod compensated;
pub mod polynomial;
pub mod quantile;
pub mod rational;
pub mod running_median;
pub mod spline;
pub mod strip;
pub mod sum;
