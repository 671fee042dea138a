//! Complex numbers, as far as the interference integrals need them.

use std::ops::{Add, Mul, Neg, Sub};

use super::elementary::exp;
use super::trigonometry::sin_cos;

/// re + i im.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Complex {
    /// Real part.
    pub re: f64,
    /// Imaginary part.
    pub im: f64,
}

impl Complex {
    /// 1.
    pub const ONE: Complex = Complex::new(1.0, 0.0);
    /// i.
    pub const I: Complex = Complex::new(0.0, 1.0);

    /// re + i im.
    #[inline]
    pub const fn new(re: f64, im: f64) -> Complex {
        Complex { re, im }
    }

    /// This number times a real one.
    #[inline]
    pub fn scaled(self, factor: f64) -> Complex {
        Complex::new(self.re * factor, self.im * factor)
    }

    /// 1 over this number, which must not vanish.
    #[inline]
    pub fn inverse(self) -> Complex {
        let inverse = 1.0 / (self.re * self.re + self.im * self.im);
        Complex::new(self.re * inverse, -self.im * inverse)
    }

    /// The exponential function.
    #[inline]
    pub fn exp(self) -> Complex {
        let (sine, cosine) = sin_cos(self.im);
        Complex::new(cosine, sine).scaled(exp(self.re))
    }
}

impl Add for Complex {
    type Output = Complex;
    #[inline]
    fn add(self, other: Complex) -> Complex {
        Complex::new(self.re + other.re, self.im + other.im)
    }
}

impl Sub for Complex {
    type Output = Complex;
    #[inline]
    fn sub(self, other: Complex) -> Complex {
        Complex::new(self.re - other.re, self.im - other.im)
    }
}

impl Mul for Complex {
    type Output = Complex;
    #[inline]
    fn mul(self, other: Complex) -> Complex {
        Complex::new(
            self.re * other.re - self.im * other.im,
            self.re * other.im + self.im * other.re,
        )
    }
}

impl Neg for Complex {
    type Output = Complex;
    #[inline]
    fn neg(self) -> Complex {
        Complex::new(-self.re, -self.im)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn arithmetic_and_exponential() {
        let a = Complex::new(3.0, -2.0);
        assert_eq!(a * Complex::I, Complex::new(2.0, 3.0));
        assert_eq!(a + -a, Complex::new(0.0, 0.0));
        let one = a * a.inverse();
        assert!((one.re - 1.0).abs() < 1e-15 && one.im.abs() < 1e-15);
        let turned = Complex::new(1.0, std::f64::consts::PI).exp();
        assert!((turned.re + std::f64::consts::E).abs() < 1e-15 && turned.im.abs() < 1e-15);
    }
}
