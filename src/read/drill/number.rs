//! Coordinates of drill files: explicit points, or digits under a zero rule.

/// Which zeros of a coordinate without a point are written.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Zeros {
    /// Leading zeros are kept, trailing ones left out (`LZ`).
    LeadingKept,
    /// Trailing zeros are kept, leading ones left out (`TZ`).
    TrailingKept,
}

/// How the coordinates of a file are written.
#[derive(Clone, Copy, Debug, Default)]
pub struct Notation {
    /// Length of the unit in metres, where stated.
    pub unit_m: Option<f64>,
    /// Zero rule, where stated.
    pub zeros: Option<Zeros>,
    /// Digits before and after the point, where stated.
    pub digits: Option<(usize, usize)>,
}

impl Notation {
    /// A coordinate in metres, on whole nanometres; an error is a sentence.
    pub fn coordinate(&self, text: &str) -> Result<f64, String> {
        let unit_m = self.unit_m.ok_or("coordinates need the unit (`METRIC` or `INCH`) before them")?;
        let body = text.strip_prefix(['+', '-']).unwrap_or(text);
        let wrong = || format!("coordinate `{}` must be a number", crate::read::gerber::excerpt(text));
        let n_points = body.bytes().filter(|&b| b == b'.').count();
        let n_digits = body.bytes().filter(u8::is_ascii_digit).count();
        if n_digits == 0 || n_points > 1 || n_digits + n_points != body.len() || n_digits > 15 {
            return Err(wrong());
        }
        let value: f64 = if n_points == 1 {
            body.parse().map_err(|_| wrong())?
        } else {
            let (before, after) = self.digits.unwrap_or(if unit_m < 2e-3 { (3, 3) } else { (2, 4) });
            let digits: f64 = body.parse().map_err(|_| wrong())?;
            if n_digits > before + after {
                return Err(format!("coordinate `{text}` must have at most {} digits", before + after));
            }
            let missing = match self.zeros {
                Some(Zeros::TrailingKept) => 0,
                Some(Zeros::LeadingKept) => before + after - n_digits,
                None if n_digits == before + after => 0,
                None => {
                    return Err(format!(
                        "coordinate `{text}` has no decimal point, and the file states no zero rule (`LZ` or `TZ`)"
                    ));
                }
            };
            digits * 10f64.powi(missing as i32 - after as i32)
        };
        let nm = (value * unit_m * 1e9).round();
        if nm > 1e9 {
            return Err(format!("coordinate `{text}` must lie within 1 m of the origin"));
        }
        Ok(if text.starts_with('-') { -nm / 1e9 } else { nm / 1e9 })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn zero_rules_decide_what_digits_mean() {
        let metric = Notation { unit_m: Some(1e-3), ..Notation::default() };
        let leading = Notation { zeros: Some(Zeros::LeadingKept), ..metric };
        let trailing = Notation { zeros: Some(Zeros::TrailingKept), ..metric };
        assert_eq!(leading.coordinate("0105"), Ok(10_500_000.0 / 1e9));
        assert_eq!(trailing.coordinate("10500"), Ok(10_500_000.0 / 1e9));
        assert_eq!(metric.coordinate("-010500"), Ok(-10_500_000.0 / 1e9));
        assert_eq!(trailing.coordinate("+.5"), Ok(500_000.0 / 1e9));
        assert!(metric.coordinate("10500").is_err());
        let wide = Notation { digits: Some((4, 4)), ..trailing };
        assert_eq!(wide.coordinate("105000"), Ok(10_500_000.0 / 1e9));
        let inch = Notation { unit_m: Some(25.4e-3), zeros: Some(Zeros::TrailingKept), digits: None };
        assert_eq!(inch.coordinate("10000"), Ok(25_400_000.0 / 1e9));
        for bad in ["", ".", "1.2.3", "1e3", "--1", "12345678", "9999.0"] {
            assert!(trailing.coordinate(bad).is_err(), "{bad}");
        }
        assert!(Notation::default().coordinate("1.0").is_err());
    }
}
