//! From charge to what the user's detector measured; one small file for each unit.

mod radiant_exposure;

pub use radiant_exposure::Photodetector;
