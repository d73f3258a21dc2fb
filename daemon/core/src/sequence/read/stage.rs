//! One stage of a sequence, as it stands in the text: checked, not yet unrolled.

use std::ops::Range;

use super::Context;
use super::asked;
use super::axis::{self, Axis};
use crate::analysis::transfer::Choice;
use crate::bench::{OFFSETS_V, SPANS_V, field, overrides};
use crate::document::Table;
use crate::sequence::step::{CapturePlan, DeskewPlan, Limit, OnLimit, OnVoid, VerifyPlan};
use crate::sequence::transfer::TransferPlan;
use crate::units::Unit;

/// How deeply sweeps may be nested: three axes in each is more than any night has time for.
const DEEPEST: usize = 4;

/// The longest wait: a day. What waits longer is another run.
const LONGEST_WAIT_S: f64 = 86_400.0;

/// The longest free command: the input buffer of a small instrument; no command of one line needs more.
const LONGEST_COMMAND: usize = 255;

/// Where stages stand.
#[derive(Debug, Clone, Copy)]
pub(super) enum Part {
    /// In the part that is carried out whatever happened: nothing that takes long or measures.
    Always,
    /// Among the stages, within so many sweeps.
    Stages {
        /// How many sweeps are around it.
        depth: usize,
    },
}

/// A stage.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Stage {
    /// Where it stands.
    pub(super) span: Range<usize>,
    /// What it does.
    pub(super) what: What,
}

/// What a stage does.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum What {
    Ask { instrument: String, command: String },
    Capture(CapturePlan),
    Deskew(DeskewPlan),
    Route { route: String },
    Send { instrument: String, command: String },
    Set { setting: String, value: f64 },
    Sweep { axes: Vec<Axis>, inner: Vec<Stage> },
    Transfer(TransferPlan),
    Verify(VerifyPlan),
    Wait { time_s: f64 },
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Kind {
    Ask,
    Capture,
    Deskew,
    Route,
    Send,
    Set,
    Sweep,
    Transfer,
    Verify,
    Wait,
}

const KINDS: [(&str, Kind); 10] = [
    ("ask", Kind::Ask),
    ("capture", Kind::Capture),
    ("deskew", Kind::Deskew),
    ("route", Kind::Route),
    ("send", Kind::Send),
    ("set", Kind::Set),
    ("sweep", Kind::Sweep),
    ("transfer", Kind::Transfer),
    ("verify", Kind::Verify),
    ("wait", Kind::Wait),
];

/// Reads every stage of the list `key`.
pub(super) fn read_list(table: &mut Table<'_>, key: &str, context: &Context<'_>, part: Part) -> Vec<Stage> {
    let mut stages = Vec::new();
    for mut entry in table.tables(key).unwrap_or_default() {
        let kind = field::choice(&mut entry, "do", &KINDS)
            .or_else(|| entry.missing("do", "say what the stage does, such as `do = \"capture\"`"));
        // What an unknown kind of stage may hold cannot be known, so its other keys are left alone.
        let Some(kind) = kind else { continue };
        if let Some(what) = read(&mut entry, kind, context, part) {
            entry.refuse_others();
            stages.push(Stage { span: entry.span(), what });
        }
    }
    stages
}

fn read(table: &mut Table<'_>, kind: Kind, context: &Context<'_>, part: Part) -> Option<What> {
    let measures = matches!(kind, Kind::Capture | Kind::Deskew | Kind::Sweep | Kind::Transfer | Kind::Verify);
    if matches!(part, Part::Always) && measures {
        table.mistakes().add(
            table.span(),
            "the `always` part neither measures nor sweeps",
            "only ask, route, send, set and wait stand there: it must work when nothing else does",
        );
    }
    match kind {
        Kind::Ask => command(table, context, true).map(|(instrument, command)| What::Ask { instrument, command }),
        Kind::Capture => capture(table, context).map(What::Capture),
        Kind::Deskew => deskew(table, context).map(What::Deskew),
        Kind::Route => {
            let known: Vec<String> = context.bench.routes.iter().map(|route| route.name.clone()).collect();
            let route = field::name(table, "route", "route", &known)
                .or_else(|| table.missing("route", "name the route to close"));
            route.map(|route| What::Route { route })
        }
        Kind::Send => command(table, context, false).map(|(instrument, command)| What::Send { instrument, command }),
        Kind::Set => set(table, context),
        Kind::Sweep => sweep(table, context, part),
        Kind::Transfer => transfer(table, context).map(What::Transfer),
        Kind::Verify => verify(table, context).map(What::Verify),
        Kind::Wait => field::amount(table, "time", Unit::Second, &(0.0..=LONGEST_WAIT_S))
            .or_else(|| table.missing("time", "say how long, such as `time = \"5 s\"`"))
            .map(|time_s| What::Wait { time_s }),
    }
}

fn set(table: &mut Table<'_>, context: &Context<'_>) -> Option<What> {
    let known: Vec<String> = context.bench.settings.iter().map(|setting| setting.name.clone()).collect();
    let name =
        field::name(table, "setting", "setting", &known).or_else(|| table.missing("setting", "name the setting"));
    let Some(setting) = name.and_then(|name| context.bench.setting(&name)) else {
        // Its unit is unknown, so that the value cannot be judged; an absent one is still missing.
        return table.missing("value", "the value in the setting's unit");
    };
    let value = field::amount(table, "value", setting.unit, &(setting.min..=setting.max))
        .or_else(|| table.missing("value", &format!("the value in {}", setting.unit)))?;
    Some(What::Set { setting: setting.name.clone(), value })
}

fn sweep(table: &mut Table<'_>, context: &Context<'_>, part: Part) -> Option<What> {
    let depth = match part {
        Part::Always => DEEPEST,
        Part::Stages { depth } => depth,
    };
    let axes = axis::read_list(table, context);
    if depth >= DEEPEST {
        table.mistakes().add(
            table.span(),
            "this sweep is nested too deeply",
            format!("at most {DEEPEST} within each other"),
        );
        // Asked for, so that it is not called a stranger as well.
        let _ = table.tables("stage");
        return None;
    }
    let inner = read_list(table, "stage", context, Part::Stages { depth: depth + 1 });
    let path = table.path().to_owned();
    let _: Option<()> = table.missing("stage", &format!("write what is swept as `[[{path}.stage]]` below it"));
    Some(What::Sweep { axes, inner })
}

/// A free command: one line, to an instrument that the bench opened for it.
fn command(table: &mut Table<'_>, context: &Context<'_>, asks: bool) -> Option<(String, String)> {
    let known: Vec<String> = context.bench.instruments.iter().map(|spec| spec.name.clone()).collect();
    let instrument = field::name(table, "instrument", "instrument", &known)
        .or_else(|| table.missing("instrument", "name the instrument"));
    let command = table.text("command").or_else(|| table.missing("command", "write the command"));
    let instrument = instrument?;
    if context.bench.instrument(&instrument).is_some_and(|spec| !spec.free_commands) {
        table.mistakes().add(
            table.span(),
            format!("the bench does not allow free commands to `{instrument}`"),
            "use `set` and `route`, or write `free_commands = true` for it in the bench file: nothing checks such a command",
        );
    }
    let command = command?;
    let text = &command.value;
    let printable = text.bytes().all(|byte| (0x20..0x7f).contains(&byte));
    if text.trim().is_empty() || text.len() > LONGEST_COMMAND || !printable {
        table.mistakes().add(
            command.span,
            "this is no command of one line",
            format!("1 to {LONGEST_COMMAND} printable ASCII characters, without a line end"),
        );
    } else if text.contains('?') != asks {
        let (what, help) = if asks {
            ("`ask` waits for a reply, but this has no `?`", "use `do = \"send\"` for a command that answers nothing")
        } else {
            ("`send` reads no reply, but this asks for one", "use `do = \"ask\"` for a query")
        };
        table.mistakes().add(command.span, what, help);
    }
    Some((instrument, command.value))
}

fn pair(table: &mut Table<'_>, context: &Context<'_>) -> Option<String> {
    let known: Vec<String> = context.bench.pairs.iter().map(|pair| pair.name.clone()).collect();
    field::name(table, "pair", "pair", &known).or_else(|| table.missing("pair", "name the pair"))
}

fn reference(table: &mut Table<'_>, key: &str, context: &Context<'_>) -> Option<String> {
    let known: Vec<String> = context.bench.references.iter().map(|reference| reference.name.clone()).collect();
    field::name(table, key, "reference", &known)
}

fn deskew(table: &mut Table<'_>, context: &Context<'_>) -> Option<DeskewPlan> {
    let pair = pair(table, context);
    let skew_reference = reference(table, "skew_reference", context);
    let gain_reference = reference(table, "gain_reference", context);
    let target = field::amount(table, "target_u_skew", Unit::Second, &(1e-15..=1e-6));
    let most = field::whole(table, "most_acquisitions", &(2..=10_000));
    let scope_skew = table.flag("use_scope_skew");
    let response = table.flag("response");
    let plan = DeskewPlan::of(context.bench, &pair?, skew_reference.as_deref(), gain_reference.as_deref());
    let mut plan =
        plan.map_err(|error| table.mistakes().add(table.span(), error.to_string(), "take another reference")).ok()?;
    plan.target_u_skew_s = target.unwrap_or(plan.target_u_skew_s);
    plan.most_acquisitions = most.unwrap_or(plan.most_acquisitions);
    plan.use_scope_skew = scope_skew.map_or(plan.use_scope_skew, |item| item.value);
    plan.response = response.map_or(plan.response, |item| item.value);
    Some(plan)
}

fn transfer(table: &mut Table<'_>, context: &Context<'_>) -> Option<TransferPlan> {
    let pair = pair(table, context);
    let reference = reference(table, "reference", context)
        .or_else(|| table.missing("reference", "name a signal that both ranges can show"));
    let span_v = field::amount(table, "span", Unit::Volt, &SPANS_V)
        .or_else(|| table.missing("span", "the full vertical span of the new range at the tip"));
    let offset_v = field::amount(table, "offset", Unit::Volt, &OFFSETS_V);
    let choice = field::choice(table, "by", &Choice::NAMES);
    let target = field::amount(table, "target_u_skew", Unit::Second, &(1e-15..=1e-6));
    let most = field::whole(table, "most_acquisitions", &(2..=10_000));
    let plan = TransferPlan::of(context.bench, &pair?, &reference?, span_v?, offset_v);
    let help = "take another reference or range; both ranges have to show all of the reference";
    let mut plan = plan.map_err(|error| table.mistakes().add(table.span(), error.to_string(), help)).ok()?;
    plan.choice = choice.unwrap_or(plan.choice);
    plan.target_u_skew_s = target.unwrap_or(plan.target_u_skew_s);
    plan.most_acquisitions = most.unwrap_or(plan.most_acquisitions);
    Some(plan)
}

fn verify(table: &mut Table<'_>, context: &Context<'_>) -> Option<VerifyPlan> {
    let pair = pair(table, context);
    let reference = reference(table, "reference", context);
    VerifyPlan::of(context.bench, &pair?, reference.as_deref())
        .map_err(|error| table.mistakes().add(table.span(), error.to_string(), "take another reference"))
        .ok()
}

fn capture(table: &mut Table<'_>, context: &Context<'_>) -> Option<CapturePlan> {
    let pair = pair(table, context);
    let overrides = overrides(table);
    let asked = asked::read(table);
    let on_void = field::choice(table, "on_void", &[("mark", OnVoid::Mark), ("refuse", OnVoid::Refuse)]);
    let on_limit = field::choice(table, "on_limit", &[("continue", OnLimit::Continue), ("end", OnLimit::End)]);
    let on_void = on_void.unwrap_or(OnVoid::Refuse);
    let limits: Vec<Limit> = table
        .tables("limit")
        .unwrap_or_default()
        .into_iter()
        .filter_map(|mut entry| limit(&mut entry, context))
        .collect();
    asked::needed(table, &asked, &limits);
    let spec = context.bench.pair(&pair?)?;
    let acquisition = spec.acquisition.with(&overrides);
    let channel = acquisition.trigger.channel;
    if channel != 0 && spec.leg_on(channel).is_none() {
        table.mistakes().add(
            table.span(),
            format!("this capture is triggered by channel {channel}, which is no leg of pair `{}`", spec.name),
            "trigger on a leg of the pair, or on the external input with `channel = 0`",
        );
    }
    Some(CapturePlan {
        pair: spec.name.clone(),
        acquisition,
        asked,
        on_void,
        limits,
        on_limit: on_limit.unwrap_or(OnLimit::Continue),
    })
}

fn limit(table: &mut Table<'_>, context: &Context<'_>) -> Option<Limit> {
    let figure = table.text("figure").or_else(|| table.missing("figure", "name the figure that is limited"))?;
    let Some(unit) = (context.figures)(&figure.value) else {
        table.mistakes().add(
            figure.span,
            format!("there is no figure `{}`", figure.value),
            "the figures are listed in configs/README.md",
        );
        return None;
    };
    let min = table.amount("min", unit);
    let max = table.amount("max", unit);
    table.refuse_others();
    if !table.has("min") && !table.has("max") {
        table.mistakes().add(table.span(), "a limit needs `min`, `max` or both", format!("in {unit}"));
    }
    if let (Some(min), Some(max)) = (&min, &max)
        && min.value > max.value
    {
        table.mistakes().add(
            max.span.clone(),
            "`max` is below `min`: nothing could keep this limit",
            "exchange the two",
        );
    }
    Some(Limit { figure: figure.value, unit, min: min.map(|item| item.value), max: max.map(|item| item.value) })
}
