package budget_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
)

// FuzzParsePolicy: whatever somebody writes, nothing panics, every finding
// says where, what and what to do, and a policy without findings judges.
func FuzzParsePolicy(f *testing.F) {
	for _, seed := range []string{"", "\xff", "format = 1\n", plain, sample, first, second,
		"format = 1\nbudget = [{name = \"a\", limit = \"1 g per step\", per = \"run\", warn_at = 0.5}]\n",
		"format = 1\n[account]\ndecision = \"guarded\"\nuncertainty.meter = \"2%\"\n[[budget]]\nname = \"n\"\nlimit = \"90 g\"\nper = \"run\"\n",
		"format = 1\n[[job]]\nname = \"j\"\nschedule = \"CRON_TZ=UTC 1 2 * * *\"\n", "format = 1\n[[job]]\nname = \"j\"\nschedule = \"TZ=\"\n",
		"format = 1\n[machine.quad]\nunits = 1e300\nunmetered = \"1 W\"\nembodied = \"1 kg\"\nlifetime = \"1ms\"\n[site.quay-north]\nzone = \"NORTH\"\n",
	} {
		f.Add([]byte(seed), []byte("[evidence]\nmax_age = \"1h\"\n"))
	}
	record := night().text(f)
	set := seriesOf(f, steady)
	f.Fuzz(func(t *testing.T, one, two []byte) {
		p, found := budget.ParsePolicy(budget.PolicyFile{Name: "one.toml", Data: one}, budget.PolicyFile{Name: "two.toml", Data: two})
		for _, x := range found {
			require.Contains(t, []string{"one.toml", "two.toml"}, x.File)
			require.NotEmpty(t, x.What)
			require.NotEmpty(t, x.Do, x.What)
			if x.What != "the policy has no format" { // of no line
				require.Positive(t, x.Line, x.What)
			}
		}
		if len(found) > 0 {
			return
		}
		c := budget.Case{Branch: "main", Now: now, PolicySource: "one.toml and two.toml"}
		c.Head = append(c.Head, weigh(t, p, set, "night.ndjson", record))
		s := p.Judge(c)
		assert.Contains(t, []budget.Gate{budget.Open, budget.Closed}, s.Gate)
		assert.NotEmpty(t, s.Reason)
	})
}
