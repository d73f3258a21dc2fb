//! What comes from the server, message by message.

use super::super::header::{Channel, ErrorCode, FatalCode, Header, Kind};
use super::fault::{Fault, Phase};
use super::{Client, Event, FIRST_ID, LockAnswer, MAXIMUM_MESSAGE_BYTES, NO_ID, Piece, payload_of};

/// The message that is coming in on one connection.
#[derive(Debug, Clone, Default)]
pub(super) struct Incoming {
    header: Option<Header>,
    keep: Keep,
    text: Vec<u8>,
}

/// What becomes of a payload.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
enum Keep {
    /// Nothing.
    #[default]
    Nothing,
    /// It belongs to the reply that is awaited.
    Reply,
    /// It is kept until the message ends; [`super::super::scan`] has bounded it.
    Text,
}

impl Incoming {
    /// Lets the rest of the message that is coming in go by.
    pub(super) fn skip(&mut self) {
        self.keep = Keep::Nothing;
    }
}

impl Client {
    /// Takes in what came on a connection. Ask [`Client::next_output`] afterwards, also after an error.
    ///
    /// # Errors
    /// What the connection cannot go on with; if [`Fault::curable`], a device clear may help. Pieces may still be taken
    /// in after an error that is.
    pub fn take(&mut self, channel: Channel, piece: Piece<'_>) -> Result<Option<Event>, Fault> {
        match piece {
            Piece::Head(header) => {
                let keep = self.judge(channel, &header);
                let incoming = self.incoming(channel);
                incoming.header = Some(header);
                incoming.keep = keep.as_ref().copied().unwrap_or_default();
                incoming.text.clear();
                keep?;
                if header.length == 0 { self.ended(channel) } else { Ok(None) }
            }
            Piece::Payload { bytes, last } => {
                let incoming = self.incoming(channel);
                match incoming.keep {
                    Keep::Nothing => {}
                    Keep::Reply => self.reply.extend_from_slice(bytes),
                    Keep::Text => incoming.text.extend_from_slice(bytes),
                }
                if last { self.ended(channel) } else { Ok(None) }
            }
        }
    }

    fn incoming(&mut self, channel: Channel) -> &mut Incoming {
        match channel {
            Channel::Sync => &mut self.sync,
            Channel::Async => &mut self.r#async,
        }
    }

    /// Decides on the header alone what becomes of the payload.
    fn judge(&mut self, channel: Channel, header: &Header) -> Result<Keep, Fault> {
        let clearing = matches!(self.phase, Phase::Clearing { .. });
        match (channel, header.kind) {
            (Channel::Sync, Kind::Data | Kind::DataEnd) if clearing => Ok(Keep::Nothing),
            (Channel::Sync, Kind::Data | Kind::DataEnd) if self.phase == Phase::Ready => self.judge_data(header),
            (_, Kind::Error | Kind::FatalError) | (Channel::Async, Kind::AsyncMaximumMessageSizeResponse) => {
                Ok(Keep::Text)
            }
            _ => Ok(Keep::Nothing),
        }
    }

    fn judge_data(&mut self, header: &Header) -> Result<Keep, Fault> {
        let ours = header.parameter == self.last_id;
        // Only at its end must a reply say which request it belongs to; before, the server may not know yet.
        let perhaps_ours = header.kind == Kind::Data && header.parameter == NO_ID && self.awaited.is_some();
        if !ours && !perhaps_ours {
            // Another request's: it goes, and with it what was taken for the beginning of ours.
            self.reply.clear();
            return Ok(Keep::Nothing);
        }
        let Some(most) = self.awaited else { return Err(Fault::Unsolicited { bytes: header.length }) };
        let declared = header.length.saturating_add(self.reply.len() as u64);
        if declared > most as u64 {
            return Err(Fault::ReplyTooLong { declared, most });
        }
        Ok(Keep::Reply)
    }

    /// A message is complete.
    fn ended(&mut self, channel: Channel) -> Result<Option<Event>, Fault> {
        let incoming = self.incoming(channel);
        // Without a message that began there is none that ends.
        let Some(header) = incoming.header.take() else { return Ok(None) };
        let keep = std::mem::take(&mut incoming.keep);
        let text = std::mem::take(&mut incoming.text);
        let shown = || String::from_utf8_lossy(&text).trim().to_owned();
        let clearing = matches!(self.phase, Phase::Clearing { .. });
        match (channel, header.kind) {
            (_, Kind::FatalError) => Err(Fault::Fatal { code: FatalCode::from(header.control), text: shown() }),
            // What is answered to a message from before the clearing does not count any more.
            (Channel::Sync, Kind::Error) if clearing => Ok(None),
            (_, Kind::Error) => Err(Fault::Answered { code: ErrorCode::from(header.control), text: shown() }),
            (_, Kind::Unknown(number)) => {
                // The standard has such a message thrown away and answered with an error, after which all goes on.
                let code = if number < 128 { ErrorCode::UnrecognizedType } else { ErrorCode::UnrecognizedVendor };
                self.say(channel, Header::new(Kind::Error).control(code.into()), code.to_string().as_bytes());
                Ok(None)
            }
            (Channel::Sync, kind) => self.ended_sync(kind, &header, keep),
            (Channel::Async, kind) => self.ended_async(kind, &header, &text),
        }
    }

    fn ended_sync(&mut self, kind: Kind, header: &Header, keep: Keep) -> Result<Option<Event>, Fault> {
        match (kind, self.phase) {
            (Kind::InitializeResponse, Phase::Initializing) => {
                let [_, _, high, low] = header.parameter.to_be_bytes();
                self.session = u16::from_be_bytes([high, low]);
                self.phase = Phase::AsyncInitializing { overlap: header.control & 1 != 0 };
                let session = u32::from(self.session);
                self.say(Channel::Async, Header::new(Kind::AsyncInitialize).parameter(session), &[]);
                Ok(Some(Event::OpenAsync))
            }
            (Kind::DataEnd, Phase::Ready) if keep == Keep::Reply => {
                self.awaited = None;
                self.delivered = true;
                Ok(Some(Event::Reply(std::mem::take(&mut self.reply))))
            }
            (Kind::DataEnd, Phase::Ready) => Ok(Some(Event::Stale { id: header.parameter })),
            (Kind::Data, Phase::Ready) => Ok(None),
            (Kind::Interrupted, Phase::Ready) => Err(Fault::Interrupted),
            (Kind::DeviceClearAcknowledge, Phase::Clearing { acknowledged: true, opening }) => {
                if header.control & 1 != 0 {
                    return Err(Fault::OverlapOnly);
                }
                self.phase = Phase::Ready;
                (self.next_id, self.last_id) = (FIRST_ID, NO_ID);
                self.delivered = false;
                Ok(Some(if opening { Event::Ready } else { Event::Cleared }))
            }
            (Kind::Data | Kind::DataEnd | Kind::Interrupted, Phase::Clearing { .. }) => Ok(None),
            (kind, _) => Err(Fault::Unexpected { kind, channel: Channel::Sync }),
        }
    }

    fn ended_async(&mut self, kind: Kind, header: &Header, text: &[u8]) -> Result<Option<Event>, Fault> {
        match (kind, self.phase) {
            (Kind::AsyncInitializeResponse, Phase::AsyncInitializing { overlap }) => {
                self.phase = Phase::Sizing { overlap };
                let size = Header::new(Kind::AsyncMaximumMessageSize);
                self.say(Channel::Async, size, &MAXIMUM_MESSAGE_BYTES.to_be_bytes());
                Ok(None)
            }
            (Kind::AsyncMaximumMessageSizeResponse, Phase::Sizing { overlap }) => {
                let size = text.try_into().map_or(0, u64::from_be_bytes);
                self.most_payload = payload_of(size).ok_or(Fault::Size { size })?;
                if overlap {
                    self.begin_clear(true);
                    return Ok(None);
                }
                self.phase = Phase::Ready;
                Ok(Some(Event::Ready))
            }
            (Kind::AsyncDeviceClearAcknowledge, Phase::Clearing { acknowledged: false, opening }) => {
                self.phase = Phase::Clearing { acknowledged: true, opening };
                // Control code 0 asks for synchronised mode, whatever the server prefers.
                self.say(Channel::Sync, Header::new(Kind::DeviceClearComplete), &[]);
                Ok(None)
            }
            (Kind::AsyncServiceRequest, _) => Ok(Some(Event::ServiceRequest(header.control))),
            // Answers to what was asked before a device clear may come during it.
            (Kind::AsyncStatusResponse, Phase::Ready | Phase::Clearing { .. }) => {
                Ok(Some(Event::Status(header.control)))
            }
            (Kind::AsyncLockResponse, Phase::Ready | Phase::Clearing { .. }) => {
                Ok(Some(Event::Lock(LockAnswer::from(header.control))))
            }
            (Kind::AsyncInterrupted, Phase::Ready) => Err(Fault::Interrupted),
            (Kind::AsyncInterrupted, Phase::Clearing { .. }) => Ok(None),
            (kind, _) => Err(Fault::Unexpected { kind, channel: Channel::Async }),
        }
    }
}
