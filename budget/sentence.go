package budget

import (
	"fmt"
	"strings"
)

// Sentence is the most important line: why the gate is as it is. quote makes
// text from records and policies inert where the sentence is going to stand.
func (s *Statement) Sentence(quote func(string) string) string {
	if s.unruled {
		return fmt.Sprintf("no rule of %s applies to branch %s", quote(s.PolicySource), quote(s.Branch))
	}
	if len(s.Rulings) == 0 {
		return "no ruling was due"
	}
	worst := s.Rulings[0]
	if s.adoption && s.Gate == Open {
		return fmt.Sprintf("branch %s has no policy yet; by this change's own, %s", quote(s.Branch), s.sentence(worst, quote))
	}
	return s.sentence(worst, quote)
}

// sentence tells the worst ruling and how the others went.
func (s *Statement) sentence(worst Ruling, quote func(string) string) string {
	n := s.count()
	switch {
	case worst.State != Over && worst.State != Unproven:
		return s.tally(n)
	case s.Gate == Open && !s.adoption:
		return "the policy only warns: " + worst.headline(quote) + s.others(n)
	}
	return worst.headline(quote) + s.others(n)
}

// headline is the ruling in one line.
func (r Ruling) headline(quote func(string) string) string {
	switch {
	case r.State == Over && r.Kind == KindRegression:
		return fmt.Sprintf("%s is over: %s, where %s is allowed", quote(r.Name), quote(or(r.IntervalText, r.ObservedText)), quote(r.LimitText))
	case r.State == Over:
		return fmt.Sprintf("%s is over by %s: %s of %s", quote(r.Name), quote(r.ExcessText), quote(r.ObservedText), quote(r.LimitText))
	case r.Kind == KindEvidence:
		return "unproven: " + quote(r.Reason)
	}
	return fmt.Sprintf("%s is unproven: %s", quote(r.Name), quote(r.Reason))
}

func (s *Statement) count() map[State]int {
	n := map[State]int{}
	for _, r := range s.Rulings {
		n[r.State]++
	}
	return n
}

// others tells how the other rulings went.
func (s *Statement) others(n map[State]int) string {
	if len(s.Rulings) == 1 {
		return ""
	}
	return " (" + s.tally(n) + ")"
}

func (s *Statement) tally(n map[State]int) string {
	var parts []string
	for _, st := range []State{Over, Unproven, Near, Within, Waived} {
		if n[st] > 0 {
			parts = append(parts, fmt.Sprintf("%d %s", n[st], st))
		}
	}
	if len(s.Rulings) == 1 {
		return "the only ruling is " + string(s.Rulings[0].State)
	}
	return fmt.Sprintf("of %d rulings %s", len(s.Rulings), strings.Join(parts, ", "))
}
