//! Numerical tools that know nothing of records: polynomials, sums, quantiles, autoregression.

pub mod analogue;
pub mod autoregression;
pub mod autoregressive_gap;
pub mod compensated;
pub mod covariance;
pub mod floor;
pub mod fourier;
pub mod lag;
pub mod leading_number;
pub mod least_squares;
pub mod monotone;
pub mod noise;
pub mod polynomial;
pub mod quantile;
pub mod quantum;
pub mod rational;
pub mod running_median;
pub mod smooth;
pub mod spline;
pub mod stretch;
pub mod strip;
pub mod sum;
