//! The switch unit's headers after SCPI-99's signal switcher class.

use crate::instrument::switch::{self, Switch};
use crate::instrument::tree::{Action, Table};

/// The headers.
pub(super) fn table() -> Table<Switch> {
    use Action::{Command, Query};
    vec![
        (":ROUTe:CLOSe", Command(switch::close)),
        (":ROUTe:CLOSe", Query(|switch, call| switch.tell(call, true))),
        (":ROUTe:CLOSe:STATe", Query(switch::closed)),
        (":ROUTe:OPEN", Command(switch::open)),
        (":ROUTe:OPEN", Query(|switch, call| switch.tell(call, false))),
        (":ROUTe:OPEN:ALL", Command(switch::open_all)),
    ]
}
