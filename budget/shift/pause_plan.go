package shift

import "math"

// planner finds the least cost by dynamic programming over the work done and
// the slots paused so far. While the run works the pause does not grow, so a
// slice is a stretch of one row of the table, its cost the difference of two
// running sums, and the least cost of all slices that end at a slot needs only
// the best place to have started: every cell is visited once, and the length of
// a slice is no dimension of the table.
type planner struct {
	*board
	least   int       // slots of a slice
	eps     float64   // differences below it are rounding
	idle    []float64 // by work done: least cost with a slice just complete, or complete and the run paused
	open    []float64 // by work done: cost when a slice is about to start, less the row's running sum
	resume  []float64 // by time slot: what a resume costs there
	plain   []float64 // by time slot: its intensity; -1 where it changes or is not known
	marks   []byte    // by pause and work done: how the cell came about
	best    float64
	pause   int // of the best run, in all
	from    int // where its last slice starts
	planned bool
}

// How a cell came about.
const (
	started  byte = 1 << iota // the best slice of the row is now the one that starts least slots before
	complete                  // the slice of the row makes a better cost than a shorter pause
)

// row is one pass over the work with the same pause so far.
type row struct {
	pause int
	sum   float64 // cost of the work so far, but for slots in holes
	low   int     // no slice can have started before this work slot, for a hole came after
	from  int     // where the best slice of finish started; -1 for where the marks say
	b     float64 // the best slice's value in open
}

// plan is the time slot of each work slot in the cheapest run, nil if none is
// possible.
func (b *board) plan() []int {
	n := len(b.energy)
	p := &planner{board: b, best: math.Inf(1), eps: rounding * b.scale(),
		least: max(1, int(min((b.how.MinSlice+b.how.Slot-1)/b.how.Slot, mostCells))),
		idle:  make([]float64, n), open: make([]float64, n), marks: make([]byte, (len(b.time)-n+1)*n)}
	for j := range p.idle {
		p.idle[j] = math.Inf(1)
	}
	for _, t := range b.time {
		p.resume = append(p.resume, float64(b.how.Resume)*t.mean)
		p.plain = append(p.plain, t.plain())
	}
	for pause := 0; pause+n <= len(b.time); pause++ {
		p.finish(p.row(pause))
	}
	return p.slots()
}

// scale is a cost that no plan without resumes exceeds.
func (b *board) scale() (g float64) {
	peak := 0.0
	for i := range b.time {
		peak = max(peak, b.time[i].mean, b.last[i].mean)
	}
	return peak * float64(b.run.Profile.Energy())
}

// row does all work slots but the last. It is the inner loop of a long search:
// its variables are local and its slices cut to one length.
func (p *planner) row(pause int) row {
	n := len(p.energy)
	energy, marks, idle, open := p.energy[:n], p.marks[pause*n:][:n], p.idle[:n], p.open[:n]
	plain, resume, least, eps := p.plain[pause:][:n], p.resume[pause:][:n], p.least, p.eps
	sum, low, best := 0.0, 0, math.Inf(1)
	open[0] = 0 // a later first start is no resume
	for j := 1; j < n; j++ {
		if i := plain[j-1]; i >= 0 {
			sum += energy[j-1] * i
		} else if t := &p.time[pause+j-1]; t.known {
			sum += energy[j-1]*t.first + t.extra(j-1)
		} else {
			low, best = j, math.Inf(1)
		}
		var mark byte
		if from := j - least; from >= low {
			if v := open[from]; v < best-eps {
				best, mark = v, started
			}
		}
		before := idle[j]
		open[j] = before + resume[j] - sum
		if cost := sum + best; cost < before-eps {
			idle[j] = cost
			mark |= complete
		}
		marks[j] = mark
	}
	return row{pause: pause, sum: sum, low: low, from: -1, b: best}
}

// finish does the last work slot; the last slice may be of any length.
func (p *planner) finish(r row) {
	n := len(p.energy)
	last := n - 1
	if i := last + r.pause; !p.last[i].known {
		return
	} else if r.sum += p.cost(last, i); last > 0 {
		p.open[last] += float64(p.how.Resume) * (p.last[i].mean - p.time[i].mean)
	}
	for from := max(r.low, n-p.least); from < n; from++ {
		if v := p.open[from]; v < r.b-p.eps {
			r.b, r.from = v, from
		}
	}
	if cost := r.sum + r.b; cost < p.best*(1-tie)-p.eps {
		p.best, p.pause, p.from, p.planned = cost, r.pause, r.from, true
		if r.from < 0 {
			p.from = p.startOf(r.pause, last)
		}
	}
}

// startOf is where the best slice of a row started that ends with j work done.
func (p *planner) startOf(pause, j int) int {
	marks := p.marks[pause*len(p.energy):]
	for marks[j]&started == 0 {
		j--
	}
	return j - p.least
}

// slots follows the marks from the best run's last slice back to its first.
func (p *planner) slots() []int {
	if !p.planned {
		return nil
	}
	n := len(p.energy)
	slots := make([]int, n)
	for end, from, pause := n, p.from, p.pause; ; from = p.startOf(pause, end) {
		for j := from; j < end; j++ {
			slots[j] = j + pause
		}
		if end = from; end == 0 {
			return slots
		}
		for pause--; p.marks[pause*n+end]&complete == 0; {
			pause--
		}
	}
}
