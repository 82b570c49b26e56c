//! Where the sensors of a rig sit. They bear on records of the rig and on nothing computed of it.

use super::ElementId;
use crate::knobs::{KnobId, KnobSpec, Range};
use crate::units::Dimension;

/// A sensor in the wall of an element.
#[derive(Clone, Debug, PartialEq)]
pub struct Sensor {
    /// Its name, which is that of its channel in a record.
    pub name: String,
    /// The element it sits in.
    pub element: ElementId,
    /// Distance from the inlet of the element along the flow (m).
    pub distance: KnobId,
    /// The passage between the wall and the sensor, where it does not sit flush.
    pub recess: Option<Recess>,
}

/// A recess or a stand-off tube: a narrow passage that ends at the sensor.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Recess {
    /// Length (m).
    pub length: KnobId,
    /// Inner diameter (m).
    pub diameter: KnobId,
    /// Volume before the sensor at its end (m^3).
    pub volume: KnobId,
    /// Temperature of the gas in it (K).
    pub temperature: KnobId,
}

/// What a file may state of a sensor in numbers.
pub const KNOBS: &[KnobSpec] = &[
    KnobSpec {
        key: "distance",
        dimension: Dimension::Length,
        range: Range::NotNegative,
        default: None,
        doc: "distance from the inlet of its element along the flow",
    },
    KnobSpec {
        key: "recess_length",
        dimension: Dimension::Length,
        range: Range::Positive,
        default: None,
        doc: "length of the recess or stand-off tube between wall and sensor",
    },
    KnobSpec {
        key: "recess_diameter",
        dimension: Dimension::Length,
        range: Range::Positive,
        default: None,
        doc: "inner diameter of the recess",
    },
    KnobSpec {
        key: "recess_volume",
        dimension: Dimension::Volume,
        range: Range::NotNegative,
        default: Some(0.0),
        doc: "volume before the sensor at the end of the recess",
    },
    KnobSpec {
        key: "recess_temperature",
        dimension: Dimension::Temperature,
        range: Range::Positive,
        default: None,
        doc: "temperature of the gas in the recess, near that of the wall",
    },
];
