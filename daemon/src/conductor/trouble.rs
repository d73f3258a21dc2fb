//! Why a stage could not be completed: what was being done, to what, and what to try.

use evenpair_core::analysis::apply::ApplyError;
use evenpair_core::analysis::skew::SkewError;
use evenpair_core::analysis::transfer::TransferError;
use evenpair_core::dialect::DialectError;

use crate::session::SessionError;
use crate::store::StoreError;

/// Why a stage could not be completed.
#[derive(Debug, thiserror::Error)]
pub(crate) enum Trouble {
    /// The records cannot be corrected.
    #[error("correcting a capture of the pair `{pair}`: {source}")]
    Apply { pair: String, source: ApplyError },
    /// A leg's converter was driven to its end.
    #[error(
        "the {leg} leg of the pair `{pair}` is clipped: {count} samples of {points} lie at the converter's ends while \
         its span is {span}; choose a larger span, or look whether the probe's attenuation is what the bench file says"
    )]
    Clipped { pair: String, leg: &'static str, count: usize, points: usize, span: String },
    /// The correction does not hold and the stage says to refuse then.
    #[error("the correction of the pair `{pair}` is void: {}; deskew it again under these conditions", reasons.join("; "))]
    CorrectionVoid { pair: String, reasons: Vec<String> },
    /// The scope said something that the dialect cannot read.
    #[error("reading what `{instrument}` answered: {source}")]
    Dialect { instrument: String, source: Box<DialectError> },
    /// The legs show no common signal.
    #[error("deskewing the pair `{pair}` on the reference `{reference}`: {source}")]
    Estimate { pair: String, reference: String, source: SkewError },
    /// The two legs' records come from two acquisitions.
    #[error(
        "the two legs of the pair `{pair}` came from different acquisitions (numbers {first} and {second}) three times \
         over; another client seems to use the scope: let it finish, then start again"
    )]
    MixedAcquisitions { pair: String, first: i64, second: i64 },
    /// The pair was never deskewed.
    #[error("the pair `{pair}` has no correction; put a `deskew` stage before this one, or deskew the pair first")]
    NoCorrection { pair: String },
    /// Both tips on one node gave no frequency at which rejection could be told.
    #[error(
        "verifying the pair `{pair}` on the reference `{reference}`: no frequency of it stands out of the noise; look \
         whether the reference runs and both tips are on it"
    )]
    NothingToVerify { pair: String, reference: String },
    /// The acquisition did not complete.
    #[error(
        "acquiring the pair `{pair}`: `{instrument}` did not complete an acquisition within {within_s:.1} s; {trigger} \
         did not come, or its level of {level} is not crossed: look at the signal and the trigger's level"
    )]
    NoTrigger { pair: String, instrument: String, within_s: f64, trigger: String, level: String },
    /// An instrument did not do what it was asked.
    #[error(transparent)]
    Session(#[from] SessionError),
    /// A person stopped it.
    #[error("it was stopped")]
    Stopped,
    /// The store did not take what was measured.
    #[error(transparent)]
    Store(#[from] StoreError),
    /// Two ranges could not be compared.
    #[error("transferring the correction of the pair `{pair}` by the reference `{reference}`: {source}")]
    Transfer { pair: String, reference: String, source: Box<TransferError> },
    /// The scope gave a leg a smaller window than was asked for.
    #[error(
        "preparing the pair `{pair}`: `{instrument}` set the {leg} leg to {got}, but {asked} was asked for; ask for a \
         window that it has, or use a probe that attenuates more"
    )]
    TooSmall { pair: String, instrument: String, leg: &'static str, asked: String, got: String },
    /// A long computation ended in a fault.
    #[error("{what} ended in a fault of the daemon; its log has more")]
    Computation { what: &'static str },
}
