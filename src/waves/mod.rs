//! Linear wave algebra: the closed set of primitives, the arithmetics they are evaluated in, and
//! the elimination that turns a chain of them into one characteristic function. No physics here.

#[cfg(test)]
mod bounds;
pub mod complex;
pub mod exterior;
pub mod front;
pub mod law;
pub mod primitive;
pub mod tail;
pub mod tape;
