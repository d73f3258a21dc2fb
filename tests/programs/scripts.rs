//! The sequences that the tests run, put together from parts.

/// A deskew, content with little, so that it is short.
pub(crate) const DESKEW: &str = "[[stage]]\ndo = \"deskew\"\npair = \"gate\"\nmost_acquisitions = 4\n";

/// The bus at 24 V and the tips on the device.
pub(crate) const DEVICE: &str = "[[stage]]\ndo = \"set\"\nsetting = \"bus_voltage\"\nvalue = \"24 V\"\n[[stage]]\ndo = \"route\"\nroute = \"device\"\n";

/// The `always` part: the bus at nought.
pub(crate) const ALWAYS: &str = "[[always]]\ndo = \"set\"\nsetting = \"bus_voltage\"\nvalue = \"0 V\"\n";

/// A sweep of the bus over `volts` with a capture at each; `more` goes into the capture's stage.
pub(crate) fn sweep(volts: &[u32], more: &str) -> String {
    let list: Vec<String> = volts.iter().map(|volts| format!("\"{volts} V\"")).collect();
    format!(
        "[[stage]]\ndo = \"sweep\"\naxes = [{{ setting = \"bus_voltage\", list = [{}] }}]\n\
         [[stage.stage]]\ndo = \"capture\"\npair = \"gate\"\n{more}\n",
        list.join(", ")
    )
}

/// One capture outside a sweep; `more` goes into its stage.
pub(crate) fn capture(more: &str) -> String {
    format!("[[stage]]\ndo = \"capture\"\npair = \"gate\"\n{more}\n")
}

/// A limit within a sweep's capture.
pub(crate) fn limit(figure: &str, min: &str, max: &str) -> String {
    format!("[[stage.stage.limit]]\nfigure = \"{figure}\"\nmin = \"{min}\"\nmax = \"{max}\"\n")
}

/// A whole sequence of parts.
pub(crate) fn sequence(parts: &[&str]) -> String {
    format!("title = \"a test's sequence\"\n{}", parts.join("\n"))
}

/// Deskew, then a capture at each of `volts`; the limits of `more` apply to each.
pub(crate) fn night(volts: &[u32], more: &str) -> String {
    sequence(&[DESKEW, DEVICE, &sweep(volts, more), ALWAYS])
}

/// The body of `POST /runs` for a text.
pub(crate) fn text(sequence: &str) -> serde_json::Value {
    serde_json::json!({ "text": sequence })
}
