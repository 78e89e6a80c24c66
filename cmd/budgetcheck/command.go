package main

import (
	"errors"
	"flag"
	"fmt"
	"io"
	"runtime/debug"
	"strings"
	"time"

	"budgetcheck/report"
)

// The exit statuses of every command.
const (
	exitDone    = 0 // done, gate open
	exitFinding = 1 // a finding, gate closed
	exitCannot  = 2 // bad usage, unreadable policy
)

// streams are what a command talks to. Output goes to out, messages to err.
type streams struct {
	out, err io.Writer
	clock    func() time.Time
	getenv   func(string) string
}

// command is one thing that budgetcheck does. It returns the exit status; an
// error is told to the user and means exitCannot.
type command struct {
	name, does string
	run        func(args []string, s streams) (int, error)
}

func commands() []command {
	return []command{
		{"gate", "judge head runs against the policy and write the statement", gate},
		{"weigh", "weigh records, without any rule", weigh},
		{"book", "enter runs, releases and late prices into the ledger", book},
		{"forecast", "tell where the periods of budgets will end", forecast},
		{"replay", "judge the past changes in the ledger by a policy", replay},
		{"vet", "check policy, records and series", vet},
		{"init", "write a starter policy and workflow", initialise},
		{"action", "be the step of action.yml", action},
		{"version", "print the version", version},
	}
}

// run picks the command. It is main without the process.
func run(args []string, s streams) int {
	if len(args) == 0 {
		usage(s.err)
		return exitCannot
	}
	switch args[0] {
	case "help", "-h", "-help", "--help":
		usage(s.out)
		return exitDone
	}
	for _, c := range commands() {
		if c.name == args[0] {
			return c.status(args[1:], s)
		}
	}
	fmt.Fprintf(s.err, "budgetcheck: there is no command %q; see budgetcheck help\n", args[0])
	return exitCannot
}

// status runs the command and tells the user what stopped it.
func (c command) status(args []string, s streams) int {
	status, err := c.run(args, s)
	switch {
	case errors.Is(err, flag.ErrHelp):
		return exitDone
	case err != nil:
		tell(s.err, strings.Split(fmt.Sprintf("budgetcheck %s: %v", c.name, err), "\n")...)
		return exitCannot
	}
	return status
}

// tell writes messages. What policies, records and file names say is in them.
func tell(w io.Writer, lines ...string) {
	for _, line := range lines {
		fmt.Fprintln(w, report.Inert(line))
	}
}

func usage(w io.Writer) {
	fmt.Fprint(w, "budgetcheck gates merges on emissions budgets.\n\nusage: budgetcheck COMMAND [FLAGS]\n\n")
	for _, c := range commands() {
		fmt.Fprintf(w, "  %-8s %s\n", c.name, c.does)
	}
	fmt.Fprint(w, "\nbudgetcheck COMMAND -h lists its flags. Exit status: 0 done, gate open; 1 a finding, gate closed; 2 could not.\n")
}

func version(args []string, s streams) (int, error) {
	var o options
	if err := o.parse("version", args, s); err != nil {
		return 0, err
	}
	if err := o.noRest(); err != nil {
		return 0, err
	}
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return 0, errors.New("the binary carries no build information; build it with go build")
	}
	_, err := fmt.Fprintf(s.out, "budgetcheck %s, %s\n", info.Main.Version, info.GoVersion)
	return exitDone, err
}

// list is a flag that may be repeated.
type list []string

func (l *list) String() string { return strings.Join(*l, ", ") }

// Set adds a value.
func (l *list) Set(text string) error {
	if text == "" {
		return errors.New("it is empty")
	}
	*l = append(*l, text)
	return nil
}
