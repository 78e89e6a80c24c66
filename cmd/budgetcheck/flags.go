package main

import (
	"errors"
	"flag"
	"fmt"
	"os"
	"strings"
	"time"

	"budgetcheck/budget/unit"
)

// policyName is the policy that is read where none is named.
const policyName = "budgetcheck.toml"

// options are the flags that commands share by name.
type options struct {
	policy, head, base, grid, job list
	beside                        list
	branch                        string
	pull                          int
	commit, baseCommit            string
	now                           string
	out                           string
	json                          bool

	ledger, repo              string
	run, attempt, part, parts string
	release, correct          string
	book, settle, enforce     bool

	rest []string // arguments after the flags
}

// parse reads the flags of one command: those that the command names.
func (o *options) parse(name string, args []string, s streams, flags ...string) error {
	set := flag.NewFlagSet("budgetcheck "+name, flag.ContinueOnError)
	var usage strings.Builder
	set.SetOutput(&usage)
	o.define(set, flags)
	err := set.Parse(args)
	o.rest = set.Args()
	switch {
	case errors.Is(err, flag.ErrHelp):
		fmt.Fprint(s.out, usage.String())
		return err
	case err != nil:
		return fmt.Errorf("%w; see budgetcheck %s -h", err, name)
	case o.pull < 0:
		return fmt.Errorf("-pull is %d; write the number of the pull request", o.pull)
	}
	return o.noLateFlag()
}

// noLateFlag refuses a flag after an argument: the flag package stops at the
// first argument, and the rest would pass for names of files.
func (o *options) noLateFlag() error {
	for _, arg := range o.rest {
		if _, err := os.Stat(arg); strings.HasPrefix(arg, "-") && err != nil {
			return fmt.Errorf("%s stands after %s; write flags first", arg, o.rest[0])
		}
	}
	return nil
}

func (o *options) define(set *flag.FlagSet, flags []string) {
	lists := map[string]struct {
		to   *list
		does string
	}{
		"policy": {&o.policy, "policy `file` (default " + policyName + "); may be repeated, tables add up"},
		"beside": {&o.beside, "policy `file` to try beside -policy; may be repeated"},
		"head":   {&o.head, "`glob` of the records to judge; may be repeated"},
		"base":   {&o.base, "`glob` of the records to compare with; may be repeated"},
		"job":    {&o.job, "`glob` of the jobs to judge (default: all); may be repeated"},
		"grid":   {&o.grid, "`glob` of series files, besides those of the policy; may be repeated"},
	}
	texts := map[string]struct {
		to   *string
		does string
	}{
		"branch":      {&o.branch, "`name` of the branch; with -pull the target branch"},
		"commit":      {&o.commit, "`id` of the head commit, in the clone that the working folder is in; head runs must stand for it"},
		"base-commit": {&o.baseCommit, "`id` of the commit to merge into; jobs whose inputs are those of the merge base are not asked for runs"},
		"now":         {&o.now, "RFC 3339 `time` to judge at, for repeatable output (default: the clock)"},
		"out":         {&o.out, "`folder` to write to"},
		"ledger":      {&o.ledger, "`URL` of the books: file:PATH, git:BRANCH, git:REMOTE#BRANCH or postgres://... (default: BUDGETCHECK_LEDGER)"},
		"repo":        {&o.repo, "`name` of this repository in books that several share (default: what the CI host tells)"},
		"run":         {&o.run, "`name` of the run, for records that do not tell it (default: what CI host or scheduler tell; so for attempt, part, parts)"},
		"attempt":     {&o.attempt, "`number` of the attempt, for records that do not tell it"},
		"part":        {&o.part, "`name` of the part, for records that do not tell it"},
		"parts":       {&o.parts, "`number` of parts in all, for records that do not tell it"},
		"release":     {&o.release, "`tag` of a release to enter: it ends one account of -branch and opens the next"},
		"correct":     {&o.correct, "`reason`: runs that are booked with other content are entered as corrections"},
	}
	switches := map[string]struct {
		to   *bool
		does string
	}{
		"json":    {&o.json, "write JSON to standard output"},
		"book":    {&o.book, "book the head runs first, whatever the verdict"},
		"settle":  {&o.settle, "price again what was booked before its series arrived"},
		"enforce": {&o.enforce, "exit 1 if the next run of -job does not fit"},
	}
	for _, f := range flags {
		switch {
		case lists[f].to != nil:
			set.Var(lists[f].to, f, lists[f].does)
		case texts[f].to != nil:
			set.StringVar(texts[f].to, f, "", texts[f].does)
		case f == "pull":
			set.IntVar(&o.pull, f, 0, "`number` of the pull request")
		case switches[f].to != nil:
			set.BoolVar(switches[f].to, f, false, switches[f].does)
		}
	}
}

// noRest refuses arguments that no flag took.
func (o *options) noRest() error {
	if len(o.rest) > 0 {
		return fmt.Errorf("unexpected argument %q; only flags are expected, and globs in quotation marks, so that the shell leaves them alone", o.rest[0])
	}
	return nil
}

// clock is the moment to judge at.
func (o *options) clock(now func() time.Time) (unit.Instant, error) {
	if o.now == "" {
		return unit.At(now().Truncate(time.Second)), nil
	}
	at, err := unit.ParseInstant(o.now)
	if err != nil {
		return 0, fmt.Errorf("-now: %w", err)
	}
	return at, nil
}
