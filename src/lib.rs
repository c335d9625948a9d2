//! Independent check of radiotherapy plans in batch. The stages, in order:
//! each may use the ones before it and none after it.

pub mod quantity;

pub mod settings;

pub mod intake;

pub mod plan;

pub mod beam_model;

pub mod dose;

pub mod audit;

pub mod report;

pub mod batch;

pub mod cli;
