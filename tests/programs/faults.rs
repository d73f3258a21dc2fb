//! Faults of the simulated bench, ordered over its control port, and what the daemon makes of them.

use evenpair_tests::{Control, Lab, LabPlan, Strike};
use serde_json::json;

/// The control port tells what has struck, in order, and the instrument is as ever afterwards.
#[tokio::test]
async fn the_control_port_arms_and_reports() {
    let lab = Lab::start(&LabPlan::default().with_control()).await;
    let mut control: Control = lab.control().await;
    // The daemon never asks for a self-test, so nobody else meets these.
    let junk = control.arm("instrument = \"switch\", what = \"junk\", to = \"*TST\", times = 2").await;
    let late = control.arm("instrument = \"supply\", what = \"meddle\", send = \"VOLT 7\", to = \"*TST\"").await;
    assert_eq!(control.report().await, []);
    assert_eq!(lab.ask("switch", "*TST?").await, "0 ~+?9,x");
    assert_eq!(lab.ask("supply", "*TST?").await, "0");
    assert_eq!(lab.ask("supply", "VOLT?").await, "7.0E+0");
    assert_eq!(lab.ask("switch", "*TST?").await, "0 ~+?9,x");
    assert_eq!(lab.ask("switch", "*TST?").await, "0");
    let seen: Vec<(u32, String, String)> = control
        .report()
        .await
        .into_iter()
        .map(|Strike { fault, instrument, what, .. }| (fault, instrument, what))
        .collect();
    let strike = |fault, instrument: &str, what: &str| (fault, instrument.to_owned(), what.to_owned());
    let expected = [strike(junk, "switch", "junk"), strike(late, "supply", "meddle"), strike(junk, "switch", "junk")];
    assert_eq!(seen, expected);
    let counts = control.counts().await;
    assert_eq!(counts[&("switch".to_owned(), "junk".to_owned())], 2);
    assert_eq!(control.disarm_all().await, 2);
}

/// Catches: a connection that is lost in the middle of a block and half a record taken for a whole one.
#[tokio::test]
async fn a_connection_cut_in_a_block_does_not_end_a_deskew() {
    let lab = Lab::start(&LabPlan::default().with_control()).await;
    let mut control = lab.control().await;
    control.arm("instrument = \"scope\", what = \"cut\", to = \"TRAC\", when = { bytes = 30000 }").await;
    let run = lab.api.begin("/pairs/gate/deskew", &json!({ "most_acquisitions": 4 })).await;
    let run = lab.api.ended(&run).await;
    let strikes = control.report().await;
    assert_eq!(strikes.iter().map(|strike| strike.what.as_str()).collect::<Vec<_>>(), ["cut"]);
    assert_eq!(run["state"], "passed", "{run}\n{}", lab.log());
    assert_eq!(lab.api.get("/pairs/gate/correction").await.status, 200);
}
