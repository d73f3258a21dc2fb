//! What a lost connection costs: who answers is checked, settings are made again, and nothing is done twice unasked.

use super::*;

/// Carries out a setting that the instrument takes.
async fn set(bench: &Bench, peer: &mut Peer, call: Call, line: &str) {
    let call = bench.call(call);
    peer.hear(line).await;
    peer.no_errors().await;
    call.await.unwrap().unwrap();
}

fn route(intent: Intent, channel: i64) -> Call {
    Call::new(intent).with("channels", vec![channel])
}

#[tokio::test(start_paused = true)]
async fn settings_are_made_again_in_order_after_a_lost_connection() {
    let (mut bench, mut peer) = Bench::up().await;
    set(&bench, &mut peer, output(false), "OUTPut1:STATe 0").await;
    set(&bench, &mut peer, route(Intent::RouteClose, 101), "ROUTe:CLOSe (@101)").await;
    let skew = Call::new(Intent::SkewSet).with("channel", 2_i64).with("delay_s", 2.3e-9);
    set(&bench, &mut peer, skew, "INPut2:DELay 2.3E-9").await;
    set(&bench, &mut peer, output(true), "OUTPut1:STATe 1").await;
    drop(peer);
    let mut peer = bench.peer().await;
    peer.greet().await;
    for line in ["INPut2:DELay 2.3E-9", "OUTPut1:STATe 1", "ROUTe:CLOSe (@101)"] {
        peer.hear(line).await;
        peer.no_errors().await;
    }
    bench.is_up().await;
    let report = bench.handle.watch().borrow().clone();
    assert_eq!((report.reconnects, report.identity.as_deref(), report.trouble), (1, Some(WHO), None));
}

#[tokio::test(start_paused = true)]
async fn a_refused_setting_is_not_made_again() {
    let (mut bench, mut peer) = Bench::up().await;
    set(&bench, &mut peer, output(false), "OUTPut1:STATe 0").await;
    let call = bench.call(output(true));
    peer.hear("OUTPut1:STATe 1").await;
    peer.asked_for_errors("-221,\"Settings conflict\"").await;
    peer.no_errors().await;
    assert!(matches!(call.await.unwrap(), Err(SessionError::Refused { number: -221, .. })));
    drop(peer);
    let mut peer = bench.peer().await;
    peer.greet().await;
    peer.hear("OUTPut1:STATe 0").await;
    peer.no_errors().await;
    bench.is_up().await;
}

#[tokio::test(start_paused = true)]
async fn an_instrument_that_refuses_its_old_setting_is_not_up() {
    let (mut bench, mut peer) = Bench::up().await;
    set(&bench, &mut peer, output(true), "OUTPut1:STATe 1").await;
    drop(peer);
    let mut peer = bench.peer().await;
    peer.greet().await;
    peer.hear("OUTPut1:STATe 1").await;
    peer.asked_for_errors("-200,\"Execution error;interlock\"").await;
    peer.no_errors().await;
    peer.closed().await;
    let report = bench.handle.watch().borrow().clone();
    assert!(!report.up);
    assert!(report.trouble.is_some_and(|text| text.contains("OUTPut1:STATe 1") && text.contains("interlock")));
}

#[tokio::test(start_paused = true)]
async fn a_stranger_gets_nothing_but_the_question_who_it_is() {
    let (mut bench, peer) = Bench::up().await;
    drop(peer);
    let call = bench.call(measure());
    let mut peer = bench.peer().await;
    peer.hear("*IDN?").await;
    peer.say("Somebody,Else,1,1\n").await;
    peer.closed().await;
    let error = call.await.unwrap().unwrap_err();
    let SessionError::Stranger { expected, found, .. } = &error else { panic!("{error}") };
    assert_eq!((expected.as_str(), found.as_str()), (WHO, "Somebody,Else,1,1"));
    // Nobody waits for a stranger to go.
    let started = Instant::now();
    assert!(matches!(bench.handle.call(measure()).await, Err(SessionError::Stranger { .. })));
    assert_eq!(started.elapsed(), Duration::ZERO);
}

#[tokio::test(start_paused = true)]
async fn a_query_is_asked_again_once_and_no_more() {
    let (mut bench, mut peer) = Bench::up().await;
    let call = bench.call(measure());
    peer.hear(MEASURE).await;
    drop(peer);
    let mut peer = bench.greeted().await;
    peer.hear(MEASURE).await;
    drop(peer);
    let error = call.await.unwrap().unwrap_err();
    let SessionError::Lost { command, reason, .. } = &error else { panic!("{error}") };
    assert_eq!((command.as_str(), &**reason), (MEASURE, &Trouble::PeerClosed));
    let mut peer = bench.greeted().await;
    drop(bench.handle);
    peer.closed().await;
}

#[tokio::test(start_paused = true)]
async fn a_setting_is_sent_again_and_an_action_is_not() {
    let (mut bench, mut peer) = Bench::up().await;
    let call = bench.call(output(true));
    peer.hear("OUTPut1:STATe 1").await;
    drop(peer);
    let mut peer = bench.greeted().await;
    peer.hear("OUTPut1:STATe 1").await;
    peer.no_errors().await;
    call.await.unwrap().unwrap();

    let call = bench.call(Call::new(Intent::AcquireStart));
    peer.hear("INITiate:IMMediate").await;
    drop(peer);
    assert!(matches!(call.await.unwrap(), Err(SessionError::Lost { .. })));
    let mut peer = bench.peer().await;
    peer.greet().await;
    peer.hear("OUTPut1:STATe 1").await;
    peer.no_errors().await;
    bench.is_up().await;
    drop(bench.handle);
    peer.closed().await;
}

#[tokio::test(start_paused = true)]
async fn a_silent_query_is_explained_by_the_error_queue() {
    let (mut bench, mut peer) = Bench::up().await;
    let call = bench.call(measure());
    peer.hear(MEASURE).await;
    peer.closed().await;
    let mut peer = bench.peer().await;
    peer.hear("*IDN?").await;
    peer.say(format!("{WHO}\n")).await;
    peer.asked_for_errors("-420,\"Query UNTERMINATED\"").await;
    peer.asked_for_errors("-113,\"Undefined header\"").await;
    peer.no_errors().await;
    peer.hear("*CLS").await;
    let error = call.await.unwrap().unwrap_err();
    let SessionError::Refused { command, number, text, more, .. } = &error else { panic!("{error}") };
    assert_eq!((command.as_str(), *number, text.as_str(), *more), (MEASURE, -113, "Undefined header", 0));
    // It is not asked again: the answer would be the same.
    drop(bench.handle);
    peer.closed().await;
}

#[tokio::test(start_paused = true)]
async fn a_caller_that_goes_away_in_the_middle_breaks_the_link_for_the_next() {
    let (mut bench, mut peer) = Bench::up().await;
    let call = bench.call(measure());
    peer.hear(MEASURE).await;
    call.abort();
    assert!(call.await.unwrap_err().is_cancelled());
    peer.closed().await;
    let next = bench.call(Call::new(Intent::OutputGet).with("channel", 1_i64));
    let mut peer = bench.greeted().await;
    peer.hear("OUTPut1:STATe?").await;
    peer.say("1\n").await;
    assert_eq!(next.await.unwrap().unwrap().flag("state"), Ok(true));
}

#[tokio::test(start_paused = true)]
async fn a_caller_that_goes_away_while_waiting_its_turn_has_nothing_sent() {
    let (bench, mut peer) = Bench::up().await;
    let first = bench.call(measure());
    peer.hear(MEASURE).await;
    let second = bench.call(output(true));
    tokio::task::yield_now().await;
    second.abort();
    assert!(second.await.unwrap_err().is_cancelled());
    peer.say("12\n").await;
    assert_eq!(value(&first.await.unwrap().unwrap()), 12);
    drop(bench.handle);
    peer.closed().await;
}
