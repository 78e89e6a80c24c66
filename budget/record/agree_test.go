package record

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

// agree reads one line by both paths. Whatever the fast path takes, the general
// path must take too, and read the same; the fast path may always decline.
func agree(t require.TestingT, s *scanner, line []byte) (fast bool) {
	var f fields
	if !s.scan(line, &f) {
		return false
	}
	want, meter, _, wrong := decode(line, nil)
	require.Nil(t, wrong, "%q", line)
	got := Line{Kind: f.kind, At: f.at}
	got.setReading(f.value, f.wrap)
	require.Equal(t, want, got, "%q", line)
	require.Equal(t, meter, string(f.meter), "%q", line)
	require.False(t, math.Signbit(f.value), "%q", line)
	return true
}

// TestFastPathTakesTheUsualShapes: else the speed would be lost unseen.
func TestFastPathTakesTheUsualShapes(t *testing.T) {
	var s scanner
	for _, line := range []string{
		power(1, "gpu0", 412.5), power(1, "gpu0", 0), power(1, "gpu0", "0.25"), energy(1, "cpu-0:package", 262143328850), wrapping(1, "cpu", 7, 262144),
		power(1, "gpu0", 412.5) + "\r",
		`{"k": "power", "at": "2031-03-04T02:15:00Z", "meter": "gpu0", "w": 412.5}`,
		`{"k":"power","at":"2031-03-04T02:15:00.123456Z","meter":"gpu0","w":412.5}`,
		`{"k":"power","at":"2031-03-04T02:15:00.123456+00:00","meter":"gpu0","w":412.5}`,
		`{"at":"2031-03-04T02:15:00+01:00","meter":"gpu0","w":412.5,"k":"power"}`,
		`{"host":"h3","k":"power","seq":-1.5e300,"at":"2031-03-04T02:15:00Z","ok": true , "meter":"gpu0","w":412.5,"seq":12345678901234567890}`,
		`{"j":123456.789,"k":"energy","meter":"gpu0","at":"2031-03-04T02:15:00-11:30"}`,
	} {
		assert.True(t, agree(t, &s, []byte(line)), line)
	}
}

// TestFastPathDeclines what needs a judgement.
func TestFastPathDeclines(t *testing.T) {
	var s scanner
	good := power(1, "gpu0", 412.5)
	for _, line := range []string{
		"", "{", "{}", "[]", good + "x", good + good, good[:len(good)-1], opening, closing(1, "ok"),
		power(1, "gpu0", -1), power(1, "gpu0", "1e3"), power(1, "gpu0", "01"), power(1, "gpu0", "1."), power(1, "gpu0", "null"), power(1, "gpu0", `"1"`),
		power(1, "gpu0", "1234567890123456"), power(1, "gpu0", "0.0000000000000001"), power(1, "gpu0", "99999999999999999999999999"),
		power(1, "", 1), power(1, `g"pu`, 1), power(1, "gäu", 1), wrapping(1, "cpu", 7, 0),
		strings.Replace(good, `"w"`, `"j"`, 1), strings.Replace(energy(1, "cpu", 1), `"j"`, `"w"`, 1), strings.Replace(good, "}", `,"wrap_j":1}`, 1),
		strings.Replace(good, "}", `,"w":412.5}`, 1), strings.Replace(good, "}", `,"k":"power"}`, 1), strings.Replace(good, "}", `,"other":[1]}`, 1), strings.Replace(good, "}", `,"other":{}}`, 1),
		strings.Replace(good, "}", `,"other":"caf\u00e9"}`, 1), strings.Replace(good, "}", `,"other":01}`, 1), strings.Replace(good, "}", `,"other":}`, 1),
		strings.Replace(good, "}", `,"other":nul}`, 1), strings.Replace(good, "}", `,"other":"}`, 1), strings.Replace(good, "}", `,"other"}`, 1),
		strings.Replace(good, "2031", "1699", 1), strings.Replace(good, "2031", "2201", 1), strings.Replace(good, "-03-04", "-02-30", 1),
		strings.Replace(good, ":01Z", ":60Z", 1), strings.Replace(good, "01Z", "01,5Z", 1), strings.Replace(good, "01Z", "01.Z", 1),
		strings.Replace(good, "01Z", "01.0000000001Z", 1), strings.Replace(good, "01Z", "01+24:00", 1), strings.Replace(good, "T02", "T24", 1),
		strings.Replace(good, `"gpu0"`, "\"gp\x00u\"", 1), strings.Replace(good, `"gpu0"`, "\"gp\x7fu\"", 1), strings.Replace(good, `"gpu0"`, `"gp\u0075"`, 1),
	} {
		assert.False(t, agree(t, &s, []byte(line)), "%q", line)
	}
}

// drawLine draws a power or energy line in one of its many writings.
func drawLine(t *rapid.T) []byte {
	space := rapid.StringMatching(`[ \t\r]{0,2}`)
	number := rapid.OneOf(rapid.StringMatching(`(0|[1-9][0-9]{0,8})(\.[0-9]{1,8})?`), rapid.StringMatching(`[0-9]{1,20}(\.[0-9]{0,20})?([eE][+-]?[0-9]{1,3})?`))
	when := rapid.StringMatching(`20[0-9]{2}-(0[1-9]|1[0-2])-[0-3][0-9]T[0-2][0-9]:[0-6][0-9]:[0-6][0-9](\.[0-9]{1,10})?(Z|[+-][0-2][0-9]:[0-6][0-9])`)
	word := rapid.OneOf(rapid.StringMatching(`[a-z0-9:/._-]{0,12}`), rapid.String())
	members := []string{
		fmt.Sprintf(`"k":%s"%s"`, space.Draw(t, "space"), rapid.SampledFrom([]string{"power", "energy", "used", "Power", ""}).Draw(t, "kind")),
		fmt.Sprintf(`"at"%s:"%s"`, space.Draw(t, "space"), when.Draw(t, "at")),
		fmt.Sprintf(`"meter":%q`, word.Draw(t, "meter")),
		fmt.Sprintf(`"%s":%s`, rapid.SampledFrom([]string{"w", "j", "w", "j", "x"}).Draw(t, "key"), number.Draw(t, "value")),
		fmt.Sprintf(`"wrap_j":%s`, number.Draw(t, "wrap")),
	}
	for range rapid.IntRange(0, 2).Draw(t, "ignored") {
		members = append(members, fmt.Sprintf(`"%s":%s`, rapid.SampledFrom([]string{"seq", "host", "k", "w", "how"}).Draw(t, "key"), rapid.OneOf(number, rapid.SampledFrom([]string{`"h3"`, "true", "null", "-1", "[1]", "{}", "x"})).Draw(t, "ignored value")))
	}
	members = rapid.Permutation(members).Draw(t, "order")[:rapid.IntRange(3, len(members)).Draw(t, "members")]
	return []byte("{" + strings.Join(members, ","+space.Draw(t, "space")) + "}" + space.Draw(t, "space"))
}

// TestShapes: the fast path remembers how lines were written; a line that only
// resembles them must not pass for one.
func TestShapes(t *testing.T) {
	first := power(1, "gpu0", 412.5)
	for second, fast := range map[string]bool{
		power(2, "gpu1", 0): true, power(2, "a-longer-name", "123456.789"): true, strings.Replace(first, "01Z", "01.25+01:00", 1): true,
		energy(2, "gpu0", 7): true, wrapping(2, "gpu0", 7, 9): true, first + " ": true, first + "x": false, first[:len(first)-1]: false, first + "\n": true,
		strings.Replace(first, `"w":`, `"w" :`, 1): true, strings.Replace(first, "412.5", "4e2", 1): false, strings.Replace(first, "412.5", "", 1): false,
		strings.Replace(first, "412.5", "0412.5", 1): false, strings.Replace(first, "gpu0", "", 1): false, strings.Replace(first, "gpu0", `a","w":1,"b":"`, 1): false,
		strings.Replace(first, "gpu0", "gpü", 1): false, strings.Replace(first, "01Z", `01Z","at":"2031-03-04T02:15:01Z`, 1): false, first[:40]: false,
		strings.Replace(first, "2031-03-04T02:15:01Z", "", 1): false, strings.Replace(first, "02:15:01Z", "02:15:61Z", 1): false,
	} {
		var s scanner
		require.True(t, agree(t, &s, []byte(first)))
		for range 2 {
			assert.Equal(t, fast, agree(t, &s, []byte(second)), second)
			assert.True(t, agree(t, &s, []byte(first)), "after %s", second)
		}
	}
}

// TestPathsAgree on lines of many writings, and on ones with changed bytes.
func TestPathsAgree(t *testing.T) {
	var s scanner // kept over lines, as the Reader keeps it
	taken := 0
	rapid.Check(t, func(t *rapid.T) {
		line := drawLine(t)
		if rapid.Bool().Draw(t, "usual") {
			line = []byte(power(rapid.IntRange(0, 1e6).Draw(t, "second"), "gpu0", rapid.Float32Range(0, 3000).Draw(t, "w")))
		}
		for range rapid.IntRange(0, 2).Draw(t, "changes") {
			i := rapid.IntRange(0, len(line)-1).Draw(t, "place")
			switch rapid.IntRange(0, 2).Draw(t, "change") {
			case 0:
				line[i] = rapid.Byte().Draw(t, "byte")
			case 1:
				line = append(line[:i], line[i+1:]...)
			case 2:
				line = append(line[:i], append([]byte{rapid.SampledFrom([]byte(`0123456789.,:-+eE"{}\ TZ`)).Draw(t, "byte")}, line[i:]...)...)
			}
		}
		if agree(t, &s, line) {
			taken++
		}
	})
	assert.Positive(t, taken, "the check must bite")
}
