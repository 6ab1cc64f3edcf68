//! Which number formats show a day or a span of time.

/// What a number is shown as.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Shown {
    Number,
    Date,
    Span,
}

impl Shown {
    /// A format of the list that every workbook has (ECMA-376 part 1, 18.8.30).
    pub(super) fn of_number(number: u16) -> Self {
        match number {
            14..=22 | 27..=36 | 45 | 47 | 50..=58 => Self::Date,
            46 => Self::Span,
            _ => Self::Number,
        }
    }

    /// A format's own code: its first section, quoted and escaped characters left aside.
    pub(super) fn of_code(code: &str) -> Self {
        let mut chars = code.chars();
        while let Some(c) = chars.next() {
            match c {
                ';' => break,
                '\\' | '_' | '*' => drop(chars.next()),
                '"' => drop(chars.by_ref().find(|c| *c == '"')),
                '[' => {
                    let inside: String = chars.by_ref().take_while(|c| *c != ']').collect();
                    let inside = inside.to_ascii_lowercase();
                    let is_elapsed = ['h', 'm', 's']
                        .into_iter()
                        .any(|unit| !inside.is_empty() && inside.chars().all(|c| c == unit));
                    if is_elapsed {
                        return Self::Span;
                    }
                }
                'd' | 'm' | 'h' | 'y' | 's' | 'D' | 'M' | 'H' | 'Y' | 'S' => return Self::Date,
                'g' | 'G' if code.to_ascii_lowercase().starts_with("general") => {
                    return Self::Number;
                }
                _ => {}
            }
        }
        Self::Number
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn codes_of_days_spans_and_numbers() {
        for (code, shown) in [
            ("yyyy-mm-dd hh:mm:ss.000", Shown::Date),
            ("[$-414]d. mmmm yyyy", Shown::Date),
            ("\"day \"d", Shown::Date),
            ("[h]:mm", Shown::Span),
            ("[SS].00", Shown::Span),
            ("0.0000\" mm\"", Shown::Number),
            ("[Red]-0.00\\m", Shown::Number),
            ("General", Shown::Number),
            ("0.00;yyyy", Shown::Number),
            ("#,##0_d", Shown::Number),
        ] {
            assert_eq!(Shown::of_code(code), shown, "{code}");
        }
    }
}
