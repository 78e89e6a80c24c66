package report

import (
	"fmt"
	"io"
	"strings"

	"budgetcheck/budget"
	"budgetcheck/budget/unit"
)

// landings is where periods end if runs go on as scheduled.
func landings(list []budget.Landing) table {
	t := table{title: "Landings", head: []string{"account", "per", "spent", "without the change", "expected", "95 % interval", "limit",
		"runs left", "runs out on", "burn ratio", "state"}}
	for _, l := range list {
		if l.LimitE != nil {
			t.rows = append(t.rows, landing(l, l.SpentE, l.WithoutE, l.ExpectedE, l.LowE, l.HighE, l.LimitE))
		} else {
			t.rows = append(t.rows, landing(l, l.Spent, l.Without, l.Expected, l.Low, l.High, l.Limit))
		}
	}
	return t
}

func landing[Q interface {
	~float64
	fmt.Stringer
	Text(int) string
}](l budget.Landing, spent, without, expected, low, high, limit *Q) []cell {
	interval, lands := none, value(expected)
	if low != nil {
		interval = own("%s to %s", *low, *high)
	}
	bound := value(limit)
	if expected != nil {
		e, b := unit.Apart(*expected, *limit)
		lands, bound = own("%s", e), own("%s", b)
	}
	out, burn := none, none
	if l.RunsOutOn != nil {
		out = own("%s", l.RunsOutOn.Time().Format("2006-01-02"))
	}
	if l.BurnRatio != nil {
		burn = own("%.3g", *l.BurnRatio)
	}
	return []cell{foreign(l.Name), per(l.Per, l.Period), value(spent), value(without), lands, interval, bound,
		own("%s", amount(l.RunsLeft)), out, burn, own("%s", l.State)}
}

// per names a period.
func per(kind, period string) cell {
	if period == "" {
		return own("%s", kind)
	}
	return foreign(kind + " " + period)
}

// Forecast writes where the periods of budgets will end.
func Forecast(w io.Writer, f *budget.Forecast) error {
	var b strings.Builder
	fmt.Fprintf(&b, "Landings of branch %s at %s, if runs go on as scheduled\n", Inert(f.Branch), f.Now)
	if len(f.Landings) == 0 {
		fmt.Fprintf(&b, "\nThe policy has no budget over a period for this branch.\n")
	}
	textTable(&b, landings(f.Landings).slim())
	textNotes(&b, landingNotes(f.Landings))
	if f.Job != "" {
		fmt.Fprintf(&b, "\n%s\n", fits(f))
		for _, r := range f.Reasons {
			fmt.Fprintf(&b, "  %s\n", Inert(r))
		}
	}
	fmt.Fprintf(&b, "\nThe burn ratio is the share of the limit spent over the share of the time gone.\n%s\n", Caution)
	_, err := io.WriteString(w, b.String())
	return err
}

func fits(f *budget.Forecast) string {
	switch {
	case f.Fits == nil:
		return fmt.Sprintf("Whether the next run of %s fits is not known.", Inert(f.Job))
	case *f.Fits:
		return fmt.Sprintf("The next run of %s fits.", Inert(f.Job))
	}
	return fmt.Sprintf("The next run of %s does not fit:", Inert(f.Job))
}

// landingNotes are the notes of all landings, each once, with the account that
// they are about.
func landingNotes(list []budget.Landing) (notes []string) {
	told := map[string]bool{}
	for _, l := range list {
		for _, n := range l.Notes {
			if n = fmt.Sprintf("%s, %s: %s", l.Name, l.Period, n); !told[n] {
				told[n] = true
				notes = append(notes, n)
			}
		}
	}
	return notes
}

// ForecastJSON writes the landings for programs.
func ForecastJSON(w io.Writer, f *budget.Forecast) error { return indented(w, f) }
