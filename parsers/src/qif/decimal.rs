//! Decimal numbers as the standard writes them, kept exact: limits are sums of them.
//!
//! Not here: NaN and infinities, which are no decimals, and numbers of more than 37 digits.

/// Digits that `i128` holds.
const DIGITS_MAX: usize = 37;

/// `digits` × 10^`power`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Decimal {
    digits: i128,
    power: i32,
}

impl Decimal {
    /// An `xs:decimal` (`5.` and `.5` too), or one with an exponent.
    pub(super) fn read(text: &str) -> Option<Self> {
        let text = text.trim();
        let (mantissa, exponent) = text.split_once(['e', 'E']).unwrap_or((text, "0"));
        let unsigned = mantissa.strip_prefix(['+', '-']).unwrap_or(mantissa);
        let (whole, fraction) = unsigned.split_once('.').unwrap_or((unsigned, ""));
        let fraction = fraction.trim_end_matches('0');
        let all = format!("{whole}{fraction}");
        if !(unsigned.bytes().any(|b| b.is_ascii_digit())
            && all.bytes().all(|b| b.is_ascii_digit())
            && all.len() <= DIGITS_MAX)
        {
            return None;
        }
        let power: i32 = exponent.parse().ok()?;
        let digits: i128 = match all.as_str() {
            "" => 0,
            all => all.parse().ok()?,
        };
        let read = Self {
            digits: if mantissa.starts_with('-') {
                -digits
            } else {
                digits
            },
            power: power.checked_sub(i32::try_from(fraction.len()).ok()?)?,
        };
        let value = read.value();
        (value.is_finite() && (value == 0.0) == (digits == 0)).then_some(read)
    }

    /// The number nearest to it.
    pub(super) fn value(self) -> f64 {
        format!("{}e{}", self.digits, self.power)
            .parse()
            .unwrap_or(f64::NAN)
    }

    pub(super) fn is_positive(self) -> bool {
        self.digits > 0
    }

    pub(super) fn negative(self) -> Self {
        Self {
            digits: -self.digits,
            ..self
        }
    }

    /// `None` beyond 37 digits.
    pub(super) fn half(self) -> Option<Self> {
        Some(Self {
            digits: self.digits.checked_mul(5)?,
            power: self.power.checked_sub(1)?,
        })
    }

    /// `None` beyond 37 digits.
    pub(super) fn plus(self, other: Self) -> Option<Self> {
        let power = self.power.min(other.power);
        let digits = |of: Self| scale(of.digits, of.power.checked_sub(power)?);
        Some(Self {
            digits: digits(self)?.checked_add(digits(other)?)?,
            power,
        })
    }

    /// It × `over` ÷ `under`, exact where that is a decimal, else to 30 digits.
    pub(super) fn times(self, over: Self, under: Self) -> Option<Self> {
        let above = self.digits.checked_mul(over.digits)?;
        let mut power = self
            .power
            .checked_add(over.power)?
            .checked_sub(under.power)?;
        let (mut digits, mut rest) = (above / under.digits, above % under.digits);
        while rest != 0 && digits.unsigned_abs() < 10_u128.pow(30) {
            rest = rest.checked_mul(10)?;
            digits = digits.checked_mul(10)?.checked_add(rest / under.digits)?;
            rest %= under.digits;
            power = power.checked_sub(1)?;
        }
        let product = Self { digits, power };
        product.value().is_finite().then_some(product)
    }
}

fn scale(digits: i128, power: i32) -> Option<i128> {
    digits.checked_mul(10_i128.checked_pow(u32::try_from(power).ok()?)?)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn of(text: &str) -> Decimal {
        Decimal::read(text).unwrap()
    }

    /// Expected values are Rust literals: the compiler's own correctly rounded reading.
    #[test]
    fn texts_that_are_decimals() {
        for (text, value) in [
            ("12.0020", 12.002),
            ("+3", 3.0),
            ("-.5", -0.5),
            ("5.", 5.0),
            (" 007 ", 7.0),
            ("0.000", 0.0),
            ("1.5e-3", 0.0015),
        ] {
            assert_eq!(of(text).value(), value, "{text}");
        }
        for text in [
            "", ".", "-", "+-5", "1,5", "NaN", "INF", "1e999", "1e-999", "0x1", "1 2", "e5",
        ] {
            assert_eq!(Decimal::read(text), None, "{text}");
        }
        assert_eq!(Decimal::read(&"1".repeat(38)), None);
    }

    #[test]
    fn sums_and_halves_are_exact() {
        assert_eq!(of("1.1").plus(of("2.2")).unwrap().value(), 3.3);
        assert_eq!(of("0.3").plus(of("0.05").negative()).unwrap().value(), 0.25);
        assert_eq!(of("0.05").half().unwrap().value(), 0.025);
        assert_eq!(of("1e30").plus(of("1e-30")), None);
    }

    #[test]
    fn fractions_end_or_are_long_enough() {
        assert_eq!(
            of("0.0005")
                .times(of("0.0254"), of("0.001"))
                .unwrap()
                .value(),
            0.0127
        );
        assert_eq!(of("1").times(of("1"), of("3")).unwrap().value(), 1.0 / 3.0);
        assert_eq!(
            of("-1").times(of("1"), of("3")).unwrap().value(),
            -1.0 / 3.0
        );
        assert_eq!(of("0").times(of("1"), of("3")).unwrap().value(), 0.0);
    }
}
