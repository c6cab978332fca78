//! Graphs of known chromatic number, and their text in the DIMACS `.col` format.
