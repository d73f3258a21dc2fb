//! Status registers and error-queue entries (IEEE Std 488.2-1992, 11; SCPI-99 volume 1, 9 and 21.8).
//!
//! A register keeps every bit that came, also those without a meaning here, so that nothing is lost on the way into a
//! log.

use super::value::{self, ValueError};

/// Makes a register type out of its named bits.
macro_rules! register {
    ($(#[$doc:meta])* $name:ident { $($(#[$bit_doc:meta])* $method:ident = $bit:literal,)* }) => {
        $(#[$doc])*
        #[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Hash)]
        pub struct $name(pub u16);

        impl $name {
            $(
                $(#[$bit_doc])*
                #[must_use]
                pub fn $method(self) -> bool {
                    self.0 & (1 << $bit) != 0
                }
            )*

            /// The bits that have no meaning here.
            #[must_use]
            pub fn unknown(self) -> u16 {
                self.0 & !(0 $(| 1 << $bit)*)
            }

            /// Reads the reply to the register's query.
            ///
            /// # Errors
            /// When it is no whole number of at most 16 bits.
            pub fn parse(reply: &str) -> Result<Self, ValueError> {
                let bits = value::whole(reply)?;
                u16::try_from(bits).map(Self).map_err(|_| ValueError::NotWhole(value::shorten(reply)))
            }
        }
    };
}

register! {
    /// The status byte, the reply to `*STB?` (488.2, 11.2; bits 2, 3 and 7 after SCPI-99).
    StatusByte {
        /// The error queue holds something.
        error_queue = 2,
        /// A questionable-status event.
        questionable = 3,
        /// A reply waits to be read.
        message_available = 4,
        /// A standard event.
        event = 5,
        /// Master summary or request for service.
        master = 6,
        /// An operation-status event.
        operation = 7,
    }
}

register! {
    /// The standard event status register, the reply to `*ESR?` (488.2, 11.5.1).
    EventStatus {
        /// Operation complete.
        operation_complete = 0,
        /// The instrument wants to be in control.
        request_control = 1,
        /// A query was interrupted or not ended.
        query_error = 2,
        /// A device-dependent error.
        device_error = 3,
        /// An execution error.
        execution_error = 4,
        /// A command error.
        command_error = 5,
        /// Somebody touched the instrument.
        user_request = 6,
        /// It was switched on since the register was read: its settings are gone.
        power_on = 7,
    }
}

register! {
    /// The operation condition register, the reply to `STATus:OPERation:CONDition?` (SCPI-99 volume 1, 9.3).
    OperationCondition {
        /// It adjusts itself.
        calibrating = 0,
        /// Something settles.
        settling = 1,
        /// It changes its range.
        ranging = 2,
        /// A sweep goes on.
        sweeping = 3,
        /// A measurement goes on.
        measuring = 4,
        /// It waits for a trigger.
        waiting_for_trigger = 5,
        /// It waits to be armed.
        waiting_for_arm = 6,
        /// A correction goes on.
        correcting = 7,
    }
}

/// One entry of an instrument's error queue.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ErrorEntry {
    /// The number: negative ones are the standard's, positive ones the instrument's own, 0 says that there is none.
    pub number: i64,
    /// The text, without quotes; empty when the instrument sent none.
    pub text: String,
}

/// What sort of thing an entry reports (SCPI-99 volume 2, 21.8; classes of hundreds).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ErrorClass {
    /// −100 … −199: the command was not understood.
    Command,
    /// −200 … −299: the command could not be carried out.
    Execution,
    /// −300 … −399: something is wrong in the instrument.
    Device,
    /// −400 … −499: asking and reading were not in step.
    Query,
    /// −500 … −899: an event, no error.
    Event,
    /// 0: none.
    None,
    /// Anything else: the instrument's own numbers.
    Own,
}

impl ErrorEntry {
    /// Reads `-113,"Undefined header"`, also without quotes, without a text, or with more parts behind the text.
    ///
    /// # Errors
    /// When it does not begin with a whole number.
    pub fn parse(reply: &str) -> Result<Self, ValueError> {
        // An unclosed quote in a text is no reason to lose the number.
        let parts = value::list(reply).unwrap_or_else(|_| reply.splitn(2, ',').collect());
        let number = value::whole(parts.first().copied().unwrap_or_default())?;
        let text = parts.get(1).map(|text| value::loose_text(text)).unwrap_or_default();
        Ok(Self { number, text })
    }

    /// What sort of thing it reports.
    #[must_use]
    pub fn class(&self) -> ErrorClass {
        match self.number {
            -199..=-100 => ErrorClass::Command,
            -299..=-200 => ErrorClass::Execution,
            -399..=-300 => ErrorClass::Device,
            -499..=-400 => ErrorClass::Query,
            -899..=-500 => ErrorClass::Event,
            0 => ErrorClass::None,
            _ => ErrorClass::Own,
        }
    }
}

#[cfg(test)]
mod tests;
