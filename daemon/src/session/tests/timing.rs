//! When things happen: to the millisecond, on a clock that stands still.

use tokio::time::advance;

use super::*;

#[tokio::test(start_paused = true)]
async fn a_reply_one_millisecond_before_its_time_is_up_is_taken() {
    let (bench, mut peer) = Bench::up().await;
    let call = bench.call(measure());
    peer.hear(MEASURE).await;
    advance(REPLY - MS).await;
    peer.say("48.0\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 48);
}

#[tokio::test(start_paused = true)]
async fn a_missing_reply_is_an_error_when_its_time_is_up_and_not_a_millisecond_before() {
    let (bench, mut peer) = Bench::up().await;
    let started = Instant::now();
    let call = bench.call(Call::new(Intent::AcquireAbort));
    peer.hear("ABORt").await;
    peer.hear("SYSTem:ERRor?").await;
    advance(REPLY - MS).await;
    assert!(bench.handle.watch().borrow().up);
    assert!(!call.is_finished());
    advance(MS).await;
    peer.closed().await;
    assert_eq!(started.elapsed(), REPLY);
    let error = call.await.unwrap().unwrap_err();
    let (instrument, what) = ("supply".to_owned(), "`acquire.abort`".to_owned());
    let command = "SYSTem:ERRor?".to_owned();
    assert_eq!(error, SessionError::TimedOut { instrument, what, command, after: REPLY });
}

#[tokio::test(start_paused = true)]
async fn a_call_may_bring_its_own_time() {
    let (bench, mut peer) = Bench::up().await;
    let handle = bench.handle.clone();
    let call = tokio::spawn(async move { handle.call_within(measure(), 10 * REPLY).await });
    peer.hear(MEASURE).await;
    advance(10 * REPLY - MS).await;
    peer.say("1\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 1);
}

#[tokio::test(start_paused = true)]
async fn a_late_reply_never_meets_the_next_query() {
    let (mut bench, mut peer) = Bench::up().await;
    let call = bench.call(measure());
    peer.hear(MEASURE).await;
    advance(REPLY).await;
    // The old connection is closed before anything is asked again, so the late reply goes nowhere.
    peer.closed().await;
    assert!(peer.stream.get_mut().write_all(b"24.0\n").await.is_err());
    let mut peer = bench.greeted().await;
    peer.hear(MEASURE).await;
    peer.say("48.0\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 48);
    assert_eq!(bench.handle.watch().borrow().reconnects, 1);
}

#[tokio::test(start_paused = true)]
async fn an_acquisition_that_is_not_complete_in_time_says_so_and_is_not_asked_again() {
    let (mut bench, mut peer) = Bench::up().await;
    let handle = bench.handle.clone();
    let started = Instant::now();
    let waiting = tokio::spawn(async move { handle.complete(5 * REPLY).await });
    peer.hear("*OPC?").await;
    peer.closed().await;
    assert_eq!(started.elapsed(), 5 * REPLY);
    let error = waiting.await.unwrap().unwrap_err();
    assert_eq!(error, SessionError::NotComplete { instrument: "supply".to_owned(), after: 5 * REPLY });
    let mut peer = bench.greeted().await;
    drop(bench.handle);
    peer.closed().await;
}

#[tokio::test(start_paused = true)]
async fn completion_by_asking_again_keeps_its_distance_and_its_end() {
    let text = bundled("scpi-99").unwrap().replace(
        "ask = \"*OPC?\"\nequals = \"1\"",
        "ask = \"STATus:OPERation:CONDition?\"\nclear = 56\nevery = \"50 ms\"",
    );
    let mut bench = Bench::with(&text);
    let mut peer = bench.greeted().await;
    let handle = bench.handle.clone();
    let started = Instant::now();
    let waiting = tokio::spawn(async move { (handle.complete(120 * MS).await, handle.complete(REPLY).await) });
    for ms in [0, 50, 100] {
        peer.hear("STATus:OPERation:CONDition?").await;
        assert_eq!(started.elapsed(), ms * MS);
        peer.say("32\n").await;
    }
    // The second one begins where the first gave up, on the same connection: nothing was late.
    peer.hear("STATus:OPERation:CONDition?").await;
    assert_eq!(started.elapsed(), 120 * MS);
    peer.say("8192\n").await;
    let (first, second) = waiting.await.unwrap();
    assert_eq!(first, Err(SessionError::NotComplete { instrument: "supply".to_owned(), after: 120 * MS }));
    assert_eq!(second, Ok(()));
}

#[tokio::test(start_paused = true)]
async fn attempts_to_connect_grow_rarer_and_a_call_waits_no_longer_than_its_patience() {
    let mut bench = Bench::new();
    bench.open.store(false, Ordering::SeqCst);
    let started = Instant::now();
    let error = bench.handle.call(measure()).await.unwrap_err();
    assert_eq!(started.elapsed(), Duration::from_secs(6));
    let attempts: Vec<u128> =
        bench.attempts.lock().unwrap().iter().map(|at| at.duration_since(started).as_millis()).collect();
    assert_eq!(attempts, [0, 100, 300, 700, 1500, 3100]);
    let text = error.to_string();
    assert!(matches!(error, SessionError::Unreachable { .. }), "{text}");
    assert!(text.contains("supply") && text.contains("fan:5025") && text.contains("nobody listens"), "{text}");
    // It goes on trying, and the next call finds it.
    bench.open.store(true, Ordering::SeqCst);
    let call = bench.call(measure());
    let mut peer = bench.greeted().await;
    peer.hear(MEASURE).await;
    peer.say("3\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 3);
}

#[tokio::test(start_paused = true)]
async fn an_instrument_that_hangs_up_at_once_is_not_called_without_pause() {
    let mut bench = Bench::new();
    let started = Instant::now();
    for _ in 0..5 {
        let peer = bench.greeted().await;
        drop(peer);
        bench.handle.watch().wait_for(|report| !report.up).await.unwrap();
    }
    let attempts: Vec<u128> =
        bench.attempts.lock().unwrap().iter().map(|at| at.duration_since(started).as_millis()).collect();
    assert_eq!(attempts, [0, 0, 100, 300, 700]);
}
