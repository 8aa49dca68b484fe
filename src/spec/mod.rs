//! Takes TOML text; gives a checked [`Spec`].
//!
//! [`TABLES`] is the one list of what a spec may hold. [`parse`] walks the text by it and collects
//! every problem with its place; the JSON Schema and the reference in `docs/spec.md` are written
//! from it. What only the data can tell is left to `design`.

mod cross;
mod fault;
mod fields;
mod keys;
mod predictor;
mod prior;
mod read;
mod reference;
mod schema;
mod sections;
mod study;
mod tables;
mod told;
mod values;
mod words;

pub use fault::{
    AnswerFault, EarlierFault, Encoding, JointFault, KeyHint, MergeFault, RangeFault, SpecError, SpecFault,
};
pub use keys::{Bounds, Choice, DefaultValue, End, KeyInfo, Kind, LeftOut, NotYet, TableInfo, Times};
pub use read::{MOST_BYTES, parse, read};
pub use reference::{EXAMPLE, reference_markdown};
pub use schema::json_schema;
pub use study::*;
pub use tables::{TABLES, TABLES_NOT_YET};
pub use values::NARROWEST;
