package ledger

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"strconv"
	"strings"
	"unicode/utf8"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// id stands for names of any length in keys and indexes.
type id = [16]byte

// identify hashes names; those of different lists never give one text.
func identify(names ...string) id {
	text, err := json.Marshal(names)
	if err != nil { // texts only
		panic(err)
	}
	sum := sha256.Sum256(text)
	return id(sum[:len(id{})])
}

func (a attempt) id() id { return identify(a.repository, a.run, strconv.Itoa(a.n)) }

func (k Key) id() id { return identify(k.Repository, k.Run, strconv.Itoa(k.Attempt), k.Part) }

func (m *Mark) id() id {
	return identify(m.Repository, m.Tag, m.Commit, m.Branch, m.At.String())
}

// chained is the hash of a line and, through the hash before, of all before it.
func chained(before id, body string) id { return identify(hex.EncodeToString(before[:]), body) }

// groupID is of the account and of the line of its spending.
func (e *Entry) groupID() id {
	g := e.group()
	return identify(e.Repository, e.Account, g.Job, g.Stage, g.Site, g.Zone, g.Machine, string(g.Factor), string(g.Boundary))
}

// longestCell is less than an index of the database takes of one text.
const longestCell = 500

// cell is a text as it stands in an indexed column. One that does not fit
// there, too long or no text to the database, is there by its hash.
func cell(s string) string {
	if len(s) <= longestCell && utf8.ValidString(s) && !strings.ContainsAny(s, "\x00\x01") {
		return s
	}
	sum := sha256.Sum256([]byte(s))
	return "\x01" + hex.EncodeToString(sum[:])
}

func cells(list []string) []string {
	out := make([]string, len(list))
	for n, s := range list {
		out[n] = cell(s)
	}
	return out
}

// encode is a value that consists of texts and figures, as JSON.
func encode(v any) string {
	text, err := json.Marshal(v)
	if err != nil {
		panic(err)
	}
	return string(text)
}

// decimal writes a figure so that the database reads the very same.
func decimal(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }

// bits tell which figures are in doubt, as the database keeps it: 1 the
// emissions, 2 the energy.
func (d doubts) bits() (n int64) {
	if d.mass {
		n |= 1
	}
	if d.energy {
		n |= 2
	}
	return n
}

func doubtsOf(bits int64) doubts { return doubts{bits&1 != 0, bits&2 != 0} }

// dayOf is the day of UTC that holds the hour, counted from 1970.
func dayOf(hour int64) int64 {
	d := hour / 24
	if hour%24 < 0 {
		d--
	}
	return d
}

// amount is what of an entry falls into an hour.
type amount struct {
	hour        int64
	facility    unit.Energy
	operational unit.Mass
	embodied    unit.Mass
}

// figures are the amount's, in the order of the table: the last two count
// where nothing speaks against the entry's energy, or against its emissions.
func (a amount) figures(d doubts) [5]float64 {
	f := [5]float64{float64(a.facility), float64(a.operational), float64(a.embodied)}
	if !d.energy {
		f[3] = float64(a.facility)
	}
	if !d.mass {
		f[4] = float64(a.operational + a.embodied)
	}
	return f
}

// amounts shares an entry out over the hours that it touches. Energy has its
// hours already: none of its spans crosses one.
func (e *Entry) amounts() []amount {
	first, last := e.Start.Hour(), max(e.End, e.Start).Hour()
	list := make([]amount, last-first+1)
	held := footprint.Booked{Run: footprint.Run{Start: e.Start, End: e.End, Embodied: e.Embodied}}
	for n := range list {
		list[n].hour = first + int64(n)
		list[n].embodied = held.Within(unit.HourStart(first+int64(n)), unit.HourStart(first+int64(n)+1)).Embodied
	}
	for _, h := range e.Hours {
		n := h.From.Hour() - first
		if n < 0 || n >= int64(len(list)) { // outside the run: in no window that holds it
			continue
		}
		list[n].facility += h.KWh
		if h.G != nil {
			list[n].operational += *h.G
		}
	}
	return list
}
