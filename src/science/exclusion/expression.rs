//! Conditions on the columns of a pair, such as `wind_speed_mean_m_s > 25 or hour_utc >= 22`.
//!
//! Grammar, loosest first: `or`, `and`, `not`, one comparison (`<`, `<=`, `>`, `>=`, `=`, `!=`, `is missing`,
//! `is not missing`), `+ -`, `* /`, a sign, numbers, names of columns, parentheses. A comparison with a missing value is
//! neither true nor false, and stays so under `not`; only what is true excludes.

use super::words::{Kind, Word, words};

/// Why a condition cannot be read.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("at character {at}: {problem}")]
pub struct ExpressionError {
    /// Where, in characters from 1.
    pub at: usize,
    /// What was found and what was expected.
    pub problem: String,
}

/// A condition, read and checked.
#[derive(Debug, Clone, PartialEq)]
pub struct Expression {
    root: Truth,
    names: Vec<usize>,
}

/// Deepest nesting that is read: enough for people, and no stack is exhausted.
const DEEPEST: usize = 50;

#[derive(Debug, Clone, PartialEq)]
enum Truth {
    Or(Box<Truth>, Box<Truth>),
    And(Box<Truth>, Box<Truth>),
    Not(Box<Truth>),
    Compare(Comparison, Number, Number),
    Missing(Number),
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Comparison {
    Less,
    LessOrEqual,
    Greater,
    GreaterOrEqual,
    Equal,
    NotEqual,
}

#[derive(Debug, Clone, PartialEq)]
enum Number {
    Constant(f64),
    /// Index into the names that were known when the condition was read.
    Column(usize),
    Sum(Box<Number>, Box<Number>),
    Difference(Box<Number>, Box<Number>),
    Product(Box<Number>, Box<Number>),
    Ratio(Box<Number>, Box<Number>),
}

/// What a part of a condition is.
enum Part {
    Truth(Truth),
    Number(Number),
}

impl Expression {
    /// Reads a condition on columns of these names.
    ///
    /// # Errors
    /// Where it does not follow the grammar, or names a column that is not there.
    pub fn parse(text: &str, columns: &[&str]) -> Result<Self, ExpressionError> {
        let words = words(text)?;
        let mut parser = Parser { words: &words, next: 0, columns, end: text.chars().count() + 1, depth: 0 };
        let start = parser.at();
        let part = parser.or()?;
        if let Some(word) = parser.peek() {
            let problem = match &word.kind {
                Kind::Sign("<" | "<=" | ">" | ">=" | "=" | "!=") => {
                    "a comparison of three; write `a < b and b < c`".to_owned()
                }
                _ => format!("`{}` is left over; expected `and`, `or` or the end", word.text()),
            };
            return Err(ExpressionError { at: word.at, problem });
        }
        let root = truth(part, start)?;
        let mut names = Vec::new();
        root.columns(&mut names);
        names.sort_unstable();
        names.dedup();
        Ok(Self { root, names })
    }

    /// Indices of the columns it needs, each once, increasing.
    pub fn columns(&self) -> &[usize] {
        &self.names
    }

    /// Whether it is true. `value` gives the value of a column by its index; NaN is missing.
    pub fn holds(&self, value: &dyn Fn(usize) -> f64) -> bool {
        self.root.of(value) == Some(true)
    }
}

impl Truth {
    /// `None`: neither true nor false.
    fn of(&self, value: &dyn Fn(usize) -> f64) -> Option<bool> {
        match self {
            Self::Or(a, b) => match (a.of(value), b.of(value)) {
                (Some(true), _) | (_, Some(true)) => Some(true),
                (Some(false), Some(false)) => Some(false),
                _ => None,
            },
            Self::And(a, b) => match (a.of(value), b.of(value)) {
                (Some(false), _) | (_, Some(false)) => Some(false),
                (Some(true), Some(true)) => Some(true),
                _ => None,
            },
            Self::Not(a) => a.of(value).map(|truth| !truth),
            Self::Compare(how, a, b) => {
                let (a, b) = (a.of(value), b.of(value));
                let order = a.partial_cmp(&b)?;
                Some(match how {
                    Comparison::Less => order.is_lt(),
                    Comparison::LessOrEqual => order.is_le(),
                    Comparison::Greater => order.is_gt(),
                    Comparison::GreaterOrEqual => order.is_ge(),
                    Comparison::Equal => order.is_eq(),
                    Comparison::NotEqual => order.is_ne(),
                })
            }
            Self::Missing(a) => Some(a.of(value).is_nan()),
        }
    }

    fn columns(&self, found: &mut Vec<usize>) {
        match self {
            Self::Or(a, b) | Self::And(a, b) => {
                a.columns(found);
                b.columns(found);
            }
            Self::Not(a) => a.columns(found),
            Self::Compare(_, a, b) => {
                a.columns(found);
                b.columns(found);
            }
            Self::Missing(a) => a.columns(found),
        }
    }
}

impl Number {
    fn of(&self, value: &dyn Fn(usize) -> f64) -> f64 {
        match self {
            Self::Constant(number) => *number,
            Self::Column(index) => value(*index),
            Self::Sum(a, b) => a.of(value) + b.of(value),
            Self::Difference(a, b) => a.of(value) - b.of(value),
            Self::Product(a, b) => a.of(value) * b.of(value),
            Self::Ratio(a, b) => a.of(value) / b.of(value),
        }
    }

    fn columns(&self, found: &mut Vec<usize>) {
        match self {
            Self::Constant(_) => {}
            Self::Column(index) => found.push(*index),
            Self::Sum(a, b) | Self::Difference(a, b) | Self::Product(a, b) | Self::Ratio(a, b) => {
                a.columns(found);
                b.columns(found);
            }
        }
    }
}

struct Parser<'a> {
    words: &'a [Word],
    next: usize,
    columns: &'a [&'a str],
    /// Place after the last character.
    end: usize,
    depth: usize,
}

fn truth(part: Part, at: usize) -> Result<Truth, ExpressionError> {
    match part {
        Part::Truth(truth) => Ok(truth),
        Part::Number(_) => {
            Err(ExpressionError { at, problem: "a number where a condition is expected, such as `x > 3`".to_owned() })
        }
    }
}

fn quantity(part: Part, at: usize) -> Result<Number, ExpressionError> {
    match part {
        Part::Number(number) => Ok(number),
        Part::Truth(_) => {
            Err(ExpressionError { at, problem: "a condition where a number or a column is expected".to_owned() })
        }
    }
}

impl Parser<'_> {
    fn peek(&self) -> Option<&Word> {
        self.words.get(self.next)
    }

    fn at(&self) -> usize {
        self.peek().map_or(self.end, |word| word.at)
    }

    fn take_name(&mut self, name: &str) -> bool {
        let is = matches!(self.peek(), Some(Word { kind: Kind::Name(found), .. }) if found.eq_ignore_ascii_case(name));
        self.next += usize::from(is);
        is
    }

    fn take_sign(&mut self, signs: &[&str]) -> Option<&'static str> {
        match self.peek()?.kind {
            Kind::Sign(sign) if signs.contains(&sign) => {
                self.next += 1;
                Some(sign)
            }
            _ => None,
        }
    }

    fn or(&mut self) -> Result<Part, ExpressionError> {
        let start = self.at();
        let mut left = self.and()?;
        while self.take_name("or") {
            let place = self.at();
            let right = truth(self.and()?, place)?;
            left = Part::Truth(Truth::Or(Box::new(truth(left, start)?), Box::new(right)));
        }
        Ok(left)
    }

    fn and(&mut self) -> Result<Part, ExpressionError> {
        let start = self.at();
        let mut left = self.not()?;
        while self.take_name("and") {
            let place = self.at();
            let right = truth(self.not()?, place)?;
            left = Part::Truth(Truth::And(Box::new(truth(left, start)?), Box::new(right)));
        }
        Ok(left)
    }

    fn not(&mut self) -> Result<Part, ExpressionError> {
        if self.take_name("not") {
            let place = self.at();
            self.deeper()?;
            let inner = truth(self.not()?, place)?;
            self.depth -= 1;
            return Ok(Part::Truth(Truth::Not(Box::new(inner))));
        }
        self.comparison()
    }

    fn comparison(&mut self) -> Result<Part, ExpressionError> {
        let start = self.at();
        let left = self.sum()?;
        if self.take_name("is") {
            let negated = self.take_name("not");
            if !self.take_name("missing") {
                return Err(self.unexpected("`missing` or `not missing`"));
            }
            let missing = Truth::Missing(quantity(left, start)?);
            return Ok(Part::Truth(if negated { Truth::Not(Box::new(missing)) } else { missing }));
        }
        let Some(sign) = self.take_sign(&["<", "<=", ">", ">=", "=", "!="]) else { return Ok(left) };
        let place = self.at();
        let right = quantity(self.sum()?, place)?;
        let how = match sign {
            "<" => Comparison::Less,
            "<=" => Comparison::LessOrEqual,
            ">" => Comparison::Greater,
            ">=" => Comparison::GreaterOrEqual,
            "=" => Comparison::Equal,
            _ => Comparison::NotEqual,
        };
        Ok(Part::Truth(Truth::Compare(how, quantity(left, start)?, right)))
    }

    fn sum(&mut self) -> Result<Part, ExpressionError> {
        let start = self.at();
        let mut left = self.product()?;
        while let Some(sign) = self.take_sign(&["+", "-"]) {
            let place = self.at();
            let right = Box::new(quantity(self.product()?, place)?);
            let first = Box::new(quantity(left, start)?);
            left = Part::Number(if sign == "+" { Number::Sum(first, right) } else { Number::Difference(first, right) });
        }
        Ok(left)
    }

    fn product(&mut self) -> Result<Part, ExpressionError> {
        let start = self.at();
        let mut left = self.sign()?;
        while let Some(sign) = self.take_sign(&["*", "/"]) {
            let place = self.at();
            let right = Box::new(quantity(self.sign()?, place)?);
            let first = Box::new(quantity(left, start)?);
            left = Part::Number(if sign == "*" { Number::Product(first, right) } else { Number::Ratio(first, right) });
        }
        Ok(left)
    }

    fn sign(&mut self) -> Result<Part, ExpressionError> {
        if self.take_sign(&["-"]).is_some() {
            let place = self.at();
            self.deeper()?;
            let inner = quantity(self.sign()?, place)?;
            self.depth -= 1;
            return Ok(Part::Number(Number::Difference(Box::new(Number::Constant(0.0)), Box::new(inner))));
        }
        self.atom()
    }

    fn atom(&mut self) -> Result<Part, ExpressionError> {
        if self.take_sign(&["("]).is_some() {
            self.deeper()?;
            let inner = self.or()?;
            self.depth -= 1;
            if self.take_sign(&[")"]).is_none() {
                return Err(self.unexpected("`)`"));
            }
            return Ok(inner);
        }
        match self.peek().map(|word| word.kind.clone()) {
            Some(Kind::Number(number)) => {
                self.next += 1;
                Ok(Part::Number(Number::Constant(number)))
            }
            Some(Kind::Name(name)) if !["and", "or", "not", "is", "missing"].contains(&name.as_str()) => {
                let Some(index) = self.columns.iter().position(|column| *column == name) else {
                    return Err(self.no_column(&name));
                };
                self.next += 1;
                Ok(Part::Number(Number::Column(index)))
            }
            _ => Err(self.unexpected("a column, a number or `(`")),
        }
    }

    fn no_column(&self, name: &str) -> ExpressionError {
        let problem = format!("there is no column `{name}`; known here: {}", self.columns.join(", "));
        ExpressionError { at: self.at(), problem }
    }

    fn unexpected(&self, expected: &str) -> ExpressionError {
        let found = self.peek().map_or_else(|| "the end".to_owned(), |word| format!("`{}`", word.text()));
        ExpressionError { at: self.at(), problem: format!("found {found}; expected {expected}") }
    }

    fn deeper(&mut self) -> Result<(), ExpressionError> {
        self.depth += 1;
        if self.depth > DEEPEST {
            let problem = format!("nested more than {DEEPEST} deep; expected a simpler condition");
            return Err(ExpressionError { at: self.at(), problem });
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const COLUMNS: [&str; 3] = ["wind", "level_db", "hour_utc"];

    fn holds(text: &str, values: [f64; 3]) -> bool {
        Expression::parse(text, &COLUMNS).unwrap().holds(&|index| values[index])
    }

    #[test]
    fn conditions_bind_as_in_arithmetic_and_logic() {
        assert!(holds("wind > 3 and level_db < 70 or hour_utc = 5", [1.0, 90.0, 5.0]));
        assert!(!holds("wind > 3 and (level_db < 70 or hour_utc = 5)", [1.0, 90.0, 5.0]));
        assert!(holds("not wind > 3", [3.0, 0.0, 0.0]));
        assert!(holds("1 + 2 * 3 = 7 and (1 + 2) * 3 = 9 and 7 - 2 - 1 = 4 and 8 / 2 / 2 = 2", [0.0; 3]));
        assert!(holds("-wind < - 2.5e0", [3.0, 0.0, 0.0]) && holds("wind >= 1e1 or wind!=2", [10.0, 0.0, 0.0]));
        assert!(holds("WIND = 1 or wind = 2".to_lowercase().as_str(), [2.0, 0.0, 0.0]));
        assert_eq!(Expression::parse("hour_utc > wind or wind > 1", &COLUMNS).unwrap().columns(), [0, 2]);
    }

    #[test]
    fn a_missing_value_excludes_nothing_unless_asked_for() {
        let missing = [f64::NAN, 60.0, 0.0];
        assert!(!holds("wind > 3", missing) && !holds("not (wind > 3)", missing) && !holds("wind != 3", missing));
        assert!(holds("wind > 3 or level_db = 60", missing) && !holds("wind > 3 and level_db = 60", missing));
        assert!(holds("wind is missing", missing) && !holds("wind is not missing", missing));
        assert!(holds("not wind > 3 or wind is missing", missing));
    }

    #[test]
    fn errors_say_where_and_what() {
        let error = |text: &str| Expression::parse(text, &COLUMNS).unwrap_err().to_string();
        assert_eq!(error(""), "at character 1: found the end; expected a column, a number or `(`");
        assert_eq!(
            error("wind > 3 and sog < 2"),
            "at character 14: there is no column `sog`; known here: wind, level_db, hour_utc"
        );
        assert_eq!(error("1 < wind < 3"), "at character 10: a comparison of three; write `a < b and b < c`");
        assert_eq!(error("wind"), "at character 1: a number where a condition is expected, such as `x > 3`");
        assert_eq!(error("(wind > 3"), "at character 10: found the end; expected `)`");
        assert_eq!(
            error("wind > 3 level_db"),
            "at character 10: `level_db` is left over; expected `and`, `or` or the end"
        );
        assert_eq!(error("(wind > 3) + 1 > 2"), "at character 1: a condition where a number or a column is expected");
        assert_eq!(error("wind is 3"), "at character 9: found `3`; expected `missing` or `not missing`");
        assert_eq!(error("wind > 1.2.3"), "at character 8: `1.2.3` is no number");
        assert!(error("wind > µ").starts_with("at character 8: `µ` is not understood"));
        assert!(error(&format!("{}wind > 1", "not ".repeat(1000))).contains("nested more than 50 deep"));
        assert!(error(&"(".repeat(100_000)).contains("nested more than 50 deep"));
    }

    proptest::proptest! {
        #[test]
        fn any_text_is_read_or_refused(text in ".{0,60}") {
            let _ = Expression::parse(&text, &COLUMNS);
        }

        #[test]
        fn any_made_of_words_is_read_or_refused(words in proptest::collection::vec(
            proptest::sample::select(vec!["wind", "and", "or", "not", "is", "missing", "(", ")", "<", "=", "1", "+", "-", "*"]),
            0..20,
        )) {
            if let Ok(read) = Expression::parse(&words.join(" "), &COLUMNS) {
                // De Morgan, for whatever was read.
                let text = words.join(" ");
                let twice = Expression::parse(&format!("not (not ({text}))"), &COLUMNS).unwrap();
                for values in [[1.0, 2.0, 3.0], [f64::NAN, 0.0, -1.0]] {
                    proptest::prop_assert_eq!(read.holds(&|i| values[i]), twice.holds(&|i| values[i]));
                }
            }
        }
    }
}
