package report

import (
	"reflect"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// hostile are texts that a record or a policy may carry to make a statement
// say or do something else.
func hostile() []string {
	return []string{
		"::set-output name=gate::open", "  ::error::x", "##[set-output name=gate]open", "%0A::warning::x", "@everyone", "@quay/lead, look",
		"</details>", "</summary></details><h1>open</h1>", "<script>alert(1)</script>", "<img src=x onerror=y>", "<!-- ", "-->", "<![CDATA[", "<?php",
		"`", "``", "```", "````", strings.Repeat("`", 80) + "@everyone", strings.Repeat("`", 81) + " <b>", "a`b``c```d", "`@everyone`", "` | `", "```\n@everyone\n```", "~~~", "|", "||", `\|`, `a\|b`, `\\|`, "| x | y |", `\`, `x\`,
		"a\nb", "a\r\n\r\n# head", "\n- item", "\n\n---\n\n", "\u2028- item", "a\u200b@everyone", "\u202eneppo", "\u2066x\u2069", "\ufeff::debug::x",
		"https://x.example", "http://x.example/?a=b&c=d", "www.x.example", "ftp://x.example", "a@b.example", "mailto:a@b.example", "xmpp:a@b.example",
		"#123", "GH-123", "quay/tide#5", "5f3c1b7a94d2f36881ce4b05a7d9e2f0316c8d47", "quay/tide@5f3c1b7a94d2f36881ce4b05a7d9e2f0316c8d47",
		strings.Repeat("tide ", 20_000), strings.Repeat("`", 3_000), strings.Repeat("|", 3_000), " leading", "trailing ", "   ", "&lt;b&gt;", "&#64;everyone", "&copy;",
		"[x](y)", "![x](y)", "[x]: y", "[^1]", "[ ] task", "- [x] task", "1. item", "# head", "> quote", "**bold**", "_it_", "~~gone~~", "<https://x.example>",
		"+ 1 run  at 0 g", "! over", "diff", "-", ":---:", "$x$", "$$x$$", ":tada:", "\x00", "\x1b[31mred\x1b[0m", "\xff\xfe", "\u0301", "]]>", "'\"", "\uffff", "\u0085",
	}
}

// filled is a statement with the text in every field that can carry what a
// record, a policy or the caller wrote, whatever fields there will be.
func filled(t *testing.T, text string) *budget.Statement {
	t.Helper()
	s := closed.judge(t)
	s.Notes = []string{"x"}
	s.Edits = []budget.Edit{{Table: "x", Key: "x", From: "x", To: "x"}}
	preview := *s
	preview.Rulings = append([]budget.Ruling{}, s.Rulings...)
	preview.Rulings[0].State, preview.Preview = budget.Near, nil
	s.Preview = &preview
	for _, r := range s.Runs {
		r.Notes = append(r.Notes, "x")
	}
	n := fill(reflect.ValueOf(s).Elem(), text)
	require.Greater(t, n, 100)
	return s
}

// ours are the fields with words of our own or with figures that we printed
// from numbers. Texts of quantities stay: a unit in them comes from the policy.
var ours = map[string]bool{"Per": true, "Side": true}

func fill(v reflect.Value, text string) (n int) {
	switch v.Kind() {
	case reflect.Pointer:
		if !v.IsNil() {
			n = fill(v.Elem(), text)
		}
	case reflect.Slice:
		for i := range v.Len() {
			n += fill(v.Index(i), text)
		}
	case reflect.Struct:
		for i := range v.NumField() {
			if f := v.Type().Field(i); f.IsExported() && !ours[f.Name] && f.Name != "Pieces" && f.Name != "Doubts" {
				n += fill(v.Field(i), text)
			}
		}
	case reflect.String:
		if v.Type() == reflect.TypeFor[string]() { // others are words of a list
			v.SetString(text)
			n = 1
		}
	}
	return n
}

// hostileRun is one that weigh prints.
func hostileRun(text string) *footprint.Run {
	at, one, rate := unit.Instant(0), unit.Energy(1), 0.5
	return &footprint.Run{Run: text, Job: text, Stage: text, Site: text, Zone: text, Machine: text, Host: text, Attempt: 2, Start: at, End: at + 1,
		Outcome: record.OK, Facility: &one, Work: &record.Work{Unit: text, Done: 1}, Rate: &rate, Notes: []string{text},
		Doubts: []footprint.Doubt{{Reason: text}}}
}
