//! What an instrument may send: in pieces, too much, too little, the wrong thing, or a refusal.

use evenpair_core::dialect::Message;

use super::*;

const DATA: &str = "TRACe:DATA? CHANnel1";

fn data(bench: &Bench, points: u64) -> JoinHandle<Result<Message, SessionError>> {
    let handle = bench.handle.clone();
    let call = Call::new(Intent::RecordData).with("channel", 1_i64);
    tokio::spawn(async move { handle.data(call, points).await })
}

#[tokio::test(start_paused = true)]
async fn a_reply_may_be_cut_at_every_byte() {
    let (bench, mut peer) = Bench::up().await;
    let block = b"#16\n\"#\x00;\xff\n";
    for cut in 1..block.len() {
        let reading = data(&bench, 3);
        peer.hear(DATA).await;
        peer.say(&block[..cut]).await;
        // The task sees the first piece alone before the second is there.
        tokio::time::advance(MS).await;
        peer.say(&block[cut..]).await;
        assert_eq!(reading.await.unwrap(), Ok(Message::Block(b"\n\"#\x00;\xff".to_vec())), "cut at {cut}");
    }
    assert_eq!(bench.handle.watch().borrow().reconnects, 0);
}

#[tokio::test(start_paused = true)]
async fn a_block_that_stays_short_is_a_broken_link() {
    let (mut bench, mut peer) = Bench::up().await;
    let reading = data(&bench, 3);
    peer.hear(DATA).await;
    peer.say(b"#16ab").await;
    peer.closed().await;
    let mut peer = bench.greeted().await;
    peer.hear(DATA).await;
    peer.say(b"#16abc").await;
    drop(peer);
    let error = reading.await.unwrap().unwrap_err();
    let SessionError::Lost { reason, .. } = &error else { panic!("{error}") };
    assert_eq!(**reason, Trouble::Codec(CodecError::Cut { bytes: 6 }));
}

#[tokio::test(start_paused = true)]
async fn a_block_longer_than_asked_for_is_refused_on_its_header() {
    let (mut bench, mut peer) = Bench::up().await;
    let reading = data(&bench, 3);
    peer.hear(DATA).await;
    peer.say(b"#3999").await;
    peer.closed().await;
    let mut peer = bench.greeted().await;
    peer.hear(DATA).await;
    peer.say(b"#16abcdef\n").await;
    assert_eq!(reading.await.unwrap(), Ok(Message::Block(b"abcdef".to_vec())));
}

#[tokio::test(start_paused = true)]
async fn bytes_that_come_unasked_break_the_link_at_once() {
    let (mut bench, mut peer) = Bench::up().await;
    peer.say("17\n").await;
    peer.closed().await;
    let mut peer = bench.greeted().await;
    let call = bench.call(measure());
    peer.hear(MEASURE).await;
    peer.say("5\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 5);
}

#[tokio::test(start_paused = true)]
async fn two_replies_to_one_query_are_none() {
    let (mut bench, mut peer) = Bench::up().await;
    let call = bench.call(measure());
    peer.hear(MEASURE).await;
    peer.say("24.0\n48.0\n").await;
    peer.closed().await;
    let mut peer = bench.greeted().await;
    peer.hear(MEASURE).await;
    peer.say("48.0\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 48);
}

#[tokio::test(start_paused = true)]
async fn a_reply_that_cannot_be_read_breaks_the_link_and_names_the_dialect() {
    let (mut bench, mut peer) = Bench::up().await;
    let call = bench.call(measure());
    peer.hear(MEASURE).await;
    peer.say("ON FIRE\n").await;
    peer.closed().await;
    let mut peer = bench.greeted().await;
    peer.hear(MEASURE).await;
    peer.say("ON FIRE\n").await;
    let error = call.await.unwrap().unwrap_err();
    assert!(matches!(error, SessionError::Unreadable { .. }), "{error}");
    assert!(error.to_string().contains("ON FIRE"), "{error}");
}

#[tokio::test(start_paused = true)]
async fn a_refused_command_is_told_with_its_number_and_keeps_the_link() {
    let (bench, mut peer) = Bench::up().await;
    let call = bench.call(output(true));
    peer.hear("OUTPut1:STATe 1").await;
    peer.asked_for_errors("-222,\"Data out of range\"").await;
    peer.asked_for_errors("+310,\"Too hot\"").await;
    peer.no_errors().await;
    let expected = SessionError::Refused {
        instrument: "supply".to_owned(),
        what: "`output.set`".to_owned(),
        command: "OUTPut1:STATe 1".to_owned(),
        number: -222,
        text: "Data out of range".to_owned(),
        more: 1,
    };
    assert_eq!(call.await.unwrap().unwrap_err(), expected);
    assert!(expected.to_string().contains("and 1 more"), "{expected}");
    let call = bench.call(measure());
    peer.hear(MEASURE).await;
    peer.say("5\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 5);
    assert_eq!(bench.handle.watch().borrow().reconnects, 0);
}

#[tokio::test(start_paused = true)]
async fn an_error_queue_that_never_runs_dry_does_not_hold_the_session() {
    let (bench, mut peer) = Bench::up().await;
    let call = bench.call(output(true));
    peer.hear("OUTPut1:STATe 1").await;
    for _ in 0..link::MOST_ENTRIES {
        peer.asked_for_errors("-350,\"Queue overflow\"").await;
    }
    let error = call.await.unwrap().unwrap_err();
    assert!(matches!(error, SessionError::Refused { number: -350, more: 63, .. }), "{error}");
}

#[tokio::test(start_paused = true)]
async fn raw_text_is_one_line_and_its_errors_are_read() {
    let (bench, mut peer) = Bench::up().await;
    let handle = bench.handle.clone();
    let asking = tokio::spawn(async move { handle.exchange_raw("SYSTem:VERSion?", true).await });
    peer.hear("SYSTem:VERSion?").await;
    peer.say("1999.0\n").await;
    peer.no_errors().await;
    assert_eq!(asking.await.unwrap(), Ok(Some(Message::Line("1999.0".to_owned()))));
    let error = bench.handle.exchange_raw("*CLS\n*RST", false).await.unwrap_err();
    assert!(matches!(error, SessionError::Dialect { .. }), "{error}");
    drop(bench.handle);
    peer.closed().await;
}
