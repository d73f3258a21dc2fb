use std::sync::Arc;
use std::sync::atomic::{AtomicUsize, Ordering};

use evenpair_api::{EventKind, ProblemCode};
use tokio::io::{AsyncReadExt, AsyncWriteExt};
use tokio::net::TcpListener;

use super::*;
use crate::exit::Exit;

/// A server that answers the n-th connection with the n-th text (the last one ever after) and hands back what it was asked.
async fn server(answers: Vec<String>) -> (Daemon, tokio::sync::mpsc::UnboundedReceiver<String>) {
    let listener = TcpListener::bind("127.0.0.1:0").await.unwrap();
    let daemon = Daemon::new(&format!("http://{}", listener.local_addr().unwrap())).unwrap();
    let (sender, receiver) = tokio::sync::mpsc::unbounded_channel();
    let count = Arc::new(AtomicUsize::new(0));
    tokio::spawn(async move {
        loop {
            let (mut stream, _) = listener.accept().await.unwrap();
            let mut request = vec![0; 4096];
            let length = stream.read(&mut request).await.unwrap();
            sender.send(String::from_utf8_lossy(&request[..length]).into_owned()).unwrap();
            let n = count.fetch_add(1, Ordering::SeqCst).min(answers.len() - 1);
            stream.write_all(answers[n].as_bytes()).await.unwrap();
        }
    });
    (daemon, receiver)
}

fn answer(status: &str, kind: &str, body: &str) -> String {
    format!(
        "HTTP/1.1 {status}\r\ncontent-type: {kind}\r\nconnection: close\r\ncontent-length: {}\r\n\r\n{body}",
        body.len()
    )
}

fn stream(body: &str) -> String {
    format!("HTTP/1.1 200 OK\r\ncontent-type: text/event-stream\r\nconnection: close\r\n\r\n{body}")
}

#[tokio::test]
async fn a_problem_document_becomes_an_error_with_its_exit_status() {
    let body = r#"{"type":"urn:evenpair:problem:unknown-pair","title":"There is no such pair","status":404,
        "detail":"the bench has no pair `x`; it has: gate","code":"unknown-pair"}"#;
    let (daemon, _requests) = server(vec![answer("404 Not Found", "application/problem+json", body)]).await;
    let trouble = daemon.correction("x").await.unwrap_err();
    assert!(matches!(&trouble, Trouble::Problem(problem) if problem.code == ProblemCode::UnknownPair));
    assert_eq!(trouble.exit(), Exit::Usage);
    assert!(trouble.to_string().contains("it has: gate"));
}

#[tokio::test]
async fn another_program_at_the_address_is_recognised() {
    let (daemon, _requests) = server(vec![answer("200 OK", "text/html", "<p>hello</p>")]).await;
    assert!(matches!(daemon.bench().await, Err(Trouble::Answer { .. })));
    let (daemon, _requests) = server(vec![answer("500 No", "text/html", "")]).await;
    assert!(matches!(daemon.bench().await, Err(Trouble::Answer { .. })));
}

#[tokio::test]
async fn nobody_at_the_address_says_what_to_try() {
    let listener = TcpListener::bind("127.0.0.1:0").await.unwrap();
    let daemon = Daemon::new(&format!("http://{}", listener.local_addr().unwrap())).unwrap();
    drop(listener);
    let trouble = daemon.bench().await.unwrap_err();
    assert_eq!(trouble.exit(), Exit::Incomplete);
    assert!(trouble.to_string().contains("evenpaird --bench"), "{trouble}");
}

#[tokio::test]
async fn a_dropped_stream_is_taken_up_after_the_last_event() {
    let first = "id: 1\ndata: {\"generation\":1,\"at_s\":0.0,\"kind\":\"state_changed\",\"state\":\"running\"}\n\n";
    let second = "id: 2\ndata: {\"generation\":2,\"at_s\":1.0,\"kind\":\"state_changed\",\"state\":\"passed\"}\n\n";
    // The second stream begins with an event that was seen already, as a careless proxy would repeat it.
    let (daemon, mut requests) = server(vec![stream(first), stream(&format!("{first}{second}"))]).await;
    let mut seen = Vec::new();
    daemon
        .follow("abc", |event| {
            assert!(matches!(event.kind, EventKind::StateChanged { .. }));
            seen.push(event.generation);
            Ok(())
        })
        .await
        .unwrap();
    assert_eq!(seen, [1, 2]);
    assert!(requests.recv().await.unwrap().contains("last-event-id: 0"));
    assert!(requests.recv().await.unwrap().contains("last-event-id: 1"));
}

#[test]
fn only_http_addresses_are_taken() {
    assert!(matches!(Daemon::new("127.0.0.1:7488"), Err(Trouble::Usage(_))));
    assert!(Daemon::new("http://127.0.0.1:7488/").is_ok());
}
