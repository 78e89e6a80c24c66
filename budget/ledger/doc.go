// Package ledger keeps the books: one entry for each part of a run, for good.
//
// A Store holds lines, entries and release marks, and never changes one. What
// is in force is worked out when they are read: an entry of a killed job gives
// way to a longer one of its key, and a correction stands in for what it
// corrects. Three stores keep the same books: a file, a branch of a git
// repository, and PostgreSQL; Open picks one by its URL.
//
// Books is what was read, a value: judging reads it and never the store.
package ledger
