//! Sky and weather into chance, prominence, timeline and windows.
//!
//! The question runs downhill through the files: [`timeline`] asks for each instant what [`sight`] can be had along the
//! visible arc, [`chance`] walks out along it through each copy of the weather that [`copies`] makes and [`scene`] lays
//! round the observer, [`shade`] tells what of it is lit, and [`windows`] gathers the good steps. [`answer`] is what comes out.

pub mod answer;
pub mod chance;
pub mod copies;
pub mod scene;
pub mod shade;
pub mod sight;
pub mod timeline;
pub mod windows;
