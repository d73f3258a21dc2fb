//! Complex numbers: as much of them as the decaying modes of a wave need.

use std::ops::{Add, Div, Mul, Neg, Sub};

/// `re + j·im`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Complex {
    /// Real part.
    pub(crate) re: f64,
    /// Imaginary part.
    pub(crate) im: f64,
}

impl Complex {
    /// `re + j·im`.
    pub(crate) const fn new(re: f64, im: f64) -> Self {
        Self { re, im }
    }

    /// A real number.
    pub(crate) const fn real(re: f64) -> Self {
        Self { re, im: 0.0 }
    }

    /// `e^self`.
    pub(crate) fn exp(self) -> Self {
        let size = self.re.exp();
        Self { re: size * self.im.cos(), im: size * self.im.sin() }
    }

    /// `|self|`.
    pub(crate) fn abs(self) -> f64 {
        self.re.hypot(self.im)
    }
}

impl Add for Complex {
    type Output = Self;
    fn add(self, other: Self) -> Self {
        Self { re: self.re + other.re, im: self.im + other.im }
    }
}

impl Sub for Complex {
    type Output = Self;
    fn sub(self, other: Self) -> Self {
        Self { re: self.re - other.re, im: self.im - other.im }
    }
}

impl Neg for Complex {
    type Output = Self;
    fn neg(self) -> Self {
        Self { re: -self.re, im: -self.im }
    }
}

impl Mul for Complex {
    type Output = Self;
    fn mul(self, other: Self) -> Self {
        Self { re: self.re * other.re - self.im * other.im, im: self.re * other.im + self.im * other.re }
    }
}

impl Mul<f64> for Complex {
    type Output = Self;
    fn mul(self, factor: f64) -> Self {
        Self { re: self.re * factor, im: self.im * factor }
    }
}

impl Div for Complex {
    type Output = Self;
    fn div(self, other: Self) -> Self {
        let square = other.re * other.re + other.im * other.im;
        Self {
            re: (self.re * other.re + self.im * other.im) / square,
            im: (self.im * other.re - self.re * other.im) / square,
        }
    }
}
