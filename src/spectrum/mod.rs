//! What a record holds at every frequency: densities with confidence limits, lines, bands, levels, road classes.
//!
//! Normalisation, stated once. Samples x_n in unit u, n = 0..N-1, at `rate` samples per second (or metre); frequencies in Hz
//! (or 1/m), densities in u^2 per Hz (or per 1/m), one-sided.
//!
//! - Welch: segments of M samples, `spacing` = rate/M, periodic window w. At line k
//!   P_k = (c_k / (rate sum w^2)) |sum_n w_n x_n exp(-2 pi i k n/M)|^2, averaged over the segments; c_k = 2, but 1 at zero and at
//!   the Nyquist line of an even M.
//! - Sine tapers: v_j(n) = sqrt(2/(N+1)) sin(pi j (n+1)/(N+1)), j = 1..K; `spacing` = rate/(N+1);
//!   P_k = (c_k / (rate K)) sum_j |sum_n v_j(n) x_n exp(-2 pi i k (n+1)/(N+1))|^2.
//! - Mean square of a band: sum of P_k times `spacing`, a line covering half a spacing either side and counting by the share
//!   that lies inside. The lines at zero and at the Nyquist frequency cover half a spacing only and count whole. All bands of
//!   a partition add up to the sum over the lines.
//! - Degrees of freedom and limits hold for a stationary normal record whose density is flat over the width of the window:
//!   nu P / chi2. Real records are at best nearly so.
//!
//! Sources: Welch 1967, IEEE Trans. Audio Electroacoust. 15, 70; Riedel and Sidorenko 1995, IEEE Trans. Signal Processing 43,
//! 188 (sine tapers); Percival and Walden 1993 (degrees of freedom, limits); Bendat and Piersol, Random Data.

mod adaptive;
mod band;
mod coefficient;
mod density;
mod detrend;
mod limits;
mod line;
mod octave;
mod road;
mod taper;
mod welch;
mod window;

pub use adaptive::adaptive;
pub use band::{BandLevel, band};
pub use coefficient::{Coefficient, Coefficients};
pub use density::{Correlation, Density};
pub use detrend::Detrend;
pub use limits::{Limits, ratio_limits};
pub use line::{Line, lines};
pub use octave::{FEWEST_LINES, Fraction, OctaveBand, octave_bands};
pub use road::{Road, RoadClass, road};
pub use taper::{MOST_TAPERS, sine};
pub use welch::{Segments, welch};
pub use window::{WINDOWS, Window, window};
