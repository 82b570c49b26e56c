//! stub
use crate::{gas::State, network::Network, numerics::dual::Real, problems::Problems};
/// stub
#[derive(Clone, Debug, PartialEq)]
pub struct MeanFlow<T> {
    /// states
    pub states: Vec<State<T>>,
}
/// stub
pub fn solve<T: Real>(_: &Network<T>) -> Result<MeanFlow<T>, Problems> {
    Err(Problems::new())
}
