package footprint

import (
	"cmp"
	"maps"
	"math"
	"slices"

	"budgetcheck/budget/unit"
)

// Declared are relative standard uncertainties (k = 1) of the inputs; nil
// where none is declared.
type Declared struct {
	Meter, Share, PUE, Intensity, Embodied *unit.Share
}

// InputKind is what sort of quantity an input is.
type InputKind string

// The kinds of input, named as in the policy.
const (
	InputMeter     InputKind = "meter"
	InputShare     InputKind = "share"
	InputPUE       InputKind = "pue"
	InputIntensity InputKind = "intensity"
	InputEmbodied  InputKind = "embodied"
)

func (d Declared) of(k InputKind) *unit.Share {
	return map[InputKind]*unit.Share{InputMeter: d.Meter, InputShare: d.Share, InputPUE: d.PUE,
		InputIntensity: d.Intensity, InputEmbodied: d.Embodied}[k]
}

// none tells whether nothing at all is declared.
func (d Declared) none() bool { return d == Declared{} }

// Input is one quantity whose error is shared by everything that uses it: the
// intensity of a zone, the PUE of a site, the others of a machine.
type Input struct {
	Kind InputKind
	Name string
}

// compare puts inputs in an order, so that sums over them round alike each time.
func (in Input) compare(o Input) int {
	return cmp.Or(cmp.Compare(in.Kind, o.Kind), cmp.Compare(in.Name, o.Name))
}

// Terms is how a figure depends on its inputs: for each, how much of the
// figure scales with it. Terms of figures that are added are added with sign
// first, and only then squared, since one input is wrong in the same way
// everywhere (JCGM 100:2008, 5.2.2 and F.1.2).
type Terms struct {
	By     map[Input]float64
	Random float64 // sum of the variances of what is independent: gaps, expected hours
}

func (t *Terms) add(k InputKind, name string, c float64) {
	if t.By == nil {
		t.By = map[Input]float64{}
	}
	t.By[Input{k, name}] += c
}

// Plus adds factor times o. With factors 1/total and -1/total it makes the
// terms of the logarithm of a ratio.
func (t Terms) Plus(factor float64, o Terms) Terms {
	sum := Terms{By: map[Input]float64{}, Random: t.Random + factor*factor*o.Random}
	for in, c := range t.By {
		sum.By[in] += c
	}
	for in, c := range o.By {
		sum.By[in] += factor * c
	}
	return sum
}

// U is the standard uncertainty, in the unit of the figure. ok is false where
// nothing is declared: an uncertainty of gaps alone would flatter.
func (t Terms) U(d Declared) (u float64, ok bool) {
	if d.none() {
		return 0, false
	}
	variance := unit.Sum[float64]{}
	variance.Add(t.Random)
	for _, in := range slices.SortedFunc(maps.Keys(t.By), Input.compare) {
		if rel := d.of(in.Kind); rel != nil {
			variance.Add(float64(*rel) * float64(*rel) * t.By[in] * t.By[in])
		}
	}
	return math.Sqrt(variance.Value()), true
}
