//! Numerical tools that know nothing of records: polynomials, sums, quantiles, autoregression.

pub mod noise;
pub mod compensated;
pub mod polynomial;
pub mod sum;
