//! The grade of a figure: how far the common mode of its capture could explain it.

/// How far the common mode could explain a figure.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Grade {
    /// The leak bound is below the figure's standard uncertainty.
    Clean,
    /// The leak bound is comparable: above the uncertainty, but too small to be the figure.
    Shaded,
    /// The leak bound could explain the figure.
    Swamped,
}

impl Grade {
    /// `clean`, `shaded` or `swamped`.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Clean => "clean",
            Self::Shaded => "shaded",
            Self::Swamped => "swamped",
        }
    }
}

/// Grades a figure of magnitude `size` with standard uncertainty `u`, to which the common mode can have added `leak`;
/// all three in one unit. A bound that is not a number is no bound.
#[must_use]
pub fn grade(size: f64, u: f64, leak: f64) -> Grade {
    let leak = if leak.is_nan() { f64::INFINITY } else { leak.abs() };
    if leak < u || leak <= 0.0 {
        Grade::Clean
    } else if leak < size.abs() {
        Grade::Shaded
    } else {
        Grade::Swamped
    }
}

#[cfg(test)]
mod tests;
