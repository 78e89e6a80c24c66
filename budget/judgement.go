package budget

import (
	"fmt"
	"slices"
	"strings"

	"budgetcheck/budget/footprint"
)

// judgement is the state of judging one case.
type judgement struct {
	policy     *Policy
	c          *Case
	s          *Statement
	standing   *standing
	head, base []*footprint.Run // head runs of which something is asked
	stray      []*footprint.Part
	pasts      map[pastKey]pastRuns
}

func (j *judgement) rule(r Ruling) { j.s.Rulings = append(j.s.Rulings, r) }

// evidence rules on what was given: files, required jobs, runs.
func (j *judgement) evidence() {
	place := j.policy.Evidence.Place
	unproven := func(job, reason string, missing bool, at Place) {
		j.rule(Ruling{Kind: KindEvidence, Name: "evidence", Branch: j.c.Branch, Job: job, State: Unproven, Reason: reason, Missing: missing, PolicyLine: at.Line, PolicyFile: at.File})
	}
	for _, f := range j.c.Unread {
		unproven("", f.String(), false, place)
	}
	for _, part := range j.stray {
		unproven("", fmt.Sprintf("%s belongs to no run: %s", part.File, part.Findings.First()), false, place)
	}
	for _, job := range j.policy.Jobs {
		switch {
		case j.standing.unchanged(job):
			j.rule(Ruling{Kind: KindEvidence, Name: "evidence", Branch: j.c.Branch, Job: job.Name, State: Within, Reason: unchanged, PolicyLine: job.Line, PolicyFile: job.File})
		case j.asked(job) && !j.satisfied(job):
			reason, missing := j.missing(job)
			unproven(job.Name, reason, missing, job.Place)
		}
	}
	if len(j.head) == 0 && len(j.s.Rulings) == 0 {
		unproven("", "there is no head run to judge", true, place)
	}
	for _, job := range j.jobsSeen() {
		j.rule(j.jobEvidence(job))
	}
}

// asked tells whether a run of the job has to be there. Of a past change it is
// not known which jobs it left alone.
func (j *judgement) asked(job *Job) bool { return job.Required && !j.c.Past }

// unchanged is the reason of rulings on jobs whose inputs are the merge base's.
const unchanged = "inputs unchanged"

func (j *judgement) satisfied(job *Job) bool {
	return slices.ContainsFunc(j.head, func(r *footprint.Run) bool { return job.covers(r) && r.Outcome.Evidence() })
}

// covers tells whether the run is one of the job.
func (j *Job) covers(r *footprint.Run) bool {
	return j.Name == r.Job && (j.Stage == "" || j.Stage == r.Stage)
}

// missing says why a required job is not satisfied, and whether a record that
// is still to come may be all that it lacks.
func (j *judgement) missing(job *Job) (reason string, missing bool) {
	for _, r := range j.head {
		if job.covers(r) {
			return fmt.Sprintf("job %s is required, and the outcome of its run %s is %s", job.Name, r.Run, r.Outcome), false
		}
	}
	return fmt.Sprintf("job %s is required, and there is no head run of it", job.Name), true
}

// jobsSeen are the jobs of the head runs, in order of start.
func (j *judgement) jobsSeen() (jobs []string) {
	for _, r := range j.head {
		if !slices.Contains(jobs, r.Job) {
			jobs = append(jobs, r.Job)
		}
	}
	return jobs
}

// jobEvidence sums up the doubts about one job's head runs.
func (j *judgement) jobEvidence(job string) Ruling {
	place := j.policy.Evidence.Place
	r := Ruling{Kind: KindEvidence, Name: "evidence", Branch: j.c.Branch, Job: job, State: Within, PolicyLine: place.Line, PolicyFile: place.File}
	var doubts []footprint.Doubt
	for _, run := range j.head {
		if run.Job == job {
			doubts = append(doubts, run.Doubts...)
		}
	}
	if len(doubts) == 0 {
		return r
	}
	r.State, r.Missing = Unproven, onlyMissing(doubts)
	var reasons []string
	for _, d := range doubts {
		if !slices.Contains(reasons, d.Reason) {
			reasons = append(reasons, d.Reason)
		}
	}
	r.Reason = strings.Join(reasons, "; ")
	if d := doubts[0]; d.Unit != "" && believable(&d.Observed) && believable(&d.Limit) {
		r.Observed, r.Limit, r.Unit = &d.Observed, &d.Limit, d.Unit
	}
	return r
}

// remarks says what the reader must know beside the rulings.
func (j *judgement) remarks() {
	j.expired()
	if j.policy.Evidence.SameInputs && j.c.HeadCommit == "" {
		j.s.note("whether head runs stand for the head commit (same_inputs) is not judged: no commit is given")
	}
}
