package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"budgetcheck/budget"
	"budgetcheck/budget/inputs"
	"budgetcheck/report"
	"budgetcheck/report/github"
)

// patience is for reading from the code host, and again for posting to it, so
// that a long judgement takes nothing from it. When the host stays down the gate
// still exits by its ruling.
const patience = 3 * time.Minute

// action is the step of action.yml: it judges what the event asks for, posts
// the statement, and exits by the verdict.
func action(args []string, s streams) (int, error) {
	if len(args) > 0 {
		return 0, fmt.Errorf("unexpected argument %q; everything comes from the environment of action.yml", args[0])
	}
	a := &actionRun{s: s, runner: github.NewRunner(s.out, s.getenv)}
	a.s.out, a.s.err = &a.messages, &a.messages // shown when the runner cannot take them for commands
	status, err := a.run()
	if outputs := a.runner.Outputs(a.outputs()); outputs != nil {
		err = errors.Join(err, outputs)
	}
	return status, err
}

// actionRun is one run of the action.
type actionRun struct {
	in       actionInputs
	s        streams
	messages strings.Builder
	runner   *github.Runner
	host     *github.Host
	subject  github.Subject
	posting  github.Posting
}

// run judges and posts. What cannot be judged is posted too, as unknown.
func (a *actionRun) run() (int, error) {
	if err := a.read(); err != nil {
		return 0, err
	}
	statement, err := a.judge()
	if errors.Is(err, github.ErrNoPull) {
		return exitDone, a.runner.Log("Nothing to judge", err.Error())
	}
	if err == nil {
		err = a.write(statement)
	}
	if err != nil {
		a.posting.Trouble = err.Error()
	}
	return a.status(), errors.Join(err, a.tell(), a.post())
}

// read takes the inputs. The token is masked before anything else is done.
func (a *actionRun) read() (err error) {
	if err := a.runner.Mask(a.s.getenv("INPUT_TOKEN")); err != nil {
		return err
	}
	if a.in, err = readInputs(a.s.getenv); err != nil {
		return err
	}
	a.posting = github.Posting{Name: a.in.name, ReportOnly: !a.in.enforce, Runner: a.runner}
	if a.posting.Places, err = github.ParsePlaces(a.in.post...); err != nil {
		return err
	}
	a.host, err = github.NewHost(github.FromEnvironment(a.s.getenv, a.in.token))
	return err
}

// judge finds out what is to be judged, and judges it.
func (a *actionRun) judge() (*budget.Statement, error) {
	ctx, cancel := context.WithTimeout(context.Background(), patience)
	defer cancel()
	var err error
	if a.subject, err = a.readSubject(ctx); err != nil {
		return nil, err
	}
	a.posting.Pull, a.posting.Commit = a.subject.CommentOn(), a.subject.Head
	a.posting.Name = a.subject.Called(a.in.name)
	repo := inputs.Either{}
	if clone, err := inputs.OpenGit(ctx, "."); err == nil {
		repo = append(repo, clone)
	}
	repo = append(repo, a.host.Repository())
	now, err := (&options{now: a.s.getenv("BUDGETCHECK_NOW")}).clock(a.s.clock)
	if err != nil {
		return nil, err
	}
	c := &change{subject: a.subject, repo: repo, in: a.in, now: now, s: a.s}
	a.posting.Line = c.line
	return c.judge(ctx)
}

// readSubject reads the event, and asks the host for what it leaves open.
func (a *actionRun) readSubject(ctx context.Context) (github.Subject, error) {
	getenv := a.s.getenv
	payload, err := os.ReadFile(getenv("GITHUB_EVENT_PATH"))
	if err != nil {
		return github.Subject{}, fmt.Errorf("the event cannot be read (%w); the command action runs only as a step of action.yml", err)
	}
	subject, err := github.ReadEvent(github.Environment{Event: getenv("GITHUB_EVENT_NAME"), Payload: payload,
		Repository: getenv("GITHUB_REPOSITORY"), SHA: getenv("GITHUB_SHA"), Ref: getenv("GITHUB_REF")})
	if err != nil {
		return github.Subject{}, err
	}
	if subject, err = subject.With(a.in.branch, a.in.pull, a.in.commit); err != nil {
		return github.Subject{}, err
	}
	a.posting.Commit = subject.Head // what cannot be completed is posted there as unknown
	return a.host.Complete(ctx, subject)
}

// write puts the statement into files, and makes it ready to be posted.
func (a *actionRun) write(s *budget.Statement) error {
	if err := writeForms(a.in.out, s); err != nil {
		return fmt.Errorf("the statement cannot be written: %w", err)
	}
	var text strings.Builder
	if err := report.Markdown(&text, s); err != nil {
		return err
	}
	a.posting.Statement, a.posting.Markdown = s, text.String()
	a.posting.Await = a.in.await && s.Awaits()
	return nil
}

// tell shows findings and the statement in the log.
func (a *actionRun) tell() error {
	if a.messages.Len() > 0 {
		if err := a.runner.Log("Findings in records and series", a.messages.String()); err != nil {
			return err
		}
	}
	if a.posting.Statement == nil {
		return nil
	}
	var text strings.Builder
	if err := report.Text(&text, a.posting.Statement); err != nil {
		return err
	}
	return a.runner.Log("Statement", text.String())
}

// post posts the statement and tells what could not be posted. None of it
// changes the verdict.
func (a *actionRun) post() error {
	ctx, cancel := context.WithTimeout(context.Background(), patience)
	defer cancel()
	if !a.subject.MayWrite() {
		a.posting.Places = slices.DeleteFunc(a.posting.Places, func(p github.Place) bool { return p != github.Summary })
		if err := a.runner.Log("Nothing is posted", "The pull request comes from a fork, whose token only reads. The workflow_run after it posts."); err != nil {
			return err
		}
	}
	host, err := github.NewHost(github.FromEnvironment(a.s.getenv, a.in.token)) // with all its patience
	if err != nil {
		return err
	}
	notices := host.Post(ctx, a.posting)
	return errors.Join(a.runner.Tell(notices), a.runner.Annotate(a.posting))
}

// outputs are what later steps see.
func (a *actionRun) outputs() github.Outputs {
	s := a.posting.Statement
	if s == nil {
		return github.OutputsOf(nil, "", "")
	}
	out := github.OutputsOf(s, filepath.Join(a.in.out, "statement.md"), filepath.Join(a.in.out, "statement.json"))
	if a.posting.Await {
		out.Gate = "unknown"
	}
	return out
}

// status is the exit status that the verdict comes to.
func (a *actionRun) status() int {
	s := a.posting.Statement
	if s != nil && s.Gate == budget.Closed && a.in.enforce && !a.posting.Await {
		return exitFinding
	}
	return exitDone
}
