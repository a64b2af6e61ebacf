//! The inert record of a run: the sheet as plain data, and the events it is folded from, in their stored forms.
//! Must not import limits, recipe or run: bounds, certificates and words are copied in by value.
//! Main types: [`sheet::Sheet`], [`event::Event`].

pub mod event;
pub mod finding;
pub mod life;
pub mod light;
pub mod link;
pub mod question;
pub mod reference;
pub mod sheet;
