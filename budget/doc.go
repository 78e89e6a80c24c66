// Package budget judges what the runs of a change emit against a policy.
//
// The packages below it are the stages of one pipeline:
//
//  1. records: package record reads what a job run left behind, line by line,
//     and package grid the carbon intensity of zones over time.
//  2. weigh: [Policy.Weigh] makes one pass over a record and prices its energy
//     hour by hour; package footprint gives one part of one run.
//  3. runs: [Policy.Runs] combines parts into runs, each part once.
//  4. rulings: [Policy.Judge] doubts what the policy does not accept, puts head
//     beside base with package compare, and holds each run against the budgets.
//  5. statement: the worst ruling opens or closes the gate. [Statement] is the
//     whole answer; package report writes it for people and for programs.
//
// Quantities are those of package unit. What is wrong with an input is a value
// of package finding, with its place and what to do; nothing stops at it.
//
// Nothing here opens a file or looks at a clock: the gate is a pure function of
// its policy and its [Case].
package budget
