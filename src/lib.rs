//! Simulation and power planning for adaptive studies.
//!
//! An adaptive study is a loop: look at what has been seen, decide what to collect next, collect
//! it. `windage` runs that loop many times before anyone is enrolled, under every truth that
//! matters, and scores what each method of inference makes of the result.
//!
//! The modules follow the flow of one replay:
//!
//! | module | step |
//! | --- | --- |
//! | [`scenario`] | the file as written: reading, error messages with the source line |
//! | [`plan`] | the scenario as meant: resolved and checked |
//! | [`population`], [`outcome`] | covariates and outcomes of units |
//! | [`rules`] | who is enrolled, and in which arm: they see the past and nothing else |
//! | [`trial`] | the columnar record of one trial |
//! | [`methods`] | estimates, or the reason why there is none |
//! | [`replay`] | streams, one trial, blocks of trials in parallel |
//! | [`score`] | tallies, measures with Monte Carlo errors, verdicts |
//! | [`planning`] | sweeps over scenario values |
//! | [`report`] | tables, result folder, figures |
//! | [`numerics`] | linear algebra kernels and distributions |
#![forbid(unsafe_code)]

pub mod cli;
pub mod methods;
pub mod numerics;
pub mod outcome;
pub mod plan;
pub mod planning;
pub mod population;
pub mod replay;
pub mod report;
pub mod rules;
pub mod scenario;
pub mod score;
pub mod streams;
pub mod trial;
