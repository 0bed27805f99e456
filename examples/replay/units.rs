//! Numbers for people: SI prefixes, and values rounded to their uncertainty.

const PREFIXES: [(f64, &str); 13] = [
    (1e-18, "a"),
    (1e-15, "f"),
    (1e-12, "p"),
    (1e-9, "n"),
    (1e-6, "µ"),
    (1e-3, "m"),
    (1.0, ""),
    (1e3, "k"),
    (1e6, "M"),
    (1e9, "G"),
    (1e12, "T"),
    (1e15, "P"),
    (1e18, "E"),
];

/// Factor and symbol of the prefix that brings `magnitude` to 1 ... 999.
pub(crate) fn prefix(magnitude: f64) -> (f64, &'static str) {
    if magnitude == 0.0 || !magnitude.is_finite() {
        return (1.0, "");
    }
    let fitting = PREFIXES.iter().rev().find(|(factor, _)| magnitude.abs() >= factor * 0.9995);
    *fitting.unwrap_or(&PREFIXES[0])
}

/// Decimals that show `uncertainty` with two significant digits; negative: it is rounded to tens.
fn decimals(uncertainty: f64) -> i32 {
    // The exponent after rounding, so that 0.0996 counts as 0.10.
    let rounded = format!("{uncertainty:.1e}");
    let exponent = rounded.split('e').nth(1).and_then(|e| e.parse::<i32>().ok()).unwrap_or(0);
    1 - exponent
}

/// `value` with so many decimals; negative: rounded to tens, hundreds ...
fn fixed(value: f64, decimals: i32) -> String {
    match usize::try_from(decimals) {
        Ok(places) => format!("{value:.places$}"),
        Err(_) => {
            let step = 10_f64.powi(-decimals);
            format!("{:.0}", (value / step).round() * step)
        }
    }
}

/// `(value ± uncertainty) unit`: two digits of the uncertainty, the value rounded to match, an SI prefix for both.
/// `uncertainty` is whatever the caller states it to be.
pub(crate) fn with_uncertainty(value: f64, uncertainty: f64, unit: &str) -> String {
    let (factor, symbol) = prefix(value.abs().max(uncertainty));
    in_unit(value / factor, uncertainty / factor, &format!("{symbol}{unit}"))
}

/// The same, in `unit` as it stands.
pub(crate) fn in_unit(value: f64, uncertainty: f64, unit: &str) -> String {
    if uncertainty > 0.0 && uncertainty.is_finite() {
        let places = decimals(uncertainty);
        format!("({} ± {}) {unit}", fixed(value, places), fixed(uncertainty, places))
    } else {
        format!("{value:.6} {unit}")
    }
}

/// `value` rounded to the same place as an uncertainty of `uncertainty`, with the prefix of `scale`.
pub(crate) fn rounded_like(value: f64, uncertainty: f64, scale: f64, unit: &str) -> String {
    let (factor, symbol) = prefix(scale);
    let places = if uncertainty > 0.0 { decimals(uncertainty / factor) } else { 6 };
    format!("{} {symbol}{unit}", fixed(value / factor, places))
}

/// `value` with two significant digits and an SI prefix.
pub(crate) fn two_digits(value: f64, unit: &str) -> String {
    let (factor, symbol) = prefix(value);
    let scaled = value / factor;
    let places = if scaled == 0.0 { 0 } else { decimals(scaled.abs()) };
    format!("{} {symbol}{unit}", fixed(scaled, places))
}
