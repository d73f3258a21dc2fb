//! How a session begins, fills up and ends.

use super::*;

#[tokio::test(start_paused = true)]
async fn too_many_waiting_requests_are_turned_away() {
    let (bench, mut peer) = Bench::up().await;
    let first = bench.call(measure());
    peer.hear(MEASURE).await;
    let waiting: Vec<_> = (0..QUEUE).map(|_| bench.call(measure())).collect();
    tokio::task::yield_now().await;
    let error = bench.handle.call(measure()).await.unwrap_err();
    let (instrument, what) = ("supply".to_owned(), "`measure.voltage`".to_owned());
    assert_eq!(error, SessionError::Busy { instrument, what, waiting: QUEUE });
    peer.say("0\n").await;
    assert_eq!(value(&first.await.unwrap().unwrap()), 0);
    for (call, volts) in waiting.into_iter().zip(1..) {
        peer.hear(MEASURE).await;
        peer.say(format!("{volts}\n")).await;
        assert_eq!(value(&call.await.unwrap().unwrap()), volts);
    }
}

#[tokio::test(start_paused = true)]
async fn the_token_ends_the_task_at_once_and_tells_everyone_who_waits() {
    let (bench, mut peer) = Bench::up().await;
    let (under_way, queued) = (bench.call(measure()), bench.call(output(true)));
    peer.hear(MEASURE).await;
    let started = Instant::now();
    bench.token.cancel();
    bench.tracker.wait().await;
    assert_eq!(started.elapsed(), Duration::ZERO);
    let closed = |what: &str| SessionError::Closed { instrument: "supply".to_owned(), what: what.to_owned() };
    assert_eq!(under_way.await.unwrap(), Err(closed("`measure.voltage`")));
    assert_eq!(queued.await.unwrap(), Err(closed("`output.set`")));
    assert_eq!(bench.handle.call(measure()).await, Err(closed("`measure.voltage`")));
    assert!(!bench.handle.watch().borrow().up);
    peer.closed().await;
}

#[tokio::test(start_paused = true)]
async fn the_token_ends_a_session_that_is_not_connected() {
    let bench = Bench::new();
    bench.open.store(false, Ordering::SeqCst);
    let call = bench.call(measure());
    bench.handle.watch().wait_for(|report| report.trouble.is_some()).await.unwrap();
    bench.token.cancel();
    bench.tracker.wait().await;
    assert!(matches!(call.await.unwrap(), Err(SessionError::Closed { .. })));
}

#[tokio::test(start_paused = true)]
async fn the_last_handle_takes_the_session_with_it() {
    let (bench, mut peer) = Bench::up().await;
    drop(bench.handle);
    bench.tracker.wait().await;
    peer.closed().await;
}

#[tokio::test(start_paused = true)]
async fn a_call_that_the_dialect_cannot_say_sends_nothing() {
    let (bench, mut peer) = Bench::up().await;
    let call = Call::new(Intent::OutputSet).with("channel", 0_i64).with("state", true);
    let error = bench.handle.call(call).await.unwrap_err();
    assert!(matches!(error, SessionError::Dialect { .. }), "{error}");
    drop(bench.handle);
    peer.closed().await;
}

/// Real sockets, real time: waits on events only.
#[tokio::test]
async fn a_session_over_tcp_connects_asks_and_closes() {
    let listener = tokio::net::TcpListener::bind("127.0.0.1:0").await.unwrap();
    let spec = SessionSpec {
        instrument: "supply".to_owned(),
        host: "127.0.0.1".to_owned(),
        port: listener.local_addr().unwrap().port(),
        protocol: Protocol::Socket,
        dialect: Arc::new(Dialect::read(bundled("scpi-99").unwrap()).unwrap()),
        timing: Timing::default(),
        caps: Caps::default(),
    };
    let tracker = TaskTracker::new();
    let handle = spawn(spec, CancellationToken::new(), &tracker);
    tracker.close();
    let (stream, _) = listener.accept().await.unwrap();
    let mut peer = Peer { stream: BufReader::new(stream) };
    peer.greet().await;
    handle.watch().wait_for(|report| report.up).await.unwrap();
    assert_eq!((handle.instrument(), handle.dialect().name()), ("supply", "scpi-99"));
    let asking = handle.clone();
    let call = tokio::spawn(async move { asking.call(measure()).await });
    peer.hear(MEASURE).await;
    peer.say("48\n").await;
    assert_eq!(value(&call.await.unwrap().unwrap()), 48);
    drop(handle);
    tracker.wait().await;
    peer.closed().await;
}

#[test]
fn commands_are_shown_on_one_short_line() {
    assert_eq!(error::shown(b"DISPlay:TEXT \"a\tb\"\r\n"), "DISPlay:TEXT \"a\\tb\"");
    let long = vec![b'x'; 1 << 20];
    assert_eq!(error::shown(&long), format!("{}…", "x".repeat(80)));
    assert_eq!(error::shown(&[0xff, 0x00]), "\u{fffd}\\0");
}

#[test]
fn a_host_in_ipv6_stands_in_brackets() {
    assert_eq!(Tcp { host: "::1".to_owned(), port: 5025 }.to_string(), "[::1]:5025");
    assert_eq!(Tcp { host: "scope".to_owned(), port: 5025 }.to_string(), "scope:5025");
}
