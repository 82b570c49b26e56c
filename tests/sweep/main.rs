//! Modes followed along a path: against exceptional points known exactly, against dense continuation
//! that shares nothing with the matching, and over the networks that come with the program.

mod events;
mod ground;
mod growth;
mod meetings;
