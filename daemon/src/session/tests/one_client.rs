//! An instrument that serves one connection at a time: the old one is gone before a new one is made.

use super::*;

#[tokio::test(start_paused = true)]
async fn a_new_connection_waits_until_the_old_one_is_gone() {
    let text = "name = \"single\"\nlike = \"scpi-99\"\n[line]\none_client = true\n";
    let mut bench = Bench::with(text);
    let mut peer = bench.greeted().await;
    // Bytes that nobody asked for cost the connection; the instrument takes its time to notice that.
    peer.say("unasked\n").await;
    peer.closed().await;
    assert_eq!(bench.attempts.lock().unwrap().len(), 1, "a second connection beside the first");
    let since = Instant::now();
    tokio::time::advance(500 * MS).await;
    assert_eq!(bench.attempts.lock().unwrap().len(), 1, "a second connection beside the first");
    drop(peer);
    bench.greeted().await;
    assert_eq!(bench.attempts.lock().unwrap().len(), 2);
    assert!(since.elapsed() < Timing::default().connect);
}

#[tokio::test(start_paused = true)]
async fn an_instrument_that_never_hangs_up_is_not_waited_for_longer_than_for_a_connection() {
    let text = "name = \"single\"\nlike = \"scpi-99\"\n[line]\none_client = true\n";
    let mut bench = Bench::with(text);
    let mut held = bench.greeted().await;
    held.say("unasked\n").await;
    held.closed().await;
    let since = Instant::now();
    bench.greeted().await;
    let waited = since.elapsed();
    assert!(waited >= Timing::default().connect && waited < Timing::default().connect + 100 * MS, "{waited:?}");
}
