package budget

import (
	"fmt"
	"maps"
	"path"
	"slices"
	"strings"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/inputs"
)

// Commits are the commits that a judgement turns on, by their files.
type Commits struct {
	Head inputs.Tree // of the head commit
	Base inputs.Tree // of the merge base; nil where there is none to compare with
	// Named are the commits that records name, by their id, as far as the
	// repository has them. It may include the head commit.
	Named map[string]inputs.Tree
}

// standing tells which runs stand for the head commit, and which jobs a change
// does not touch. A run stands for every commit with the same inputs.
type standing struct {
	policy  *Policy
	commits *Commits // nil where no repository is at hand
	head    string   // id of the head commit
	hashes  map[hashKey]string
}

type hashKey struct {
	job    *Job
	commit string
}

// The names under which the two trees are cached; no commit id is so short.
const (
	atHead = "head"
	atBase = "base"
)

func newStanding(p *Policy, c *Case) *standing {
	return &standing{policy: p, commits: c.Commits, head: c.HeadCommit, hashes: map[hashKey]string{}}
}

// inputs is the hash over the job's files in a tree: those that its paths
// match, by default all but the policy and the series. It is empty where the
// paths match nothing: such a hash would be the same in every commit, and a
// misspelt path would ask for no run ever.
func (s *standing) inputs(j *Job, name string, t inputs.Tree) string {
	k := hashKey{j, name}
	if _, ok := s.hashes[k]; !ok {
		switch {
		case len(j.Paths) == 0:
			s.hashes[k] = t.Hash(nil, s.policy.OwnFiles())
		case len(t.Match(j.Paths...)) > 0:
			s.hashes[k] = t.Hash(j.Paths, nil)
		default:
			s.hashes[k] = ""
		}
	}
	return s.hashes[k]
}

// OwnFiles are globs of the policy and its series in the repository.
func (p *Policy) OwnFiles() (globs []string) {
	for _, f := range p.Files {
		globs = append(globs, inputs.Literal(path.Join(p.Prefix, f)))
	}
	return append(globs, p.SeriesGlobs()...)
}

// SeriesGlobs are the globs of the policy's series, from the root of the
// repository.
func (p *Policy) SeriesGlobs() (globs []string) {
	dir := inputs.Literal(path.Dir(path.Join(p.Prefix, p.SeriesFrom())))
	for _, g := range p.Grid.Series {
		globs = append(globs, path.Join(dir, g))
	}
	return globs
}

// SeriesFrom is the policy file that names the series: their globs are relative
// to its folder.
func (p *Policy) SeriesFrom() string {
	file, _ := p.Grid.of("series")
	return file
}

// unchanged tells whether the job's inputs are those of the merge base. Then
// nothing is asked of it.
func (s *standing) unchanged(j *Job) bool {
	if s.commits == nil || s.commits.Base == nil || j == nil {
		return false
	}
	now := s.inputs(j, atHead, s.commits.Head)
	return now != "" && now == s.inputs(j, atBase, s.commits.Base)
}

// headInputs is the hash of the job's inputs at the head commit; "" where it is
// not known.
func (s *standing) headInputs(j *Job) string {
	if s.commits == nil {
		return ""
	}
	return s.inputs(j, atHead, s.commits.Head)
}

// alike are the head commit, and those of the known commits that have a job's
// inputs in common with it.
func (s *standing) alike() (commits []string) {
	commits = []string{s.head}
	if s.commits == nil {
		return commits
	}
	for _, id := range slices.Sorted(maps.Keys(s.commits.Named)) {
		for _, j := range s.policy.Jobs {
			if head := s.headInputs(j); id != s.head && head != "" && head == s.inputs(j, id, s.commits.Named[id]) {
				commits = append(commits, id)
				break
			}
		}
	}
	return commits
}

// boundPart tells whether a booked part stands for the head commit.
func (s *standing) boundPart(p *footprint.Part, j *Job) bool {
	return s.bound(s.only(p, j), j)
}

// ofBase tells whether a booked part has the merge base's inputs.
func (s *standing) ofBase(p *footprint.Part, j *Job) bool {
	if s.commits == nil || s.commits.Base == nil || j == nil {
		return false
	}
	base := s.inputs(j, atBase, s.commits.Base)
	return base != "" && s.only(p, j).Inputs == base
}

// only is as much of the part's run as its inputs take.
func (s *standing) only(p *footprint.Part, j *Job) *footprint.Run {
	r := &footprint.Run{Pieces: []*footprint.Part{p}}
	r.Inputs = s.of(r, j)
	return r
}

// of is the hash of a run's inputs; "" where its commit is not known.
func (s *standing) of(r *footprint.Run, j *Job) string {
	commit := r.Commit()
	switch {
	case s.commits == nil || j == nil || commit == "":
		return ""
	case commit == s.head:
		return s.inputs(j, atHead, s.commits.Head)
	}
	t, ok := s.commits.Named[commit]
	if !ok {
		return r.Booked()
	}
	return s.inputs(j, commit, t)
}

// bound tells whether the run stands for the head commit: by its inputs, or,
// where they cannot be compared, because it ran on that very commit.
func (s *standing) bound(r *footprint.Run, j *Job) bool {
	if s.commits == nil || s.inputs(j, atHead, s.commits.Head) == "" {
		return s.head != "" && r.Commit() == s.head
	}
	return r.Inputs == s.inputs(j, atHead, s.commits.Head)
}

// examine doubts head runs that do not stand for the head commit.
func (s *standing) examine(r *footprint.Run, j *Job) {
	if s.head == "" || j == nil {
		return
	}
	switch commit := r.Commit(); {
	case s.bound(r, j):
	case commit == "":
		r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("run %s does not say with one voice on which commit it ran; write commit on the open line", r.Run)})
	case s.commits == nil:
		r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("run %s ran on commit %s, not the head commit, and there is no repository at hand to compare their inputs", r.Run, commit)})
	case !inputs.FullID(commit):
		r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("run %s names its commit %s; only a full id always means the same commit", r.Run, commit)})
	case s.inputs(j, atHead, s.commits.Head) == "":
		r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("run %s ran on commit %s, not the head commit, of which no file matches the paths of job %s", r.Run, commit, j.Name)})
	case r.Inputs == "":
		r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("run %s ran on commit %s, which is not in the repository", r.Run, commit)})
	default:
		r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("run %s ran on commit %s, where the inputs of job %s are not those of the head commit; run it again", r.Run, commit, j.Name)})
	}
}

// noteBase says which base runs do not have the merge base's inputs.
func (s *standing) noteBase(base []*footprint.Run) (notes []string) {
	if s.commits == nil || s.commits.Base == nil {
		return nil
	}
	var others []string
	for _, r := range base {
		j := s.policy.job(r.Job, r.Stage)
		if j != nil && r.Inputs != s.inputs(j, atBase, s.commits.Base) {
			others = append(others, r.Run)
		}
	}
	if len(others) == 0 {
		return nil
	}
	return []string{fmt.Sprintf("base runs with other inputs than the merge base fill the base up: %s", strings.Join(others, ", "))}
}

// touched are the head runs of which something is asked, and notes on those
// of which nothing is.
func (s *standing) touched(head []*footprint.Run) (kept []*footprint.Run, notes []string) {
	kept = slices.DeleteFunc(slices.Clone(head), func(r *footprint.Run) bool {
		unchanged := s.unchanged(s.policy.job(r.Job, r.Stage))
		if unchanged {
			notes = append(notes, fmt.Sprintf("the inputs of job %s are unchanged: run %s is not judged", r.Job, r.Run))
		}
		return unchanged
	})
	return kept, notes
}
