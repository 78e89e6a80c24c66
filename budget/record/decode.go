package record

import (
	"fmt"
	"strconv"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/unit"
)

// decode reads a line by the general path. meter and word are returned aside,
// for the reader interns meters and counts unknown words.
func decode(raw []byte, fill func(*Open)) (l Line, meter, word string, wrong *finding.Finding) {
	o := parseObject(raw)
	if o.wrong != nil {
		return l, "", "", o.wrong
	}
	word = o.word("k")
	l.Kind = kindOf(word)
	switch l.Kind {
	case KindOpen:
		l.Open = o.open(fill)
		l.At = l.Open.At
	case KindPower:
		l.At, meter = o.instant("at"), o.word("meter")
		l.Power = unit.Power(o.number("w", "a power in W"))
	case KindEnergy:
		l.At, meter = o.instant("at"), o.word("meter")
		l.Joules = unit.Joules(o.number("j", "a counter's reading in J"))
		if o.has("wrap_j") {
			l.Wrap = unit.Joules(o.number("wrap_j", "the counter's range in J"))
			if l.Wrap == 0 {
				o.fail(`"wrap_j" is 0`, "write the counter's range in J, or leave it out")
			}
		}
	case KindUsed:
		l.Used = o.used()
	case KindWork:
		l.At = o.instant("at")
		l.Work = o.work()
	case KindClose:
		l.At = o.instant("at")
		o.need("outcome", "write one of [ok pilot stopped failed cancelled]")
		l.Close = &Close{choice(o, "outcome", OK, Pilot, Stopped, Failed, Cancelled)}
	}
	return l, meter, word, o.wrong
}

// open reads an open line; fill, which may be nil, fills in what it lacks.
func (o *object) open(fill func(*Open)) *Open {
	o.format()
	op := &Open{
		Run: o.text("run"), Part: o.label("part"), Host: o.text("host"),
		Job: o.word("job"), Stage: o.text("stage"), At: o.instant("at"), Site: o.text("site"),
		Machine: o.text("machine"), Commit: o.text("commit"), Branch: o.text("branch"),
	}
	if o.has("attempt") {
		op.Attempt = o.whole("attempt", 1)
	}
	if o.has("parts") {
		op.Parts = o.whole("parts", 1)
	}
	if o.has("pull") {
		op.Pull = o.whole("pull", 1)
	}
	if fill != nil {
		fill(op)
	}
	if op.Run == "" {
		o.word("run")
	}
	op.Attempt, op.Parts = max(op.Attempt, 1), max(op.Parts, 1)
	if op.Parts > 1 && op.Part == "" {
		o.fail(`"parts" is above 1 but "part" is missing`, "say which part this is")
	}
	if n, err := strconv.Atoi(op.Part); err == nil && n > op.Parts {
		o.fail(fmt.Sprintf("\"part\" is %d of %d", n, op.Parts), "write in parts how many parts there are in all")
	}
	if o.has("reserved") {
		op.Reserved = o.number("reserved", "the number of units of the machine")
		if op.Reserved == 0 {
			o.fail(`"reserved" is 0`, "write the number of units reserved, or leave it out for all")
		}
	}
	op.Labels = o.texts("labels")
	return op
}

func (o *object) format() {
	if !o.need("format", `write "format":1`) {
		return
	}
	raw := o.raw("format")
	if n, err := wholeNumber(raw); err != nil || n != 1 {
		o.fail(`"format" is `+show(raw), "this version reads format 1, so write that or use a newer budgetcheck")
	}
}

func (o *object) used() *Used {
	u := &Used{From: o.instant("from"), To: o.instant("to"), Energy: unit.Energy(o.number("kwh", "an energy in kWh"))}
	o.need("how", "write measured or estimated")
	u.Measured = choice(o, "how", "measured", "estimated") == "measured"
	if u.To <= u.From {
		o.fail(fmt.Sprintf(`"to" (%s) is not after "from" (%s)`, u.To, u.From), "write the span that the total covers")
	}
	return u
}

func (o *object) work() *Work {
	w := &Work{Unit: o.word("unit"), Done: o.number("done", "the work done so far")}
	if o.has("planned") {
		w.Planned = o.number("planned", "the work planned")
	}
	w.OfPart = choice(o, "of", "run", "part") == "part"
	return w
}
