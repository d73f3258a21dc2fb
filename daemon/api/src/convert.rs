//! The mathematics' results as the API's documents, one way for the daemon that answers and for the client that works
//! on files itself.

use evenpair_core::analysis::budget::{self, Basis};
use evenpair_core::analysis::figures::Figure as CoreFigure;
use evenpair_core::analysis::grade::Grade as CoreGrade;
use evenpair_core::analysis::leak::LeakBound as CoreLeak;
use evenpair_core::analysis::rejection::RejectionBand;
use evenpair_core::analysis::saved::{Findings, Given, Legs, SavedError, Verified};
use evenpair_core::analysis::skew::{Reference, Shape};
use evenpair_core::analysis::{Estimate, saved};
use evenpair_core::import::{Decimal, ImportError, Imported, Options, Separator, from_text};

use crate::{
    Analysis, AnalysisRequest, CorrelatedTerm, Coverage, CoverageBasis, Figure, Grade, Guess, LeakBound, Quantity,
    Reading, ReferenceShape, RejectionPoint, Response, SavedRecords, SavedText, UncertaintyTerm, VerifiedOn,
};

/// Why saved records could not be analysed.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum AnalysisError {
    /// One of the texts could not be read.
    #[error("reading the {which}: {source}")]
    Import {
        /// `reference`, `verification` or `device`.
        which: &'static str,
        /// What is wrong with it.
        source: ImportError,
    },
    /// The records could not be analysed.
    #[error(transparent)]
    Saved(#[from] SavedError),
}

/// The acquisitions to analyse, read already.
#[derive(Debug, Clone, PartialEq)]
pub struct Acquisitions {
    /// Both tips on a reference.
    pub reference: Imported,
    /// Another one, to verify on.
    pub verification: Option<Imported>,
    /// The tips on the device.
    pub device: Option<Imported>,
}

impl AnalysisRequest {
    /// Reads the texts and analyses them.
    ///
    /// # Errors
    /// When a text cannot be read, or its records cannot be analysed.
    pub fn answer(&self) -> Result<Analysis, AnalysisError> {
        let read = |which, saved: &SavedText| {
            let options = Options::try_from(&saved.reading);
            let imported = options.and_then(|options| from_text(&saved.text, saved.negative_text.as_deref(), &options));
            imported.map_err(|source| AnalysisError::Import { which, source })
        };
        let all = Acquisitions {
            reference: read("reference", &self.reference)?,
            verification: self.verification.as_ref().map(|saved| read("verification", saved)).transpose()?,
            device: self.device.as_ref().map(|saved| read("device", saved)).transpose()?,
        };
        Ok(analyse(all, self.shape, self.period_s, self.scale_spec, self.response)?)
    }
}

/// Analyses acquisitions that were read, with a `response` if it is asked for.
///
/// # Errors
/// When the reference gives no correction, or records do not belong together.
pub fn analyse(
    all: Acquisitions,
    shape: Option<ReferenceShape>,
    period_s: Option<f64>,
    scale_spec: Option<f64>,
    response: bool,
) -> Result<Analysis, SavedError> {
    let mut records = Vec::new();
    let mut legs = |imported: Imported| {
        records.push(SavedRecords::from(&imported));
        Legs { positive: imported.positive, negative: imported.negative }
    };
    let shape = match shape.unwrap_or(ReferenceShape::Unknown) {
        ReferenceShape::Edges => Shape::Edges,
        ReferenceShape::Multitone => Shape::Multitone,
        ReferenceShape::Sine => Shape::Sine,
        ReferenceShape::Unknown => Shape::Unknown,
    };
    let (has_verification, has_device) = (all.verification.is_some(), all.device.is_some());
    let given = Given {
        reference: legs(all.reference),
        verification: all.verification.map(&mut legs),
        device: all.device.map(&mut legs),
        known: Reference { shape, period_s },
        scale_spec,
        response,
    };
    let found = saved::analyse(&given)?;
    let mut records = records.into_iter();
    let reference = records.next().unwrap_or_default();
    let verification = has_verification.then(|| records.next()).flatten();
    let device = has_device.then(|| records.next()).flatten();
    Ok(document(found, reference, verification, device))
}

fn document(
    found: Findings,
    reference: SavedRecords,
    verification: Option<SavedRecords>,
    device: Option<SavedRecords>,
) -> Analysis {
    let quantity = |estimate: Estimate, unit| Quantity::new(estimate.value, estimate.u, unit);
    let mut warnings = found.warnings;
    warnings.extend(found.device.iter().flat_map(|device| device.warnings.iter().cloned()));
    Analysis {
        reference,
        verification,
        device,
        skew: quantity(found.correction.skew_s, "s"),
        gain: quantity(found.correction.gain, "1"),
        offset: quantity(found.correction.offset_v, "V"),
        response: found.beyond.response.as_ref().map(Response::from),
        rejection: found.rejection.iter().map(RejectionPoint::from).collect(),
        verified_on: match found.verified {
            Verified::Fresh => VerifiedOn::Fresh,
            Verified::OtherHalf => VerifiedOn::OtherHalf,
            Verified::Itself => VerifiedOn::Itself,
        },
        independent: found.verified.independent(),
        figures: found.device.iter().flat_map(|device| &device.figures).map(Figure::from).collect(),
        leak: found.device.as_ref().map(|device| LeakBound::from(&device.leak)),
        warnings,
    }
}

impl From<&Imported> for SavedRecords {
    fn from(imported: &Imported) -> Self {
        let guess = |guess: &evenpair_core::import::Guess| Guess {
            option: guess.option.to_owned(),
            taken: guess.taken.clone(),
        };
        Self {
            points: imported.positive.samples.len() as u64,
            sample_interval: Quantity::exact(imported.positive.interval_s, "s"),
            start: Quantity::exact(imported.positive.start_s, "s"),
            guesses: imported.guesses.iter().map(guess).collect(),
            notes: imported.notes.clone(),
        }
    }
}

impl From<&CoreFigure> for Figure {
    fn from(figure: &CoreFigure) -> Self {
        let shares = budget::shares(&figure.budget);
        let term = |(term, share): (&budget::Term, f64)| UncertaintyTerm {
            name: term.name.to_owned(),
            u: term.u,
            sensitivity: term.sensitivity,
            distribution: term.distribution.name().to_owned(),
            correlated: term.correlated.map(|c| CorrelatedTerm { with: c.with.to_owned(), coefficient: c.coefficient }),
            kind: term.kind.name().to_owned(),
            freedom: term.freedom,
            share,
        };
        Self {
            name: figure.kind.name().to_owned(),
            quantity: Quantity::new(figure.value, figure.u, figure.kind.unit().symbol()),
            coverage: figure.coverage.map(|c| Coverage {
                low: c.low,
                high: c.high,
                basis: match c.basis {
                    Basis::CommonMode => CoverageBasis::CommonMode,
                    Basis::Normal => CoverageBasis::Normal,
                    Basis::Propagated => CoverageBasis::Propagated,
                    Basis::Rectangular => CoverageBasis::Rectangular,
                },
            }),
            plain: figure.plain,
            grade: match figure.grade {
                CoreGrade::Clean => Grade::Clean,
                CoreGrade::Shaded => Grade::Shaded,
                CoreGrade::Swamped => Grade::Swamped,
            },
            valid: figure.valid,
            why: figure.why.clone(),
            budget: figure.budget.iter().zip(shares).map(term).collect(),
        }
    }
}

impl From<&RejectionBand> for RejectionPoint {
    fn from(band: &RejectionBand) -> Self {
        Self {
            frequency_hz: band.frequency_hz,
            before_db: band.before_db,
            after_db: band.after_db,
            floor_db: band.floor_db,
            at_least: band.at_least,
        }
    }
}

impl From<&CoreLeak> for LeakBound {
    fn from(leak: &CoreLeak) -> Self {
        let volts = |value| Quantity::exact(value, "V");
        Self {
            rms: volts(leak.rms_v),
            peak: volts(leak.peak_v),
            common_rms: volts(leak.common_rms_v),
            common_swing: volts(leak.common_swing_v),
        }
    }
}

impl TryFrom<&Reading> for Options {
    type Error = ImportError;

    fn try_from(reading: &Reading) -> Result<Self, ImportError> {
        fn word<T>(
            option: &'static str,
            text: &Option<String>,
            parse: impl Fn(&str) -> Option<T>,
            known: &str,
        ) -> Result<Option<T>, ImportError> {
            let Some(text) = text else { return Ok(None) };
            let why = || format!("`{text}` is not one of {known}");
            parse(text).map(Some).ok_or_else(|| ImportError::Option { option, why: why() })
        }
        let attenuation = match (reading.attenuation, reading.negative_attenuation) {
            (None, None) => None,
            (p, n) => Some([p.unwrap_or(1.0), n.or(p).unwrap_or(1.0)]),
        };
        Ok(Self {
            separator: word("separator", &reading.separator, Separator::parse, "comma, semicolon, tab, blank")?,
            decimal: word("decimal", &reading.decimal, Decimal::parse, "point, comma")?,
            header_lines: reading.header_lines.map(|lines| usize::try_from(lines).unwrap_or(usize::MAX)),
            time: reading.time.clone(),
            negative_time: reading.negative_time.clone(),
            positive: reading.positive.clone(),
            negative: reading.negative.clone(),
            time_unit: reading.time_unit.clone(),
            volt_unit: reading.volt_unit.clone(),
            interval_s: reading.interval_s,
            attenuation,
            bits: reading.bits,
            span_v: reading.span_v,
            averages: reading.averages,
        })
    }
}
