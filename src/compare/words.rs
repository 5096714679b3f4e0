//! Numbers as notes and warnings write them.

/// A count in groups of three digits.
pub(super) fn counted(n: u64) -> String {
    let digits = n.to_string();
    let mut text = String::with_capacity(digits.len() + digits.len() / 3);
    for (i, digit) in digits.char_indices() {
        if i > 0 && (digits.len() - i).is_multiple_of(3) {
            text.push(',');
        }
        text.push(digit);
    }
    text
}

/// A number to four significant digits.
pub(super) fn rounded(x: f64) -> String {
    let four: f64 = format!("{x:.3e}").parse().unwrap_or(x);
    if four != 0.0 && !(1e-4..1e7).contains(&four.abs()) { format!("{four:e}") } else { four.to_string() }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn counts_are_grouped_and_numbers_rounded() {
        assert_eq!([0, 999, 1000, 500_000, 1_234_567].map(counted), ["0", "999", "1,000", "500,000", "1,234,567"]);
        let numbers = [0.0, 0.05, 12.346_789, 2.5e-4, 1.0 / 3.0 * 1e-9, 123_456.0];
        assert_eq!(numbers.map(rounded), ["0", "0.05", "12.35", "0.00025", "3.333e-10", "123500"]);
    }
}
