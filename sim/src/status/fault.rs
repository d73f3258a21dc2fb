//! The errors an instrument puts into its queue: numbers and texts of SCPI-99.

/// One entry of the error queue. Numbers and texts after SCPI-99 vol. 2, 21.8 (from memory); the classes are
/// -1xx command, -2xx execution, -3xx device-specific and -4xx query errors.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
pub(crate) enum Fault {
    /// A character that no part of a message may hold.
    #[error("Invalid character")]
    InvalidCharacter,
    /// A message that cannot be read at all.
    #[error("Syntax error")]
    Syntax,
    /// A separator other than the one that belongs here.
    #[error("Invalid separator")]
    InvalidSeparator,
    /// A parameter of another kind than the header takes.
    #[error("Data type error")]
    DataType,
    /// More parameters than the header takes.
    #[error("Parameter not allowed")]
    ParameterNotAllowed,
    /// Fewer parameters than the header takes.
    #[error("Missing parameter")]
    MissingParameter,
    /// Something other than white space after the header.
    #[error("Header separator error")]
    HeaderSeparator,
    /// A mnemonic of more than twelve characters.
    #[error("Program mnemonic too long")]
    MnemonicTooLong,
    /// A header that this instrument does not have.
    #[error("Undefined header")]
    UndefinedHeader,
    /// A numeric suffix that this instrument does not have.
    #[error("Header suffix out of range")]
    HeaderSuffix,
    /// A character that a number may not hold.
    #[error("Invalid character in number")]
    NumberCharacter,
    /// An exponent beyond ±32,000.
    #[error("Exponent too large")]
    ExponentTooLarge,
    /// More than 255 digits.
    #[error("Too many digits")]
    TooManyDigits,
    /// A unit that does not belong to the parameter.
    #[error("Invalid suffix")]
    InvalidSuffix,
    /// A unit of more than twelve characters.
    #[error("Suffix too long")]
    SuffixTooLong,
    /// A unit behind a number that has none.
    #[error("Suffix not allowed")]
    SuffixNotAllowed,
    /// A word that the header does not know.
    #[error("Invalid character data")]
    InvalidCharacterData,
    /// A word of more than twelve characters.
    #[error("Character data too long")]
    CharacterDataTooLong,
    /// A string without its end.
    #[error("Invalid string data")]
    InvalidString,
    /// A block that is cut short or has a wrong length.
    #[error("Invalid block data")]
    InvalidBlock,
    /// An expression, such as a channel list, that cannot be read.
    #[error("Invalid expression")]
    InvalidExpression,
    /// An acquisition was started while one is under way.
    #[error("Init ignored")]
    InitIgnored,
    /// A legal command that the present state forbids.
    #[error("Settings conflict")]
    SettingsConflict,
    /// A number beyond the limits; settings are clamped, masks are left alone.
    #[error("Data out of range")]
    OutOfRange,
    /// A reading was asked for and there is none.
    #[error("Data corrupt or stale")]
    Stale,
    /// The instrument itself failed.
    #[error("System error")]
    System,
    /// Entries were lost because the queue was full.
    #[error("Queue overflow")]
    QueueOverflow,
    /// A message longer than the input buffer.
    #[error("Input buffer overrun")]
    InputOverrun,
    /// A reply was thrown away because the next message came before it was taken.
    #[error("Query INTERRUPTED")]
    QueryInterrupted,
    /// A query behind one whose reply has no recognisable end.
    #[error("Query UNTERMINATED after indefinite response")]
    QueryAfterIndefinite,
}

impl Fault {
    /// The number that `SYSTem:ERRor?` reports.
    pub(crate) fn number(self) -> i16 {
        match self {
            Self::InvalidCharacter => -101,
            Self::Syntax => -102,
            Self::InvalidSeparator => -103,
            Self::DataType => -104,
            Self::ParameterNotAllowed => -108,
            Self::MissingParameter => -109,
            Self::HeaderSeparator => -111,
            Self::MnemonicTooLong => -112,
            Self::UndefinedHeader => -113,
            Self::HeaderSuffix => -114,
            Self::NumberCharacter => -121,
            Self::ExponentTooLarge => -123,
            Self::TooManyDigits => -124,
            Self::InvalidSuffix => -131,
            Self::SuffixTooLong => -134,
            Self::SuffixNotAllowed => -138,
            Self::InvalidCharacterData => -141,
            Self::CharacterDataTooLong => -144,
            Self::InvalidString => -151,
            Self::InvalidBlock => -161,
            Self::InvalidExpression => -171,
            Self::InitIgnored => -213,
            Self::SettingsConflict => -221,
            Self::OutOfRange => -222,
            Self::Stale => -230,
            Self::System => -310,
            Self::QueueOverflow => -350,
            Self::InputOverrun => -363,
            Self::QueryInterrupted => -410,
            Self::QueryAfterIndefinite => -440,
        }
    }

    /// The bit of the standard event status register that the error's class sets (IEEE 488.2 11.5.1.1, from memory).
    pub(crate) fn event_bit(self) -> u8 {
        match self.number() {
            -199..=-100 => super::event::COMMAND_ERROR,
            -299..=-200 => super::event::EXECUTION_ERROR,
            -399..=-300 => super::event::DEVICE_ERROR,
            _ => super::event::QUERY_ERROR,
        }
    }

    /// Whether the rest of the message is thrown away: after a command error the parser no longer knows where it is.
    pub(crate) fn ends_message(self) -> bool {
        self.event_bit() == super::event::COMMAND_ERROR
    }
}
