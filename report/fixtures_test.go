package report

import (
	"bufio"
	"bytes"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"github.com/klauspost/compress/gzip"
	"github.com/klauspost/compress/zstd"
	"github.com/santhosh-tekuri/jsonschema/v6"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/record"
)

// kinds are the sorts of file below testdata, told by their name, and how each
// is checked. A file of no kind fails the test: nothing would look at it.
var kinds = []struct {
	name  string
	match *regexp.Regexp
	check func(t *testing.T, path string)
}{
	{"books", regexp.MustCompile(`/books\.ndjson$`), checkBooks},
	{"record", regexp.MustCompile(`\.ndjson(\.gz|\.zst)?$`), checkRecord},
	{"series", regexp.MustCompile(`\.csv$`), checkSeries},
	{"policy", regexp.MustCompile(`\.toml$`), checkPolicy},
	{"statement", regexp.MustCompile(`statement[^/]*\.json$`), checkStatement},
	{"program", regexp.MustCompile(`/gen/[^/]+\.go$`), checkProgram},
	{"prose", regexp.MustCompile(`(README\.md|\.gitattributes)$`), checkProse},
}

func TestEveryFixtureHoldsToItsFormat(t *testing.T) {
	seen := map[string]int{}
	require.NoError(t, filepath.WalkDir("../testdata", func(path string, d fs.DirEntry, err error) error {
		if err == nil && !d.IsDir() {
			name, check := kindOf(filepath.ToSlash(path))
			require.NotEmpty(t, name, "%s is of a kind that nothing checks", path)
			seen[name]++
			t.Run(path, func(t *testing.T) { check(t, path) })
		}
		return err
	}))
	for _, kind := range []string{"record", "series", "policy"} {
		require.NotZero(t, seen[kind], "no %s below testdata", kind)
	}
}

func kindOf(path string) (name string, check func(*testing.T, string)) {
	for _, k := range kinds {
		if k.match.MatchString(path) {
			return k.name, k.check
		}
	}
	return "", nil
}

func TestFilesOfNoKindAreFound(t *testing.T) {
	for _, path := range []string{"testdata/notes.txt", "testdata/demo/head/a.json", "testdata/demo/main.go", "testdata/a.ndjson.xz"} {
		name, _ := kindOf(path)
		require.Empty(t, name, path)
	}
}

// checkBooks has the ledger check itself, and reads it.
func checkBooks(t *testing.T, path string) {
	store, err := ledger.Open(t.Context(), "file:"+path)
	require.NoError(t, err)
	found, err := store.Vet(t.Context())
	require.NoError(t, err)
	require.Empty(t, found.Lines())
	read, err := store.Read(t.Context(), ledger.Query{})
	require.NoError(t, err)
	require.NotEmpty(t, read.Entries)
	require.NoError(t, store.Close())
}

// checkRecord holds each line against the schema and the whole against the
// reader, which must have nothing to say.
func checkRecord(t *testing.T, path string) {
	line := schema(t, "../budget/record/schema.json")
	text := inflated(t, path)
	scan := bufio.NewScanner(bytes.NewReader(text))
	scan.Buffer(nil, record.MaxLine)
	lines := 0
	for ; scan.Scan(); lines++ {
		v, err := jsonschema.UnmarshalJSON(bytes.NewReader(scan.Bytes()))
		require.NoError(t, err, "line %d", lines+1)
		require.NoError(t, line.Validate(v), "line %d", lines+1)
	}
	require.NoError(t, scan.Err())
	require.NotZero(t, lines)

	r, err := record.NewReader(bytes.NewReader(text), path)
	require.NoError(t, err)
	for err == nil {
		_, err = r.Next()
	}
	require.ErrorIs(t, err, io.EOF)
	require.Empty(t, r.Findings().Lines())
	require.Empty(t, r.Unknown().Lines())
	require.Empty(t, r.Notes())
}

// inflated unpacks by the name, unlike the reader, which looks at the content.
func inflated(t *testing.T, path string) []byte {
	t.Helper()
	f, err := os.Open(path)
	require.NoError(t, err)
	defer f.Close()
	var in io.Reader = f
	switch filepath.Ext(path) {
	case ".gz":
		in, err = gzip.NewReader(f)
	case ".zst":
		in, err = zstd.NewReader(f)
	}
	require.NoError(t, err)
	text, err := io.ReadAll(in)
	require.NoError(t, err)
	return text
}

func checkSeries(t *testing.T, path string) {
	data, err := os.ReadFile(path)
	require.NoError(t, err)
	f, err := grid.ReadCSV(bytes.NewReader(data), path, grid.Columns{})
	require.NoError(t, err)
	require.Empty(t, f.Findings.Lines())
	require.NotEmpty(t, grid.NewSet(grid.Direct, f).All())
}

func checkPolicy(t *testing.T, path string) {
	data, err := os.ReadFile(path)
	require.NoError(t, err)
	_, found := budget.ParsePolicy(budget.PolicyFile{Name: path, Data: data})
	require.Empty(t, found)
}

func checkStatement(t *testing.T, path string) {
	data, err := os.ReadFile(path)
	require.NoError(t, err)
	require.NoError(t, schema(t, "statement.schema.json").Validate(decoded(t, data)))
}

// checkProgram: whoever compiles the module's packages names those folders
// too; here it is enough that they say what they are.
func checkProgram(t *testing.T, path string) {
	data, err := os.ReadFile(path)
	require.NoError(t, err)
	require.Contains(t, string(data), "package main")
}

func checkProse(t *testing.T, path string) {
	data, err := os.ReadFile(path)
	require.NoError(t, err)
	require.NotEmpty(t, strings.TrimSpace(string(data)))
}
