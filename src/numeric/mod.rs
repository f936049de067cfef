//! Numerical tools that know nothing of records: polynomials, sums, quantiles, autoregression.

pub mod fourier;
pub mod noise;
pub mod polynomial;
pub mod sum;
