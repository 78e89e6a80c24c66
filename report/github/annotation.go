package github

import (
	"cmp"
	"crypto/sha256"
	"encoding/json"
	"fmt"

	"github.com/google/go-github/v60/github"

	"budgetcheck/budget"
	"budgetcheck/report"
)

// levels are how loud a state is as an annotation of a check. Other states say
// nothing there.
var levels = map[budget.State]string{budget.Over: "failure", budget.Unproven: "warning", budget.Near: "notice"}

// annotations are the remarks on the lines of the policy in the head commit. A
// posted check that waits has none: they could not be taken away again.
func (p Posting) annotations() (list []*github.CheckRunAnnotation) {
	if p.Statement == nil || p.Await || p.Line == nil {
		return nil
	}
	for _, r := range p.Statement.Rulings {
		level := levels[r.State]
		path, line := p.Line(r)
		if level == "" || path == "" {
			continue
		}
		line = max(line, 1)
		list = append(list, &github.CheckRunAnnotation{Path: &path, StartLine: &line, EndLine: &line, AnnotationLevel: &level,
			Title: github.String(clipped(subjectOf(r), mostTitle)), Message: github.String(clipped(told(r), mostMessage/4))})
	}
	return list
}

// subjectOf says what a ruling is about, in plain text.
func subjectOf(r budget.Ruling) string {
	text := report.Inert(r.Name)
	if r.Job != "" {
		text += ", job " + report.Inert(r.Job)
	}
	return text
}

// told is a ruling in a line of plain text.
func told(r budget.Ruling) string {
	text := string(r.State)
	if seen := cmp.Or(r.IntervalText, r.ObservedText); seen != "" {
		text += ", observed " + report.Inert(seen)
	}
	if r.LimitText != "" {
		text += ", limit " + report.Inert(r.LimitText)
	}
	if r.Reason != "" {
		text += ": " + report.Inert(r.Reason)
	}
	return text
}

// digest tells lists of annotations apart.
func digest(list []*github.CheckRunAnnotation) string {
	text, err := json.Marshal(list)
	if err != nil {
		panic(err) // texts and numbers
	}
	return fmt.Sprintf("%d.%.6x", len(list), sha256.Sum256(text))
}
