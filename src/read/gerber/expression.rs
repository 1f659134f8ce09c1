//! Arithmetic in aperture macros: numbers, `$n`, `+ - x /`, brackets.

use super::number::decimal;
use std::collections::BTreeMap;

/// Deepest nesting of brackets and signs.
const DEEPEST: u32 = 50;

/// A parsed expression.
#[derive(Clone, Debug, PartialEq)]
pub enum Expression {
    /// A number.
    Number(f64),
    /// `$n`.
    Variable(u32),
    /// A negated expression.
    Negative(Box<Expression>),
    /// Two expressions joined by `+`, `-`, `x` or `/`.
    Pair(Box<Expression>, u8, Box<Expression>),
}

impl Expression {
    /// Parses `text`; an error is a sentence.
    pub fn parse(text: &str) -> Result<Self, String> {
        let bytes: Vec<u8> = text.bytes().filter(|b| !b.is_ascii_whitespace()).collect();
        let mut parser = Parser { bytes: &bytes, at: 0, depth: 0 };
        let found = parser.sum().filter(|_| parser.at == bytes.len());
        found.ok_or_else(|| format!("`{}` must be a number or an expression", super::words::excerpt(text)))
    }

    /// Its value; variables that were never set are zero, as the format says.
    pub fn value(&self, variables: &BTreeMap<u32, f64>) -> f64 {
        match self {
            Self::Number(value) => *value,
            Self::Variable(index) => variables.get(index).copied().unwrap_or(0.0),
            Self::Negative(inner) => -inner.value(variables),
            Self::Pair(a, operator, b) => {
                let (a, b) = (a.value(variables), b.value(variables));
                match operator {
                    b'+' => a + b,
                    b'-' => a - b,
                    b'/' => a / b,
                    _ => a * b,
                }
            }
        }
    }
}

struct Parser<'a> {
    bytes: &'a [u8],
    at: usize,
    depth: u32,
}

impl Parser<'_> {
    fn peek(&self) -> Option<u8> {
        self.bytes.get(self.at).copied()
    }

    fn sum(&mut self) -> Option<Expression> {
        let mut left = self.product()?;
        while let Some(operator @ (b'+' | b'-')) = self.peek() {
            self.at += 1;
            left = Expression::Pair(Box::new(left), operator, Box::new(self.product()?));
        }
        Some(left)
    }

    fn product(&mut self) -> Option<Expression> {
        let mut left = self.factor()?;
        while let Some(operator @ (b'x' | b'X' | b'/')) = self.peek() {
            self.at += 1;
            left = Expression::Pair(Box::new(left), operator, Box::new(self.factor()?));
        }
        Some(left)
    }

    fn factor(&mut self) -> Option<Expression> {
        self.depth += 1;
        if self.depth > DEEPEST {
            return None;
        }
        let factor = match self.peek()? {
            b'+' => {
                self.at += 1;
                self.factor()
            }
            b'-' => {
                self.at += 1;
                self.factor().map(|inner| Expression::Negative(Box::new(inner)))
            }
            b'(' => {
                self.at += 1;
                let inner = self.sum()?;
                (self.peek()? == b')').then(|| self.at += 1)?;
                Some(inner)
            }
            b'$' => {
                self.at += 1;
                self.digits(|b| b.is_ascii_digit())?.parse().ok().map(Expression::Variable)
            }
            _ => decimal(&self.digits(|b| b.is_ascii_digit() || b == b'.')?).map(Expression::Number),
        };
        self.depth -= 1;
        factor
    }

    fn digits(&mut self, keep: impl Fn(u8) -> bool) -> Option<String> {
        let start = self.at;
        while self.peek().is_some_and(&keep) {
            self.at += 1;
        }
        String::from_utf8(self.bytes[start..self.at].to_vec()).ok().filter(|text| !text.is_empty())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn operators_bind_as_in_arithmetic() {
        let variables = BTreeMap::from([(1, 2.0), (2, 0.5)]);
        for (text, value) in
            [("1+2x3", 7.0), ("$1-$2-1", 0.5), ("-$1X(1.5+.5)/4", -1.0), ("+3", 3.0), ("$9", 0.0)]
        {
            assert_eq!(Expression::parse(text).unwrap().value(&variables), value, "{text}");
        }
        for bad in ["", "1+", "(1", "1)", "$", "a", "1 2 3 $", "1e3"] {
            assert!(Expression::parse(bad).is_err(), "{bad}");
        }
        assert!(Expression::parse(&"(".repeat(100_000)).is_err());
        assert!(Expression::parse(&"-".repeat(100_000)).is_err());
    }
}
