//! The two connections of a client: what is said to the instrument, and what overtakes it.

use std::io;
use std::sync::Arc;
use std::time::Duration;

use tokio::io::{AsyncRead, AsyncWrite};
use tokio::sync::mpsc;

use super::Server;
use super::session::Session;
use super::wire::{self, Frame, Got, LARGEST, kind};
use crate::message::{Arrival, Input};

/// Serves the synchronous connection until it ends.
///
/// # Errors
/// When reading or writing fails.
pub(super) async fn serve_sync(
    server: &Server,
    session: &Session,
    mut from: impl AsyncRead + Unpin,
    mut to: impl AsyncWrite + Unpin,
) -> io::Result<()> {
    let mut input = Input::default();
    loop {
        let frame = match wire::read(&mut from).await? {
            Got::End => return Ok(()),
            Got::Garbage => return wire::write(&mut to, &Frame::error(kind::FATAL_ERROR, wire::POOR_HEADER)).await,
            Got::TooLarge(_) => {
                wire::write(&mut to, &Frame::error(kind::ERROR, wire::TOO_LARGE)).await?;
                continue;
            }
            Got::Frame(frame) => frame,
        };
        if *session.clearing.borrow() {
            // Everything from before the clear goes, until the client says that nothing more of it comes.
            input = Input::default();
            if frame.kind == kind::DEVICE_CLEAR_COMPLETE {
                session.forget_reply();
                session.clearing.send_replace(false);
                // Synchronised mode is all there is, whatever the client wants.
                wire::write(&mut to, &Frame::new(kind::DEVICE_CLEAR_ACKNOWLEDGE, 0, 0)).await?;
            }
            continue;
        }
        if !session.complete() {
            return wire::write(&mut to, &Frame::error(kind::FATAL_ERROR, wire::ONE_CHANNEL)).await;
        }
        let mut arrivals = match frame.kind {
            kind::DATA | kind::DATA_END | kind::TRIGGER => {
                if session.interrupts(frame.control & 1 != 0) {
                    session.device.interrupted();
                    wire::write(&mut to, &Frame::new(kind::INTERRUPTED, 0, frame.parameter)).await?;
                    let told = Frame::new(kind::ASYNC_INTERRUPTED, 0, frame.parameter);
                    // Fails only when the session ends.
                    let _ = session.outbox.send(told).await;
                }
                input.push(&frame.payload)
            }
            kind::ERROR | kind::FATAL_ERROR => {
                tracing::debug!(code = frame.control, "the client reports an error");
                continue;
            }
            other => {
                wire::write(&mut to, &Frame::unrecognized(other)).await?;
                continue;
            }
        };
        match frame.kind {
            kind::DATA_END => arrivals.extend(input.end()),
            // Group execute trigger is what `*TRG` is (488.2, 10.37, from memory).
            kind::TRIGGER => arrivals.push(Arrival::Message(b"*TRG".to_vec())),
            _ => {}
        }
        let reply = tokio::select! {
            biased;
            () = clear_begins(session) => continue,
            reply = carry_out(server, session, arrivals) => reply,
        };
        say(session, &mut to, frame.parameter, &reply).await?;
    }
}

async fn clear_begins(session: &Session) {
    // The sender lives in the session.
    let _ = session.clearing.subscribe().wait_for(|clearing| *clearing).await;
}

/// The reply to everything that a message held.
async fn carry_out(server: &Server, session: &Session, arrivals: Vec<Arrival>) -> Vec<u8> {
    let mut reply = Vec::new();
    for arrival in arrivals {
        server.locks.admitted(session.id).await;
        match arrival {
            Arrival::Message(message) => reply.extend(session.device.run(&message).await),
            Arrival::Overrun => session.device.overrun(),
        }
    }
    reply
}

/// Says a reply in pieces that the client takes, whole ones even if a device clear begins: where a message ends must not
/// become unclear.
async fn say(session: &Session, to: &mut (impl AsyncWrite + Unpin), id: u32, reply: &[u8]) -> io::Result<()> {
    if reply.is_empty() {
        return Ok(());
    }
    session.replied();
    let mut pieces = reply.chunks(session.most_payload()).peekable();
    while let Some(piece) = pieces.next() {
        if *session.clearing.borrow() {
            return Ok(());
        }
        let kind = if pieces.peek().is_some() { kind::DATA } else { kind::DATA_END };
        wire::write(to, &Frame::new(kind, 0, id).with(piece)).await?;
    }
    Ok(())
}

/// Serves the asynchronous connection until it ends.
///
/// # Errors
/// When reading fails.
pub(super) async fn serve_async(
    server: &Arc<Server>,
    session: &Arc<Session>,
    mut from: impl AsyncRead + Unpin,
) -> io::Result<()> {
    loop {
        let frame = match wire::read(&mut from).await? {
            Got::End => return Ok(()),
            Got::Garbage => Err(Frame::error(kind::FATAL_ERROR, wire::POOR_HEADER)),
            Got::TooLarge(_) => Err(Frame::error(kind::ERROR, wire::TOO_LARGE)),
            Got::Frame(frame) => Ok(frame),
        };
        let answer = match frame {
            Ok(frame) => answer(server, session, frame),
            Err(error) => Some(error),
        };
        let Some(answer) = answer else { continue };
        let fatal = answer.kind == kind::FATAL_ERROR;
        if session.outbox.send(answer).await.is_err() {
            return Ok(());
        }
        if fatal {
            // Its delivery ends the session.
            std::future::pending::<()>().await;
        }
    }
}

/// What is said to a message on the asynchronous connection, if it can be said at once.
fn answer(server: &Arc<Server>, session: &Arc<Session>, frame: Frame) -> Option<Frame> {
    Some(match frame.kind {
        kind::ASYNC_MAXIMUM_MESSAGE_SIZE => {
            let Ok(size) = <[u8; 8]>::try_from(frame.payload.as_slice()) else {
                return Some(Frame::error(kind::ERROR, (0, "a size has eight bytes")));
            };
            session.set_size(u64::from_be_bytes(size));
            let ours = (LARGEST as u64).to_be_bytes();
            Frame::new(kind::ASYNC_MAXIMUM_MESSAGE_SIZE_RESPONSE, 0, 0).with(ours)
        }
        kind::ASYNC_DEVICE_CLEAR => {
            session.clearing.send_replace(true);
            session.forget_reply();
            Frame::new(kind::ASYNC_DEVICE_CLEAR_ACKNOWLEDGE, 0, 0)
        }
        kind::ASYNC_STATUS_QUERY => {
            Frame::new(kind::ASYNC_STATUS_RESPONSE, session.poll_status(frame.control & 1 != 0), 0)
        }
        kind::ASYNC_LOCK if frame.control == 0 => {
            Frame::new(kind::ASYNC_LOCK_RESPONSE, server.locks.release(session.id), 0)
        }
        kind::ASYNC_LOCK if frame.control == 1 => {
            let (server, session) = (Arc::clone(server), Arc::clone(session));
            // Whoever waits for a lock can still clear and ask for the status.
            tokio::spawn(async move {
                let within = Duration::from_millis(frame.parameter.into());
                let granted = tokio::select! {
                    biased;
                    () = session.over.cancelled() => return,
                    granted = server.locks.request(session.id, &frame.payload, within) => granted,
                };
                // Fails only when the session ends, which gives the lock back.
                let _ = session.outbox.send(Frame::new(kind::ASYNC_LOCK_RESPONSE, granted, 0)).await;
            });
            return None;
        }
        kind::ASYNC_LOCK_INFO => {
            let (exclusive, holders) = server.locks.info();
            Frame::new(kind::ASYNC_LOCK_INFO_RESPONSE, u8::from(exclusive), holders)
        }
        // Seven ways of local lockout; a simulated instrument has no front panel.
        kind::ASYNC_REMOTE_LOCAL_CONTROL if frame.control <= 6 => Frame::new(kind::ASYNC_REMOTE_LOCAL_RESPONSE, 0, 0),
        kind::ASYNC_LOCK | kind::ASYNC_REMOTE_LOCAL_CONTROL => Frame::error(kind::ERROR, wire::UNRECOGNIZED_CONTROL),
        kind::ERROR | kind::FATAL_ERROR => {
            tracing::debug!(code = frame.control, "the client reports an error");
            return None;
        }
        other => Frame::unrecognized(other),
    })
}

/// Writes what waits for the asynchronous connection, until the session ends.
pub(super) async fn deliver(mut inbox: mpsc::Receiver<Frame>, mut to: impl AsyncWrite + Unpin) -> io::Result<()> {
    while let Some(frame) = inbox.recv().await {
        wire::write(&mut to, &frame).await?;
        if frame.kind == kind::FATAL_ERROR {
            break;
        }
    }
    Ok(())
}

/// Asks for service whenever there is a new reason.
pub(super) async fn watch_status(session: &Session) {
    let mut changes = session.device.status_changes();
    loop {
        if let Some(request) = session.service_request()
            && session.outbox.send(request).await.is_err()
        {
            return;
        }
        if changes.changed().await.is_err() {
            return;
        }
    }
}
