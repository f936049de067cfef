//! Numerical tools that know nothing of records: polynomials, sums, quantiles, autoregression.

pub mod analogue;
pub mod autoregression;
pub mod covariance;
pub mod fourier;
pub mod noise;
pub mod polynomial;
pub mod quantum;
pub mod sum;
