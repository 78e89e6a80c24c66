package main

import (
	"errors"
	"fmt"
	"strings"

	"github.com/sethvargo/go-githubactions"
)

// actionInputs are the inputs of action.yml.
type actionInputs struct {
	policy, head, base, grid, job []string
	name                          string
	branch, pull, commit          string
	token, out, ledger            string
	post                          []string
	book, await, enforce          bool
}

// readInputs reads what the runner hands over in the environment.
func readInputs(getenv func(string) string) (in actionInputs, err error) {
	a := githubactions.New(githubactions.WithGetenv(getenv))
	lines := func(name string) (list []string) {
		for line := range strings.Lines(a.GetInput(name)) {
			if line = strings.TrimSpace(line); line != "" {
				list = append(list, line)
			}
		}
		return list
	}
	in.policy, in.head, in.base, in.grid, in.job = lines("policy"), lines("head"), lines("base"), lines("grid"), lines("job")
	in.name, in.out, in.token = a.GetInput("name"), a.GetInput("out"), a.GetInput("token")
	in.branch, in.pull, in.commit = a.GetInput("branch"), a.GetInput("pull"), a.GetInput("commit")
	in.post = strings.FieldsFunc(a.GetInput("post"), func(r rune) bool { return strings.ContainsRune(", \t\r\n", r) })
	in.ledger = a.GetInput("ledger")
	var errBook, errAwait, errEnforce error
	in.book, errBook = truth("book", a.GetInput("book"), false)
	in.await, errAwait = truth("await", a.GetInput("await"), false)
	in.enforce, errEnforce = truth("enforce", a.GetInput("enforce"), true)
	in.complete()
	return in, errors.Join(errBook, errAwait, errEnforce)
}

// truth reads a boolean input.
func truth(name, text string, absent bool) (bool, error) {
	switch strings.ToLower(text) {
	case "true":
		return true, nil
	case "false":
		return false, nil
	case "":
		return absent, nil
	}
	return false, fmt.Errorf("the input %s is %q; write true or false", name, text)
}

// complete fills in what an empty input means.
func (in *actionInputs) complete() {
	if len(in.policy) == 0 {
		in.policy = []string{policyName}
	}
	if in.out == "" {
		in.out = "budgetcheck-statement"
	}
}
