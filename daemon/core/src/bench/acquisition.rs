//! How the two legs of a pair are acquired, and what may differ from it.

/// How both legs are acquired. Both have the same span and offset, so that they are as alike as they can be.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Acquisition {
    /// Full vertical span at the tip, in volts.
    pub span_v: f64,
    /// Voltage at the tip in the middle of the span, in volts.
    pub offset_v: f64,
    /// Sample interval, in seconds.
    pub interval_s: f64,
    /// Samples of one record.
    pub points: u32,
    /// Sweeps averaged into one record.
    pub averages: u32,
    /// Where in the record the trigger lies, from 0 to 1.
    pub position: f64,
    /// What starts a sweep.
    pub trigger: Trigger,
}

impl Acquisition {
    /// The same with what `overrides` says instead.
    #[must_use]
    pub fn with(self, overrides: &Overrides) -> Self {
        Self {
            span_v: overrides.span_v.unwrap_or(self.span_v),
            offset_v: overrides.offset_v.unwrap_or(self.offset_v),
            interval_s: overrides.interval_s.unwrap_or(self.interval_s),
            points: overrides.points.unwrap_or(self.points),
            averages: overrides.averages.unwrap_or(self.averages),
            position: overrides.position.unwrap_or(self.position),
            trigger: overrides.trigger.unwrap_or(self.trigger),
        }
    }

    /// The lowest and the highest voltage at the tip that lie within the span.
    #[must_use]
    pub fn window_v(&self) -> (f64, f64) {
        (self.offset_v - self.span_v / 2.0, self.offset_v + self.span_v / 2.0)
    }

    /// Whether both are on the same vertical range: then gain and offset hold for both.
    #[must_use]
    pub fn same_range(&self, other: &Self) -> bool {
        let close = |a: f64, b: f64| (a - b).abs() <= 1e-6 * self.span_v.abs();
        close(self.span_v, other.span_v) && close(self.offset_v, other.offset_v)
    }
}

/// What differs from a pair's own [`Acquisition`].
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Overrides {
    /// Full vertical span at the tip, in volts.
    pub span_v: Option<f64>,
    /// Voltage at the tip in the middle of the span, in volts.
    pub offset_v: Option<f64>,
    /// Sample interval, in seconds.
    pub interval_s: Option<f64>,
    /// Samples of one record.
    pub points: Option<u32>,
    /// Sweeps averaged into one record.
    pub averages: Option<u32>,
    /// Where in the record the trigger lies, from 0 to 1.
    pub position: Option<f64>,
    /// What starts a sweep.
    pub trigger: Option<Trigger>,
}

/// What starts a sweep.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Trigger {
    /// A channel of the pair, or 0 for the scope's external trigger input.
    pub channel: u32,
    /// The level in volts: at the tip for a channel, at the input for the external one.
    pub level_v: f64,
    /// The direction in which the level is crossed.
    pub slope: Slope,
}

/// A direction.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Slope {
    /// Downwards.
    Negative,
    /// Upwards.
    Positive,
}

impl Slope {
    /// `positive` or `negative`.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Negative => "negative",
            Self::Positive => "positive",
        }
    }
}
