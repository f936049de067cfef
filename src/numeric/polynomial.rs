//! Polynomials of low degree on an interval, in a scaled variable so that powers stay near one.

/// sum_j c_j u^j with u = (x - centre) / half_width; exact calculus in x.
#[derive(Debug, Clone, PartialEq)]
pub struct Polynomial {
    centre: f64,
    half_width: f64,
    coefficients: Vec<f64>,
}

impl Polynomial {
    /// The polynomial with these coefficients of u = (x - centre) / half_width. `half_width` must not be zero.
    pub fn new(centre: f64, half_width: f64, coefficients: Vec<f64>) -> Self {
        debug_assert!(half_width != 0.0);
        Self { centre, half_width, coefficients }
    }

    /// Zero, on the interval from 0 to `length`.
    pub fn zero(length: f64) -> Self {
        let half_width = if length > 0.0 { length / 2.0 } else { 1.0 };
        Self::new(length / 2.0, half_width, Vec::new())
    }

    /// The polynomial sum_j p_j x^j, re-expanded about the middle of 0..length.
    pub fn from_powers(length: f64, powers: &[f64]) -> Self {
        let mut result = Self::zero(length);
        for &p in powers.iter().rev() {
            result = result.times_x().plus_constant(p);
        }
        result
    }

    /// Value at x.
    pub fn at(&self, x: f64) -> f64 {
        let u = (x - self.centre) / self.half_width;
        self.coefficients.iter().rev().fold(0.0, |sum, &c| sum * u + c)
    }

    /// Coefficients of u.
    pub fn coefficients(&self) -> &[f64] {
        &self.coefficients
    }

    /// Centre of the scaled variable.
    pub fn centre(&self) -> f64 {
        self.centre
    }

    /// Half width of the scaled variable.
    pub fn half_width(&self) -> f64 {
        self.half_width
    }

    /// True when every coefficient is zero.
    pub fn is_zero(&self) -> bool {
        self.coefficients.iter().all(|&c| c == 0.0)
    }

    /// d/dx.
    #[must_use]
    pub fn derivative(&self) -> Self {
        let coefficients =
            self.coefficients.iter().enumerate().skip(1).map(|(j, &c)| c * j as f64 / self.half_width).collect();
        Self { coefficients, ..*self }
    }

    /// The integral from x = 0.
    #[must_use]
    pub fn integral(&self) -> Self {
        let mut coefficients = vec![0.0];
        coefficients.extend(self.coefficients.iter().enumerate().map(|(j, &c)| c * self.half_width / (j as f64 + 1.0)));
        let mut result = Self { coefficients, ..*self };
        result.coefficients[0] = -result.at(0.0);
        result
    }

    /// The product with a number.
    #[must_use]
    pub fn scaled(&self, factor: f64) -> Self {
        Self { coefficients: self.coefficients.iter().map(|c| c * factor).collect(), ..*self }
    }

    /// The sum with a number.
    #[must_use]
    pub fn plus_constant(mut self, constant: f64) -> Self {
        match self.coefficients.first_mut() {
            Some(first) => *first += constant,
            None => self.coefficients.push(constant),
        }
        self
    }

    /// The sum with slope * x.
    #[must_use]
    pub fn plus_slope(self, slope: f64) -> Self {
        let line = Self { coefficients: vec![slope * self.centre, slope * self.half_width], ..self };
        self.plus(&line)
    }

    /// The sum with another polynomial on the same interval.
    #[must_use]
    pub fn plus(&self, other: &Self) -> Self {
        debug_assert!(self.centre == other.centre && self.half_width == other.half_width);
        let len = self.coefficients.len().max(other.coefficients.len());
        let term = |p: &Self, j: usize| p.coefficients.get(j).copied().unwrap_or(0.0);
        Self { coefficients: (0..len).map(|j| term(self, j) + term(other, j)).collect(), ..*self }
    }

    fn times_x(&self) -> Self {
        // x = centre + half_width u
        let mut coefficients = vec![0.0; self.coefficients.len() + 1];
        for (j, &c) in self.coefficients.iter().enumerate() {
            coefficients[j] += c * self.centre;
            coefficients[j + 1] += c * self.half_width;
        }
        Self { coefficients, ..*self }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn calculus_is_exact() {
        // 1 + 2x + 3x^2 on 0..10: derivative 2 + 6x, integral x + x^2 + x^3.
        let p = Polynomial::from_powers(10.0, &[1.0, 2.0, 3.0]);
        for x in [0.0, 0.5, 3.0, 10.0] {
            assert!((p.at(x) - (1.0 + 2.0 * x + 3.0 * x * x)).abs() < 1e-12);
            assert!((p.derivative().at(x) - (2.0 + 6.0 * x)).abs() < 1e-12);
            assert!((p.integral().at(x) - (x + x * x + x * x * x)).abs() < 1e-11);
            assert!((p.clone().plus_slope(2.0).at(x) - p.at(x) - 2.0 * x).abs() < 1e-12);
        }
    }
}
