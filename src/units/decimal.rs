//! Decimal numbers as text, kept exact until the one rounding to a double.

/// The text of a decimal number without its exponent, and the power of ten that multiplies it.
#[derive(Clone, Copy, Debug)]
pub(super) struct Written<'a> {
    /// Sign, digits and point: `-0.25`.
    pub digits: &'a str,
    /// Power of ten.
    pub exponent: i32,
}

/// `mantissa * 10^exponent`, exactly.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Decimal {
    mantissa: i128,
    exponent: i32,
}

/// Exponents beyond this are beyond any double whatever the digits of a text of sane length.
const FAR: i64 = 1_000_000;

impl<'a> Written<'a> {
    /// Splits the longest decimal number off the front of `text`; `None` where there is none.
    pub fn split(text: &'a str) -> Option<(Written<'a>, &'a str)> {
        let bytes = text.as_bytes();
        let digits_from = |from: usize| {
            bytes
                .iter()
                .skip(from)
                .take_while(|b| b.is_ascii_digit())
                .count()
        };
        let sign = usize::from(matches!(bytes.first(), Some(b'+' | b'-')));
        let whole = digits_from(sign);
        let mut end = sign + whole;
        let mut fraction = 0;
        if bytes.get(end) == Some(&b'.') {
            fraction = digits_from(end + 1);
            if whole + fraction > 0 {
                end += 1 + fraction;
            }
        }
        if whole + fraction == 0 {
            return None;
        }
        let digits = text.get(..end)?;
        let mut exponent = 0;
        if matches!(bytes.get(end), Some(b'e' | b'E')) {
            let signed = usize::from(matches!(bytes.get(end + 1), Some(b'+' | b'-')));
            let count = digits_from(end + 1 + signed);
            if count > 0 {
                let stop = end + 1 + signed + count;
                let negative = bytes.get(end + 1) == Some(&b'-');
                // A failure to parse is an overflow: the text is a sign and digits.
                let far = if negative { -FAR } else { FAR };
                let power: i64 = text.get(end + 1..stop)?.parse().unwrap_or(far);
                exponent = i32::try_from(power.clamp(-FAR, FAR)).unwrap_or_default();
                end = stop;
            }
        }
        Some((Written { digits, exponent }, text.get(end..)?))
    }

    /// The double nearest to the number times `10^shift`.
    pub fn scaled(self, shift: i32) -> f64 {
        // The text is a valid literal, which the standard library rounds correctly.
        format!("{}e{}", self.digits, self.exponent + shift)
            .parse()
            .unwrap_or(f64::NAN)
    }

    /// Whether every digit is zero.
    pub fn is_zero(self) -> bool {
        self.digits
            .bytes()
            .all(|b| !b.is_ascii_digit() || b == b'0')
    }

    /// The number exactly, where its digits fit.
    pub fn exact(self) -> Option<Decimal> {
        let places = self
            .digits
            .split_once('.')
            .map_or(0, |(_, fraction)| fraction.len());
        let mantissa = self.digits.replace('.', "").parse().ok()?;
        Some(Decimal {
            mantissa,
            exponent: self.exponent - i32::try_from(places).ok()?,
        })
    }
}

impl Decimal {
    /// The sum with `mantissa * 10^exponent`, where it fits.
    pub fn plus(self, mantissa: i128, exponent: i32) -> Option<Decimal> {
        let common = self.exponent.min(exponent);
        let raise = |m: i128, e: i32| {
            let power = 10i128.checked_pow(u32::try_from(e - common).ok()?)?;
            m.checked_mul(power)
        };
        let sum = raise(self.mantissa, self.exponent)?.checked_add(raise(mantissa, exponent)?)?;
        Some(Decimal {
            mantissa: sum,
            exponent: common,
        })
    }

    /// The product with a whole number, where it fits.
    pub fn times(self, factor: i128) -> Option<Decimal> {
        Some(Decimal {
            mantissa: self.mantissa.checked_mul(factor)?,
            ..self
        })
    }

    /// The double nearest to the number times `10^shift`.
    pub fn scaled(self, shift: i32) -> f64 {
        format!("{}e{}", self.mantissa, self.exponent + shift)
            .parse()
            .unwrap_or(f64::NAN)
    }
}
