//! What can be told about a file, so that it need not be guessed.

/// What separates the fields of a line.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Separator {
    /// `,`
    Comma,
    /// `;`
    Semicolon,
    /// A tab.
    Tab,
    /// One or more blanks.
    Blank,
}

impl Separator {
    /// Its word, as the options write it.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Comma => "comma",
            Self::Semicolon => "semicolon",
            Self::Tab => "tab",
            Self::Blank => "blank",
        }
    }

    /// The separator with this word.
    #[must_use]
    pub fn parse(word: &str) -> Option<Self> {
        [Self::Comma, Self::Semicolon, Self::Tab, Self::Blank].into_iter().find(|one| one.name() == word)
    }
}

/// What stands between the whole and the fraction of a number.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Decimal {
    /// `0.5`
    Point,
    /// `0,5`
    Comma,
}

impl Decimal {
    /// Its word, as the options write it.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Point => "point",
            Self::Comma => "comma",
        }
    }

    /// The decimal mark with this word.
    #[must_use]
    pub fn parse(word: &str) -> Option<Self> {
        [Self::Point, Self::Comma].into_iter().find(|one| one.name() == word)
    }
}

/// What can be told about a file. What is `None` is guessed.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Options {
    /// What separates fields.
    pub separator: Option<Separator>,
    /// The decimal mark.
    pub decimal: Option<Decimal>,
    /// How many lines stand before the first row of numbers.
    pub header_lines: Option<usize>,
    /// The time column: its name, or its number from 1.
    pub time: Option<String>,
    /// The negative leg's own time column, where it has one.
    pub negative_time: Option<String>,
    /// The positive leg's column.
    pub positive: Option<String>,
    /// The negative leg's column.
    pub negative: Option<String>,
    /// The unit of the time column, such as `ns`.
    pub time_unit: Option<String>,
    /// The unit of both legs, such as `mV`.
    pub volt_unit: Option<String>,
    /// Seconds between two samples; the time column then only tells where the record begins.
    pub interval_s: Option<f64>,
    /// What the file's volts have to be multiplied by to be volts at the tip: positive and negative leg. 1 where the
    /// scope knew its probes.
    pub attenuation: Option<[f64; 2]>,
    /// The converter's resolution in bits; needs `span_v`.
    pub bits: Option<u32>,
    /// Full vertical span at the tip in volts.
    pub span_v: Option<f64>,
    /// How many acquisitions the scope averaged.
    pub averages: Option<u32>,
}
