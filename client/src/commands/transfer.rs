//! `evenpair transfer`

use clap::{Args, ValueEnum};
use evenpair_api::{TransferChoice, TransferRequest};
use evenpair_core::units::{Amount, Unit};

use super::deskew::finish;
use crate::exit::Exit;
use crate::http::Daemon;
use crate::trouble::Trouble;

/// To which range, and by what.
#[derive(Debug, Args)]
pub(crate) struct TransferArguments {
    /// The pair's name.
    pair: String,
    /// A signal that the pair's own range and the new one both show: the name of a reference.
    #[arg(long, value_name = "NAME")]
    reference: String,
    /// Full vertical span of the new range at the tip, such as `20 V`.
    #[arg(long, value_name = "VOLTS")]
    span: String,
    /// Voltage at the tip in the middle of the new span; as the reference is acquired if absent.
    #[arg(long, value_name = "VOLTS", allow_hyphen_values = true)]
    offset: Option<String>,
    /// The way that is taken.
    #[arg(long, value_enum, default_value_t = By::Best)]
    by: By,
    /// The most acquisitions to spend on each range.
    #[arg(long, value_name = "N")]
    most: Option<u32>,
}

/// The way that is taken.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
enum By {
    /// Whichever has the smaller uncertainty.
    Best,
    /// A deskew on the new range: both tips on one node.
    Common,
    /// Each leg compared with itself on the two ranges.
    Legs,
}

/// Transfers a pair's correction and shows what came of it.
pub(crate) async fn transfer(daemon: &Daemon, wish: &TransferArguments, json: bool) -> Result<Exit, Trouble> {
    let volts = |flag: &str, text: &str| {
        Amount::parse_in(text, Unit::Volt).map_err(|error| Trouble::Usage(format!("--{flag}: {error}")))
    };
    let request = TransferRequest {
        reference: wish.reference.clone(),
        span_v: volts("span", &wish.span)?,
        offset_v: wish.offset.as_deref().map(|text| volts("offset", text)).transpose()?,
        by: Some(match wish.by {
            By::Best => TransferChoice::Best,
            By::Common => TransferChoice::Common,
            By::Legs => TransferChoice::Legs,
        }),
        target_u_skew_s: None,
        most_acquisitions: wish.most,
    };
    let run = daemon.transfer(&wish.pair, &request).await?;
    finish(daemon, run, json, async || {
        let newest = daemon.corrections(&wish.pair).await?.items.into_iter().find(|one| one.transferred_from.is_some());
        newest.ok_or_else(|| Trouble::Usage(format!("the pair {} has no transferred correction", wish.pair)))
    })
    .await
}
