package main

import (
	"encoding/json"
	"fmt"
	"os"
	"regexp"
	"strconv"
	"strings"

	"budgetcheck/budget/record"
)

// surroundings is what the place where a job runs tells of it: the flags, else
// BUDGETCHECK_* variables, else those of CI hosts and schedulers.
type surroundings struct {
	o      *options
	getenv func(string) string
}

// The variables that tell each thing, best first. What CI hosts and schedulers
// set is from their documentation, from memory.
var (
	runVariables = []string{"BUDGETCHECK_RUN", "GITHUB_RUN_ID", "CI_PIPELINE_ID", "BUILDKITE_BUILD_ID", "CIRCLE_WORKFLOW_ID", "BUILD_TAG",
		"SLURM_ARRAY_JOB_ID", "SLURM_JOB_ID", "PBS_JOBID", "LSB_JOBID", "AWS_BATCH_JOB_ID"}
	attemptVariables = []string{"BUDGETCHECK_ATTEMPT", "GITHUB_RUN_ATTEMPT", "AWS_BATCH_JOB_ATTEMPT"}
	partVariables    = []string{"BUDGETCHECK_PART", "SLURM_NODEID", "GROUP_RANK", "OMPI_COMM_WORLD_RANK", "AWS_BATCH_JOB_NODE_INDEX", "JOB_COMPLETION_INDEX"}
	partsVariables   = []string{"BUDGETCHECK_PARTS", "SLURM_JOB_NUM_NODES", "GROUP_WORLD_SIZE", "OMPI_COMM_WORLD_SIZE", "AWS_BATCH_JOB_NUM_NODES"}
	commitVariables  = []string{"BUDGETCHECK_COMMIT", "GITHUB_SHA", "CI_COMMIT_SHA", "BUILDKITE_COMMIT", "CIRCLE_SHA1", "GIT_COMMIT"}
	branchVariables  = []string{"BUDGETCHECK_BRANCH", "CI_COMMIT_BRANCH", "BUILDKITE_BRANCH", "CIRCLE_BRANCH", "BRANCH_NAME"}
	pullVariables    = []string{"BUDGETCHECK_PULL", "CI_MERGE_REQUEST_IID", "BUILDKITE_PULL_REQUEST", "CHANGE_ID"}
	repoVariables    = []string{"BUDGETCHECK_REPOSITORY", "GITHUB_REPOSITORY", "CI_PROJECT_PATH"}
)

// first is the flag, or the first variable that says something.
func (s surroundings) first(flag string, variables []string) string {
	if flag != "" {
		return flag
	}
	for _, name := range variables {
		if v := s.getenv(name); v != "" && v != "false" {
			return v
		}
	}
	return ""
}

// ledger is the URL of the books; "" where none is named.
func (s surroundings) ledger() string { return s.first(s.o.ledger, []string{"BUDGETCHECK_LEDGER"}) }

// repository names this repository in a ledger that several share.
func (s surroundings) repository() string { return s.first(s.o.repo, repoVariables) }

// pull is the number of the pull request that the job runs for, 0 if none.
func (s surroundings) pull() (int, error) {
	if s.o.pull > 0 {
		return s.o.pull, nil
	}
	text := s.first("", pullVariables)
	if m := pullRef.FindStringSubmatch(s.getenv("GITHUB_REF")); text == "" && m != nil {
		text = m[1]
	}
	if text == "" {
		return 0, nil
	}
	n, err := strconv.Atoi(text)
	if err != nil || n < 1 {
		return 0, fmt.Errorf("the pull request is said to be %q by the environment; set -pull to its number", text)
	}
	return n, nil
}

var pullRef = regexp.MustCompile(`^refs/pull/(\d+)/`)

// branch is the branch that the job runs on, "" if it is not told.
func (s surroundings) branch() string {
	if b := s.first(s.o.branch, branchVariables); b != "" {
		return b
	}
	if b, ok := strings.CutPrefix(s.getenv("GITHUB_REF"), "refs/heads/"); ok {
		return b
	}
	return ""
}

// commit is the commit that the job runs on. Of a pull request it is the head,
// not the test merge that the host checks out.
func (s surroundings) commit() string {
	if s.o.commit == "" && s.getenv("BUDGETCHECK_COMMIT") == "" {
		if head := s.pullHead(); head != "" {
			return head
		}
	}
	return s.first(s.o.commit, commitVariables)
}

// pullHead is the head commit that the event of a pull request names.
func (s surroundings) pullHead() string {
	text, err := os.ReadFile(s.getenv("GITHUB_EVENT_PATH"))
	if err != nil {
		return ""
	}
	var event struct {
		PullRequest struct {
			Head struct{ SHA string } `json:"head"`
		} `json:"pull_request"`
	}
	if json.Unmarshal(text, &event) != nil { // somebody else's file
		return ""
	}
	return event.PullRequest.Head.SHA
}

// whole is a whole number from a flag or variables; 0 where nothing tells it.
func (s surroundings) whole(what, flag string, variables []string, least int) (int, error) {
	text := s.first(flag, variables)
	if text == "" {
		return 0, nil
	}
	n, err := strconv.Atoi(text)
	if err != nil || n < least {
		return 0, fmt.Errorf("the %s is %q; write a whole number from %d up", what, text, least)
	}
	return n, nil
}

// fill gives what completes an open line. The run of a CI host or a scheduler
// may have several jobs; each is a run of its own here.
func (s surroundings) fill() (func(*record.Open), error) {
	attempt, err := s.whole("attempt", s.o.attempt, attemptVariables, 1)
	if err != nil {
		return nil, err
	}
	parts, err := s.whole("number of parts", s.o.parts, partsVariables, 1)
	if err != nil {
		return nil, err
	}
	pull, err := s.pull()
	if err != nil {
		return nil, err
	}
	return func(o *record.Open) {
		if o.Run == "" {
			if o.Run = s.o.run; o.Run == "" {
				o.Run = joined(s.first("", runVariables), o.Job, o.Stage)
			}
			complete(&o.Attempt, attempt)
			complete(&o.Parts, parts)
			if o.Part == "" && o.Parts > 1 {
				o.Part = s.first(s.o.part, partVariables)
			}
		}
		complete(&o.Commit, s.commit())
		complete(&o.Branch, s.branch())
		complete(&o.Pull, pull)
	}, nil
}

// joined makes the name of a run from what tells it apart.
func joined(run, job, stage string) string {
	if run == "" {
		return ""
	}
	name := run + "/" + job
	if stage != "" {
		name += "/" + stage
	}
	return name
}

// complete sets what is not set yet.
func complete[T comparable](to *T, value T) {
	var unset T
	if *to == unset {
		*to = value
	}
}
