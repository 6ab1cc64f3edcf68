//! Whole exports in, runs and what was set aside out.

#[cfg(test)]
mod books;
#[cfg(test)]
mod damage;
#[cfg(test)]
mod dresses;
#[cfg(test)]
mod fixtures;
#[cfg(test)]
mod mistaken;
#[cfg(test)]
mod qif;
#[cfg(test)]
mod refusals;
#[cfg(test)]
mod runs;
#[cfg(test)]
mod shared;
#[cfg(test)]
mod texts;
#[cfg(test)]
mod workbooks;
