package inputs_test

import (
	"crypto/sha256"
	"encoding/hex"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"github.com/bmatcuk/doublestar/v4"
	"github.com/stretchr/testify/assert"

	"budgetcheck/budget/inputs"
)

// files is a small repository.
func files() inputs.Tree {
	return inputs.Tree{
		{Mode: "100644", Path: "budgetcheck.toml", Blob: "b1"}, {Mode: "100644", Path: "grid/march.csv", Blob: "b2"},
		{Mode: "100644", Path: "tide/train.py", Blob: "b3"}, {Mode: "100755", Path: "tide/deep/run.sh", Blob: "b4"}, {Mode: "100644", Path: "docs/tides.md", Blob: "b5"},
	}
}

// The hash is what anybody can compute by hand from git ls-tree.
func TestHashByHand(t *testing.T) {
	sum := sha256.Sum256([]byte("100755\x00tide/deep/run.sh\x00b4\x00100644\x00tide/train.py\x00b3\x00"))
	assert.Equal(t, hex.EncodeToString(sum[:]), files().Hash([]string{"tide/**"}, nil))
}

func TestHashHasNoOrder(t *testing.T) {
	want := files().Hash(nil, nil)
	draw := rand.New(rand.NewPCG(1, 2))
	for range 50 {
		mixed := files()
		draw.Shuffle(len(mixed), func(i, j int) { mixed[i], mixed[j] = mixed[j], mixed[i] })
		before := slices.Clone(mixed)
		assert.Equal(t, want, mixed.Hash(nil, nil))
		assert.Equal(t, before, mixed, "the tree is left as it was")
	}
}

// Mode, path and content of each file count, and which files there are.
func TestHashTellsTreesApart(t *testing.T) {
	seen := map[string]string{files().Hash(nil, nil): "as it is"}
	for name, change := range map[string]func(inputs.Tree) inputs.Tree{
		"mode":           func(t inputs.Tree) inputs.Tree { t[2].Mode = "100755"; return t },
		"path":           func(t inputs.Tree) inputs.Tree { t[2].Path = "tide/trains.py"; return t },
		"blob":           func(t inputs.Tree) inputs.Tree { t[2].Blob = "b9"; return t },
		"two swapped":    func(t inputs.Tree) inputs.Tree { t[2].Blob, t[3].Blob = t[3].Blob, t[2].Blob; return t },
		"one less":       func(t inputs.Tree) inputs.Tree { return t[1:] },
		"one more":       func(t inputs.Tree) inputs.Tree { return append(t, inputs.File{Mode: "100644", Path: "x", Blob: "b1"}) },
		"none":           func(inputs.Tree) inputs.Tree { return nil },
		"moved boundary": func(t inputs.Tree) inputs.Tree { t[2].Path, t[2].Blob = "tide/train.pyb", "3"; return t },
	} {
		hash := change(files()).Hash(nil, nil)
		assert.NotContains(t, seen, hash, name)
		seen[hash] = name
	}
}

func TestHashOfGlobs(t *testing.T) {
	all := files()
	of := func(paths ...string) string {
		return inputs.Tree(slices.DeleteFunc(files(), func(f inputs.File) bool { return !slices.Contains(paths, f.Path) })).Hash(nil, nil)
	}
	for _, c := range []struct {
		globs, except []string
		paths         []string
	}{
		{[]string{"tide/*"}, nil, []string{"tide/train.py"}},
		{[]string{"tide/**"}, nil, []string{"tide/train.py", "tide/deep/run.sh"}},
		{[]string{"**/*.{py,sh}"}, nil, []string{"tide/train.py", "tide/deep/run.sh"}},
		{[]string{"tide/**", "**/*.py"}, nil, []string{"tide/train.py", "tide/deep/run.sh"}},
		{[]string{"tide/**"}, []string{"tide/deep/**"}, []string{"tide/train.py"}},
		{nil, []string{"budgetcheck.toml", "grid/*.csv"}, []string{"tide/train.py", "tide/deep/run.sh", "docs/tides.md"}},
		{[]string{"tide"}, nil, nil},
		{[]string{"/tide/**"}, nil, nil},
		{nil, []string{"**"}, nil},
	} {
		assert.Equal(t, of(c.paths...), all.Hash(c.globs, c.except), "%v without %v", c.globs, c.except)
	}
}

func TestFindAndMatch(t *testing.T) {
	f, ok := files().Find("tide/train.py")
	assert.True(t, ok)
	assert.Equal(t, "b3", f.Blob)
	_, ok = files().Find("tide")
	assert.False(t, ok)
	assert.Equal(t, []string{"tide/deep/run.sh", "tide/train.py"}, paths(files().Match("**/*.py", "tide/**")), "sorted, each once")
	assert.Empty(t, files().Match())
}

// A literal glob matches its path and no other.
func TestLiteral(t *testing.T) {
	names := append([]string{"plain/path.toml", "a*b", "a?b", "[a]", "{a,b}", "a]b", "x{", "!a", "[!a]", "a/**/b"}, odd...)
	for _, name := range names {
		glob := inputs.Literal(name)
		assert.True(t, doublestar.ValidatePattern(glob), glob)
		for _, other := range append(names, "axb", "a", "b", "a/b", "a/x/b") {
			assert.Equal(t, name == other, doublestar.MatchUnvalidated(glob, other), "%q and %q", glob, other)
		}
	}
}

func TestFullID(t *testing.T) {
	full := strings.Repeat("0a", 20)
	for name, want := range map[string]bool{full: true, full + strings.Repeat("f", 24): true, full[:39]: false, full + "0": false, "main": false, "": false,
		strings.Repeat("g", 40): false, full[:38] + "^0": false, strings.Repeat("A", 40): false} {
		assert.Equal(t, want, inputs.FullID(name), name)
	}
}
