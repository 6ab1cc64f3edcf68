//! Random-effects analysis of variance for gauge studies.
//!
//! Model: readings `y = mu + sum of random effects + error`, one effect for every [`Term`] that the
//! [`Design`] (factors, crossed or nested) implies. From it follow degrees of freedom, sums of squares,
//! expected mean squares, F tests, variance components and confidence limits; nothing is written out
//! per design.
//!
//! Not here: files, clocks, network, chance without a seed, who measured what (labels stay with the caller).
//!
//! Invariant: a number is finite or absent; an absent one says why.
