//! What can be wrong with a recipe.

/// Why a recipe was refused.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum Error {
    /// The text is not JSON, has an unknown key, or a value of the wrong type.
    #[error("recipe, line {line}, column {column}: {message}")]
    Syntax {
        /// Line in the text, from 1.
        line: usize,
        /// Column in the line, from 1.
        column: usize,
        /// What the parser found and what it expected.
        message: String,
    },
    /// A value lies outside its range.
    #[error("recipe, {field}: found {found}, expected {expected}")]
    Value {
        /// Path of the field, such as `channels[0].orders[2].order`.
        field: String,
        /// The value found.
        found: String,
        /// The range allowed, with its unit.
        expected: String,
    },
}
