//! Which pairs of wind and level a study leaves out by rule, and which rule it was.

mod apply;
mod expression;
mod words;

pub use apply::{Interval, RULE_COLUMNS, Rule, RuleKind, exclude};
pub use expression::{Expression, ExpressionError};
