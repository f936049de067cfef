//! Periodic ends: the orthonormal real Fourier basis, packed constant, cosine and sine of each harmonic, Nyquist.

use super::real::RealFft;

#[derive(Debug)]
pub struct Fourier {
    fft: RealFft,
}

impl Fourier {
    pub fn new(len: usize) -> Self {
        Self { fft: RealFft::new(len) }
    }

    pub fn scratch_len(&self) -> usize {
        self.fft.scratch_len()
    }

    pub fn forward(&self, x: &mut [f64], scratch: &mut [f64]) {
        let spectrum = self.fft.forward(x, scratch);
        let flat = (1.0 / x.len() as f64).sqrt();
        let wave = (2.0 / x.len() as f64).sqrt();
        x[0] = flat * spectrum[0].re;
        let (pairs, nyquist) = x[1..].as_chunks_mut::<2>();
        for (pair, value) in pairs.iter_mut().zip(&spectrum[1..]) {
            *pair = [wave * value.re, -wave * value.im];
        }
        if let [nyquist] = nyquist {
            *nyquist = flat * spectrum[spectrum.len() - 1].re;
        }
    }

    pub fn inverse(&self, c: &mut [f64], scratch: &mut [f64]) {
        let flat = (1.0 / c.len() as f64).sqrt();
        // Each pair is one entry of the spectrum and its conjugate: half the amplitude each.
        let wave = 0.5 * (2.0 / c.len() as f64).sqrt();
        self.fft.inverse(c, scratch, |c, spectrum| {
            spectrum[0].re = flat * c[0];
            let (pairs, nyquist) = c[1..].as_chunks::<2>();
            for (value, &[cosine, sine]) in spectrum[1..].iter_mut().zip(pairs) {
                value.re = wave * cosine;
                value.im = -wave * sine;
            }
            if let ([nyquist], Some(last)) = (nyquist, spectrum.last_mut()) {
                last.re = flat * nyquist;
            }
        });
    }

    /// a cos + b sin becomes a sin + b cos; the constant and the Nyquist cosine vanish.
    pub fn inverse_turned(&self, c: &mut [f64], scratch: &mut [f64]) {
        c[0] = 0.0;
        let (pairs, nyquist) = c[1..].as_chunks_mut::<2>();
        pairs.iter_mut().for_each(|pair| pair.swap(0, 1));
        nyquist.fill(0.0);
        self.inverse(c, scratch);
    }
}
