package unit

import (
	"strings"
)

// Mass is an amount of greenhouse gas in grams of CO2 equivalent.
type Mass float64

// Energy is electric energy in kilowatt-hours.
type Energy float64

// Joules is energy as meters count it. 3.6e6 J are 1 kWh.
type Joules float64

// Power is electric power in watts.
type Power float64

// Intensity is the carbon intensity of electricity in g CO2e per kWh.
type Intensity float64

// Share is a part of a whole; 1 is 100 %.
type Share float64

// JoulesPerKWh is exact: 1 kWh = 3.6e6 J (NIST SP 811, Appendix B).
const JoulesPerKWh = 3.6e6

const (
	pound    = 453.59237  // g, exact (NIST SP 811, Appendix B)
	shortTon = 907_184.74 // g, exact (NIST SP 811, Appendix B)
)

// The scales are functions of nothing: tables, one for each quantity.
var (
	masses = scale{
		what: "a mass of CO2e", example: "25 kg",
		prints:  []step{{"µg", 1, 1e6}, {"mg", 1, 1e3}, {"g", 1, 1}, {"kg", 1e3, 1}, {"t", 1e6, 1}, {"kt", 1e9, 1}, {"Mt", 1e12, 1}},
		accepts: []step{{"ug", 1, 1e6}, {"lb", pound, 1}, {"short ton", shortTon, 1}, {"short tons", shortTon, 1}},
	}
	energies = scale{
		what: "an energy", example: "350 Wh",
		prints:  []step{{"µWh", 1, 1e9}, {"mWh", 1, 1e6}, {"Wh", 1, 1e3}, {"kWh", 1, 1}, {"MWh", 1e3, 1}, {"GWh", 1e6, 1}, {"TWh", 1e9, 1}},
		accepts: []step{{"uWh", 1, 1e9}, {"J", 1, JoulesPerKWh}, {"kJ", 1e3, JoulesPerKWh}, {"MJ", 1e6, JoulesPerKWh}, {"GJ", 1e9, JoulesPerKWh}},
	}
	powers = scale{
		what: "a power", example: "2.8 kW",
		prints:  []step{{"µW", 1, 1e6}, {"mW", 1, 1e3}, {"W", 1, 1}, {"kW", 1e3, 1}, {"MW", 1e6, 1}, {"GW", 1e9, 1}},
		accepts: []step{{"uW", 1, 1e6}},
	}
	intensities = scale{
		what: "a carbon intensity", example: "412 g/kWh",
		prints: []step{{"g/kWh", 1, 1}},
		accepts: []step{{"mg/kWh", 1, 1e3}, {"kg/kWh", 1e3, 1}, {"kg/MWh", 1, 1}, {"g/MWh", 1, 1e3}, {"t/MWh", 1e3, 1},
			{"t/GWh", 1, 1}, {"mg/Wh", 1, 1}, {"lb/MWh", pound, 1e3}, {"lb/kWh", pound, 1}},
	}
	shares = scale{
		what: "a share", example: "5 %",
		prints:  []step{{"%", 1, 100}},
		accepts: []step{{"", 1, 1}},
	}
)

// ParseMass reads text like "25 kg", "1.2 t" or "3 lb". "CO2e" may follow the unit.
func ParseMass(text string) (Mass, error) {
	v, err := masses.parse(plainGas(text))
	return Mass(v), err
}

// ParseEnergy reads text like "350 Wh", "1.2 MWh" or "7.2 MJ".
func ParseEnergy(text string) (Energy, error) {
	v, err := energies.parse(text)
	return Energy(v), err
}

// ParsePower reads text like "2.8 kW".
func ParsePower(text string) (Power, error) {
	v, err := powers.parse(text)
	return Power(v), err
}

// ParseIntensity reads text like "412 g/kWh", "0.4 kg/kWh" or "823.1 lb/MWh".
func ParseIntensity(text string) (Intensity, error) {
	v, err := intensities.parse(plainGas(text))
	return Intensity(v), err
}

// ParseShare reads text like "5 %" or "0.05".
func ParseShare(text string) (Share, error) {
	v, err := shares.parse(text)
	return Share(v), err
}

// plainGas drops the name of the gas after a unit: "g CO2e/kWh" becomes
// "g/kWh". Any other gas stays and is refused, for its warming potential would
// have to be guessed.
func plainGas(text string) string {
	for _, gas := range []string{"CO2eq", "CO2-eq", "CO2e"} {
		before, after, found := strings.Cut(text, gas)
		before = strings.TrimRight(before, " ")
		if _, symbol, err := split(before); found && err == nil && symbol != "" {
			return before + after
		}
	}
	return text
}

// Of is the mass that energy causes at intensity i.
func (i Intensity) Of(e Energy) Mass { return Mass(float64(i) * float64(e)) }

// Energy converts a meter's count.
func (j Joules) Energy() Energy { return Energy(float64(j) / JoulesPerKWh) }

// Over is the energy that constant power p takes over d.
func (p Power) Over(d Duration) Energy { return Joules(float64(p) * d.Seconds()).Energy() }

func (m Mass) String() string      { return m.Text(3) }
func (e Energy) String() string    { return e.Text(3) }
func (j Joules) String() string    { return figures(float64(j), 3) + " J" }
func (p Power) String() string     { return p.Text(3) }
func (i Intensity) String() string { return i.Text(3) }
func (s Share) String() string     { return s.Text(3) }

// Text prints the quantity with its unit and the given number of significant figures.
func (m Mass) Text(digits int) string { return masses.text(float64(m), digits) }

// Text prints the quantity with its unit and the given number of significant figures.
func (e Energy) Text(digits int) string { return energies.text(float64(e), digits) }

// Text prints the quantity with its unit and the given number of significant figures.
func (p Power) Text(digits int) string { return powers.text(float64(p), digits) }

// Text prints the quantity with its unit and the given number of significant figures.
func (i Intensity) Text(digits int) string { return intensities.text(float64(i), digits) }

// Text prints the share as a percentage with the given number of significant
// figures, or as a plain number where 100 times it would cost the last ones.
func (s Share) Text(digits int) string {
	if digits > 15 {
		return figures(float64(s), digits)
	}
	return figures(float64(s)*100, digits) + " %"
}

// Texter is a quantity that prints with any number of significant figures.
type Texter interface{ Text(digits int) string }

// Apart prints two quantities with three significant figures, or with as many
// more as it takes to tell them apart: 25.04 kg against 25.00 kg.
func Apart[T interface {
	Texter
	comparable
}](a, b T) (string, string) {
	const most = 17 // figures that tell any two floats apart
	for n := 3; n <= most && a != b; n++ {
		if x, y := a.Text(n), b.Text(n); x != y {
			return x, y
		}
	}
	return a.Text(3), b.Text(3)
}

// PlusMinus prints the mass with its expanded uncertainty, "2.37 ± 0.46 kg".
func (m Mass) PlusMinus(u Mass) string { return masses.interval(float64(m), float64(u)) }

// PlusMinus prints the energy with its expanded uncertainty.
func (e Energy) PlusMinus(u Energy) string { return energies.interval(float64(e), float64(u)) }

// Signed prints a difference with its sign, "+1.20 kg".
func Signed[T interface {
	Texter
	~float64
}](v T) string {
	if v > 0 {
		return "+" + v.Text(3)
	}
	return v.Text(3)
}

// Set parses text into the value, so that it can stand in a policy or a flag.
func (m *Mass) Set(text string) error { return set(m, text, ParseMass) }

// Set parses text into the value.
func (e *Energy) Set(text string) error { return set(e, text, ParseEnergy) }

// Set parses text into the value.
func (p *Power) Set(text string) error { return set(p, text, ParsePower) }

// Set parses text into the value.
func (i *Intensity) Set(text string) error { return set(i, text, ParseIntensity) }

// Set parses text into the value.
func (s *Share) Set(text string) error { return set(s, text, ParseShare) }

func set[T any](to *T, text string, parse func(string) (T, error)) error {
	v, err := parse(text)
	if err != nil {
		return err
	}
	*to = v
	return nil
}
