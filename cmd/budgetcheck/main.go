// Command budgetcheck gates merges on emissions budgets. See README.md.
package main

import (
	"os"
	"time"
	_ "time/tzdata" // accounts have calendars; containers and Windows have none
)

func main() {
	s := streams{out: os.Stdout, err: os.Stderr, clock: time.Now, getenv: os.Getenv}
	os.Exit(run(os.Args[1:], s))
}
