//! The supply's headers after SCPI-99's power supply class.

use crate::instrument::supply::{self, Supply};
use crate::instrument::tree::{Action, Table};

/// The headers.
pub(super) fn table() -> Table<Supply> {
    vec![
        ("[:SOURce#]:VOLTage[:LEVel][:IMMediate][:AMPLitude]", Action::Number(supply::voltage())),
        ("[:SOURce#]:CURRent[:LEVel][:IMMediate][:AMPLitude]", Action::Number(supply::current())),
        (":OUTPut#[:STATe]", Action::Flag(supply::state())),
        (":MEASure#[:SCALar]:VOLTage[:DC]", Action::Query(supply::measure_voltage)),
        (":MEASure#[:SCALar]:CURRent[:DC]", Action::Query(supply::measure_current)),
    ]
}
