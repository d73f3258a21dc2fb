//! The generator's headers after SCPI-99's signal source class.

use crate::instrument::generator::{self, Generator, OUTPUTS};
use crate::instrument::tree::{Action, Call, Table};
use crate::status::Fault;

/// The headers.
pub(super) fn table() -> Table<Generator> {
    use Action::{Flag, Number, Query, Word};
    let shape = generator::shape(&["DC", "MTONe", "PULSe", "SINusoid", "SQUare"]);
    vec![
        ("[:SOURce#]:FUNCtion[:SHAPe]", Word(shape)),
        ("[:SOURce#]:FREQuency[:CW]", Number(generator::frequency())),
        ("[:SOURce#]:VOLTage[:LEVel][:IMMediate][:AMPLitude]", Number(generator::amplitude())),
        ("[:SOURce#]:VOLTage[:LEVel][:IMMediate]:OFFSet", Number(generator::offset())),
        ("[:SOURce#]:PULSe:DCYCle", Number(generator::duty())),
        ("[:SOURce#]:PULSe:TRANsition", Number(generator::edge())),
        (":OUTPut#[:STATe]", Flag(generator::state())),
        (":OUTPut#:IMPedance", Query(impedance)),
    ]
}

fn impedance(_: &Generator, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    if call.index >= OUTPUTS {
        return Err(Fault::HeaderSuffix);
    }
    call.answer("50");
    Ok(())
}
