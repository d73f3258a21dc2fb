//! `evenpair export`

use std::path::Path;

use evenpair_api::Capture;
use serde::Serialize;

use crate::arguments::Format;
use crate::exit::Exit;
use crate::http::Daemon;
use crate::output;
use crate::trouble::Trouble;

/// What was written.
#[derive(Serialize)]
struct Exported {
    captures: usize,
    folder: String,
    files: Vec<String>,
}

/// Saves a run's waveforms, one file a capture, its figures as one CSV file, and all that is known as JSON.
pub(crate) async fn export(daemon: &Daemon, id: &str, to: Format, folder: &Path, json: bool) -> Result<Exit, Trouble> {
    let run = daemon.run(id).await?;
    let id = run.id.to_string();
    let captures = daemon.captures(&id).await?;
    std::fs::create_dir_all(folder).map_err(|source| Trouble::File {
        doing: "making the folder",
        path: folder.into(),
        source,
    })?;
    let mut files = Vec::new();
    for capture in &captures {
        let bytes = daemon.waveform(&id, capture.number, to.media_type()).await?;
        let name = format!("capture-{:05}.{}", capture.number, to.ending());
        write(folder, &name, &bytes)?;
        files.push(name);
    }
    write(folder, "figures.csv", figures_csv(&captures).as_bytes())?;
    let text =
        serde_json::to_string_pretty(&captures).map_err(|error| Trouble::Demo(format!("making JSON: {error}")))?;
    write(folder, "captures.json", text.as_bytes())?;
    files.extend(["figures.csv".to_owned(), "captures.json".to_owned()]);
    let exported = Exported { captures: captures.len(), folder: folder.display().to_string(), files };
    if json {
        output::print_json(&exported)?;
    } else {
        let count = exported.captures;
        output::print(&format!("{count} captures in {}: waveforms, figures.csv, captures.json", exported.folder))?;
    }
    Ok(Exit::Passed)
}

/// Writes beside the name and renames, so that a file of that name is whole or not there.
fn write(folder: &Path, name: &str, bytes: &[u8]) -> Result<(), Trouble> {
    let path = folder.join(name);
    let part = folder.join(format!(".{name}.part"));
    std::fs::write(&part, bytes).and_then(|()| std::fs::rename(&part, &path)).map_err(|source| Trouble::File {
        doing: "writing",
        path,
        source,
    })
}

/// One line a figure: what a spreadsheet wants.
fn figures_csv(captures: &[Capture]) -> String {
    let mut settings: Vec<&str> = Vec::new();
    for condition in captures.iter().flat_map(|capture| &capture.conditions) {
        if !settings.contains(&condition.setting.as_str()) {
            settings.push(&condition.setting);
        }
    }
    let mut text = String::from("capture,made_at,");
    settings.iter().for_each(|setting| text.push_str(&format!("{setting},")));
    text.push_str("figure,value,u,low,high,unit,plain,grade,valid\n");
    for capture in captures {
        for figure in &capture.figures {
            text.push_str(&format!("{},{},", capture.number, capture.made_at));
            for setting in &settings {
                let value = capture.conditions.iter().find(|condition| condition.setting == *setting);
                text.push_str(&value.map(|condition| condition.value.value.to_string()).unwrap_or_default());
                text.push(',');
            }
            let number = |value: Option<f64>| value.map(|value| value.to_string()).unwrap_or_default();
            let quantity = &figure.quantity;
            let grade = format!("{:?}", figure.grade).to_lowercase();
            text.push_str(&format!(
                "{},{},{},{},{},{},{},{grade},{}\n",
                figure.name,
                quantity.value,
                number(quantity.u),
                number(figure.coverage.as_ref().map(|c| c.low)),
                number(figure.coverage.as_ref().map(|c| c.high)),
                quantity.unit,
                number(figure.plain),
                figure.valid
            ));
        }
    }
    text
}
